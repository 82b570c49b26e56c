//! Which node at one position is which node at the next.
//!
//! Over a step `h` a node at `a` with velocity `a'` is predicted at `a + h a'`, and backwards. Two nodes are
//! tied where each is the other's nearest prediction and falls within the disc proved to hold no
//! other mode. That alone is deceived by two modes that veer away from each other within the step, for
//! they leave as if they had passed through one another. So a step is clear only if, besides,
//!
//! - the tubes about the paths keep apart: the least distance of two paths (cubic through places and
//!   velocities) exceeds twice the sum of their bends `|h| |b' - a'|/2 + |b - a - h (a' + b')/2|`;
//! - no approach is left unseen: that distance is at least half of the smaller one at the two ends;
//!
//! and the same for a mode and its own conjugate. A step that is not clear is to be halved.

use num_complex::Complex64;

use super::sample::Node;

/// One node or two at the left end of a step, and what they are at the right end.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Tie {
    pub left: Vec<usize>,
    pub right: Vec<usize>,
}

/// A step's ties.
#[derive(Clone, Debug, Default, PartialEq)]
pub(super) struct Ties {
    pub ties: Vec<Tie>,
    /// Nodes of the left end that are none of the right.
    pub gone: Vec<usize>,
    /// Nodes of the right end that were none of the left.
    pub new: Vec<usize>,
    /// Whether every tie is beyond doubt; nodes gone or new are to be explained still.
    pub clear: bool,
}

/// How close (in merging distances) two modes must be to be taken for the two of a merged node.
const ABOUT_TO_MERGE: f64 = 8.0;

/// A step to tie.
#[derive(Clone, Copy)]
pub(super) struct Step<'a> {
    pub left: &'a [Node],
    pub right: &'a [Node],
    /// The step in `u`.
    pub h: f64,
    /// The merging distance.
    pub merge: f64,
    /// Whether modes come in conjugate pairs at both ends.
    pub symmetric: bool,
    /// Too short to halve: what is near belongs together.
    pub last: bool,
}

impl Step<'_> {
    /// The ties of the step.
    pub fn ties(&self) -> Ties {
        let mut free_left = vec![true; self.left.len()];
        let mut free_right = vec![true; self.right.len()];
        let mut ties = Vec::new();
        let mut clear = true;
        for (to, node) in self.right.iter().enumerate() {
            if let Some(from) = self.parts(node, self.left, &free_left, -self.h) {
                take(&mut free_left, &from);
                free_right[to] = false;
                ties.push(Tie {
                    left: from,
                    right: vec![to],
                });
            }
        }
        for (from, node) in self.left.iter().enumerate() {
            if !free_left[from] {
                continue;
            }
            if let Some(to) = self.parts(node, self.right, &free_right, self.h) {
                take(&mut free_right, &to);
                free_left[from] = false;
                ties.push(Tie {
                    left: vec![from],
                    right: to,
                });
            }
        }
        let forward = |a: usize| nearest(&self.left[a], self.right, &free_right, self.h);
        let backward = |b: usize| nearest(&self.right[b], self.left, &free_left, -self.h);
        let mut pairs = Vec::new();
        for a in (0..self.left.len()).filter(|a| free_left[*a]) {
            if let Some(b) = forward(a) {
                if backward(b) == Some(a) && self.left[a].on_axis == self.right[b].on_axis {
                    pairs.push((a, b));
                } else {
                    clear = false;
                }
            }
        }
        clear &= (0..self.right.len())
            .filter(|b| free_right[*b])
            .all(|b| backward(b).is_none_or(|a| forward(a) == Some(b)));
        for (a, b) in pairs {
            free_left[a] = false;
            free_right[b] = false;
            ties.push(Tie {
                left: vec![a],
                right: vec![b],
            });
        }
        if self.last {
            self.gather(&mut free_left, &mut free_right, &mut ties);
        }
        ties.sort_by(|a, b| (&a.left, &a.right).cmp(&(&b.left, &b.right)));
        let rest = |free: Vec<bool>| (0..free.len()).filter(|i| free[*i]).collect();
        Ties {
            ties,
            gone: rest(free_left),
            new: rest(free_right),
            clear,
        }
    }

    /// The nodes among `others` that a merged node, a step `h` away from them, comes from or goes to:
    /// another merged node, two single ones, or one near the axis.
    fn parts(&self, node: &Node, others: &[Node], free: &[bool], h: f64) -> Option<Vec<usize>> {
        if !node.two {
            return None;
        }
        let expected = node.predicted(h);
        let near = self.merge.max(node.error) * ABOUT_TO_MERGE;
        let reach = if self.last { f64::INFINITY } else { near };
        let mut by_distance: Vec<(f64, usize)> = (0..others.len())
            .filter(|i| free[*i])
            .map(|i| ((others[i].at - expected).norm(), i))
            .collect();
        by_distance.sort_by(|a, b| a.0.total_cmp(&b.0));
        let (distance, first) = *by_distance.first()?;
        let one = &others[first];
        if one.two {
            return (distance < node.radius.max(near) && one.on_axis == node.on_axis)
                .then(|| vec![first]);
        }
        if node.on_axis && !one.on_axis {
            return (2.0 * one.at.im <= reach).then(|| vec![first]);
        }
        let (_, second) = *by_distance.get(1)?;
        let other = &others[second];
        let fits = !other.two && one.on_axis == node.on_axis && other.on_axis == node.on_axis;
        (fits && (one.at - other.at).norm() <= reach).then(|| vec![first, second])
    }

    /// At the last halving: what is left over and near belongs together, as two and two, one and two
    /// (a mode that meets its conjugate), or one and one.
    fn gather(&self, left: &mut [bool], right: &mut [bool], ties: &mut Vec<Tie>) {
        while let Some(a) = (0..left.len()).find(|a| left[*a]) {
            left[a] = false;
            let at = self.left[a].at;
            let reach = self.left[a].radius.max(self.merge);
            let close = |nodes: &[Node], free: &[bool]| -> Vec<usize> {
                (0..nodes.len())
                    .filter(|i| free[*i] && (nodes[*i].at - at).norm() <= 8.0 * reach)
                    .take(2)
                    .collect()
            };
            let mut from = vec![a];
            let to = close(self.right, right);
            if to.is_empty() {
                left[a] = true;
                break;
            }
            let alike = |b: &usize| self.left[a].on_axis == self.right[*b].on_axis;
            if to.len() == 2 || !to.iter().all(alike) {
                from.extend(close(self.left, left).first());
            }
            take(left, &from);
            take(right, &to);
            ties.push(Tie {
                left: from,
                right: to,
            });
        }
    }

    /// Whether the paths of all tied nodes keep apart, and from their conjugates.
    pub fn apart(&self, tied: &[(Node, Node)]) -> bool {
        self.crowded(tied).is_none()
    }

    /// The first two of the tied nodes whose paths do not keep apart; the same twice for a node and its
    /// conjugate.
    pub fn crowded(&self, tied: &[(Node, Node)]) -> Option<(usize, usize)> {
        let paths: Vec<Bent> = tied.iter().map(|(a, b)| Bent::new(a, b, self.h)).collect();
        for (i, p) in paths.iter().enumerate() {
            if self.symmetric && !p.on_axis && !p.keeps_from(&p.mirrored()) {
                return Some((i, i));
            }
            for (j, q) in paths.iter().enumerate().skip(i + 1) {
                if !p.keeps_from(q) {
                    return Some((i, j));
                }
            }
        }
        None
    }
}

fn take(free: &mut [bool], taken: &[usize]) {
    for &i in taken {
        free[i] = false;
    }
}

/// The free node whose disc a prediction falls into; the nearest, where discs overlap.
fn nearest(node: &Node, others: &[Node], free: &[bool], h: f64) -> Option<usize> {
    let expected = node.predicted(h);
    (0..others.len())
        .filter(|i| free[*i] && others[*i].two == node.two)
        .map(|i| ((others[i].at - expected).norm(), i))
        .filter(|(distance, i)| *distance < others[*i].radius)
        .min_by(|a, b| a.0.total_cmp(&b.0))
        .map(|(_, i)| i)
}

/// Places along a path that its distance to another is taken between.
const PLACES: usize = 8;

/// A path over one step with the width of the tube about it.
struct Bent {
    places: [Complex64; PLACES + 1],
    bend: f64,
    /// No place of it lies farther from the first.
    reach: f64,
    on_axis: bool,
}

impl Bent {
    fn new(a: &Node, b: &Node, h: f64) -> Self {
        let turn = 0.5 * h.abs() * (b.velocity - a.velocity).norm();
        let miss = (b.at - a.at - (a.velocity + b.velocity) * (0.5 * h)).norm();
        let place = |k| {
            between(
                a.at,
                a.velocity,
                b.at,
                b.velocity,
                h,
                k as f64 / PLACES as f64,
            )
        };
        let places: [Complex64; PLACES + 1] = std::array::from_fn(place);
        let away = places.iter().map(|z| (z - places[0]).norm());
        Bent {
            places,
            bend: turn + miss,
            reach: away.fold(0.0, f64::max),
            on_axis: a.on_axis && b.on_axis,
        }
    }

    fn mirrored(&self) -> Bent {
        Bent {
            places: self.places.map(|z| z.conj()),
            ..*self
        }
    }

    fn keeps_from(&self, other: &Bent) -> bool {
        // Most pairs are so far from each other that a look at one place says it.
        let first = (self.places[0] - other.places[0]).norm();
        let reach = self.reach + other.reach;
        if reach <= 0.5 * first && first - reach > 2.0 * (self.bend + other.bend) {
            return true;
        }
        let apart: [Complex64; PLACES + 1] =
            std::array::from_fn(|k| self.places[k] - other.places[k]);
        let least = apart
            .windows(2)
            .map(|w| from_origin(w[0], w[1]))
            .fold(f64::INFINITY, f64::min);
        let ends = apart[0].norm().min(apart[PLACES].norm());
        least > 2.0 * (self.bend + other.bend) && least >= 0.5 * ends
    }
}

/// The cubic through two places with given velocities, at a fraction of the step.
pub(super) fn between(
    a: Complex64,
    a_velocity: Complex64,
    b: Complex64,
    b_velocity: Complex64,
    h: f64,
    t: f64,
) -> Complex64 {
    let (t2, t3) = (t * t, t * t * t);
    a * (2.0 * t3 - 3.0 * t2 + 1.0)
        + a_velocity * (h * (t3 - 2.0 * t2 + t))
        + b * (3.0 * t2 - 2.0 * t3)
        + b_velocity * (h * (t3 - t2))
}

/// Distance of the straight line from `a` to `b` from zero.
fn from_origin(a: Complex64, b: Complex64) -> f64 {
    let d = b - a;
    let length = d.norm_sqr();
    if length == 0.0 {
        return a.norm();
    }
    let t = (-(a.conj() * d).re / length).clamp(0.0, 1.0);
    (a + d * t).norm()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::modes::Mode;
    use proptest::prelude::*;

    fn node(at: Complex64, velocity: Complex64, radius: f64) -> Node {
        let mode = Mode {
            s: at,
            error_bound: 1e-9,
            multiplicity: 1,
        };
        Node {
            at,
            velocity,
            error: 1e-9,
            radius,
            on_axis: false,
            two: false,
            modes: [mode; 2],
            listed: 1,
        }
    }

    /// `s = s0 +- sqrt((u + i eta)^2 + epsilon^2)`: two modes beside two exceptional points at
    /// `u = -i eta +- i epsilon`. Analytic continuation along the real axis says which is which.
    fn veering(u: f64, eta: f64, epsilon: f64) -> [Node; 2] {
        let z = Complex64::new(u, eta);
        let w = z * z + epsilon * epsilon;
        // The branch of the square root that is continuous over all u: its cut must not be crossed.
        let mut root = w.sqrt();
        if eta.abs() > epsilon {
            // Beyond both points the pair passes through: root ~ z.
            if (root / z).re < 0.0 {
                root = -root;
            }
        } else if root.re < 0.0 {
            root = -root;
        }
        let v = z / root;
        let s0 = Complex64::new(-50.0, 2000.0);
        let radius = root.norm();
        [node(s0 + root, v, radius), node(s0 - root, -v, radius)]
    }

    /// Halves until clear, and says whether the first stayed the first.
    fn keeps(u: (f64, f64), at: &dyn Fn(f64) -> [Node; 2], depth: usize) -> Option<bool> {
        let (left, right) = (at(u.0), at(u.1));
        let step = Step {
            left: &left,
            right: &right,
            h: u.1 - u.0,
            merge: 1e-6,
            symmetric: false,
            last: false,
        };
        let ties = step.ties();
        let tied: Vec<(Node, Node)> = ties
            .ties
            .iter()
            .map(|t| (left[t.left[0]], right[t.right[0]]))
            .collect();
        if ties.clear && ties.gone.is_empty() && ties.new.is_empty() && step.apart(&tied) {
            let first = ties.ties.iter().find(|t| t.left == [0])?;
            return Some(first.right == [0]);
        }
        if depth == 0 {
            return None;
        }
        let middle = 0.5 * (u.0 + u.1);
        let a = keeps((u.0, middle), at, depth - 1)?;
        let b = keeps((middle, u.1), at, depth - 1)?;
        Some(a == b)
    }

    proptest! {
        #![proptest_config(ProptestConfig::with_cases(500))]

        /// Two modes that veer or pass, however the exceptional points lie and however coarse the first
        /// step is, keep the identity that analytic continuation gives them.
        #[test]
        fn veering_modes_keep_their_identity(
            epsilon in -6.0..0.0f64,
            share in prop_oneof![0.0..0.9f64, 1.1..3.0f64],
            left in 0.5..40.0f64,
            right in 0.5..40.0f64,
        ) {
            let epsilon = 10f64.powf(epsilon);
            let eta = share * epsilon;
            let at = |u: f64| veering(u, eta, epsilon);
            prop_assert_eq!(keeps((-left, right), &at, 60), Some(true));
        }

        #[test]
        fn the_cubic_meets_places_and_velocities(
            a in (-1.0..1.0f64, -1.0..1.0f64),
            b in (-1.0..1.0f64, -1.0..1.0f64),
            h in 0.1..2.0f64,
        ) {
            let c = |z: (f64, f64)| Complex64::new(z.0, z.1);
            let (p, q, v, w) = (c(a), c(b), c(b) * 3.0, c(a) - 2.0);
            let at = |t: f64| between(p, v, q, w, h, t);
            prop_assert!((at(0.0) - p).norm() < 1e-14 && (at(1.0) - q).norm() < 1e-14);
            let d = 1e-6;
            prop_assert!(((at(d) - p) / (d * h) - v).norm() < 1e-4);
            prop_assert!(((q - at(1.0 - d)) / (d * h) - w).norm() < 1e-4);
            let least = (0..=1000)
                .map(|k| (p + (q - p) * (f64::from(k) / 1000.0)).norm())
                .fold(f64::INFINITY, f64::min);
            prop_assert!((from_origin(p, q) - least).abs() < 4e-3);
        }
    }

    #[test]
    fn a_merged_node_takes_the_two_nearest_and_gives_them_back() {
        let c = |re: f64| Complex64::new(re, 1000.0);
        let far = node(c(300.0), c(0.0) * 0.0, 50.0);
        let (a, b) = (
            node(c(-2e-6), Complex64::new(0.0, 0.0), 1e-6),
            node(c(2e-6), Complex64::new(0.0, 0.0), 1e-6),
        );
        let mut both = node(c(0.0), Complex64::new(0.0, 0.0), 10.0);
        both.two = true;
        let step = Step {
            left: &[a, far, b],
            right: &[far, both],
            h: 1e-3,
            merge: 1e-6,
            symmetric: false,
            last: false,
        };
        let ties = step.ties();
        assert!(ties.clear && ties.gone.is_empty() && ties.new.is_empty());
        assert_eq!(ties.ties.len(), 2);
        assert!(ties.ties.iter().any(|t| {
            let mut from = t.left.clone();
            from.sort_unstable();
            from == [0, 2] && t.right == [1]
        }));
        let back = Step {
            left: &[far, both],
            right: &[a, far, b],
            ..step
        };
        assert!(
            back.ties()
                .ties
                .iter()
                .any(|t| t.left == [1] && t.right.len() == 2)
        );
    }
}
