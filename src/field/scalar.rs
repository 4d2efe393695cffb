//! A scalar field: one number with a unit at every node of a grid.

use ndarray::Array2;

use super::Grid;
use crate::quantity::Unit;

/// One number a node; NaN where there is none.
#[derive(Clone, Debug)]
pub struct ScalarField {
    /// Where the values are.
    pub grid: Grid,
    /// The values, shape (ny, nx), in `unit`; NaN where masked.
    pub values: Array2<f64>,
    /// Unit of the values.
    pub unit: Unit,
    /// What the values are, in words: "vorticity".
    pub name: String,
}

impl ScalarField {
    fn finite(&self) -> impl Iterator<Item = f64> {
        self.values.iter().copied().filter(|v| v.is_finite())
    }

    /// Least and greatest value, if any is finite.
    pub fn range(&self) -> Option<(f64, f64)> {
        let mut finite = self.finite();
        let first = finite.next()?;
        Some(finite.fold((first, first), |(lo, hi), v| (lo.min(v), hi.max(v))))
    }

    /// Least value, in `unit`; `None` where every cell is masked, here and below.
    pub fn min(&self) -> Option<f64> {
        Some(self.range()?.0)
    }

    /// Greatest value.
    pub fn max(&self) -> Option<f64> {
        Some(self.range()?.1)
    }

    /// Mean over the cells that have a value.
    pub fn mean(&self) -> Option<f64> {
        let (count, sum) = self.finite().fold((0u32, 0.0), |(n, s), v| (n + 1, s + v));
        (count > 0).then(|| sum / f64::from(count))
    }

    /// Root of the mean square over the cells that have a value.
    pub fn rms(&self) -> Option<f64> {
        let (count, sum) = self
            .finite()
            .fold((0u32, 0.0), |(n, s), v| (n + 1, s + v * v));
        (count > 0).then(|| (sum / f64::from(count)).sqrt())
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn means_leave_masked_cells_out() {
        let field = |values: [f64; 4]| ScalarField {
            grid: Grid {
                nx: 4,
                ny: 1,
                x0: 0.0,
                y0: 0.0,
                dx: 1.0,
                dy: 1.0,
                length: Unit::PX,
            },
            values: Array2::from(vec![values]),
            unit: Unit::ONE,
            name: "f".to_owned(),
        };
        let some = field([1.0, f64::NAN, -7.0, 3.0]);
        assert_eq!(some.mean(), Some(-1.0));
        assert_eq!((some.min(), some.max()), (Some(-7.0), Some(3.0)));
        assert_eq!(some.rms(), Some((59.0f64 / 3.0).sqrt()));
        let none = field([f64::NAN; 4]);
        assert_eq!((none.mean(), none.rms(), none.range()), (None, None, None));
    }
}
