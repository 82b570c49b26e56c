//! `stillflame map NETWORK --across ... --up ...`.

use std::ops::ControlFlow;

use clap::Args;
use indicatif::{ProgressBar, ProgressStyle};

use super::options::{Case, Common, WindowArguments};
use super::plane::{self, Points};
use super::{Answer, Failure, Status};
use crate::modes::{self, Scan, validity};
use crate::problems::Problem;
use crate::report::map::MapReport;
use crate::studies::{cautions, map};

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

    #[command(flatten)]
    window: WindowArguments,
}

pub(super) fn answer(arguments: &Arguments, mut case: Case) -> Result<Answer, Failure> {
    case.narrow(&arguments.window);
    let network = &case.network;
    let (across, up) = plane::axes(network, &arguments.across, &arguments.up, arguments.points)?;
    plane::check(network, across, up)?;
    let solved = case.solve()?;
    let window = case.window(&solved.mean)?;
    let design = modes::find(&solved, window, Scan::Whole);
    let design_outside = modes::outside(&solved, window);

    let bar = bar(across.points * up.points);
    let watch = || {
        bar.inc(1);
        ControlFlow::Continue(())
    };
    let map = map::map(network, &solved.mean, (across, up), window, watch);
    bar.finish_and_clear();
    let Some(map) = map else {
        return Err(Failure::input([Problem::error(
            "map",
            "it was not finished",
        )]));
    };

    let mut more = solved.mean.warnings.clone();
    more.extend(validity::of_window(network, &solved.mean, &window));
    more.extend(validity::of_modes(network, &design));
    let known = case.warnings_with(more);
    let more = cautions::warnings(network, &solved.mean, &map, &known);
    let mut warnings = known;
    warnings.extend(case.placed(more));

    let report = MapReport {
        heading: case.heading(),
        network,
        map: &map,
        design: &design,
        design_outside: &design_outside,
        warnings: &warnings,
    };
    let svg = report.svg().map_err(|e| {
        let what = format!("the map cannot be drawn: {e}");
        Failure::input([Problem::error("map", what)])
    })?;
    let answered = map.points.iter().any(|p| p.complete());
    Ok(Answer {
        text: if arguments.common.json {
            report.json()?
        } else {
            report.text()
        },
        files: vec![
            (case.file("map.svg"), svg.into_bytes()),
            (case.file("map.csv"), report.csv()?),
        ],
        status: if answered {
            Status::Done
        } else {
            Status::Failed
        },
    })
}

/// A bar on standard error; nothing where that is no terminal.
fn bar(points: usize) -> ProgressBar {
    let bar = ProgressBar::new(points as u64);
    if let Ok(style) = ProgressStyle::with_template("{bar:40} {pos} of {len} points, {eta} left") {
        bar.set_style(style);
    }
    bar
}
