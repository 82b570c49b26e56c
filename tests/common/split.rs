//! A network with a duct cut in two, which changes nothing.

use crate::common::rig::{Piece, Rig, What};

impl Rig {
    /// The places of its ducts among its pieces.
    pub fn ducts(&self) -> Vec<usize> {
        let is_duct = |p: &Piece| matches!(p.what, What::Duct { .. });
        (0..self.pieces.len())
            .filter(|&i| is_duct(&self.pieces[i]))
            .collect()
    }

    /// The same network with the duct at place `at` cut in two. Variances of arrival times add up.
    pub fn split(&self, at: usize, fraction: f64) -> Rig {
        let mut rig = self.clone();
        let front = &mut rig.pieces[at];
        let name = front.name.clone();
        let mut back = front.clone();
        back.name = format!("{name}_rest");
        let parts = [
            (&mut front.what, fraction),
            (&mut back.what, 1.0 - fraction),
        ];
        for (what, part) in parts {
            if let What::Duct {
                length, carried, ..
            } = what
            {
                *length *= part;
                *carried = carried.map(|d| d * part.sqrt());
            }
        }
        let outlet = |r: &str| r == name || r.strip_suffix(".out") == Some(&name);
        for piece in &mut rig.pieces {
            if let What::Flame { responses, .. } = &mut piece.what {
                for reference in responses.iter_mut().filter_map(|r| r.reference.as_mut()) {
                    if outlet(reference) {
                        *reference = format!("{}.out", back.name);
                    }
                }
            }
        }
        rig.pieces.insert(at + 1, back);
        rig
    }
}
