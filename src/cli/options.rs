//! What every verb takes, read once: the network with its overrides, and the window of a search.

use std::path::{Path, PathBuf};
use std::sync::Arc;

use clap::Args;

use super::Failure;
use crate::input::{self, SourceMap};
use crate::meanflow::{self, MeanFlow};
use crate::modes::{self, Solved, Window};
use crate::network::{FARTHEST, Network};
use crate::problems::{Problem, Problems};
use crate::report::Heading;
use crate::units::{Dimension, parse_span, write};

/// Options of every verb.
#[derive(Clone, Debug, Args)]
pub(super) struct Common {
    /// The network file (TOML)
    #[arg(value_name = "NETWORK")]
    pub network: PathBuf,

    /// Lay a value over the file, as in "chamber.length = 0.9 m"; may be given again
    #[arg(long = "set", value_name = "NAME = VALUE", allow_hyphen_values = true)]
    pub overrides: Vec<String>,

    /// Print one JSON object and nothing else on standard output; numbers in SI
    #[arg(long)]
    pub json: bool,

    /// Write files (SVG, CSV) into this directory
    #[arg(long, value_name = "DIR")]
    pub out: Option<PathBuf>,
}

/// The window of a search, where it is not the file's.
#[derive(Clone, Debug, Args)]
pub(super) struct WindowArguments {
    /// Frequencies to search, as in "20 to 800 Hz"
    #[arg(long, value_name = "A to B Hz", value_parser = frequency, allow_hyphen_values = true)]
    pub frequency: Option<Range>,

    /// Growth rates to search, as in "-300 to 300 1/s"
    #[arg(long, value_name = "A to B 1/s", value_parser = growth, allow_hyphen_values = true)]
    pub growth: Option<Range>,
}

/// Lowest and highest value in SI.
pub(super) type Range = (f64, f64);

pub(super) fn frequency(text: &str) -> Result<Range, String> {
    let range = span(text, Dimension::Frequency)?;
    if range.0 < 0.0 {
        return Err("a window has no negative frequency; start at 0 Hz".to_owned());
    }
    Ok(range)
}

fn growth(text: &str) -> Result<Range, String> {
    span(text, Dimension::Rate)
}

fn span(text: &str, dimension: Dimension) -> Result<Range, String> {
    let (low, high) = parse_span(text, dimension).map_err(|e| format!("{e}; {}", e.hint()))?;
    if low < -FARTHEST || high > FARTHEST {
        let farthest = write(FARTHEST, dimension);
        Err(format!("the window reaches beyond {farthest}"))
    } else if low < high {
        Ok((low, high))
    } else if low == high {
        Err("the window is empty: both its ends are the same".to_owned())
    } else {
        Err("the window is upside down: write the lower value first".to_owned())
    }
}

/// A network as read, and what the reports call it.
pub(super) struct Case {
    /// The file as named.
    pub path: String,
    /// The file's name without its ending, which names output files.
    stem: String,
    pub network: Network,
    /// What qualifies the network as the file states it.
    pub warnings: Vec<Problem>,
    sources: SourceMap,
}

impl Case {
    /// Reads the network.
    pub fn load(common: &Common) -> Result<Case, Failure> {
        let loaded = input::read(&common.network, &common.overrides)
            .map_err(|Problems(problems)| Failure::of_reading(problems))?;
        let stem = common.network.file_stem().unwrap_or_default();
        Ok(Case {
            path: common.network.display().to_string(),
            stem: stem.to_string_lossy().into_owned(),
            network: loaded.network,
            warnings: loaded.warnings,
            sources: loaded.sources,
        })
    }

    /// Searches where the command line says instead of where the file does.
    pub fn narrow(&mut self, arguments: &WindowArguments) {
        let search = &mut Arc::make_mut(&mut self.network.layout).search;
        search.frequency = arguments.frequency.or(search.frequency);
        search.growth = arguments.growth.or(search.growth);
    }

    /// The mean flow.
    pub fn mean(&self) -> Result<MeanFlow<f64>, Failure> {
        meanflow::solve(&self.network).map_err(|p| self.failed(p))
    }

    /// The mean flow and the acoustics about it.
    pub fn solve(&self) -> Result<Solved, Failure> {
        modes::solve(&self.network).map_err(|p| self.failed(p))
    }

    /// Where to search.
    pub fn window(&self, mean: &MeanFlow<f64>) -> Result<Window, Failure> {
        Window::of(&self.network, mean).map_err(|p| self.failed(p))
    }

    fn failed(&self, Problems(problems): Problems) -> Failure {
        Failure::input(self.placed(problems))
    }

    /// Whether the network makes sense wherever it is to be computed.
    pub fn sound(&self, refusals: Vec<Problem>) -> Result<(), Failure> {
        match refusals.is_empty() {
            true => Ok(()),
            false => Err(Failure::input(self.placed(refusals))),
        }
    }

    /// Problems with the place of their subject, where it has one.
    pub fn placed(&self, mut problems: Vec<Problem>) -> Vec<Problem> {
        for problem in problems.iter_mut().filter(|p| p.place.is_none()) {
            problem.place = self.sources.place(&problem.subject).map(Box::new);
        }
        problems
    }

    /// Everything that qualifies an answer: what the file alone tells, and `more`.
    pub fn warnings_with(&self, more: Vec<Problem>) -> Vec<Problem> {
        let mut all = self.warnings.clone();
        all.extend(self.placed(more));
        all
    }

    pub fn heading(&self) -> Heading<'_> {
        Heading {
            network: &self.path,
            title: &self.network.layout.title,
        }
    }

    /// `swirl_rig_modes.csv`.
    pub fn file(&self, what: &str) -> String {
        let stem = match Path::new(&self.stem).file_name() {
            Some(_) => self.stem.as_str(),
            None => "network",
        };
        format!("{stem}_{what}")
    }
}
