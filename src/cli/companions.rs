//! What a shell and a reader of manuals want: completions and manual pages, made of the definitions that
//! parse the command line, so that they cannot fall behind it.

use std::io;

use clap::{Args, CommandFactory, Subcommand};
use clap_complete::Shell;
use clap_mangen::Man;

use super::Cli;
use crate::problems::Problem;

/// Verbs that ask nothing of a network.
#[derive(Debug, Subcommand)]
pub(super) enum Companion {
    Completions(Completions),
    Manual(Manual),
}

/// Print the completions of a shell
///
/// A script that makes the shell complete verbs, options and file names. Where it belongs is the shell's
/// own matter; most read it from a file of a folder they know, or at their start.
#[derive(Clone, Debug, Args)]
#[command(after_help = "Example:\n  stillflame completions bash > stillflame.bash")]
pub(super) struct Completions {
    /// For which shell
    #[arg(value_name = "SHELL")]
    shell: Shell,
}

/// Print a manual page
///
/// In the format of man(1): the page of the program, or that of one verb.
#[derive(Clone, Debug, Args)]
#[command(after_help = "Example:\n  stillflame manual modes > stillflame-modes.1")]
pub(super) struct Manual {
    /// The verb; the program as a whole where none is named
    #[arg(value_name = "VERB")]
    verb: Option<String>,
}

impl Companion {
    /// What is to be printed.
    pub fn text(&self) -> Result<String, super::Failure> {
        let bytes = match self {
            Companion::Completions(c) => {
                let mut script = Vec::new();
                clap_complete::generate(c.shell, &mut Cli::command(), "stillflame", &mut script);
                script
            }
            Companion::Manual(m) => m.page()?,
        };
        String::from_utf8(bytes).map_err(|e| io::Error::other(e).into())
    }
}

impl Manual {
    fn page(&self) -> Result<Vec<u8>, super::Failure> {
        let mut program = Cli::command();
        program.build();
        let asked = match &self.verb {
            None => &program,
            Some(verb) => program.find_subcommand(verb).ok_or_else(|| {
                let verbs: Vec<&str> = program.get_subcommands().map(|c| c.get_name()).collect();
                let problem = Problem::error("manual", format!("there is no verb `{verb}`"));
                super::Failure::usage([problem.hint(format!("name one of {}", verbs.join(", ")))])
            })?,
        };
        let mut page = Vec::new();
        Man::new(asked.clone()).render(&mut page)?;
        Ok(page)
    }
}
