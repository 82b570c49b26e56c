//! A finder of zeros that has nothing but counts: a rectangle that holds more than one zero is halved,
//! until each holds one or is too small to matter.

use stillflame::numerics::analytic::Analytic;
use stillflame::numerics::count::{CountError, Rectangle, Walker};
use stillflame::numerics::zeros::Search;

/// A rectangle and the number of zeros in it; where `mirrored` it stands on the real axis, and its
/// mirror image counts too.
#[derive(Clone, Copy, Debug)]
pub struct Cell {
    pub r: Rectangle,
    pub mirrored: bool,
    pub count: i64,
}

/// Cells of that diameter over the modulus are not halved any more.
const SMALLEST: f64 = 1e-7;

fn count<F: Analytic>(
    walker: &mut Walker<'_, F>,
    r: &Rectangle,
    mirrored: bool,
) -> Result<i64, CountError> {
    if mirrored {
        walker.symmetric(r.growth, r.omega.1)
    } else {
        walker.rectangle(r)
    }
}

/// Cells that hold every zero of the window.
pub fn cells<F: Analytic>(f: &F, window: &Rectangle) -> Result<Vec<Cell>, String> {
    let mut walker = Walker::new(f);
    let mirrored = f.is_symmetric() && window.omega.0 == 0.0;
    let whole = count(&mut walker, window, mirrored).map_err(|e| e.to_string())?;
    let mut found = Vec::new();
    let mut open = vec![Cell {
        r: *window,
        mirrored,
        count: whole,
    }];
    while let Some(cell) = open.pop() {
        let (g, w) = (cell.r.growth, cell.r.omega);
        let reach = (g.1 - g.0).hypot(w.1 - w.0);
        let size = 1.0 + g.0.abs().max(g.1.abs()).hypot(w.1);
        if cell.count == 0 {
            continue;
        }
        if cell.count == 1 || reach < SMALLEST * size {
            found.push(cell);
            continue;
        }
        open.extend(halves(&mut walker, &cell)?);
    }
    Ok(found)
}

/// Both halves across the longer side, cut where no zero lies.
fn halves<F: Analytic>(walker: &mut Walker<'_, F>, cell: &Cell) -> Result<[Cell; 2], String> {
    let (g, w) = (cell.r.growth, cell.r.omega);
    let mut said = String::new();
    for part in [0.5, 0.4683, 0.5391, 0.4219, 0.6107, 0.3571] {
        let (mut a, mut b) = (*cell, *cell);
        if g.1 - g.0 > w.1 - w.0 {
            let cut = g.0 + part * (g.1 - g.0);
            (a.r.growth.1, b.r.growth.0) = (cut, cut);
        } else {
            let cut = w.0 + part * (w.1 - w.0);
            (a.r.omega.1, b.r.omega.0) = (cut, cut);
            b.mirrored = false;
        }
        let counts = [&a, &b].map(|c| count(walker, &c.r, c.mirrored));
        match counts {
            [Ok(m), Ok(n)] => {
                let twice = if cell.mirrored && !b.mirrored { 2 } else { 1 };
                if m + twice * n != cell.count {
                    return Err(format!("{m} and {twice} times {n} in {cell:?}"));
                }
                (a.count, b.count) = (m, n);
                return Ok([a, b]);
            }
            [Err(e), _] | [_, Err(e)] => said = e.to_string(),
        }
    }
    Err(format!("{cell:?} cannot be halved: {said}"))
}

/// What the cells hold against a list: each must hold as many of its zeros as it counts, and no zero
/// may lie outside all.
pub fn disagreement(cells: &[Cell], list: &Search, symmetric: bool) -> Option<String> {
    let mut placed = 0;
    for cell in cells {
        let (mut least, mut most) = (0, 0);
        for z in &list.zeros {
            let mut at = z.at;
            if z.at.im <= z.error && cell.r.omega.0 <= 0.0 {
                at.im = z.error + cell.r.omega.0.max(0.0);
            }
            let pair = cell.mirrored && !z.real && symmetric;
            let weight = i64::from(z.multiplicity) * if pair { 2 } else { 1 };
            match cell.r.holds(at, z.error) {
                Some(true) => (least, most, placed) = (least + weight, most + weight, placed + 1),
                None => (most, placed) = (most + weight, placed + 1),
                Some(false) => {}
            }
        }
        if !(least..=most).contains(&cell.count) {
            return Some(format!("{least} to {most} listed in {cell:?}"));
        }
    }
    (placed < list.zeros.len()).then(|| format!("{placed} of {:#?} in cells", list.zeros))
}
