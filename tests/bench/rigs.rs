//! The networks whose speed is measured, with the map drawn of each: gain and delay of the main flame.

use std::path::{Path, PathBuf};

use num_complex::Complex64;
use stillflame::modes::{self, Solved, Window};
use stillflame::network::Network;
use stillflame::studies::map::{self, Axis, Map};
use stillflame::{input, problems};

/// A network ready to be asked.
pub struct Rig {
    /// What it is called in figures.
    pub name: &'static str,
    /// As its file states it.
    pub network: Network,
    /// Its mean flow and acoustics.
    pub solved: Solved,
    /// The window its file states.
    pub window: Window,
}

/// Points of a map along each axis.
pub const POINTS: usize = 200;

/// A file of the repository.
pub fn file(path: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join(path)
}

impl Rig {
    /// Reads a network and solves its mean flow.
    pub fn read(name: &'static str, path: &str) -> Result<Rig, problems::Problems> {
        let network = input::read(&file(path), &[])?.network;
        let solved = modes::solve(&network)?;
        let window = Window::of(&network, &solved.mean)?;
        Ok(Rig {
            name,
            network,
            solved,
            window,
        })
    }

    /// Points spread over the window: multiples of the golden ratio across, even steps up.
    pub fn points(&self, number: u32) -> Vec<Complex64> {
        let r = self.window.rectangle();
        let within = |(a, b): (f64, f64), part: f64| a + (b - a) * part;
        let golden = 0.5 * (5f64.sqrt() - 1.0);
        (0..number)
            .map(|i| {
                let across = (f64::from(i) * golden).fract();
                let up = f64::from(i) / f64::from(number);
                Complex64::new(within(r.growth, across), within(r.omega, up))
            })
            .collect()
    }

    /// An axis over a knob.
    pub fn axis(&self, key: &str, low: f64, high: f64, points: usize) -> Axis {
        Axis {
            knob: self.network.layout.knob(key).expect("a knob of the rig"),
            low,
            high,
            points,
        }
    }

    /// The delay, 0 to 10 ms, and the gain, 0 to 2, of the main flame.
    pub fn axes(&self, points: usize) -> (Axis, Axis) {
        (
            self.axis("main_flame.delay", 0.0, 0.01, points),
            self.axis("main_flame.interaction_index", 0.0, 2.0, points),
        )
    }

    /// The modes at every point of a plane.
    pub fn map(&self, axes: (Axis, Axis)) -> Map {
        let go_on = || std::ops::ControlFlow::Continue(());
        map::map(
            &self.network,
            &self.solved.mean,
            axes,
            self.window,
            false,
            go_on,
        )
        .expect("not ended")
    }
}

/// Threads to share a map among.
pub fn threads(number: usize) -> rayon::ThreadPool {
    rayon::ThreadPoolBuilder::new()
        .num_threads(number)
        .build()
        .expect("threads")
}
