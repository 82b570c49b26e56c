//! The command line: one file per verb, the options they share, and what becomes of an answer.
//!
//! A verb turns a case (a network as read) into an answer and writes nothing itself. Here the files are written
//! first, whole or not at all, then the answer goes to standard output; everything else goes to
//! standard error.

mod check;
mod companions;
mod flow;
mod interrupt;
mod map;
mod modes;
mod options;
mod output;
mod path;
mod plane;
mod progress;
mod spectrum;
mod sweep;
mod usage;

use std::ffi::OsString;
use std::process::ExitCode;

use clap::{Parser, Subcommand};

use crate::input::OVERRIDE;
use crate::problems::{Problem, Severity};
use crate::report::{document, problems};
use companions::Companion;
use options::{Case, Common};
use output::{Destination, tell};

/// Thermoacoustic modes and stability maps of gas-turbine combustor rigs.
///
/// A network file (TOML) describes ducts, area changes, plenums, flames with their transfer functions,
/// and ends. stillflame computes the mean flow, finds every mode in a window of frequency and growth
/// rate, and proves the list complete.
#[derive(Debug, Parser)]
#[command(name = "stillflame", version, arg_required_else_help = true, after_help = AFTER_HELP)]
pub struct Cli {
    #[command(subcommand)]
    asked: Asked,
}

#[derive(Debug, Subcommand)]
enum Asked {
    #[command(flatten)]
    Network(Verb),
    #[command(flatten)]
    Record(OfRecord),
    #[command(flatten)]
    Companion(Companion),
}

const AFTER_HELP: &str = "\
Exit codes:
  0    done
  1    the network has problems, be it by values given with options; the computation failed; or a mode
       list is not proved complete
  2    wrong usage: an option, or a name, unit or value given with one, is mistaken in itself
  3    with --fail-on-growth, some mode grows
  130  interrupted

Predictions are for screening. Combustion oscillations break hardware and hurt people:
confirm by rig test, and follow local codes and licensed practice.";

#[derive(Debug, Subcommand)]
enum Verb {
    Check(check::Arguments),
    Flow(flow::Arguments),
    Modes(modes::Arguments),
    Sweep(sweep::Arguments),
    Map(map::Arguments),
}

/// Verbs that begin with a record.
#[derive(Debug, Subcommand)]
enum OfRecord {
    Spectrum(Box<spectrum::Arguments>),
}

/// How a run ended; the exit code.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Status {
    /// Done.
    Done,
    /// The input has problems, the computation failed, or its answer is not certified.
    Failed,
    /// Wrong usage.
    Usage,
    /// Some mode grows, and that was to fail.
    Grows,
}

impl From<Status> for ExitCode {
    fn from(status: Status) -> ExitCode {
        ExitCode::from(match status {
            Status::Done => 0,
            Status::Failed => 1,
            Status::Usage => 2,
            Status::Grows => 3,
        })
    }
}

/// What a verb has to say.
struct Answer {
    /// For people, or as JSON where asked for.
    text: String,
    /// Name and content of each file.
    files: Vec<(String, Vec<u8>)>,
    status: Status,
}

/// Why there is no answer.
struct Failure {
    status: Status,
    problems: Vec<Problem>,
}

impl Failure {
    /// The network or the computation is at fault.
    fn input(problems: impl Into<Vec<Problem>>) -> Self {
        Failure {
            status: Status::Failed,
            problems: problems.into(),
        }
    }

    /// A network could not be read: the command line is at fault where every error stands in it and is one of
    /// what was given there alone, not of what that makes of the network.
    fn of_reading(problems: Vec<Problem>) -> Self {
        let mut errors = problems.iter().filter(|p| p.severity == Severity::Error);
        let in_option =
            |p: &Problem| !p.of_whole && p.place.as_ref().is_some_and(|p| p.source == OVERRIDE);
        match errors.all(in_option) {
            true => Failure::usage(problems),
            false => Failure::input(problems),
        }
    }

    /// The command line is at fault.
    fn usage(problems: impl Into<Vec<Problem>>) -> Self {
        Failure {
            status: Status::Usage,
            problems: problems.into(),
        }
    }
}

impl From<std::io::Error> for Failure {
    fn from(e: std::io::Error) -> Self {
        Failure::input([Problem::error("output", e.to_string())])
    }
}

impl Verb {
    fn common(&self) -> &Common {
        match self {
            Verb::Check(a) => &a.common,
            Verb::Flow(a) => &a.common,
            Verb::Modes(a) => &a.common,
            Verb::Sweep(a) => &a.common,
            Verb::Map(a) => &a.common,
        }
    }

    /// Where files go: where asked for, and those of a map or a sweep for people into the working
    /// directory.
    fn destination(&self) -> Result<Option<Destination>, Failure> {
        let common = self.common();
        let here =
            (matches!(self, Verb::Map(_) | Verb::Sweep(_)) && !common.json).then(|| ".".into());
        let directory = common.out.clone().or(here);
        directory.map(Destination::open).transpose()
    }

    fn answer(&self, case: Case) -> Result<Answer, Failure> {
        match self {
            Verb::Check(a) => check::answer(a, case),
            Verb::Flow(a) => flow::answer(a, case),
            Verb::Modes(a) => modes::answer(a, case),
            Verb::Sweep(a) => sweep::answer(a, case),
            Verb::Map(a) => map::answer(a, case),
        }
    }
}

/// Parses the command line, the program's name first, does what it asks for, and gives the exit code.
pub fn main(arguments: impl IntoIterator<Item = OsString>) -> ExitCode {
    let arguments: Vec<OsString> = arguments.into_iter().collect();
    match Cli::try_parse_from(&arguments) {
        Ok(cli) => run(&cli).into(),
        Err(refused) => usage::refuse(&refused, &arguments),
    }
}

/// Does what the command line asks for.
pub fn run(cli: &Cli) -> Status {
    interrupt::install();
    let verb = match &cli.asked {
        Asked::Network(verb) => verb,
        Asked::Record(OfRecord::Spectrum(arguments)) => {
            let network = arguments.network.as_ref();
            let network = network.map_or(String::new(), |p| p.display().to_string());
            return end(of_record(arguments), arguments.json, &network);
        }
        Asked::Companion(companion) => return accompany(companion),
    };
    let common = verb.common();
    end(
        attempt(verb),
        common.json,
        &common.network.display().to_string(),
    )
}

/// The exit code, problems told.
fn end(attempted: Result<Status, Failure>, json: bool, network: &str) -> Status {
    match attempted {
        Ok(status) => status,
        Err(Failure {
            status,
            problems: found,
        }) => {
            if json {
                let refusal = document::refusal(network, &found);
                // Where standard output is broken as well, the problems are on standard error.
                if let Ok(json) = refusal {
                    let _ = output::print(&json);
                }
            }
            tell(&problems::render(&found));
            status
        }
    }
}

fn accompany(companion: &Companion) -> Status {
    let printed = companion
        .text()
        .and_then(|text| output::print(&text).map_err(Failure::from));
    match printed {
        Ok(()) => Status::Done,
        Err(failure) => {
            tell(&problems::render(&failure.problems));
            failure.status
        }
    }
}

fn attempt(verb: &Verb) -> Result<Status, Failure> {
    let common = verb.common();
    let case = Case::load(common)?;
    let destination = verb.destination()?;
    deliver(verb.answer(case)?, destination, common.json)
}

fn of_record(arguments: &spectrum::Arguments) -> Result<Status, Failure> {
    let destination = arguments.out.clone().map(Destination::open).transpose()?;
    deliver(spectrum::answer(arguments)?, destination, arguments.json)
}

/// Writes the files, then prints the answer.
fn deliver(
    answer: Answer,
    destination: Option<Destination>,
    json: bool,
) -> Result<Status, Failure> {
    let mut text = answer.text;
    if let Some(destination) = destination {
        for path in destination.write(&answer.files)? {
            let line = format!("Wrote {}\n", path.display());
            if json {
                tell(&line);
            } else {
                text.push_str(&line);
            }
        }
    }
    output::print(&text).map_err(|e| {
        let problem = Problem::error("standard output", format!("cannot be written: {e}"));
        Failure::input([problem.hint("send it to a place with room that may be written to")])
    })?;
    Ok(answer.status)
}
