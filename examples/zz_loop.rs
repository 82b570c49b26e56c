use num_complex::Complex64;
use stillflame::{input, modes};
use stillflame::modes::Window;
use stillflame::numerics::analytic::*;
fn main() {
    let a: Vec<String> = std::env::args().collect();
    let n = input::read(std::path::Path::new(&a[1]), &[]).unwrap().network;
    let s = modes::solve(&n).unwrap();
    let w = Window::of(&n, &s.mean).unwrap();
    let tape = &s.acoustics.characteristic.tape;
    let r = w.rectangle();
    let pts: Vec<Complex64> = (0..1024).map(|i| Complex64::new(r.growth.0 + (i as f64*0.618).fract()*(r.growth.1-r.growth.0), r.omega.1*(i as f64)/1024.0)).collect();
    let regions: Vec<Region> = pts.iter().map(|p| Region::disc(*p, 10.0)).collect();
    let mut out = Vec::with_capacity(1024);
    let mut ob = Vec::with_capacity(1024);
    if a[2] == "l" { for _ in 0..20000 { std::hint::black_box(stillflame::numerics::zeros::search(tape, &r, stillflame::numerics::zeros::Scan::UntilCounted)); } return; }
    for _ in 0..40000 { if a[2] == "v" { out.clear(); tape.values_and_slopes(&pts, &mut out); } else { ob.clear(); tape.bounds(&regions, &mut ob); } }
}
