//! Noise and cycles told apart. That they are in records of a minute is held with their peaks.

use rayon::prelude::*;

use crate::heard;
use crate::rigs::{self, NAMES};

/// A slice of the campaign of `cargo bench --bench records`.
#[test]
fn cycles_and_noise_are_told_apart_in_a_few_seconds() {
    let seconds = 6.0;
    for name in NAMES {
        let rig = rigs::rig(name);
        (0..12_u64).into_par_iter().for_each(|seed| {
            let heard = heard::hear(&rig, seconds, 5000 + seed, false);
            let wrong = heard::misjudged(&rig, seconds, &heard);
            assert!(wrong.is_empty(), "{name} {seed}: {wrong:?}");
        });
    }
}
