//! Help, completions and manual pages of the real binary: they agree with one another, and the examples of
//! the help run as they stand.

use std::path::Path;
use std::process::{Command, Output};

use assert_cmd::cargo::cargo_bin;

struct Ran {
    code: Option<i32>,
    stdout: String,
    stderr: String,
}

impl From<Output> for Ran {
    fn from(output: Output) -> Ran {
        Ran {
            code: output.status.code(),
            stdout: String::from_utf8(output.stdout).unwrap(),
            stderr: String::from_utf8(output.stderr).unwrap(),
        }
    }
}

fn stillflame(arguments: &[&str]) -> Ran {
    let output = Command::new(env!("CARGO_BIN_EXE_stillflame"))
        .args(arguments)
        .output();
    output.unwrap().into()
}

/// The verbs that the help lists, but for the help itself.
fn verbs() -> Vec<String> {
    let help = stillflame(&["--help"]).stdout;
    let listed = help.lines().skip_while(|l| *l != "Commands:").skip(1);
    let listed = listed.take_while(|l| l.starts_with("  "));
    let words = listed.filter_map(|l| l.split_whitespace().next());
    let verbs: Vec<String> = words.filter(|w| *w != "help").map(str::to_owned).collect();
    assert!(verbs.len() >= 6, "{help}");
    verbs
}

/// Long options of a verb, from its help.
fn options(verb: &str) -> Vec<String> {
    let help = stillflame(&[verb, "--help"]).stdout;
    let words = help.lines().filter_map(|l| {
        let line = l.trim_start();
        let option = line.split([' ', ',']).find(|w| w.starts_with("--"))?;
        (line.starts_with('-')).then(|| option.to_owned())
    });
    words.collect()
}

/// The commands under `Example:` or `Examples:`, a line ending in a backslash joined with the next.
fn examples(help: &str) -> Vec<String> {
    let after = help
        .lines()
        .skip_while(|l| !matches!(l.trim(), "Example:" | "Examples:"));
    let block: Vec<&str> = after
        .skip(1)
        .take_while(|l| l.starts_with("  "))
        .map(str::trim)
        .collect();
    let joined = block.join("\n").replace("\\\n", " ");
    joined.lines().map(str::to_owned).collect()
}

#[test]
fn the_example_of_every_verb_runs_as_it_stands() {
    let binary = cargo_bin("stillflame");
    let mut path = vec![binary.parent().unwrap().to_path_buf()];
    path.extend(std::env::split_paths(&std::env::var_os("PATH").unwrap()));
    let path = std::env::join_paths(path).unwrap();
    for verb in verbs() {
        let commands = examples(&stillflame(&[&verb, "--help"]).stdout);
        assert!(!commands.is_empty(), "{verb} has no example");
        for command in commands {
            assert!(command.starts_with("stillflame "), "{verb}: {command}");
            assert!(command.contains(&verb), "{verb}: {command}");
            let scratch = tempfile::tempdir().unwrap();
            let networks = scratch.path().join("networks");
            std::fs::create_dir(&networks).unwrap();
            let shipped = Path::new(env!("CARGO_MANIFEST_DIR")).join("networks");
            for file in std::fs::read_dir(shipped).unwrap() {
                let file = file.unwrap();
                std::fs::copy(file.path(), networks.join(file.file_name())).unwrap();
            }
            let records = scratch.path().join("examples/records");
            std::fs::create_dir_all(&records).unwrap();
            let shipped = Path::new(env!("CARGO_MANIFEST_DIR")).join("examples/records");
            for file in std::fs::read_dir(shipped).unwrap() {
                let file = file.unwrap();
                std::fs::copy(file.path(), records.join(file.file_name())).unwrap();
            }
            let ran = Command::new("sh")
                .args(["-c", &command])
                .current_dir(scratch.path())
                .env("PATH", &path)
                .output()
                .unwrap();
            let ran = Ran::from(ran);
            assert!(matches!(ran.code, Some(0 | 3)), "{command}\n{}", ran.stderr);
            let made = |p: &Path| std::fs::read_dir(p).unwrap().count();
            // Whatever is said to go into a file or folder does.
            if let Some(file) = command.split(" > ").nth(1) {
                let text = std::fs::read_to_string(scratch.path().join(file.trim())).unwrap();
                assert!(text.len() > 200, "{command}");
            }
            if let Some(folder) = command.split("--out ").nth(1) {
                let folder = folder.split_whitespace().next().unwrap();
                assert!(made(&scratch.path().join(folder)) > 0, "{command}");
            }
        }
    }
}

#[test]
fn examples_are_told_from_the_rest() {
    let help = "Usage: x\n\nExamples:\n  stillflame a \\\n    --b\n  stillflame c\n\nMore:\n  no";
    assert_eq!(examples(help), ["stillflame a  --b", "stillflame c"]);
    assert!(examples("Usage: x\n").is_empty());
}

#[test]
fn completions_know_every_verb_and_every_option() {
    for shell in ["bash", "elvish", "fish", "powershell", "zsh"] {
        let ran = stillflame(&["completions", shell]);
        assert_eq!((ran.code, ran.stderr.as_str()), (Some(0), ""));
        for verb in verbs() {
            assert!(ran.stdout.contains(&verb), "{shell}: {verb}");
            for option in options(&verb) {
                // Some shells name an option without its dashes.
                let bare = option.trim_start_matches('-');
                assert!(ran.stdout.contains(bare), "{shell}: {verb} {option}");
            }
        }
    }
    let unknown = stillflame(&["completions", "abacus"]);
    assert_eq!(unknown.code, Some(2));
}

#[test]
fn bash_completes_a_verb_and_an_option() {
    let script = stillflame(&["completions", "bash"]).stdout;
    let completed = |words: &str| -> Vec<String> {
        let n = words.split(' ').count();
        let (last, before) = {
            let all: Vec<&str> = words.split(' ').collect();
            (all[n - 1], all[n - 2])
        };
        let ask = format!(
            "{script}\nCOMP_WORDS=({words}); COMP_CWORD={}; _stillflame stillflame {last} {before}\n\
             printf '%s\\n' \"${{COMPREPLY[@]}}\"",
            n - 1
        );
        let output = Command::new("bash").args(["-c", &ask]).output().unwrap();
        let ran = Ran::from(output);
        ran.stdout.lines().map(str::to_owned).collect()
    };
    assert_eq!(completed("stillflame mod"), ["modes"]);
    assert_eq!(completed("stillflame modes --sh"), ["--shapes"]);
    assert_eq!(completed("stillflame map --acr"), ["--across"]);
}

#[test]
fn manual_pages_say_what_the_help_says() {
    let program = stillflame(&["manual"]);
    assert_eq!(program.code, Some(0));
    assert!(program.stdout.contains(".TH stillflame 1"));
    assert!(program.stdout.contains("Predictions are for screening"));
    for verb in verbs() {
        // A hyphen is escaped in roff.
        let text = |page: &str| page.replace("\\-", "-");
        assert!(
            text(&program.stdout).contains(&format!("stillflame-{verb}")),
            "{verb}"
        );
        let page = stillflame(&["manual", &verb]);
        assert_eq!(page.code, Some(0), "{verb}: {}", page.stderr);
        let page = text(&page.stdout);
        assert!(page.contains(&format!(".TH stillflame-{verb} 1")), "{page}");
        for option in options(&verb) {
            assert!(page.contains(&option), "{verb}: {option}");
        }
        // Commands stand under a heading of their own, their lines kept as they are.
        let (_, shown) = page.split_once(".SH EXAMPLES\n.nf\n").expect(&verb);
        let (shown, _) = shown.split_once(".fi\n").unwrap();
        let lines = |text: &str| {
            text.lines()
                .map(|l| l.trim().to_owned())
                .collect::<Vec<_>>()
        };
        let help = stillflame(&[&verb, "--help"]).stdout;
        let (_, example) = help.split_once("Example:\n").unwrap();
        let (example, shown) = (lines(example.trim_end()), lines(shown));
        assert_eq!(shown.len(), example.len(), "{shown:?}");
        for (shown, line) in shown.iter().zip(&example) {
            assert_eq!(&shown.replace("\\\\", "\\"), line);
        }
    }
    for heading in [".SH \"EXIT STATUS\"\n.nf\n", ".SH NOTES\n"] {
        assert!(program.stdout.contains(heading), "{heading}");
    }
    assert!(!program.stdout.contains("EXTRA"));
    let none = stillflame(&["manual", "abacus"]);
    assert_eq!(none.code, Some(2));
    assert!(none.stderr.contains("`abacus`") && none.stderr.contains("modes"));
}

/// What a help names in quotes is there: each span of an option runs on some network that is shipped.
#[test]
fn spans_named_in_a_help_name_what_a_shipped_network_has() {
    let networks = ["swirl_rig", "staged_flame"];
    for (verb, option, more) in [
        ("sweep", "--vary", vec!["--points", "2"]),
        ("sweep", "--scale", vec!["--points", "2"]),
    ] {
        let help = stillflame(&[verb, "--help"]).stdout;
        let (_, after) = help.split_once(&format!("      {option} <")).unwrap();
        let (text, _) = after.split_once("\n\n      --").unwrap();
        let text = text.split_whitespace().collect::<Vec<_>>().join(" ");
        let spans: Vec<&str> = text.split('"').skip(1).step_by(2).collect();
        assert!(!spans.is_empty(), "{text}");
        for span in spans {
            let runs = networks.iter().any(|name| {
                let file = format!("{}/networks/{name}.toml", env!("CARGO_MANIFEST_DIR"));
                let all = [&[verb, &file, "--json", option, span], &more[..]].concat();
                stillflame(&all).code == Some(0)
            });
            assert!(runs, "{option} {span}");
        }
    }
}

#[test]
fn companions_ask_for_no_network() {
    let ran = stillflame(&["completions", "networks/swirl_rig.toml"]);
    assert_eq!(ran.code, Some(2));
    assert!(stillflame(&["completions"]).code == Some(2));
}
