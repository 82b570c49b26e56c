//! `stillflame flow NETWORK`.

use clap::Args;

use super::options::{Case, Common};
use super::{Answer, Failure, Status};
use crate::report::flow::Flow;

/// Compute the mean flow at every station
///
/// Static pressure and temperature, velocity, Mach number, sound speed, density and area at the inlet
/// and the outlet of every element; the heat release of each flame; the throat area of a choked exit.
#[derive(Clone, Debug, Args)]
#[command(
    after_help = "Example:\n  stillflame flow networks/pressurised_rig.toml --set \"feed.mass_flow = 1.0 kg/s\""
)]
pub(super) struct Arguments {
    #[command(flatten)]
    pub common: Common,
}

pub(super) fn answer(arguments: &Arguments, case: Case) -> Result<Answer, Failure> {
    let mean = case.mean()?;
    let warnings = case.warnings_with(mean.warnings.clone());
    let report = Flow {
        heading: case.heading(),
        network: &case.network,
        mean: &mean,
        warnings: &warnings,
    };
    Ok(Answer {
        text: if arguments.common.json {
            report.json()?
        } else {
            report.text()
        },
        files: vec![(case.file("flow.csv"), report.csv()?)],
        status: Status::Done,
    })
}
