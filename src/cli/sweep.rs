//! `stillflame sweep NETWORK --vary ...`.

use std::ops::ControlFlow;

use clap::Args;

use super::options::{Case, Common, WindowArguments};
use super::path::{self, Wanted};
use super::{Answer, Failure, Status, progress};
use crate::modes::{self, Scan, validity};
use crate::problems::Problem;
use crate::report::sweep::SweepReport;
use crate::studies::path::Spacing;
use crate::studies::sweep::{self, State, cautions};

/// Follow every mode while numbers of the network change
///
/// At every point the mean flow and the complete list of modes in the window; modes are followed from
/// point to point, with certified points in between where it is in doubt which is which. Told are for
/// each branch its range, where it becomes unstable and its largest growth rate, and events: modes that
/// enter or leave through the window's edge, and modes that meet. Writes two SVG files (frequency and
/// growth rate over the number, and the root locus) and a CSV file, into the working directory unless
/// --out names another; with --json only where --out is given.
#[derive(Clone, Debug, Args)]
#[command(
    after_help = "Several numbers move together where --vary or --scale is given again; values of the first are \
    reported.\n\nExample:\n  stillflame sweep networks/swirl_rig.toml --vary \"main_flame.delay = 1 ms to 8 ms\" \\\n    \
    --points 141 --out results"
)]
pub(super) struct Arguments {
    #[command(flatten)]
    pub common: Common,

    /// A number and its span, as in "main_flame.delay = 1 ms to 8 ms"; given again, numbers move together
    #[arg(long, value_name = "NAME = A to B", allow_hyphen_values = true)]
    vary: Vec<String>,

    /// Numbers that take one factor on their values, as in "*.delay = 0.8 to 1.2" or "supply.length,
    /// chamber.length = 0.8 to 1.2"; `*` stands for anything
    #[arg(long, value_name = "NAMES = A to B", allow_hyphen_values = true)]
    scale: Vec<String>,

    /// Number of points, both ends among them
    #[arg(long, value_name = "N", default_value = "141", value_parser = path::points, allow_hyphen_values = true)]
    points: usize,

    /// Space the points by equal ratios instead of equal differences
    #[arg(long)]
    log: bool,

    #[command(flatten)]
    window: WindowArguments,
}

pub(super) fn answer(arguments: &Arguments, mut case: Case) -> Result<Answer, Failure> {
    case.narrow(&arguments.window);
    let network = &case.network;
    let path = Wanted {
        vary: &arguments.vary,
        scale: &arguments.scale,
        spacing: if arguments.log {
            Spacing::Geometric
        } else {
            Spacing::Linear
        },
        points: arguments.points,
    }
    .path(network)?;
    case.sound(cautions::refusals(network, &path))?;
    let solved = case.solve()?;
    let window = case.window(&solved.mean)?;
    let design = modes::find(&solved, window, Scan::Whole);
    let design_outside = modes::outside(&solved, window);

    let bar = progress::bar(path.points);
    let watch = || {
        bar.inc(1);
        ControlFlow::Continue(())
    };
    let sweep = sweep::sweep(network, &solved.mean, &path, window, watch);
    bar.finish_and_clear();
    let Some(sweep) = sweep else {
        return Err(Failure::input([Problem::error(
            "sweep",
            "it was not finished",
        )]));
    };

    let mut more = solved.mean.warnings.clone();
    more.extend(validity::of_window(network, &solved.mean, &window));
    more.extend(validity::of_modes(network, &design));
    let known = case.warnings_with(more);
    let more = cautions::warnings(network, &solved.mean, &sweep, &known);
    let mut warnings = known;
    warnings.extend(case.placed(more));

    let report = SweepReport {
        heading: case.heading(),
        network,
        sweep: &sweep,
        design: &design,
        design_outside: &design_outside,
        warnings: &warnings,
    };
    let drawn = |svg: Result<String, crate::draw::DrawError>| {
        svg.map(String::into_bytes).map_err(|e| {
            let what = format!("the sweep cannot be drawn: {e}");
            Failure::input([Problem::error("sweep", what)])
        })
    };
    let answered = sweep.points.iter().any(|p| p.state == State::Certified);
    Ok(Answer {
        text: if arguments.common.json {
            report.json()?
        } else {
            report.text()
        },
        files: vec![
            (case.file("sweep.svg"), drawn(report.panels_svg())?),
            (case.file("locus.svg"), drawn(report.locus_svg())?),
            (case.file("sweep.csv"), report.csv()?),
        ],
        status: if answered {
            Status::Done
        } else {
            Status::Failed
        },
    })
}
