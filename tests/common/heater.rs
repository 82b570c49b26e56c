//! A heater in an open tube at and beside nine of its exceptional points: parameters and roots in 50
//! digits, `tests/yardstick/exceptional.py`.

use std::path::Path;

use serde::Deserialize;
use stillflame::input;
use stillflame::modes::{self, Solved, Window};

#[derive(Deserialize)]
struct Points {
    points: Vec<Point>,
}

#[derive(Deserialize)]
pub struct Point {
    pub x_f: String,
    pub s_re: String,
    pub s_im: String,
    pub parting: [f64; 2],
    pub beside: Vec<Beside>,
}

#[derive(Deserialize)]
pub struct Beside {
    pub moved: String,
    pub n: f64,
    pub tau: f64,
    pub roots: Vec<(f64, f64)>,
}

/// Where the roots are.
pub const WINDOW: Window = Window {
    frequency: (40.0, 480.0),
    growth: (-600.0, 400.0),
};

pub fn points() -> Vec<Point> {
    let path =
        Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/data/exceptional_neighbourhoods.json");
    let all: Points = serde_json::from_str(&std::fs::read_to_string(path).unwrap()).unwrap();
    all.points
}

/// Still gas of 340 m/s exactly: 1.36 * 250 * 340 = 340^2.
pub fn solved(x_f: &str, at: &Beside) -> Solved {
    let (x_f, n, tau) = (number(x_f), at.n, at.tau);
    let toml = format!(
        r#"
        title = "Heater in an open tube (invented)"
        feed = {{ gas = {{ gamma = 1.36, gas_constant = "250 J/(kg K)" }}, velocity = "0 m/s", temperature = "340 K", pressure = "101325 Pa", end = "open" }}
        exit = {{ end = "open" }}
        [[element]]
        name = "lower"
        kind = "duct"
        length = "{x_f:?} m"
        diameter = "100 mm"
        [[element]]
        name = "flame"
        kind = "flame"
        basis = "velocity"
        response = {{ kind = "n-tau", interaction_index = {n:?}, delay = "{tau:?} s" }}
        [[element]]
        name = "upper"
        kind = "duct"
        length = "{:?} m"
        diameter = "100 mm"
        "#,
        1.0 - x_f
    );
    let network = input::parse("heater.toml", &toml, &[]).unwrap().network;
    modes::solve(&network).unwrap()
}

pub fn number(text: &str) -> f64 {
    text.parse().unwrap()
}
