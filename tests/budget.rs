//! The growth budget adds up.

use stillflame::input;
use stillflame::modes::{self, Scan, Window, budget::budget};

#[test]
fn the_networks_budgets_add_up() {
    let folder = std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join("networks");
    for entry in std::fs::read_dir(folder).unwrap() {
        let path = entry.unwrap().path();
        let network = input::read(&path, &[]).unwrap().network;
        let solved = modes::solve(&network).unwrap();
        let window = Window::of(&network, &solved.mean).unwrap();
        for mode in modes::find(&solved, window, Scan::Whole).modes {
            let b = budget(&network, &solved, &mode).unwrap();
            println!("{} {} {}", path.display(), mode.s, b.growth());
            for p in &b.parts {
                println!(
                    "   {:12} {:10.4} {:10.4} {:10.4} {:8.4}",
                    network.layout.elements[p.element.0].name, p.flow, p.entropy, p.heat, p.energy
                );
            }
            assert!((b.growth() - mode.growth()).abs() < 1e-8 * mode.s.norm());
        }
    }
}
