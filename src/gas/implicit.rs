//! Derivatives through a root found in plain numbers.
//!
//! If `r(x) = 0` was solved for the value of `x`, Newton corrections `x <- x - r(x)/r'` over a
//! number type with derivatives, `r'` being the plain slope at the root, make one further order of
//! derivatives exact each (implicit differentiation).

use std::any::TypeId;

use crate::numerics::dual::{Dual, Real};

/// Corrections after which every derivative a `T` carries is exact: none for plain numbers, one
/// for [`Dual`], three otherwise, which serves nesting to that depth.
pub(crate) fn corrections<T: Real>() -> usize {
    let id = TypeId::of::<T>();
    if id == TypeId::of::<f64>() {
        0
    } else if id == TypeId::of::<Dual>() {
        1
    } else {
        3
    }
}

/// The root with its derivatives: `root` solves `residual` in values, with plain slope `slope`.
pub(crate) fn carry<T: Real>(root: f64, slope: f64, residual: impl Fn(T) -> T) -> T {
    let mut x = T::from(root);
    for _ in 0..corrections::<T>() {
        x -= residual(x) / slope;
    }
    x
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::numerics::dual::Grad;

    #[test]
    fn third_derivative_of_a_cube_root() {
        type Three = Grad<Grad<Dual, 1>, 1>;
        let a: Three = Grad::variable(Grad::variable(Dual::variable(8.0, 0), 0), 0);
        let x = carry(2.0, 12.0, |x: Three| x * x * x - a);
        // a^(1/3): 1/12, -2/9 a^(-5/3), 10/27 a^(-8/3).
        assert!((x.d[0].v.v - 1.0 / 12.0).abs() < 1e-15);
        assert!((x.d[0].d[0].v + 2.0 / 9.0 / 32.0).abs() < 1e-15);
        assert!((x.d[0].d[0].d[0] - 10.0 / 27.0 / 256.0).abs() < 1e-15);
    }
}
