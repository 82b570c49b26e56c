//! What lies between the pressure at the wall and the samples of a channel, and how it is taken back.

use num_complex::Complex64;

use crate::meanflow::MeanFlow;
use crate::measured::peaks::Peaks;
use crate::measured::reading::Transducer;
use crate::measured::recess::Tube;
use crate::network::Network;
use crate::network::sensors::Sensor;
use crate::problems::Problem;

/// Samples over wall pressure, as far as it is known.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Correction {
    /// The recess before the sensor.
    pub tube: Option<Tube>,
    /// The transducer.
    pub transducer: Option<Transducer>,
}

/// Gain of a recess from which on a correction multiplies noise.
const LARGEST: f64 = 5.0;

/// Change of the gain over the width of a peak that is worth a word.
const STEEP: f64 = 0.1;

impl Correction {
    /// Of a sensor in a network: its recess in the gas of the feed at the temperature stated and the pressure at the sensor.
    pub fn of(network: &Network, mean: &MeanFlow<f64>, sensor: &Sensor) -> Correction {
        let tube = sensor.recess.and_then(|recess| {
            let value = |k| network.values[k];
            let gas = mean.states.first()?.gas;
            let station = network
                .layout
                .inlet(sensor.element)
                .or(network.layout.outlet(sensor.element))?;
            let state = mean.states.get(station.0)?;
            let temperature = value(recess.temperature);
            Some(Tube {
                length: value(recess.length),
                diameter: value(recess.diameter),
                volume: value(recess.volume),
                sound_speed: gas.sound_speed(temperature),
                density: state.pressure / (gas.gas_constant() * temperature),
                gamma: gas.gamma(temperature),
                temperature,
            })
        });
        Correction {
            tube,
            transducer: None,
        }
    }

    /// Whether there is something to take back.
    pub fn any(&self) -> bool {
        self.tube.is_some() || self.transducer.is_some()
    }

    /// Samples over wall pressure at a frequency (Hz); the transducer counts within its table.
    pub fn at(&self, frequency: f64) -> Complex64 {
        let tube = self.tube.map_or(Complex64::ONE, |t| t.transfer(frequency));
        let own = self.transducer.as_ref().and_then(|t| t.at(frequency));
        tube * own.unwrap_or(Complex64::ONE)
    }

    /// What qualifies the correction of a channel over a band (Hz).
    pub(super) fn remarks(
        &self,
        name: &str,
        band: (f64, f64),
        peaks: Option<&Peaks>,
    ) -> Vec<Problem> {
        let mut found = Vec::new();
        if let Some(t) = &self.transducer {
            let (low, high) = t.span();
            if low > band.0 || high < band.1 {
                let what = format!(
                    "`{}` tells its response from {low} to {high} Hz only: outside it is taken for ideal",
                    t.file
                );
                found.push(
                    Problem::warning(name, what).hint("look at these frequencies with --frequency"),
                );
            }
        }
        if let Some(tube) = self.tube {
            let steps = 200;
            let at = |i: i32| band.0 + (band.1 - band.0) * f64::from(i) / f64::from(steps);
            let largest = (0..=steps)
                .map(|i| tube.transfer(at(i)).norm())
                .fold(0.0, f64::max);
            if largest > LARGEST {
                let what = format!(
                    "its recess resonates near {:.0} Hz and raises the pressure up to {largest:.0} times there",
                    tube.quarter_wave()
                );
                found.push(Problem::warning(name, what).hint(
                    "what is told near that frequency rests on the length and temperature stated",
                ));
            }
        }
        for peak in peaks.iter().flat_map(|p| &p.peaks).filter(|_| self.any()) {
            let (f, half) = (peak.frequency.value, 0.5 * peak.width.value);
            let gain = |f: f64| self.at(f).norm();
            let change = (gain(f + half) / gain((f - half).max(0.0))).ln().abs();
            if change > STEEP {
                let what = format!(
                    "the correction changes by {:.0} % over the width of the peak at {f:.1} Hz, which is fitted as measured",
                    100.0 * change.exp_m1()
                );
                found.push(
                    Problem::warning(name, what)
                        .hint("its decay rate is that of the samples, not of the wall pressure"),
                );
            }
        }
        found
    }
}
