//! A spectrum that came without its record: its maxima, without intervals.

use serde::Serialize;

use super::significant;
use crate::draw::{Axis, DrawError, LineFigure, Mark, Panel, Scale, Series, Spot, lines};
use crate::measured::reading::{Line, MeasuredSpectrum};
use crate::problems::Problem;
use crate::report::table::{Lean, Table};
use crate::report::{CAUTION, Document, Heading, closing, csv_of};
use crate::studies::record::Maximum;
use crate::units::write_decimals;

/// A spectrum to report.
#[derive(Clone, Copy, Debug)]
pub struct LinesReport<'a> {
    /// The spectrum.
    pub spectrum: &'a MeasuredSpectrum,
    /// The maxima of each column.
    pub maxima: &'a [Vec<Maximum>],
    /// Frequencies looked at (Hz).
    pub band: (f64, f64),
    /// What qualifies it.
    pub warnings: &'a [Problem],
}

#[derive(Clone, Debug, Serialize)]
struct Row<'a> {
    channel: &'a str,
    unit: &'static str,
    frequency_hz: f64,
    rms: f64,
    width_hz: Option<f64>,
    power_over_median: f64,
}

#[derive(Clone, Debug, Serialize)]
struct Body<'a> {
    spectrum: &'a str,
    notes: &'a [String],
    band_hz: (f64, f64),
    maxima: Vec<Row<'a>>,
}

impl LinesReport<'_> {
    fn rows(&self) -> Vec<Row<'_>> {
        let columns = self.spectrum.columns.iter().zip(self.maxima);
        columns
            .flat_map(|(column, maxima)| {
                maxima.iter().map(|m| Row {
                    channel: &column.name,
                    unit: column.quantity.unit(),
                    frequency_hz: m.frequency,
                    rms: m.rms,
                    width_hz: m.width,
                    power_over_median: m.prominence,
                })
            })
            .collect()
    }

    /// As JSON.
    ///
    /// # Errors
    /// Where it has no form in JSON.
    pub fn json(&self) -> std::io::Result<String> {
        let body = Body {
            spectrum: &self.spectrum.file,
            notes: &self.spectrum.notes,
            band_hz: self.band,
            maxima: self.rows(),
        };
        let heading = Heading {
            network: "",
            title: "",
        };
        Document::new("stillflame/spectrum-lines", &heading, body, self.warnings).to_json()
    }

    /// The maxima as CSV.
    ///
    /// # Errors
    /// Where a row cannot be written.
    pub fn csv(&self) -> std::io::Result<Vec<u8>> {
        csv_of(self.rows())
    }

    /// For people.
    pub fn text(&self) -> String {
        use Lean::{Left, Right};
        let spectrum = self.spectrum;
        let mut text = format!(
            "Spectrum {}: {} frequencies from {} to {} Hz\n",
            crate::report::problems::visible(&spectrum.file),
            spectrum.frequency.len(),
            significant(spectrum.frequency.first().copied().unwrap_or(0.0), 6),
            significant(spectrum.frequency.last().copied().unwrap_or(0.0), 6)
        );
        for note in &spectrum.notes {
            text.push_str(&format!(
                "  \"{}\"\n",
                crate::report::problems::visible(note)
            ));
        }
        let mut table = Table::new(&[Left, Right, Right, Right, Right]);
        table.heading(&[
            "channel",
            "frequency",
            "rms",
            "full width at",
            "over the median",
        ]);
        table.heading(&["", "Hz", "", "half power, Hz", "dB"]);
        let rows = self.rows();
        for row in &rows {
            table.row(vec![
                crate::report::problems::visible(row.channel),
                write_decimals(row.frequency_hz, 2),
                format!("{} {}", significant(row.rms, 4), row.unit),
                row.width_hz
                    .map_or("-".to_owned(), |w| write_decimals(w, 2)),
                write_decimals(10.0 * row.power_over_median.log10(), 1),
            ]);
        }
        if rows.is_empty() {
            text.push_str("\nNo line stands 10 dB above the spectrum about it.\n");
        } else {
            text.push_str(&format!(
                "\nMaxima as read off the lines\n\n{}",
                table.text()
            ));
        }
        text.push_str(
            "\nA spectrum alone tells no interval and not what is noise and what a cycle; its widths hold the window's. The record does.\n",
        );
        text.push_str(&closing(self.warnings));
        text
    }

    /// The columns with their maxima as SVG.
    ///
    /// # Errors
    /// Where the figure cannot be drawn.
    pub fn svg(&self) -> Result<String, DrawError> {
        let spectrum = self.spectrum;
        let inside: Vec<usize> = (spectrum.frequency.iter().enumerate())
            .filter(|(_, f)| (self.band.0..=self.band.1).contains(*f))
            .map(|(i, _)| i)
            .collect();
        let panels = spectrum
            .columns
            .iter()
            .zip(self.maxima)
            .take(4)
            .map(|(column, maxima)| {
                let unit = column.quantity.unit();
                let unit = match column.line {
                    Line::Rms if unit == "1" => "rms".to_owned(),
                    Line::Rms => format!("{unit} rms"),
                    Line::Density => format!("({unit})\u{b2}/Hz"),
                };
                let spot = |m: &Maximum| Spot {
                    x: m.frequency,
                    y: m.height,
                    mark: Mark::Circle,
                    style: Some(1),
                    label: String::new(),
                };
                Panel {
                    y: Axis {
                        label: column.name.clone(),
                        unit,
                        scale: Scale::Logarithmic,
                    },
                    series: vec![Series {
                        name: String::new(),
                        style: 0,
                        values: inside
                            .iter()
                            .map(|i| column.values.get(*i).copied().filter(|v| *v > 0.0))
                            .collect(),
                        tag: String::new(),
                    }],
                    spots: maxima.iter().map(spot).collect(),
                    ..Panel::default()
                }
            })
            .collect();
        let count = self.maxima.iter().map(Vec::len).sum::<usize>();
        lines::render(&LineFigure {
            title: match count {
                0 => "No line stands out".to_owned(),
                1 => "1 line stands out".to_owned(),
                n => format!("{n} lines stand out"),
            },
            subtitle: spectrum.file.clone(),
            footnote: format!("As read; no interval is known. {CAUTION}"),
            x: Axis::new("Frequency", "Hz"),
            x_values: inside
                .iter()
                .filter_map(|i| spectrum.frequency.get(*i).copied())
                .collect(),
            panels,
            marks: vec![(Mark::Circle, "maximum".to_owned())],
            ..LineFigure::default()
        })
    }
}
