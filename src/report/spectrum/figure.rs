//! A record as figures: densities, coherence and phase, spectrograms.

use super::{SpectrumReport, significant};
use crate::draw::{
    Axis, DrawError, LineFigure, Mark, Panel, Scale, Series, Spot, Waterfall, lines, waterfall,
};
use crate::measured::nature::{Evidence, Verdict};
use crate::report::{CAUTION, counted};
use crate::units::write_decimals;

/// Most channels with a panel of their own.
const MOST_PANELS: usize = 4;

/// Most pairs in a figure.
const MOST_PAIRS: usize = 5;

/// Positions along x that a figure can show.
const POSITIONS: usize = 600;

/// Range of a spectrogram's levels (dB), a tenth of it above the loudest but one in a thousand.
const DEPTH: f64 = 60.0;

/// Bins of which a figure shows the values: of each stretch that falls on one position the least and the largest.
fn thinned(power: &[f64]) -> Vec<usize> {
    let part = power.len().div_ceil(POSITIONS).max(1);
    let mut kept = Vec::with_capacity(2 * POSITIONS);
    for (k, chunk) in power.chunks(part).enumerate() {
        let indexed = || chunk.iter().enumerate();
        let least = indexed().min_by(|a, b| a.1.total_cmp(b.1)).map(|(i, _)| i);
        let largest = indexed().max_by(|a, b| a.1.total_cmp(b.1)).map(|(i, _)| i);
        let mut both: Vec<usize> = least.into_iter().chain(largest).collect();
        both.sort_unstable();
        both.dedup();
        kept.extend(both.into_iter().map(|i| k * part + i));
    }
    kept
}

fn mark(evidence: Option<&Evidence>) -> Mark {
    match evidence.map(|e| e.verdict) {
        Some(Verdict::Noise) => Mark::Circle,
        Some(Verdict::Cycle) => Mark::Diamond,
        Some(Verdict::Undecided) | None => Mark::Cross,
    }
}

impl SpectrumReport<'_> {
    /// The finding: the strongest peak of the first channel that has one.
    fn finding(&self) -> String {
        let survey = self.survey;
        let strongest = survey.channels.iter().find_map(|channel| {
            let peaks = channel.peaks.as_ref().ok()?;
            let all = peaks.peaks.iter().zip(&channel.evidence);
            let (peak, evidence) = all.max_by(|a, b| a.0.rms.value.total_cmp(&b.0.rms.value))?;
            let what = match evidence.map(|e| e.verdict) {
                Some(Verdict::Cycle) => "a self-sustained cycle",
                Some(Verdict::Noise) => "a resonance driven by noise",
                _ => "noise or cycle undecided",
            };
            let unit = channel.signal.quantity.unit();
            let unit = if unit == "1" { "" } else { unit };
            Some(format!(
                "{}: {} Hz, {} {unit} rms, {what}",
                channel.signal.name,
                write_decimals(peak.frequency.value, 1),
                significant(Self::corrected(channel, peak).value, 3)
            ))
        });
        strongest.unwrap_or_else(|| "No peak stands out".to_owned())
    }

    fn subtitle(&self) -> String {
        let survey = self.survey;
        let title = self.heading().title;
        let of = if title.is_empty() {
            survey.file.clone()
        } else {
            format!("{title}; {}", survey.file)
        };
        let note = survey
            .notes
            .iter()
            .find(|n| n.to_uppercase().contains("SYNTHETIC"));
        let marked = if note.is_some() {
            "; SYNTHETIC record"
        } else {
            ""
        };
        format!(
            "{of}, {} s at {} Hz{marked}",
            significant(survey.duration(), 4),
            survey.spectra.plan().rate_hz
        )
    }

    fn footnote(&self) -> String {
        let spectra = &self.survey.spectra;
        let plan = spectra.plan();
        format!(
            "Welch: {} window of {} s, overlap {:.0} %, {} worth {} independent averages, resolution {} Hz. {CAUTION}",
            plan.window.noun(),
            significant(plan.segment as f64 / plan.rate_hz, 4),
            100.0 * plan.overlap as f64 / plan.segment as f64,
            counted(spectra.segments(), "segment"),
            write_decimals(spectra.averages(), 0),
            significant(plan.resolution(), 3),
        )
    }

    /// Power densities with the fit and the peaks, a panel for each channel, as SVG.
    ///
    /// # Errors
    /// Where the figure cannot be drawn.
    pub fn density_svg(&self) -> Result<String, DrawError> {
        let survey = self.survey;
        let bins: Vec<usize> = survey.bins().collect();
        let shown: Vec<usize> = (0..survey.channels.len())
            .filter(|i| survey.spectra.density(*i).iter().any(|p| *p > 0.0))
            .take(MOST_PANELS)
            .collect();
        let first: Vec<f64> = match shown.first() {
            Some(&i) => bins.iter().map(|j| survey.density(i, *j)).collect(),
            None => Vec::new(),
        };
        let kept: Vec<usize> = thinned(&first)
            .into_iter()
            .filter_map(|k| bins.get(k).copied())
            .collect();
        let x_values: Vec<f64> = kept.iter().map(|j| survey.spectra.frequency(*j)).collect();
        let part = bins.len().div_ceil(POSITIONS).max(1);
        let panels = shown.iter().map(|&i| self.panel(i, &kept, part)).collect();
        let mut footnote = self.footnote();
        if shown.len() < survey.channels.len() {
            footnote = format!(
                "{} of {} channels shown. {footnote}",
                shown.len(),
                survey.channels.len()
            );
        }
        lines::render(&LineFigure {
            title: self.finding(),
            subtitle: self.subtitle(),
            footnote,
            x: Axis::new("Frequency", "Hz"),
            x_values,
            panels,
            marks: vec![
                (Mark::Circle, "resonance driven by noise".to_owned()),
                (Mark::Diamond, "self-sustained cycle".to_owned()),
                (Mark::Cross, "undecided".to_owned()),
            ],
            crowd: "95 % band of the estimate".to_owned(),
            ..LineFigure::default()
        })
    }

    fn panel(&self, i: usize, kept: &[usize], part: usize) -> Panel {
        let survey = self.survey;
        // What falls on one position with a bin kept is shown by its largest.
        let largest = |j: usize| {
            let around = j.saturating_sub(part / 2)..j + part / 2 + 1;
            around.map(|k| survey.density(i, k)).fold(0.0, f64::max)
        };
        let value = |j: usize| {
            if i == 0 || part == 1 {
                survey.density(i, j)
            } else {
                largest(j)
            }
        };
        let values: Vec<Option<f64>> = kept
            .iter()
            .map(|j| Some(value(*j)).filter(|p| *p > 0.0))
            .collect();
        let channel = survey.channels.get(i);
        let peaks = channel.and_then(|c| c.peaks.as_ref().ok());
        let width = survey.spectra.plan().bin_width();
        let fit = |j: &usize| {
            let peaks = peaks?;
            let from = (peaks.frequency.first()? / width).round() as usize;
            let fitted = peaks.fitted.first()?.get(j.checked_sub(from)?)?;
            let gain = channel?
                .correction
                .at(survey.spectra.frequency(*j))
                .norm_sqr();
            Some(fitted / gain).filter(|p| *p > 0.0)
        };
        let told = peaks
            .iter()
            .flat_map(|p| &p.peaks)
            .zip(channel.iter().flat_map(|c| &c.evidence));
        let spots = told
            .map(|(peak, evidence)| {
                let bin = (peak.frequency.value / width).round() as usize;
                let near = bin.saturating_sub(1)..=bin + 1;
                Spot {
                    x: peak.frequency.value,
                    y: near
                        .map(|j| survey.density(i, j))
                        .fold(f64::MIN_POSITIVE, f64::max),
                    mark: mark(evidence.as_ref()),
                    style: Some(1),
                    label: String::new(),
                }
            })
            .collect();
        let (name, unit) = channel.map_or(("", "1"), |c| {
            (c.signal.name.as_str(), c.signal.quantity.unit())
        });
        let unit = match unit {
            "1" => "1/Hz".to_owned(),
            u if u.contains('/') => format!("({u})\u{b2}/Hz"),
            u => format!("{u}\u{b2}/Hz"),
        };
        Panel {
            y: Axis {
                label: name.to_owned(),
                unit,
                scale: Scale::Logarithmic,
            },
            series: vec![
                Series {
                    name: "Welch estimate".to_owned(),
                    style: 0,
                    values: values.clone(),
                    tag: String::new(),
                },
                Series {
                    name: "fit".to_owned(),
                    style: 1,
                    values: kept.iter().map(fit).collect(),
                    tag: String::new(),
                },
            ],
            crowd: self.gauge(kept, &values),
            spots,
            ..Panel::default()
        }
    }

    /// The band of an estimate as a gauge near the right end of a panel: on a logarithmic axis it is as high everywhere.
    fn gauge(&self, kept: &[usize], values: &[Option<f64>]) -> Vec<Vec<(f64, f64)>> {
        let spectra = &self.survey.spectra;
        let at = |part: f64| {
            kept.get((part * kept.len().saturating_sub(1) as f64) as usize)
                .copied()
        };
        let (Some(first), Some(last), Some(bin)) = (at(0.0), at(1.0), at(0.965)) else {
            return Vec::new();
        };
        let highest = values.iter().flatten().copied().fold(0.0, f64::max);
        let (low, high) = spectra.band(bin);
        if highest <= 0.0 || !high.is_finite() || low <= 0.0 {
            return Vec::new();
        }
        let x = spectra.frequency(bin);
        let half = 0.006 * (spectra.frequency(last) - spectra.frequency(first));
        let (bottom, top) = (highest * low / high, highest);
        vec![
            vec![(x, bottom), (x, top)],
            vec![(x - half, bottom), (x + half, bottom)],
            vec![(x - half, top), (x + half, top)],
        ]
    }

    /// Coherence and phase of channels to the first, as SVG; `None` where there is no pair.
    ///
    /// # Errors
    /// Where the figure cannot be drawn.
    pub fn coherence_svg(&self) -> Result<Option<String>, DrawError> {
        let survey = self.survey;
        let constant = |i: usize| survey.channels.get(i).is_none_or(|c| c.level.constant());
        let pairs: Vec<_> = (survey.pairs.iter())
            .filter(|(a, b)| *a == 0 && !constant(*a) && !constant(*b))
            .filter_map(|&(a, b)| Some((a, b, self.related(a, b)?)))
            .take(MOST_PAIRS)
            .collect();
        if pairs.is_empty() {
            return Ok(None);
        }
        let bins: Vec<usize> = survey.bins().collect();
        let part = bins.len().div_ceil(2 * POSITIONS).max(1);
        let kept: Vec<usize> = (0..bins.len()).step_by(part).collect();
        let name = |i: usize| {
            survey
                .channels
                .get(i)
                .map_or("", |c| c.signal.name.as_str())
        };
        let chance = pairs
            .first()
            .and_then(|(.., r)| r.first())
            .map_or(0.0, |r| r.chance_coherence);
        let mut coherence = Vec::new();
        let mut phase = Vec::new();
        for (style, (a, b, relations)) in pairs.iter().enumerate() {
            let label = format!("{} to {}", name(*a), name(*b));
            let of = |k: &usize| relations.get(*k);
            coherence.push(Series {
                name: label.clone(),
                style,
                values: kept.iter().map(|k| Some(of(k)?.coherence)).collect(),
                tag: String::new(),
            });
            phase.push(Series {
                name: label,
                style,
                values: kept
                    .iter()
                    .map(|k| {
                        let r = of(k).filter(|r| r.coherence > r.chance_coherence)?;
                        Some(r.phase.to_degrees())
                    })
                    .collect(),
                tag: String::new(),
            });
        }
        // A line across half the circle is no swing of the phase.
        for series in &mut phase {
            for k in 1..series.values.len() {
                if let (Some(a), Some(b)) = (series.values[k - 1], series.values[k])
                    && (a - b).abs() > 180.0
                {
                    series.values[k] = None;
                }
            }
        }
        let figure = LineFigure {
            title: format!(
                "How the channels hang together: coherence and phase to {}",
                name(0)
            ),
            subtitle: self.subtitle(),
            footnote: format!(
                "Phase is shown where coherence exceeds {}, which unrelated channels do with 5 %; it is positive where the second channel leads. {}",
                write_decimals(chance, 3),
                self.footnote()
            ),
            x: Axis::new("Frequency", "Hz"),
            x_values: kept
                .iter()
                .filter_map(|k| Some(survey.spectra.frequency(*bins.get(*k)?)))
                .collect(),
            panels: vec![
                Panel {
                    y: Axis::new("Coherence", ""),
                    series: coherence,
                    ..Panel::default()
                },
                Panel {
                    y: Axis::new("Phase", "deg"),
                    series: phase,
                    ..Panel::default()
                },
            ],
            ..LineFigure::default()
        };
        lines::render(&figure).map(Some)
    }

    /// The spectrogram of a channel as SVG; `None` where the record fills fewer than two rows.
    ///
    /// # Errors
    /// Where the figure cannot be drawn.
    pub fn spectrogram_svg(&self, channel: usize) -> Result<Option<String>, DrawError> {
        let survey = self.survey;
        let Some(studied) = survey.channels.get(channel) else {
            return Ok(None);
        };
        let (frequencies, rows) = self.waterfall(channel);
        if rows.len() < 2 || frequencies.len() < 2 || studied.level.constant() {
            return Ok(None);
        }
        let pressure = studied.signal.quantity == crate::measured::Quantity::Pressure;
        let reference: f64 = if pressure { 20e-6 } else { 1.0 };
        let level = |d: &f64| 10.0 * (d / (reference * reference)).max(1e-300).log10();
        let columns: Vec<Vec<f64>> = rows
            .iter()
            .map(|(_, d)| d.iter().map(level).collect())
            .collect();
        let mut all: Vec<f64> = columns.iter().flatten().copied().collect();
        all.sort_by(f64::total_cmp);
        let top = all
            .get((all.len() - 1) * 999 / 1000)
            .copied()
            .unwrap_or(0.0);
        let top = (top / 10.0).ceil() * 10.0;
        let unit = match (pressure, studied.signal.quantity.unit()) {
            (true, _) => "dB re (20 \u{b5}Pa)\u{b2}/Hz".to_owned(),
            (false, "1") => "dB re 1/Hz".to_owned(),
            (false, unit) => format!("dB re (1 {unit})\u{b2}/Hz"),
        };
        let (plan, per_row) = &survey.row_plan;
        let figure = Waterfall {
            title: format!("{} over time", studied.signal.name),
            subtitle: self.subtitle(),
            footnote: format!(
                "{}: {} window of {} s, overlap {:.0} %, resolution {} Hz. {CAUTION}",
                match *per_row {
                    1 => "Each column is one segment".to_owned(),
                    n => format!("Each column is the mean of {}", counted(n, "segment")),
                },
                plan.window.noun(),
                significant(plan.segment as f64 / plan.rate_hz, 3),
                100.0 * plan.overlap as f64 / plan.segment as f64,
                significant(plan.resolution(), 3),
            ),
            x: Axis::new("Time", "s"),
            x_values: rows.iter().map(|(t, _)| *t).collect(),
            y: Axis::new("Frequency", "Hz"),
            y_values: frequencies,
            columns,
            level: Axis::new("Power density", unit),
            range: (top - DEPTH, top),
        };
        waterfall::render(&figure).map(Some)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn thinning_keeps_extremes_in_order() {
        let mut power: Vec<f64> = (0..10_000)
            .map(|i| 1.0 + f64::from((i * 31) % 17))
            .collect();
        power[5003] = 500.0;
        power[7001] = 1e-3;
        let kept = thinned(&power);
        assert!(kept.contains(&5003) && kept.contains(&7001));
        assert!(kept.windows(2).all(|w| w[0] < w[1]) && kept.len() <= 2 * POSITIONS);
        assert_eq!(thinned(&[3.0, 1.0]), [0, 1]);
        assert!(thinned(&[]).is_empty());
    }
}
