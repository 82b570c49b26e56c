use std::time::Instant;
use num_complex::Complex64;
use stillflame::{input, modes};
use stillflame::modes::Window;
use stillflame::numerics::analytic::*;
use stillflame::numerics::zeros::{self, Scan};
use stillflame::numerics::count::Walker;
fn least(mut f: impl FnMut()) -> f64 { let mut best = f64::MAX; for _ in 0..3000 { let t = Instant::now(); f(); best = best.min(t.elapsed().as_secs_f64()); } best }
fn main() {
    exps();
    for f in std::env::args().skip(1) {
        let n = input::read(std::path::Path::new(&f), &[]).unwrap().network;
        let s = modes::solve(&n).unwrap();
        let w = Window::of(&n, &s.mean).unwrap();
        let tape = &s.acoustics.characteristic.tape;
        let r = w.rectangle();
        let pts: Vec<Complex64> = (0..1024).map(|i| Complex64::new(r.growth.0 + (i as f64*0.618).fract()*(r.growth.1-r.growth.0), r.omega.1*(i as f64)/1024.0)).collect();
        let mut out = Vec::with_capacity(1024);
        let v = least(|| { out.clear(); tape.values_and_slopes(&pts, &mut out); });
        let sc = least(|| { for p in &pts[..64] { std::hint::black_box(tape.value_and_slope(*p)); } });
        let regions: Vec<Region> = pts[..64].iter().map(|p| Region::disc(*p, 10.0)).collect();
        let mut ob = Vec::with_capacity(64);
        let b = least(|| { ob.clear(); tape.bounds(&regions, &mut ob); });
        let c = least(|| { std::hint::black_box(Walker::new(tape).symmetric(r.growth, r.omega.1).ok()); });
        let l = least(|| { std::hint::black_box(zeros::search(tape, &r, Scan::Whole)); });
        let u = least(|| { std::hint::black_box(zeros::search(tape, &r, Scan::UntilCounted)); });
        let a = least(|| { std::hint::black_box(stillflame::acoustics::assemble(&n, &s.mean).unwrap()); });
        let e = zeros::search(tape, &r, Scan::Whole);
        println!("{f}: lanes {:.1} ns, scalar {:.0} ns, bound {:.1} ns, count {:.2} us, list {:.1} / {:.1} us, assemble {:.2} us; {} zeros {:?}", v*1e9/1024.0, sc*1e9/64.0, b*1e9/64.0, c*1e6, l*1e6, u*1e6, a*1e6, e.zeros.len(), e.effort);
    }
}
use stillflame::numerics::lanes::{self, Job, Lanes, LANES};
use stillflame::numerics::number::Number;
struct Exps<'a>(&'a [[f64; LANES]], &'a [[f64; LANES]]);
impl Job for Exps<'_> {
    type Output = [f64; LANES];
    #[inline(always)]
    fn run<L: Lanes>(self) -> [f64; LANES] {
        let mut sum = L::from(0.0);
        let mut other = L::from(0.0);
        for (a, b) in self.0.iter().zip(self.1) {
            let r = lanes::exp(L::load(a));
            let (s, c) = lanes::sin_cos(L::load(b));
            sum = r.mul_add(c, sum);
            other = r.mul_add(s, other);
        }
        let mut out = [0.0; LANES];
        (sum + other).store(&mut out);
        out
    }
}
pub fn exps() {
    let a: Vec<[f64; LANES]> = (0..128).map(|i| std::array::from_fn(|j| -1.0 + 0.01 * (i * 8 + j) as f64)).collect();
    let b: Vec<[f64; LANES]> = (0..128).map(|i| std::array::from_fn(|j| -17.0 + 0.07 * (i * 8 + j) as f64)).collect();
    let t = least(|| { std::hint::black_box(lanes::on_lanes(Exps(&a, &b))); });
    println!("exponential {:.2} ns", t * 1e9 / 1024.0);
}
