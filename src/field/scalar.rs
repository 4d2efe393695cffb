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
    /// Least and greatest value, if any is finite.
    pub fn range(&self) -> Option<(f64, f64)> {
        let mut finite = self.values.iter().copied().filter(|v| v.is_finite());
        let first = finite.next()?;
        Some(finite.fold((first, first), |(lo, hi), v| (lo.min(v), hi.max(v))))
    }
}
