//! Columns for a terminal: a heading of one or more lines, numbers to the right, names to the left.

/// Which way a column leans.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Lean {
    Left,
    Right,
}

/// A table in the making.
#[derive(Clone, Debug)]
pub(super) struct Table {
    leans: Vec<Lean>,
    rows: Vec<Vec<String>>,
    headings: usize,
}

impl Table {
    /// A column for each lean.
    pub fn new(leans: &[Lean]) -> Self {
        Table {
            leans: leans.to_vec(),
            rows: Vec::new(),
            headings: 0,
        }
    }

    /// A line of the heading.
    pub fn heading(&mut self, cells: &[&str]) {
        self.headings += 1;
        self.row(cells.iter().map(|c| (*c).to_owned()).collect());
    }

    /// A line of the body.
    pub fn row(&mut self, cells: Vec<String>) {
        self.rows.push(cells);
    }

    /// The lines, a rule under the heading, each begun with two blanks.
    pub fn text(&self) -> String {
        let width = |column: usize| {
            let cells = self.rows.iter().filter_map(|r| r.get(column));
            cells.map(|c| c.chars().count()).max().unwrap_or(0)
        };
        let widths: Vec<usize> = (0..self.leans.len()).map(width).collect();
        let rule = widths.iter().sum::<usize>() + 2 * widths.len().saturating_sub(1);
        let mut text = String::new();
        for (i, row) in self.rows.iter().enumerate() {
            if i == self.headings && i > 0 {
                text.push_str(&format!("  {}\n", "-".repeat(rule)));
            }
            let cells = row.iter().zip(&widths).zip(&self.leans);
            let line: Vec<String> = cells
                .map(|((cell, &width), lean)| match lean {
                    Lean::Left => format!("{cell:<width$}"),
                    Lean::Right => format!("{cell:>width$}"),
                })
                .collect();
            text.push_str(format!("  {}", line.join("  ")).trim_end());
            text.push('\n');
        }
        text
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn columns_line_up_whatever_their_cells() {
        let mut table = Table::new(&[Lean::Left, Lean::Right]);
        table.heading(&["name", "kPa"]);
        table.row(vec!["a".into(), "101.325".into()]);
        table.row(vec!["long_name".into(), "8".into()]);
        assert_eq!(
            table.text(),
            "  name           kPa\n  ------------------\n  a          101.325\n  long_name        8\n"
        );
    }
}
