//! What a shell and a reader of manuals want: completions and manual pages, made of the definitions that
//! parse the command line, so that they cannot fall behind it.

use std::io;

use clap::{Args, CommandFactory, Subcommand};
use clap_complete::Shell;
use clap_mangen::{
    Man,
    roff::{Roff, roman},
};

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
        let man = Man::new(asked.clone());
        let mut page = Vec::new();
        man.render_title(&mut page)?;
        man.render_name_section(&mut page)?;
        man.render_synopsis_section(&mut page)?;
        man.render_description_section(&mut page)?;
        man.render_options_section(&mut page)?;
        if asked.has_subcommands() {
            man.render_subcommands_section(&mut page)?;
        }
        let after = asked.get_after_help().map(ToString::to_string);
        sections(&after.unwrap_or_default()).to_writer(&mut page)?;
        if asked.get_version().is_some() {
            man.render_version_section(&mut page)?;
        }
        Ok(page)
    }
}

/// What stands behind the options in a help: a paragraph under a heading of its own becomes a section,
/// its lines kept as they are; others are notes.
fn sections(help: &str) -> Roff {
    let mut roff = Roff::new();
    let mut noted = false;
    for paragraph in help.split("\n\n").filter(|p| !p.trim().is_empty()) {
        let listed = paragraph
            .split_once('\n')
            .filter(|(_, lines)| lines.lines().all(|l| l.starts_with("  ")))
            .and_then(|(head, lines)| Some((head.strip_suffix(':')?, lines)));
        let Some((head, lines)) = listed else {
            if !noted {
                roff.control("SH", ["NOTES"]);
                noted = true;
            }
            roff.control("PP", []);
            roff.text([roman(paragraph.replace('\n', " "))]);
            continue;
        };
        noted = false;
        let heading = match head {
            "Example" => "EXAMPLES".to_owned(),
            "Exit codes" => "EXIT STATUS".to_owned(),
            other => other.to_uppercase(),
        };
        roff.control("SH", [heading.as_str()]);
        roff.control("nf", []);
        for line in lines.lines() {
            roff.text([roman(line.strip_prefix("  ").unwrap_or(line))]);
        }
        roff.control("fi", []);
    }
    roff
}
