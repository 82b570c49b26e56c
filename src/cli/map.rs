//! `stillflame map NETWORK --across ... --up ...`.

use std::ops::ControlFlow;

use clap::Args;

use super::options::{Case, Common, WindowArguments};
use super::plane::{self, Points};
use super::{Answer, Failure, Status, progress};
use crate::modes::{self, Mode, ModeList, Scan, validity};
use crate::network::Network;
use crate::problems::Problem;
use crate::report::map::{Followed, MapReport};
use crate::studies::{beyond, branch, cautions, map, regions};

/// Draw a stability map over two numbers of the network
///
/// At every point the mean flow and the complete list of modes in the window; drawn are the largest
/// growth rate, the neutral curve and the design point, which is the network as its file states it. A
/// point whose list is not proved complete, or that has no mean flow, is hatched. Writes an SVG and a
/// CSV file, into the working directory unless --out names another; with --json only where --out is
/// given.
#[derive(Clone, Debug, Args)]
#[command(
    after_help = "Example:\n  stillflame map networks/swirl_rig.toml --across \"main_flame.delay = 0 ms to 10 ms\" \\\n    --up \"main_flame.interaction_index = 0 to 2\" --points 200x200 --out results"
)]
pub(super) struct Arguments {
    #[command(flatten)]
    pub common: Common,

    /// The number along the map and its span, as in "main_flame.delay = 0 ms to 10 ms"
    #[arg(long, value_name = "NAME = A to B", allow_hyphen_values = true)]
    across: String,

    /// The number up the map and its span, as in "main_flame.interaction_index = 0 to 2"
    #[arg(long, value_name = "NAME = A to B", allow_hyphen_values = true)]
    up: String,

    /// Columns and rows
    #[arg(long, value_name = "COLUMNSxROWS", default_value = "100x100", value_parser = plane::points, allow_hyphen_values = true)]
    points: Points,

    /// Follow one mode over the map instead of the largest growth rate: the one of that number in
    /// the list of `stillflame modes`
    ///
    /// From the design point it is followed first along the number across, then along the number up. Where two
    /// modes meet they change places for who goes around: from there a cut is drawn.
    #[arg(long, value_name = "NUMBER")]
    mode: Option<usize>,

    #[command(flatten)]
    window: WindowArguments,
}

pub(super) fn answer(arguments: &Arguments, mut case: Case) -> Result<Answer, Failure> {
    case.narrow(&arguments.window);
    let network = &case.network;
    let (across, up) = plane::axes(network, &arguments.across, &arguments.up, arguments.points)?;
    case.sound(cautions::refusals(network, across, up))?;
    let solved = case.solve()?;
    let window = case.window(&solved.mean)?;
    let design = modes::find(&solved, window, Scan::Whole);
    let design_outside = modes::outside(&solved, window);
    let chosen = match arguments.mode {
        None => None,
        Some(number) => Some((number, chosen(network, (across, up), &design, number)?)),
    };

    let bar = progress::bar(across.points * up.points);
    let watch = || {
        bar.inc(1);
        ControlFlow::Continue(())
    };
    let map = map::map(
        network,
        &solved.mean,
        (across, up),
        window,
        chosen.is_some(),
        watch,
    );
    bar.finish_and_clear();
    let Some(map) = map else {
        return Err(Failure::input([Problem::error(
            "map",
            "it was not finished",
        )]));
    };

    let over = match (&chosen, &map.lists) {
        (Some((_, mode)), Some(lists)) => branch::follow(network, &solved.mean, &map, lists, mode),
        _ => branch::Followed::default(),
    };
    let map = match chosen {
        Some(_) => map.of_one(&over.modes),
        None => map,
    };
    let followed = chosen.map(|(number, mode)| Followed {
        number,
        mode,
        over: &over,
    });

    let mut more = solved.mean.warnings.clone();
    more.extend(validity::of_window(network, &solved.mean, &window));
    more.extend(validity::of_modes(network, &design));
    let known = case.warnings_with(more);
    let more = cautions::warnings(network, &solved.mean, &map, &known);
    let mut warnings = known;
    warnings.extend(case.placed(more));

    let regions = regions::regions(network, &solved.mean, &map);
    let beyond = match followed {
        None => beyond::beyond(network, &solved.mean, &map),
        Some(_) => Vec::new(),
    };
    let report = MapReport {
        heading: case.heading(),
        network,
        map: &map,
        regions: &regions,
        beyond: &beyond,
        design: &design,
        design_outside: &design_outside,
        followed,
        warnings: &warnings,
    };
    let svg = report.svg().map_err(|e| {
        let what = format!("the map cannot be drawn: {e}");
        Failure::input([Problem::error("map", what)])
    })?;
    let name = followed.map_or_else(
        || "map".to_owned(),
        |one| format!("map_mode_{}", one.number),
    );
    let answered = map.points.iter().any(|p| p.complete());
    Ok(Answer {
        text: if arguments.common.json {
            report.json()?
        } else {
            report.text()
        },
        files: vec![
            (case.file(&format!("{name}.svg")), svg.into_bytes()),
            (case.file(&format!("{name}.csv")), report.csv()?),
        ],
        status: if answered {
            Status::Done
        } else {
            Status::Failed
        },
    })
}

/// The mode of that number at the design point, which must lie on the map to be followed from.
fn chosen(
    network: &Network,
    (across, up): (map::Axis, map::Axis),
    design: &ModeList,
    number: usize,
) -> Result<Mode, Failure> {
    for axis in [across, up] {
        let knob = network.layout.knobs.get(axis.knob.0);
        if let (false, Some(knob)) = (axis.holds(network.values[axis.knob]), knob) {
            let what =
                "it lies outside the map, so that no mode of the network can be followed over it";
            let hint = "widen the axis to hold the value of the file, or move it by --set";
            return Err(Failure::usage(
                [Problem::error(&knob.name, what).hint(hint)],
            ));
        }
    }
    let mode = number.checked_sub(1).and_then(|i| design.modes.get(i));
    mode.copied().ok_or_else(|| {
        let what = match design.modes.len() {
            0 => format!("there is no mode {number}: the network has none in the window"),
            1 => format!("there is no mode {number}: the network has 1 mode in the window"),
            n => format!("there is no mode {number}: the network has {n} modes in the window"),
        };
        let hint = "`stillflame modes` numbers them, from 1";
        Failure::usage([Problem::error("--mode", what).hint(hint)])
    })
}
