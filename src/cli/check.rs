//! `stillflame check NETWORK`.

use clap::Args;

use super::options::{Case, Common};
use super::{Answer, Failure, Status};
use crate::modes::validity;
use crate::report::check::Check;

/// Read a network and say what is wrong with it, or that it is sound
///
/// Every problem is told at once, with its place in the file, what is wrong and what would be right. A
/// sound network is summed up in one line: elements, Mach numbers, flame powers and temperatures, and
/// the window in which its modes are searched.
#[derive(Clone, Debug, Args)]
#[command(
    after_help = "Example:\n  stillflame check networks/swirl_rig.toml --set \"chamber.length = 0.9 m\""
)]
pub(super) struct Arguments {
    #[command(flatten)]
    pub common: Common,
}

pub(super) fn answer(arguments: &Arguments, case: Case) -> Result<Answer, Failure> {
    let solved = case.solve()?;
    let window = case.window(&solved.mean)?;
    let mut more = solved.mean.warnings.clone();
    more.extend(validity::of_window(&case.network, &solved.mean, &window));
    let warnings = case.warnings_with(more);
    let report = Check {
        heading: case.heading(),
        network: &case.network,
        mean: &solved.mean,
        window,
        warnings: &warnings,
    };
    Ok(Answer {
        text: if arguments.common.json {
            report.json()?
        } else {
            report.text()
        },
        files: Vec::new(),
        status: Status::Done,
    })
}
