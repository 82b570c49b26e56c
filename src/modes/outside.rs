//! What grows outside a window, and whether that is all.
//!
//! In the band of frequency from zero to the window's top, growth rates from the window's upper edge to one
//! beyond which nothing lies ([`tail`]) are searched like any window; below the window's lowest frequency
//! those above zero are searched as well, on the real axis too, and so are those between zero and a lower
//! edge that is positive.

use std::f64::consts::TAU;

use num_complex::Complex64;

use super::{Mode, ModeList, Solved, Tendency, Window, doubt_in_words, find_from, listed};
use crate::acoustics::Acoustics;
use crate::numerics::count::Rectangle;
use crate::numerics::zeros::{self, Doubt, Scan};
use crate::units::{write_decimals, write_signed};
use crate::waves::tail::{self, Unbounded};

/// Growth outside a window.
#[derive(Clone, Debug, PartialEq)]
pub struct Outside {
    /// Modes in the window's band of frequency that grow faster than its upper edge, by increasing
    /// frequency.
    pub faster: Vec<Mode>,
    /// Modes that grow below the window's lowest frequency, those that do not oscillate among them.
    pub slower: Vec<Mode>,
    /// Modes in the window's band of frequency that grow, though slower than its lower edge: there are
    /// some only where that edge is positive.
    pub milder: Vec<Mode>,
    /// Growth rate (1/s) up to which was searched.
    pub searched_to: f64,
    /// Whether the search up to there is proved complete.
    pub complete: bool,
    /// Whether it is proved that nothing lies beyond.
    pub proved: bool,
    /// Why it is not proved that nothing in the band lies right of the window and nothing below or left
    /// of it grows; `None` where it is proved.
    pub reason: Option<String>,
    /// Every zero met on the way, for the next search nearby.
    pub met: Vec<Complex64>,
}

impl Outside {
    /// Whether growth outside the window, up to its highest frequency, is excluded.
    pub fn excluded(&self) -> bool {
        self.reason.is_none()
    }

    /// Whether growth beside the modes found outside is excluded.
    pub fn rest_excluded(&self) -> bool {
        self.complete && self.proved
    }

    /// Every mode that grows outside the window, and those right of it that do not.
    pub fn modes(&self) -> impl Iterator<Item = &Mode> + Clone {
        self.slower.iter().chain(&self.milder).chain(&self.faster)
    }

    /// The fastest of all.
    pub fn fastest(&self) -> Option<&Mode> {
        super::fastest(self.modes())
    }
}

/// Growth rate (1/s) up to which the proof is sought.
const LIMIT: f64 = 1e6;

/// Where there is no such proof, how far to the right of a window is searched at least, over its height.
const REACH: f64 = 3.0;

/// Growth rate (1/s) up to which is searched where a spread delay still falls.
const FAR: f64 = 2e4;

/// Looks outside a window.
pub fn outside(solved: &Solved, window: Window) -> Outside {
    let acoustics = &solved.acoustics;
    let beyond = Beyond::sought(acoustics, window, window.growth.1);
    looked_for(acoustics, window, beyond, &[])
}

/// The modes in a window and those outside, from one search where that proves both complete. The proof of growth outside is
/// tried first at a growth rate `start`, zeros are expected at `starts`: what a network much like this one had.
pub fn find_all_from(
    acoustics: &Acoustics<f64>,
    window: Window,
    start: f64,
    starts: &[Complex64],
) -> (ModeList, Outside) {
    let beyond = Beyond::sought(acoustics, window, start);
    let mut windows = vec![window];
    windows.extend(strips(window, beyond.searched_to).into_iter().flatten());
    let rectangles: Vec<Rectangle> = windows.iter().map(Window::rectangle).collect();
    let mut whole = window.rectangle();
    for r in &rectangles {
        whole.growth.0 = whole.growth.0.min(r.growth.0);
        whole.growth.1 = whole.growth.1.max(r.growth.1);
        whole.omega.0 = whole.omega.0.min(r.omega.0);
    }
    let tape = &acoustics.characteristic.tape;
    let scan = Scan::UntilCounted;
    let found = zeros::search_parts(tape, &whole, &rectangles, scan, starts);
    if !found.iter().flat_map(|f| &f.doubts).all(on_edge) {
        // What is missing may lie in any part.
        let list = find_from(acoustics, window, scan, starts);
        return (list, looked_for(acoustics, window, beyond, starts));
    }
    let mut lists = windows.into_iter().zip(found).map(|(w, f)| listed(w, f));
    let inside = lists.next();
    let outside = judged(window, beyond, lists);
    let inside = inside.unwrap_or_else(|| listed(window, zeros::Search::default()));
    (inside, outside)
}

/// How far to the right of a window is searched, and whether nothing lies beyond.
struct Beyond {
    searched_to: f64,
    proved: bool,
    reason: Option<String>,
}

impl Beyond {
    fn sought(acoustics: &Acoustics<f64>, window: Window, start: f64) -> Beyond {
        let tape = &acoustics.characteristic.tape;
        let (low, high) = window.growth;
        let from = high.max(start);
        let clear = tail::clear_beyond(tape, from, TAU * window.frequency.1, LIMIT);
        let strip = high + REACH * (high - low);
        Beyond {
            searched_to: match clear {
                Ok(growth) => growth,
                Err(Some(Unbounded::Spread(turn))) => turn.min(FAR).max(strip),
                Err(_) => strip,
            },
            proved: clear.is_ok(),
            reason: clear.err().map(in_words),
        }
    }
}

/// Most windows searched outside one.
const STRIPS: usize = 3;

/// The windows searched outside one: right of it, below, and left.
fn strips(window: Window, searched_to: f64) -> [Option<Window>; STRIPS] {
    let (low, high) = window.growth;
    let (lowest, highest) = window.frequency;
    let strip = |growth: (f64, f64), frequency: (f64, f64)| {
        let some = growth.1 > growth.0 && frequency.1 > frequency.0;
        some.then_some(Window { frequency, growth })
    };
    [
        strip((high, searched_to), (0.0, highest)),
        strip((0.0, high), (0.0, lowest)),
        strip((0.0, low), window.frequency),
    ]
}

/// Searches each of them.
fn looked_for(
    acoustics: &Acoustics<f64>,
    window: Window,
    beyond: Beyond,
    starts: &[Complex64],
) -> Outside {
    let look = |strip| find_from(acoustics, strip, Scan::UntilCounted, starts);
    let lists = strips(window, beyond.searched_to)
        .into_iter()
        .flatten()
        .map(look);
    judged(window, beyond, lists)
}

fn on_edge(doubt: &Doubt) -> bool {
    matches!(doubt, Doubt::OnEdge { .. })
}

/// What the lists of the windows outside one tell.
fn judged(window: Window, beyond: Beyond, lists: impl Iterator<Item = ModeList>) -> Outside {
    let (low, high) = window.growth;
    let lowest = window.frequency.0;
    let mut reason = beyond.reason;
    let mut seen = Vec::new();
    let mut met = Vec::new();
    let mut complete = true;
    for list in lists {
        // A mode on an edge is listed, and judged by its own growth rate.
        if let Some(doubt) = list.doubts.iter().find(|d| !on_edge(d)) {
            complete = false;
            reason.get_or_insert(doubt_in_words(doubt).0);
        }
        seen.extend(list.modes);
        met.extend(list.met);
    }
    let (faster, others): (Vec<Mode>, Vec<Mode>) = seen
        .into_iter()
        .partition(|m| m.growth() > high && m.frequency() >= lowest);
    let (slower, milder): (Vec<Mode>, Vec<Mode>) = others
        .into_iter()
        .filter(|m| m.tendency() == Tendency::Grows)
        .filter(|m| m.frequency() < lowest || m.growth() < low)
        .partition(|m| m.frequency() < lowest);
    if let Some(found) = found_in_words(&faster, &slower, &milder) {
        reason = Some(found);
    }
    Outside {
        faster,
        slower,
        milder,
        searched_to: beyond.searched_to,
        complete,
        proved: beyond.proved,
        reason,
        met,
    }
}

fn found_in_words(faster: &[Mode], slower: &[Mode], milder: &[Mode]) -> Option<String> {
    let parts = [
        (faster, "lies right of"),
        (slower, "grows below"),
        (milder, "grows left of"),
    ];
    parts.into_iter().find_map(|(modes, does)| {
        let m = super::fastest(modes.iter())?;
        Some(format!(
            "a mode {does} the window: {} 1/s at {} Hz",
            write_signed(m.growth(), 1),
            write_decimals(m.frequency(), 1)
        ))
    })
}

fn in_words(reason: Option<Unbounded>) -> String {
    match reason {
        Some(Unbounded::Spread(_)) => {
            "a Gaussian response has a part ahead of its cause, which takes over far to the right"
        }
        Some(Unbounded::Negative) => {
            "a flame follows a station that its own sound reaches ahead of its delay"
        }
        Some(Unbounded::Degree) => "more storage terms than the proof covers",
        Some(Unbounded::Vanishes) => "the ends leave nothing without delay to compare with",
        None => "no growth rate was found that the delays cannot exceed",
    }
    .to_owned()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::modes::{ModeList, find};
    use crate::{input, modes};

    /// A flame between anechoic ends in still gas: `1 + sqrt(6) + (6 - 1) n exp(-s tau) ...`; its intrinsic
    /// modes have growth rate `ln(n (T2/T1 - 1)/(1 + sqrt(T2/T1)))/tau` (`c1 rho1 = sqrt(T2/T1) c2 rho2`).
    fn intrinsic(n: f64, tau_ms: f64, more: &str) -> String {
        format!(
            r#"
            title = "Flame between anechoic ends (invented)"
            search = {{ frequency = "20 to 800 Hz", growth = "-300 to 300 1/s" }}
            feed = {{ gas = {{ gamma = 1.4, gas_constant = "287 J/(kg K)" }}, mass_flow = "0 kg/s", temperature = "300 K", pressure = "1 bar", end = "anechoic" }}
            exit = {{ end = "anechoic" }}
            [[element]]
            name = "a"
            kind = "duct"
            length = "0.2 m"
            diameter = "80 mm"
            [[element]]
            name = "f"
            kind = "flame"
            burnt_temperature = "1800 K"
            response = {{ {more} interaction_index = {n}, delay = "{tau_ms} ms" }}
            [[element]]
            name = "b"
            kind = "duct"
            length = "0.2 m"
            diameter = "80 mm"
            "#
        )
    }

    fn ask(toml: &str) -> (ModeList, Outside) {
        let network = input::parse("t.toml", toml, &[]).unwrap().network;
        let solved = modes::solve(&network).unwrap();
        let window = Window::of(&network, &solved.mean).unwrap();
        let list = find(&solved, window, Scan::Whole);
        (list, outside(&solved, window))
    }

    #[test]
    fn an_intrinsic_mode_beyond_the_window_is_found() {
        let (list, outside) = ask(&intrinsic(2.0, 1.0, r#"kind = "n-tau","#));
        assert!(list.complete() && list.modes.is_empty());
        // Impedances: rho c falls by sqrt(6) across the flame.
        let growth = (2.0 * 5.0 / (1.0 + 6f64.sqrt())).ln() / 1e-3;
        assert!((growth - 1064.0).abs() < 1.0);
        let m = outside.fastest().unwrap();
        assert!((m.growth() - growth).abs() < 1e-6 && (m.frequency() - 500.0).abs() < 1e-6);
        assert!(!outside.excluded());
    }

    #[test]
    fn growth_is_excluded_where_it_is_proved() {
        let (list, outside) = ask(&intrinsic(0.5, 1.0, r#"kind = "n-tau","#));
        assert!(list.complete());
        assert_eq!(
            (outside.excluded(), outside.faster.len()),
            (true, 0),
            "{outside:?}"
        );
    }

    #[test]
    fn a_spread_delay_leaves_growth_open() {
        let (_, outside) = ask(&intrinsic(
            0.5,
            1.0,
            r#"kind = "gaussian", spread = "0.2 ms","#,
        ));
        assert!(outside.reason.unwrap().contains("Gaussian"));
    }

    #[test]
    fn a_mode_that_grows_without_oscillating_is_found_below_the_window() {
        // n (T2/T1 - 1) = -10: the real root ln(10/(1 + sqrt 6))/tau.
        let (list, outside) = ask(&intrinsic(-2.0, 1.0, r#"kind = "n-tau","#));
        assert!(list.complete());
        assert_eq!(outside.slower.len(), 1);
        let m = outside.slower[0];
        assert!((m.growth() - 1064.0).abs() < 1.0 && m.frequency() == 0.0);
        assert!(!outside.excluded());
    }

    #[test]
    fn growth_left_of_a_window_of_fast_growth_is_found() {
        // The intrinsic mode at 500 Hz and 1064 1/s, below a window that begins at 1200 1/s.
        let toml = intrinsic(2.0, 1.0, r#"kind = "n-tau","#).replace("-300 to 300", "1200 to 1500");
        let (list, outside) = ask(&toml);
        assert!(list.complete() && list.modes.is_empty());
        assert!(!outside.excluded() && outside.faster.is_empty() && outside.slower.is_empty());
        let m = outside.milder[0];
        assert!((m.growth() - 1064.0).abs() < 1.0 && (m.frequency() - 500.0).abs() < 1e-6);
        assert_eq!(outside.milder.len(), 1);
        assert_eq!(outside.fastest(), Some(&m));
    }
}
