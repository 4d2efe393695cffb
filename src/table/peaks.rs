//! Peaks of a correlation plane as rows.

use super::{Column, Table, TableError};
use crate::interrogate::{CorrelationPlane, PlanePeak};
use crate::quantity::Unit;

/// The `most` highest peaks of a correlation plane, one row a peak, the highest first.
///
/// Columns: peak (from 1), u and v in the unit of the plane's axes, height (a correlation
/// coefficient), ratio_to_next, and width_x and width_y in px, empty where the samples allow no
/// Gaussian.
///
/// # Errors
/// [`TableError`] never in practice: all columns have as many rows.
pub fn plane_peaks(plane: &CorrelationPlane, most: usize) -> Result<Table, TableError> {
    let peaks = || plane.peaks().iter().take(most);
    let unit = plane.field.grid.length;
    let column = |name: &str, unit: Unit, read: fn(&PlanePeak) -> Option<f64>| {
        Column::new(name, unit, peaks().map(read))
    };
    Table::of([
        Column::new("peak", Unit::ONE, (1..=peaks().count()).map(|k| k as f64)),
        column("u", unit, |p| Some(p.displacement.0)),
        column("v", unit, |p| Some(p.displacement.1)),
        column("height", Unit::ONE, |p| Some(p.height)),
        column("ratio_to_next", Unit::ONE, |p| p.ratio),
        column("width_x", Unit::PX, |p| p.width_px.0),
        column("width_y", Unit::PX, |p| p.width_px.1),
    ])
}
