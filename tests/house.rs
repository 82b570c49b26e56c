//! The rules of the house that no compiler holds: who may use whom, who touches files, how long a file
//! may be, and words that have no place in the product. The reasons stand in `docs/architecture.md`.

use std::collections::BTreeSet;
use std::io;
use std::path::{Path, PathBuf};

/// Every module at the top of `src`, with those it may use. Each uses only modules named before it.
const MAY_USE: &[(&str, &[&str])] = &[
    ("numerics", &[]),
    ("problems", &[]),
    ("draw", &[]),
    ("units", &["problems"]),
    ("gas", &["numerics"]),
    ("waves", &["numerics"]),
    ("knobs", &["numerics", "units"]),
    ("flame", &["knobs", "numerics", "units", "waves"]),
    (
        "elements",
        &["flame", "gas", "knobs", "numerics", "units", "waves"],
    ),
    (
        "network",
        &["elements", "knobs", "numerics", "problems", "units"],
    ),
    (
        "input",
        &["elements", "flame", "knobs", "network", "problems", "units"],
    ),
    (
        "meanflow",
        &[
            "elements", "gas", "knobs", "network", "numerics", "problems",
        ],
    ),
    (
        "acoustics",
        &[
            "elements", "gas", "meanflow", "network", "numerics", "problems", "waves",
        ],
    ),
    (
        "modes",
        &[
            "acoustics",
            "elements",
            "flame",
            "gas",
            "knobs",
            "meanflow",
            "network",
            "numerics",
            "problems",
            "units",
            "waves",
        ],
    ),
    ("measured", &["numerics", "problems", "units"]),
    (
        "studies",
        &[
            "acoustics",
            "elements",
            "flame",
            "gas",
            "knobs",
            "meanflow",
            "measured",
            "modes",
            "network",
            "numerics",
            "problems",
            "units",
        ],
    ),
    (
        "report",
        &[
            "draw", "elements", "gas", "meanflow", "measured", "modes", "network", "numerics",
            "problems", "studies", "units",
        ],
    ),
    (
        "cli",
        &[
            "draw", "elements", "input", "knobs", "meanflow", "measured", "modes", "network",
            "problems", "report", "studies", "units",
        ],
    ),
];

/// Modules that may touch files.
const FILE_KEEPERS: &[&str] = &["cli", "input", "measured", "report"];

/// What touching files looks like.
const FILE_MARKS: &[&str] = &["std::fs", "fs::", "File::", "tempfile::", "OpenOptions"];

/// Most lines of one file.
const LONGEST: usize = 500;

/// Words without a place in the product, each in two parts so that this file does not hold it.
const UNWANTED: &[(&str, &str)] = &[
    ("lec", "ture"),
    ("lec", "turer"),
    ("trans", "cript"),
    ("home", "work"),
    ("stu", "dents"),
    ("tea", "cher"),
    ("tu", "torial"),
    ("cur", "riculum"),
    ("brief", ".md"),
    ("shared", "/"),
    ("/work", "/"),
    ("TO", "DO"),
    ("FIX", "ME"),
    ("XX", "X"),
    ("todo", "!"),
    ("unimplemented", "!"),
    ("dbg", "!"),
];

fn root() -> &'static Path {
    Path::new(env!("CARGO_MANIFEST_DIR"))
}

/// Files under a folder with one of the endings, in order.
fn files(folder: &str, endings: &[&str]) -> io::Result<Vec<PathBuf>> {
    let (mut waiting, mut found) = (vec![root().join(folder)], Vec::new());
    while let Some(path) = waiting.pop() {
        let name = path.file_name().unwrap_or_default().to_string_lossy();
        if path.is_dir() {
            if name != "__pycache__" {
                for entry in std::fs::read_dir(&path)? {
                    waiting.push(entry?.path());
                }
            }
        } else if endings.iter().any(|e| name.ends_with(e)) {
            found.push(path);
        }
    }
    found.sort();
    Ok(found)
}

fn shown(path: &Path) -> String {
    path.strip_prefix(root())
        .unwrap_or(path)
        .display()
        .to_string()
}

/// The top module a file of `src` belongs to; `None` for `lib.rs` and `main.rs`, which see everything.
fn module(path: &Path) -> Option<String> {
    let inside = path.strip_prefix(root().join("src")).ok()?;
    let first = inside.iter().next()?.to_str()?;
    let name = first.strip_suffix(".rs").unwrap_or(first);
    (!matches!(name, "lib" | "main")).then(|| name.to_owned())
}

fn without_comment(line: &str) -> &str {
    line.split("//").next().unwrap_or_default()
}

/// The text of a file of `src` without the tests at its end, which may look further.
fn product(path: &Path) -> io::Result<String> {
    let text = std::fs::read_to_string(path)?;
    let product = text.split("#[cfg(test)]\nmod tests {").next();
    Ok(product.unwrap_or_default().to_owned())
}

/// The modules that follow each `crate::` in a text, those of a group `crate::{a, b::c}` among them.
fn used(text: &str) -> BTreeSet<String> {
    let code: Vec<&str> = text.lines().map(without_comment).collect();
    let code = code.join("\n");
    let word = |t: &str| -> String {
        let letters = t.trim_start().chars();
        letters
            .take_while(|c| c.is_alphanumeric() || *c == '_')
            .collect()
    };
    let mut found = BTreeSet::new();
    for rest in code.split("crate::").skip(1) {
        let Some(group) = rest.trim_start().strip_prefix('{') else {
            found.insert(word(rest));
            continue;
        };
        let (mut depth, mut start) = (0, 0);
        for (i, c) in group.char_indices() {
            match c {
                '{' => depth += 1,
                ',' if depth == 0 => {
                    found.insert(word(&group[start..i]));
                    start = i + 1;
                }
                '}' if depth == 0 => {
                    found.insert(word(&group[start..i]));
                    break;
                }
                '}' => depth -= 1,
                _ => {}
            }
        }
    }
    found.remove("");
    found
}

#[test]
fn modules_use_only_what_lies_below_them() {
    let mut faults = Vec::new();
    for path in files("src", &[".rs"]).unwrap() {
        let Some(module) = module(&path) else {
            continue;
        };
        let Some((_, allowed)) = MAY_USE.iter().find(|(m, _)| *m == module) else {
            faults.push(format!(
                "{}: `{module}` has no place in the house",
                shown(&path)
            ));
            continue;
        };
        let text = product(&path).unwrap();
        for other in used(&text) {
            if other != module && !allowed.contains(&other.as_str()) {
                faults.push(format!(
                    "{}: `{module}` may not use `{other}`",
                    shown(&path)
                ));
            }
        }
        // A path upwards could leave the module unseen: from a file directly in it, two steps do.
        let depth = path
            .strip_prefix(root().join("src"))
            .unwrap()
            .iter()
            .count();
        if text.contains(&"super::".repeat(depth.max(2) + 1)) {
            faults.push(format!(
                "{}: say `crate::` for what lies so far up",
                shown(&path)
            ));
        }
    }
    assert!(faults.is_empty(), "{}", faults.join("\n"));
}

#[test]
fn the_house_has_no_rooms_but_those_listed_and_no_cycle() {
    let lib = std::fs::read_to_string(root().join("src/lib.rs")).unwrap();
    let declared: BTreeSet<&str> = lib
        .lines()
        .filter_map(|l| l.strip_prefix("pub mod ")?.strip_suffix(';'))
        .collect();
    let listed: BTreeSet<&str> = MAY_USE.iter().map(|(m, _)| *m).collect();
    assert!(!declared.is_empty());
    assert!(
        declared.is_subset(&listed),
        "{:?} have no place in the house",
        declared.difference(&listed)
    );
    let mut below = BTreeSet::new();
    for (module, allowed) in MAY_USE {
        for other in *allowed {
            assert!(
                below.contains(other),
                "`{module}` names `{other}`, which is not below it"
            );
        }
        below.insert(module);
    }
}

#[test]
fn only_the_keepers_of_files_touch_files() {
    let mut faults = Vec::new();
    for path in files("src", &[".rs"]).unwrap() {
        if module(&path).is_some_and(|m| FILE_KEEPERS.contains(&m.as_str())) {
            continue;
        }
        let text = product(&path).unwrap();
        for (i, line) in text.lines().enumerate() {
            let code = without_comment(line);
            if let Some(mark) = FILE_MARKS.iter().find(|m| code.contains(*m)) {
                faults.push(format!("{}:{}: `{mark}`", shown(&path), i + 1));
            }
        }
    }
    assert!(faults.is_empty(), "{}", faults.join("\n"));
}

#[test]
fn no_file_is_too_long() {
    let mut faults = Vec::new();
    let folders = ["src", "tests", "examples"];
    for path in folders
        .iter()
        .flat_map(|f| files(f, &[".rs", ".py"]).unwrap())
    {
        let lines = std::fs::read_to_string(&path).unwrap().lines().count();
        if lines > LONGEST {
            faults.push(format!("{}: {lines} lines", shown(&path)));
        }
    }
    assert!(
        faults.is_empty(),
        "over {LONGEST} lines:\n{}",
        faults.join("\n")
    );
}

#[test]
fn words_without_a_place_in_the_product_do_not_stand_in_it() {
    let endings = [".rs", ".py", ".md", ".toml", ".txt", ".csv", ".json"];
    let folders = ["src", "tests", "examples", "networks", "docs"];
    let mut all: Vec<PathBuf> = folders
        .iter()
        .flat_map(|f| files(f, &endings).unwrap())
        .collect();
    let top = ["README.md", "DEVELOPERS.md", "Cargo.toml", ".ci/run"];
    all.extend(top.iter().map(|name| root().join(name)));
    let mut faults = Vec::new();
    for path in all {
        let text = std::fs::read_to_string(&path).unwrap();
        for (i, line) in text.lines().enumerate() {
            for (a, b) in UNWANTED {
                if stands_in(line, &format!("{a}{b}")) {
                    faults.push(format!("{}:{}: `{a}{b}`", shown(&path), i + 1));
                }
            }
        }
    }
    assert!(faults.is_empty(), "{}", faults.join("\n"));
}

/// Whether a word stands in a line by itself, whatever its case where it has no capitals.
fn stands_in(line: &str, word: &str) -> bool {
    let lower = line.to_lowercase();
    let line = if word.chars().any(char::is_uppercase) {
        line
    } else {
        &lower
    };
    let letter = |c: Option<char>| c.is_some_and(|c| c.is_alphanumeric() || c == '_');
    line.match_indices(word).any(|(at, _)| {
        let (before, after) = (
            line[..at].chars().next_back(),
            line[at + word.len()..].chars().next(),
        );
        let (first, last) = (word.chars().next(), word.chars().next_back());
        let goes_on = |inside, outside| letter(inside) && letter(outside);
        !goes_on(first, before) && !goes_on(last, after)
    })
}

/// A figure must not depend on the machine: nothing that looks for fonts of the system, renders with its
/// libraries, or finds its folders may come with any dependency. Names from memory of the registry.
#[test]
fn no_dependency_looks_for_fonts_of_the_system() {
    const ALONE: &[&str] = &[
        "allsorts",
        "app_dirs",
        "cosmic-text",
        "directories",
        "directories-next",
        "dirs",
        "dirs-next",
        "dirs-sys",
        "dirs-sys-next",
        "dwrote",
        "findfont",
        "fontdb",
        "fontique",
        "parley",
        "pango",
        "pangocairo",
        "rust-fontconfig",
        "usvg",
        "resvg",
    ];
    const WITHIN: &[&str] = &[
        "fontconfig",
        "font-kit",
        "font-loader",
        "freetype",
        "core-text",
        "core-graphics",
        "directwrite",
        "cairo",
        "skia",
        "system-font",
    ];
    let lock = std::fs::read_to_string(root().join("Cargo.lock")).unwrap();
    let names = lock
        .lines()
        .filter_map(|l| l.strip_prefix("name = \"")?.strip_suffix('"'));
    let names: Vec<&str> = names.collect();
    // The lock file is read as it stands: what measures the embedded font is in it.
    assert!(names.contains(&"ttf-parser") && names.len() > 50);
    let faults: Vec<&&str> = names
        .iter()
        .filter(|n| ALONE.contains(n) || WITHIN.iter().any(|w| n.contains(w)))
        .collect();
    assert!(faults.is_empty(), "{faults:?}");
}

#[test]
fn the_test_itself_sees_what_it_looks_for() {
    let text = "use crate::{a::b, c::{d, e}, f};\nlet x = crate::g::h(); // crate::i\n";
    let found: Vec<String> = used(text).into_iter().collect();
    assert_eq!(found, ["a", "c", "f", "g"]);
    assert!(stands_in("// to do: Home, then work", "home"));
    assert!(!stands_in("// homely", "home"));
    assert!(stands_in("see ../elsewhere/notes", "elsewhere/"));
    assert!(!stands_in("a todo list", "TO"));
}

/// Answers are written where the program is run: none is to be left in the tree.
#[test]
fn the_top_level_holds_no_answers() {
    for entry in std::fs::read_dir(root()).unwrap() {
        let name = entry.unwrap().file_name();
        let name = name.to_string_lossy();
        assert!(!name.ends_with(".svg") && !name.ends_with(".csv"), "{name}");
    }
}
