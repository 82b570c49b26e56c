//! What a recess or a stand-off tube makes of the pressure at the wall.
//!
//! A tube of length `L` and radius `a`, open to the wall and closed by a sensor with a volume `V` before it, in gas at rest
//! (Bergh & Tijdeman 1965, NLR-TR F.238; Tijdeman 1975, J. Sound Vib. 39, 1; from memory):
//!
//! ```text
//! H = p_sensor/p_wall = 1/[cosh(G L) + V/(pi a^2 L) n G L sinh(G L)/gamma],   s = a sqrt(rho w/mu)
//! G = (w/c) sqrt(J0(i^1.5 s)/J2(i^1.5 s)) sqrt(gamma/n),   n = 1/[1 + (gamma-1)/gamma J2(i^1.5 s sqrt(Pr))/J0(i^1.5 s sqrt(Pr))]
//! ```
//!
//! `G` holds friction and the exchange of heat with the wall. In a wide tube `G -> i w/c` and `H -> 1/cos(w L/c)`: a
//! resonance where the tube is a quarter wavelength long. The volume is taken as polytropic like the tube, `n/gamma`.
//! Viscosity is that of air by Sutherland's law.

use num_complex::Complex64;

/// A tube between wall and sensor, with the gas in it.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Tube {
    /// Length (m).
    pub length: f64,
    /// Inner diameter (m).
    pub diameter: f64,
    /// Volume before the sensor (m^3).
    pub volume: f64,
    /// Speed of sound in the gas (m/s).
    pub sound_speed: f64,
    /// Density of the gas (kg/m^3).
    pub density: f64,
    /// Ratio of specific heats.
    pub gamma: f64,
    /// Temperature of the gas (K).
    pub temperature: f64,
}

/// Prandtl number of air at room temperature (handbook value, from memory).
const PRANDTL: f64 = 0.71;

/// Dynamic viscosity of air (Pa s) at a temperature (K), by Sutherland's law with the constants of White, Viscous Fluid
/// Flow: 1.716e-5 Pa s at 273 K, 111 K (from memory).
pub fn viscosity(temperature: f64) -> f64 {
    1.716e-5 * (temperature / 273.0).powf(1.5) * (273.0 + 111.0) / (temperature + 111.0)
}

impl Tube {
    /// Pressure at the sensor over that at the wall, at a frequency (Hz).
    pub fn transfer(&self, frequency: f64) -> Complex64 {
        let omega = std::f64::consts::TAU * frequency;
        if omega <= 0.0 {
            return Complex64::ONE;
        }
        let radius = 0.5 * self.diameter;
        let shear = radius * (self.density * omega / viscosity(self.temperature)).sqrt();
        let turned = Complex64::from_polar(shear, 0.75 * std::f64::consts::PI);
        let thermal = ratio(turned * PRANDTL.sqrt());
        let gamma = self.gamma;
        let n = 1.0 / (1.0 + (gamma - 1.0) / gamma * thermal);
        let along = omega / self.sound_speed * ((gamma / n) / ratio(turned)).sqrt() * self.length;
        let bore = std::f64::consts::PI * radius * radius * self.length;
        let volume = self.volume / bore * (n / gamma) * along * along.sinh();
        1.0 / (along.cosh() + volume)
    }

    /// Frequency (Hz) at which the tube without its volume is a quarter wavelength long.
    pub fn quarter_wave(&self) -> f64 {
        self.sound_speed / (4.0 * self.length)
    }
}

/// `J2(z)/J0(z) = (2/z) J1(z)/J0(z) - 1` by the continued fraction `J1/J0 = z/(2 - z^2/(4 - z^2/(6 - ...)))`.
fn ratio(z: Complex64) -> Complex64 {
    let square = z * z;
    // The terms settle once they exceed the argument.
    let terms = z.norm() as u32 + 40;
    let mut tail = Complex64::from(2.0 * f64::from(terms));
    for k in (1..terms).rev() {
        tail = 2.0 * f64::from(k) - square / tail;
    }
    2.0 / tail - 1.0
}

#[cfg(test)]
mod tests {
    use super::*;

    fn tube(diameter: f64, volume: f64) -> Tube {
        Tube {
            length: 0.1,
            diameter,
            volume,
            sound_speed: 343.2,
            density: 1.204,
            gamma: 1.4,
            temperature: 293.15,
        }
    }

    /// Small arguments from the series of J0 and J2; `J2(3)/J0(3)` from tables (J0(3) = -0.2600520, J2(3) = 0.4860913,
    /// Abramowitz & Stegun, from memory).
    #[test]
    fn the_ratio_of_bessel_functions_is_that_of_tables() {
        assert!((ratio(Complex64::from(3.0)) - 0.486_091_3 / -0.260_052_0).norm() < 1e-5);
        let z = Complex64::new(0.3, 0.2);
        let z2 = z * z / 4.0;
        let j0 = 1.0 - z2 + z2 * z2 / 4.0 - z2.powi(3) / 36.0;
        let j2 = z2 / 2.0 - z2 * z2 / 6.0 + z2.powi(3) / 48.0;
        assert!((ratio(z) - j2 / j0).norm() < 1e-6);
        // Far along the ray of the tube J2/J0 tends to -1.
        let far = ratio(Complex64::from_polar(2000.0, 0.75 * std::f64::consts::PI));
        assert!((far + 1.0).norm() < 2e-3, "{far}");
    }

    #[test]
    fn a_wide_tube_is_a_lossless_line() {
        let wide = tube(0.2, 0.0);
        for f in [50.0, 200.0, 500.0, 700.0] {
            let k = std::f64::consts::TAU * f / wide.sound_speed;
            let want = 1.0 / (k * wide.length).cos();
            let got = wide.transfer(f);
            assert!((got / want - 1.0).norm() < 0.02, "{f}: {got} {want}");
        }
        assert!((wide.quarter_wave() - 858.0).abs() < 1e-9);
    }

    /// A narrow tube at low frequency is a resistance: `H -> 1/(1 + i w 8 mu L V'/(pi a^4 p))`, the pneumatic time constant
    /// of Poiseuille flow into the volume (isothermal in the bore, `V' = V/gamma + bore/2`).
    #[test]
    fn a_capillary_fills_its_volume_by_poiseuille_flow() {
        let thin = tube(2e-4, 2e-9);
        let f = 2.0;
        let radius: f64 = 1e-4;
        let pressure = thin.density * thin.sound_speed.powi(2) / thin.gamma;
        let bore = std::f64::consts::PI * radius * radius * thin.length;
        let resistance =
            8.0 * viscosity(293.15) * thin.length / (std::f64::consts::PI * radius.powi(4));
        let time = resistance * (thin.volume / thin.gamma + 0.5 * bore) / pressure;
        let lag = -thin.transfer(f).arg();
        assert!(
            (lag / (std::f64::consts::TAU * f * time) - 1.0).abs() < 0.01,
            "{lag}"
        );
    }

    #[test]
    fn a_volume_lowers_the_resonance_and_walls_damp_it() {
        let peak = |t: Tube| {
            (1..1500)
                .map(|f| (f, t.transfer(f64::from(f)).norm()))
                .max_by(|a, b| a.1.total_cmp(&b.1))
                .unwrap()
        };
        let (plain, loaded) = (peak(tube(2e-3, 0.0)), peak(tube(2e-3, 2e-7)));
        assert!(loaded.0 < plain.0 && plain.0 < 858, "{plain:?} {loaded:?}");
        assert!(plain.1 < peak(tube(4e-3, 0.0)).1);
    }
}
