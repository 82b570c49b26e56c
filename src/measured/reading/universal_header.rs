//! The head of a dataset 58 of the universal file format: eleven lines of text before the values.
//!
//! Fields stand in fixed columns (after the published description of dataset 58, "Function at nodal DOF", from memory):
//!
//! ```text
//! 1 to 5  text                               6  2(I5,I10),2(1X,10A1,I10,I4)
//! 7  3I10,3E13.5: type of ordinate, number of values, even (1) or uneven (0) abscissa, its start, step, z
//! 8 to 11  I10,3I5,2(1X,20A1): specific type, exponents, name, unit; of abscissa, ordinate, denominator, z
//! ```
//!
//! The first line of a binary one is `I6,1A1,I6,I6,I12,I12,...`: 58, b, byte order (1 little, 2 big), kind of float (2 is
//! IEEE 754), lines of text, bytes of values.

use crate::problems::Problem;

/// How values are stored.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Storage {
    Text,
    Binary { big: bool, bytes: u64 },
}

/// What a head tells.
#[derive(Clone, Debug)]
pub(super) struct Function {
    pub storage: Storage,
    pub title: String,
    /// 0 unknown, 1 response over time.
    pub kind: i64,
    pub name: String,
    pub double: bool,
    pub complex: bool,
    pub even: bool,
    pub values: u64,
    pub start: f64,
    pub step: f64,
    /// Relative distance of the true step, by the digits it is written with.
    pub slack: f64,
    /// 17 is time.
    pub abscissa: i64,
    pub unit: String,
}

/// Lines of text before the values, the first told apart.
pub(super) const LINES: usize = 11;

/// Reads the line that names a dataset: `58`, or `58b` with what follows; `None` where it is another.
pub(super) fn dataset(line: &str) -> Result<Option<Storage>, String> {
    let text = line.trim();
    let Some(rest) = text.strip_prefix("58") else {
        return Ok(None);
    };
    if rest.is_empty() {
        return Ok(Some(Storage::Text));
    }
    let Some(rest) = rest.strip_prefix(['b', 'B']) else {
        return Ok(None);
    };
    let numbers: Vec<u64> = rest
        .split_whitespace()
        .map_while(|w| w.parse().ok())
        .collect();
    let [order, float, lines, bytes, ..] = numbers[..] else {
        return Err(
            "a binary dataset 58 must tell its byte order, kind of float, lines and bytes"
                .to_owned(),
        );
    };
    if !(1..=2).contains(&order) || float != 2 || lines != LINES as u64 {
        return Err(format!(
            "byte order {order}, float format {float} and {lines} lines of text are not read: it takes 1 or 2, 2 (IEEE 754) and {LINES}"
        ));
    }
    Ok(Some(Storage::Binary {
        big: order == 2,
        bytes,
    }))
}

/// The text in columns of a line.
fn columns(line: &str, from: usize, to: usize) -> &str {
    let to = to.min(line.len());
    line.get(from.min(to)..to).unwrap_or_default().trim()
}

fn whole(line: &str, from: usize, to: usize) -> Option<i64> {
    columns(line, from, to).parse().ok()
}

fn said(text: &str) -> Option<&str> {
    Some(text).filter(|t| !t.is_empty() && !t.eq_ignore_ascii_case("none"))
}

/// Reads the eleven lines; `line` is the number of the first.
///
/// # Errors
/// Where a field that is needed cannot be read.
pub(super) fn read(
    storage: Storage,
    lines: &[String],
    line: u64,
    place: impl Fn(u64, &str) -> crate::problems::Place,
    file: &str,
) -> Result<Function, Problem> {
    let text = |i: usize| lines.get(i - 1).map_or("", String::as_str);
    let fail = |i: usize, what: &str| {
        let at = line + i as u64 - 1;
        Problem::error(file, format!("record {i} of dataset 58 {what}")).at(place(at, text(i)))
    };
    let layout = text(7);
    // Where writers keep the blanks between numbers but not the columns, words do as well.
    let words: Vec<&str> = layout.split_whitespace().collect();
    let numbers: Option<(i64, u64, i64)> = match words.as_slice() {
        [a, b, c, _, _, ..] => (a.parse().ok())
            .zip(b.parse().ok())
            .zip(c.parse().ok())
            .map(|((a, b), c)| (a, b, c)),
        _ => None,
    };
    let by_column = || {
        Some((
            whole(layout, 0, 10)?,
            u64::try_from(whole(layout, 10, 20)?).ok()?,
            whole(layout, 20, 30)?,
        ))
    };
    let (ordinate_type, values, spacing) = numbers
        .or_else(by_column)
        .ok_or_else(|| fail(7, "does not tell type, number and spacing of the values"))?;
    let (start_text, step_text) = match words.as_slice() {
        [_, _, _, start, step, ..] => (*start, *step),
        _ => (columns(layout, 30, 43), columns(layout, 43, 56)),
    };
    let real = |t: &str| {
        t.replace(['D', 'd'], "E")
            .parse::<f64>()
            .ok()
            .filter(|x| x.is_finite())
    };
    let (start, step) = real(start_text)
        .zip(real(step_text))
        .ok_or_else(|| fail(7, "has no start and step of the abscissa"))?;
    let (double, complex) = match ordinate_type {
        2 => (false, false),
        4 => (true, false),
        5 => (false, true),
        6 => (true, true),
        _ => {
            return Err(fail(
                7,
                "names no type of values: 2 and 4 are real, 5 and 6 complex",
            ));
        }
    };
    if spacing == 1 && step <= 0.0 {
        return Err(fail(7, "has a step of the abscissa that does not rise"));
    }
    let response = text(6);
    let node = || {
        format!(
            "node {}:{}",
            whole(response, 41, 51).unwrap_or(0),
            whole(response, 51, 55).unwrap_or(0)
        )
    };
    let entity = said(columns(response, 31, 41));
    let name = entity.or(said(columns(text(9), 26, 46)));
    Ok(Function {
        storage,
        title: text(1).trim().to_owned(),
        kind: whole(response, 0, 5).unwrap_or(0),
        name: name.map_or_else(node, str::to_owned),
        double,
        complex,
        even: spacing == 1,
        values,
        start,
        step,
        slack: 0.5 * super::clock::quantum(step_text) / step.abs().max(f64::MIN_POSITIVE),
        abscissa: whole(text(8), 0, 10).unwrap_or(0),
        unit: said(columns(text(9), 47, 67))
            .unwrap_or_default()
            .to_owned(),
    })
}
