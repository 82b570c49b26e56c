//! The page itself.

use std::error::Error;
use std::fmt::Write as _;
use std::path::{Path, PathBuf};

use num_complex::Complex64;
use serde_json::Value;
use stillflame::input;
use stillflame::modes::{self, ModeList, Scan, Window};

const HEAD: &str = "\
# Outside values beside ours

Eigenvalues found outside the project, ours, and how far apart they are. Written by

```sh
cargo run --release --example outside_checks > docs/outside-checks.md
```

A difference is told relative to `|s|` as the power of ten it stays below; what stays below 1e-12 is not told apart, since it\ndiffers from machine to machine. Demanded everywhere: 1e-8, a complete
list, the same number of modes.

## Closed dispersion relations

Solved with mpmath in 40-digit arithmetic; all roots in a box agreeing with an argument-principle count. `tests/data/closed_form.json` holds formulas,
parameters and digits.
";

const RANDOM: &str = "
## Independent solver

Invented random networks, solved by `tests/yardstick/witness.py` (mpmath, 45 digits) from the balances alone; `tests/data/witness_modes.json` holds
the networks and digits. Dry air burnt beyond 1000 K shows the shift at the join of its polynomials (see [validation.md](validation.md)).

| network | holds | modes | difference |
| --- | --- | --- | --- |
";

fn data(name: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR"))
        .join("tests/data")
        .join(name)
}

fn json(name: &str) -> Result<Value, Box<dyn Error>> {
    Ok(serde_json::from_str(&std::fs::read_to_string(data(name))?)?)
}

fn text<'a>(value: &'a Value, key: &str) -> Result<&'a str, String> {
    value[key].as_str().ok_or_else(|| format!("no {key}"))
}

fn list<'a>(value: &'a Value, key: &str) -> Result<&'a Vec<Value>, String> {
    value[key].as_array().ok_or_else(|| format!("no {key}"))
}

fn eigenvalue(value: &Value) -> Result<Complex64, Box<dyn Error>> {
    Ok(Complex64::new(
        text(value, "s_re")?.parse()?,
        text(value, "s_im")?.parse()?,
    ))
}

fn modes_of(name: &str, toml: &str) -> Result<ModeList, Box<dyn Error>> {
    let network = input::parse(name, toml, &[])?.network;
    let solved = modes::solve(&network)?;
    let window = Window::of(&network, &solved.mean)?;
    Ok(modes::find(&solved, window, Scan::Whole))
}

/// The mode nearest to `s`, and how far from it, relative to `|s|`.
fn nearest(list: &ModeList, s: Complex64) -> Result<(Complex64, f64), String> {
    let by_distance =
        |a: &&modes::Mode, b: &&modes::Mode| (a.s - s).norm().total_cmp(&(b.s - s).norm());
    let mode = list.modes.iter().min_by(by_distance).ok_or("no modes")?;
    Ok((mode.s, (mode.s - s).norm() / s.norm().max(1.0)))
}

/// The power of ten a difference stays below.
fn below(difference: f64) -> String {
    format!("1e{}", difference.max(1e-13).log10().floor() as i32 + 1)
}

/// Ten significant figures; rounding about zero is zero.
fn figure(x: f64) -> String {
    if x.abs() < 1e-9 {
        return "0".to_owned();
    }
    let before = x.abs().log10().floor().max(0.0) as usize;
    format!("{x:.*}", 9usize.saturating_sub(before))
}

/// The page as Markdown.
pub fn page() -> Result<String, Box<dyn Error>> {
    let mut page = HEAD.to_owned();
    let closed = json("closed_form.json")?;
    for (name, case) in closed["cases"].as_object().ok_or("no cases")? {
        let toml = std::fs::read_to_string(data(text(case, "network")?))?;
        let ours = modes_of(name, &toml)?;
        writeln!(page, "\n### `{name}`\n\n`{}`\n", text(case, "formula")?)?;
        writeln!(
            page,
            "Source: {}.\n",
            text(case, "source")?.trim_end_matches('.')
        )?;
        page.push_str("| outside, growth rate 1/s | outside, omega 1/s | ours, growth rate 1/s | ours, omega 1/s | difference |\n");
        page.push_str("| --- | --- | --- | --- | --- |\n");
        for value in list(case, "eigenvalues")? {
            let s = eigenvalue(value)?;
            let (found, difference) = nearest(&ours, s)?;
            writeln!(
                page,
                "| {} | {} | {} | {} | {} |",
                figure(s.re),
                figure(s.im),
                figure(found.re),
                figure(found.im),
                below(difference)
            )?;
        }
    }
    page.push_str(RANDOM);
    for network in list(&json("witness_modes.json")?, "networks")? {
        let name = text(network, "id")?;
        let ours = modes_of(name, text(network, "toml")?)?;
        let all = list(network, "modes")?;
        let mut worst = 0.0f64;
        for mode in all {
            worst = worst.max(nearest(&ours, eigenvalue(mode)?)?.1);
        }
        let about = text(network, "about")?;
        writeln!(
            page,
            "| {name} | {about} | {} | {} |",
            all.len(),
            below(worst)
        )?;
    }
    Ok(page)
}
