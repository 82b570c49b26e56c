use stillflame::{input, modes};
use stillflame::modes::Window;
use stillflame::numerics::zeros::{self, Scan};
fn main() { for f in std::env::args().skip(1) {
    let n = input::read(std::path::Path::new(&f), &[]).unwrap().network;
    let s = modes::solve(&n).unwrap();
    let w = Window::of(&n, &s.mean).unwrap().rectangle();
    let r = zeros::search(&s.acoustics.characteristic.tape, &w, Scan::UntilCounted);
    eprintln!("{:?} met {:?}", r.effort, r.met);
}}
