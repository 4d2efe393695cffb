//! How far the pattern moves, and how much its motion differs from place to place.

use crate::field::{FieldError, Scheme, Status, VectorField};

/// Measured vectors of a field in px and frames.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Motion {
    /// Largest displacement along either axis, px: that of all but one vector in two hundred.
    pub largest: f64,
    /// Largest difference of displacement per px of distance in any direction, of all but one
    /// vector in a hundred.
    pub gradient: f64,
    /// Share of the vectors not masked that are measured.
    pub measured: f64,
}

impl Motion {
    pub fn of(field: &VectorField) -> Result<Motion, FieldError> {
        let gradient = field.gradient(Scheme::LeastSquares)?;
        let (mut far, mut steep) = (Vec::new(), Vec::new());
        let mut nodes = 0.0;
        for (at, status) in field.status.indexed_iter() {
            nodes += f64::from(u8::from(*status != Status::Masked));
            if *status != Status::Measured {
                continue;
            }
            far.push(field.u[at].abs().max(field.v[at].abs()));
            let (a, b) = (gradient.ux[at], gradient.uy[at]);
            let (c, d) = (gradient.vx[at], gradient.vy[at]);
            let square = a * a + b * b + c * c + d * d;
            let product = a * d - b * c;
            let root = (square * square - 4.0 * product * product).max(0.0).sqrt();
            // The larger singular value.
            let stretch = (0.5 * (square + root)).sqrt();
            if stretch.is_finite() {
                steep.push(stretch);
            }
        }
        let measured = far.len() as f64 / f64::max(nodes, 1.0);
        Ok(Motion {
            largest: all_but(&mut far, 0.005),
            gradient: all_but(&mut steep, 0.01),
            measured,
        })
    }

    /// The more of both in everything, and the mean share.
    pub fn with(motions: &[Motion]) -> Option<Motion> {
        let count = motions.len() as f64;
        let most = |read: fn(&Motion) -> f64| motions.iter().map(read).fold(0.0, f64::max);
        (count > 0.0).then(|| Motion {
            largest: most(|m| m.largest),
            gradient: most(|m| m.gradient),
            measured: motions.iter().map(|m| m.measured).sum::<f64>() / count,
        })
    }
}

/// The value that all but a share of them stay below; 0 without any.
fn all_but(values: &mut [f64], share: f64) -> f64 {
    values.sort_by(f64::total_cmp);
    let place = (values.len() as f64 * (1.0 - share)) as usize;
    values
        .get(place.min(values.len().saturating_sub(1)))
        .copied()
        .unwrap_or(0.0)
}
