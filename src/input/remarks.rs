//! Warnings that the file alone can tell, before any mean flow.

use crate::elements::ends::{Exit, ExitEnd, Feed, FeedEnd, Reflection};
use crate::elements::{Element, Kind};
use crate::network::areas::{TOLERANCE, station_areas};
use crate::network::{ElementId, Network, responses, values};
use crate::problems::Problem;
use crate::units::{Dimension, write_rounded};

pub(super) fn remarks(network: &Network<f64>) -> Vec<Problem> {
    let flows = values::still(network).is_none();
    let mut found = Vec::new();
    for (id, element) in network.elements() {
        match &element.kind {
            Kind::Feed(feed) => self::feed(network, element, feed, flows, &mut found),
            Kind::Exit(exit) => self::exit(network, element, exit, &mut found),
            Kind::Restriction(r) => {
                if let Some(section) = r.section {
                    let open = section.area(&network.values);
                    found.extend(wide_opening(network, id, element, open));
                }
            }
            Kind::Duct(_)
            | Kind::Contraction(_)
            | Kind::Expansion(_)
            | Kind::Plenum(_)
            | Kind::Flame(_) => {}
        }
    }
    found.extend(responses::of_responses(network));
    found.extend(damped_at_ends_only(network, flows));
    found
}

fn feed(
    network: &Network<f64>,
    element: &Element,
    feed: &Feed,
    flows: bool,
    found: &mut Vec<Problem>,
) {
    let end = match feed.end {
        FeedEnd::Closed => "closed",
        FeedEnd::Open => "open",
        FeedEnd::Reflection(r) => {
            found.extend(active(network, element, r));
            return;
        }
        FeedEnd::Reservoir | FeedEnd::Anechoic | FeedEnd::Choked => return,
    };
    if flows {
        let what = format!("with flow, a feed with end = \"{end}\" puts acoustic power in");
        found.push(
            Problem::warning("feed.end", what)
                .hint("a real supply is nearer to \"reservoir\" or \"choked\""),
        );
    }
}

fn exit(network: &Network<f64>, element: &Element, exit: &Exit, found: &mut Vec<Problem>) {
    if let ExitEnd::Reflection(r) = exit.end {
        found.extend(active(network, element, r));
    }
}

/// An end that reflects more than arrives.
fn active(network: &Network<f64>, element: &Element, r: Reflection) -> Option<Problem> {
    let modulus = network.values[r.coefficient].abs();
    (modulus > 1.0).then(|| {
        let what = format!("this end reflects {modulus} of what arrives: it is a source of sound");
        Problem::warning(format!("{}.coefficient", element.name), what)
            .hint("a passive end without flow reflects at most 1")
    })
}

fn wide_opening(
    network: &Network<f64>,
    id: ElementId,
    element: &Element,
    open: f64,
) -> Option<Problem> {
    let station = network.layout.inlet(id)?;
    let passage = *station_areas(network).get(station.0)?;
    (open > passage * (1.0 + TOLERANCE)).then(|| {
        let area = |a| write_rounded(a, Dimension::Area, 6);
        let what = format!(
            "the opening, {}, is larger than the passage it is in, {}",
            area(open),
            area(passage)
        );
        Problem::warning(&element.name, what)
            .hint("a loss coefficient and an effective length refer to the opening stated")
    })
}

/// Whether nothing but the ends takes sound out.
fn damped_at_ends_only(network: &Network<f64>, flows: bool) -> Option<Problem> {
    // Losses of head need flow.
    let lossy = flows
        && network.elements().any(|(_, e)| match &e.kind {
            Kind::Expansion(_) | Kind::Plenum(_) => true,
            Kind::Restriction(r) => network.values[r.loss_coefficient] > 0.0,
            Kind::Feed(_)
            | Kind::Exit(_)
            | Kind::Duct(_)
            | Kind::Contraction(_)
            | Kind::Flame(_) => false,
        });
    (!lossy).then(|| {
        let what = "nothing between the ends takes sound out, so damping rests on the ends alone";
        Problem::warning("exit", what).hint(
            "real rigs lose sound in area changes, liners and boundary layers; growth rates are on the high side",
        )
    })
}
