//! `stillflame modes NETWORK`.

use clap::Args;

use super::options::{Case, Common, WindowArguments};
use super::{Answer, Failure, Status};
use crate::modes::explain::explain;
use crate::modes::{self, Scan, Tendency, shapes, validity};
use crate::problems::Problem;
use crate::report::modes::Modes;

/// Find every mode in a window and prove the list complete
///
/// For each mode: frequency, growth rate with an error bound, cycle increment (growth rate over
/// frequency), damping ratio, multiplicity, and a label: a mode of the plenum or the chamber (by where its
/// energy is), intrinsic (it lives by the flame's feedback), or convective (by carried entropy). The list is complete
/// where the number of modes counted by the argument principle is the number found and none straddles
/// the window's edge; otherwise the report says why not, and the exit code is 1.
#[derive(Clone, Debug, Args)]
#[command(
    after_help = "Example:\n  stillflame modes networks/swirl_rig.toml --frequency \"20 to 500 Hz\" --shapes --out results"
)]
pub(super) struct Arguments {
    #[command(flatten)]
    pub common: Common,

    #[command(flatten)]
    window: WindowArguments,

    /// Tell the shape of each mode: amplitude and phase of pressure and velocity at the stations and
    /// along the ducts; with --out also draw it, one SVG for each mode
    #[arg(long)]
    shapes: bool,

    /// Tell for each mode what drives and damps it, element by element, and what makes it neutral
    #[arg(long)]
    explain: bool,

    /// End with exit code 3 where some mode grows
    #[arg(long)]
    fail_on_growth: bool,
}

pub(super) fn answer(arguments: &Arguments, mut case: Case) -> Result<Answer, Failure> {
    case.narrow(&arguments.window);
    let solved = case.solve()?;
    let window = case.window(&solved.mean)?;
    let list = modes::find(&solved, window, Scan::Whole);
    let explained: Vec<_> = list
        .modes
        .iter()
        .map(|mode| explain(&case.network, &solved, mode))
        .collect();
    let mut more = solved.mean.warnings.clone();
    more.extend(validity::of_window(&case.network, &solved.mean, &window));
    more.extend(validity::of_modes(&case.network, &list));
    let outside = modes::outside(&solved, window);
    more.extend(validity::of_growth_outside(&window, &outside));
    more.extend(modes::doubts_as_warnings(&list));
    if arguments.shapes {
        more.extend(shapes::unsettled(&list, &explained));
    }
    let warnings = case.warnings_with(more);
    let report = Modes {
        heading: case.heading(),
        network: &case.network,
        list: &list,
        outside: &outside,
        explained: &explained,
        with_shapes: arguments.shapes,
        with_explanation: arguments.explain,
        warnings: &warnings,
    };
    let mut files = vec![(case.file("modes.csv"), report.csv()?)];
    if arguments.shapes {
        files.push((case.file("shapes.csv"), report.shapes_csv()?));
        if arguments.common.out.is_some() {
            files.extend(pictures(&case, &report)?);
        }
    }
    let mut known = list.modes.iter().chain(outside.modes());
    let grows = known.any(|m| m.tendency() == Tendency::Grows);
    let status = if arguments.fail_on_growth && grows {
        Status::Grows
    } else if list.complete() {
        Status::Done
    } else {
        Status::Failed
    };
    Ok(Answer {
        text: if arguments.common.json {
            report.json()?
        } else {
            report.text()
        },
        files,
        status,
    })
}

/// The figure of each mode, named by its number in the list.
fn pictures(case: &Case, report: &Modes) -> Result<Vec<(String, Vec<u8>)>, Failure> {
    let drawn = report.shapes_svg().map_err(|e| {
        let what = format!("the shapes cannot be drawn: {e}");
        Failure::input([Problem::error("modes", what)])
    })?;
    let digits = report.list.modes.len().to_string().len();
    let named = |(number, svg): (usize, String)| {
        let file = case.file(&format!("shape_{number:0digits$}.svg"));
        (file, svg.into_bytes())
    };
    Ok(drawn.into_iter().map(named).collect())
}
