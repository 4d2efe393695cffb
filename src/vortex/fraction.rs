//! Size by vorticity fraction.
//!
//! Measures the region round the centre where the vorticity is more than a given fraction (25 %
//! by default) of its peak. The diameter is that of the circle of the same area, the circulation
//! the line integral of the velocity round the region's outline, which by Stokes is the
//! vorticity inside without differentiating anything.
//!
//! Exact answers: Lamb-Oseen and Burgers, radius rc sqrt(ln 1/f) (1.17741 rc at 25 %) and
//! 1 - f of the whole circulation; Rankine, the core. It needs the peak, which one small core
//! and noise make uncertain, and sees only the part of an eddy that is inside edge and mask.

use std::f64::consts::PI;

use super::contour::{Contour, around};
use super::peak::Peak;
use crate::field::{Place, VectorField};
use ndarray::Array2;

/// What the vorticity fraction says of one eddy.
pub(super) struct Fraction {
    pub contour: Contour,
    /// Diameter of the circle of the same area.
    pub diameter: f64,
    /// Line integral of the velocity round the contour, counter-clockwise.
    pub circulation: f64,
}

/// Measures the eddy with the given peak whose core of swirling strength has `nodes` nodes;
/// `rotation` is the vorticity times the eddy's sign. `None` where the contour holds no area.
pub(super) fn fraction(
    field: &VectorField,
    rotation: &Array2<f64>,
    peak: Peak,
    nodes: usize,
    fraction: f64,
) -> Option<Fraction> {
    let level = fraction * peak.height;
    let cells = (nodes as f64 / PI).sqrt();
    let contour = around(rotation, &field.grid, (peak.x, peak.y), level, cells)?;
    let area = contour.area();
    (area > 0.0).then(|| Fraction {
        diameter: 2.0 * (area / PI).sqrt(),
        circulation: circulation_round(field, &contour.points),
        contour,
    })
}

/// Line integral of the velocity along a closed polygon by the trapezoidal rule on its sides.
fn circulation_round(field: &VectorField, points: &[[f64; 2]]) -> f64 {
    let velocity: Vec<(f64, f64)> = points
        .iter()
        .map(|&[x, y]| match Place::on(&field.grid, x, y) {
            Some(place) => (place.read(&field.u), place.read(&field.v)),
            None => (f64::NAN, f64::NAN),
        })
        .collect();
    let corners = points.iter().zip(&velocity);
    let next = corners.clone().cycle().skip(1);
    corners
        .zip(next)
        .map(|((a, from), (b, to))| {
            0.5 * ((from.0 + to.0) * (b[0] - a[0]) + (from.1 + to.1) * (b[1] - a[1]))
        })
        .sum()
}
