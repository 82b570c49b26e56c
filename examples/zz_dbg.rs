use num_complex::Complex64;
use stillflame::{input, modes};
use stillflame::modes::Window;
use stillflame::numerics::{isolate, analytic::*};
fn main() {
    for f in std::env::args().skip(1) {
        let n = input::read(std::path::Path::new(&f), &[]).unwrap().network;
        let s = modes::solve(&n).unwrap();
        let w = Window::of(&n, &s.mean).unwrap().rectangle();
        let tape = &s.acoustics.characteristic.tape;
        let scale = isolate::scale(tape, Complex64::new(w.growth.0, w.omega.1));
        let pitch = 1.6*scale;
        let nx = ((w.growth.1-w.growth.0)*1.04/pitch).ceil(); let ny = (w.omega.1*1.02/pitch).ceil();
        let mut near = [0; 4]; 
        for j in 0..ny as usize { for i in 0..nx as usize {
            let z = Complex64::new(w.growth.0 + (i as f64+0.5)*pitch, (j as f64+0.5)*pitch);
            let (v, d) = tape.value_and_slope(z);
            let st = (v/d).norm()/pitch;
            for (k, lim) in [0.3, 0.6, 0.9, 1.2].iter().enumerate() { if st < *lim { near[k]+=1; } }
        }}
        println!("{f}: scale {scale:.1} pitch {pitch:.1} grid {nx} x {ny} = {}, near {near:?}", nx*ny);
        for g in [w.growth.0, 0.0, w.growth.1] { println!("   scale at growth {g}: {:.1}", isolate::scale(tape, Complex64::new(g, w.omega.1))); }
    }
}
