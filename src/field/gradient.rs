//! The velocity-gradient field and what follows from it at each node.

use ndarray::{Array2, Zip};

use super::derivative::{Axis, derivative};
use super::{FieldError, Grid, ScalarField, Scheme, Trace, VectorField};
use crate::quantity::Unit;

/// The four first derivatives of a velocity field, each of shape (ny, nx), in 1 / `time`.
///
/// NaN where the field has no vector; see [`Scheme`] for what happens beside such cells and at
/// the edge.
#[derive(Clone, Debug)]
pub struct Gradient {
    /// Where the derivatives are.
    pub grid: Grid,
    /// Unit of time: frame or s.
    pub time: Unit,
    /// du/dx.
    pub ux: Array2<f64>,
    /// du/dy.
    pub uy: Array2<f64>,
    /// dv/dx.
    pub vx: Array2<f64>,
    /// dv/dy.
    pub vy: Array2<f64>,
    /// The scheme that made them.
    pub scheme: Scheme,
}

impl VectorField {
    /// The velocity gradient by the given scheme.
    ///
    /// # Errors
    /// [`FieldError::TooSmall`] on a grid of fewer than 2 x 2 nodes.
    pub fn gradient(&self, scheme: Scheme) -> Result<Gradient, FieldError> {
        let grid = self.grid;
        if grid.nx < 2 || grid.ny < 2 {
            return Err(FieldError::TooSmall {
                what: "a gradient",
                least: 2,
                nx: grid.nx,
                ny: grid.ny,
            });
        }
        Ok(Gradient {
            grid,
            time: self.time,
            ux: derivative(&self.u, Axis::X, grid.dx, scheme),
            uy: derivative(&self.u, Axis::Y, grid.dy, scheme),
            vx: derivative(&self.v, Axis::X, grid.dx, scheme),
            vy: derivative(&self.v, Axis::Y, grid.dy, scheme),
            scheme,
        })
    }
}

impl Gradient {
    /// Unit of the derivatives: 1 / `time`.
    pub fn unit(&self) -> Unit {
        Unit::ONE.per(self.time)
    }

    /// `formula(ux, uy, vx, vy)` at every node.
    fn each(
        &self,
        name: &str,
        unit: Unit,
        formula: impl Fn(f64, f64, f64, f64) -> f64,
    ) -> ScalarField {
        let values = Zip::from(&self.ux)
            .and(&self.uy)
            .and(&self.vx)
            .and(&self.vy)
            .map_collect(|&ux, &uy, &vx, &vy| formula(ux, uy, vx, vy));
        ScalarField {
            grid: self.grid,
            values,
            unit,
            name: name.to_owned(),
        }
    }

    /// Vorticity v_x - u_y, positive counter-clockwise.
    pub fn vorticity(&self) -> ScalarField {
        self.each("vorticity", self.unit(), |_, uy, vx, _| vx - uy)
    }

    /// Divergence u_x + v_y in the plane: zero in two-dimensional flow of constant density, so
    /// what is left is noise or motion through the sheet.
    pub fn divergence(&self) -> ScalarField {
        self.each("divergence", self.unit(), |ux, _, _, vy| ux + vy)
    }

    /// Rate of strain along x, s_xx = u_x.
    pub fn strain_xx(&self) -> ScalarField {
        self.each("strain xx", self.unit(), |ux, _, _, _| ux)
    }

    /// Rate of strain along y, s_yy = v_y.
    pub fn strain_yy(&self) -> ScalarField {
        self.each("strain yy", self.unit(), |_, _, _, vy| vy)
    }

    /// Rate of shear strain s_xy = (u_y + v_x) / 2.
    pub fn strain_xy(&self) -> ScalarField {
        self.each("strain xy", self.unit(), |_, uy, vx, _| (uy + vx) / 2.0)
    }

    /// Magnitude of the rate of strain, sqrt(2 s_ij s_ij) = sqrt(2 u_x² + 2 v_y² + (u_y + v_x)²):
    /// the shear rate in plain shear, zero in solid rotation.
    pub fn strain(&self) -> ScalarField {
        self.each("strain", self.unit(), |ux, uy, vx, vy| {
            (2.0 * (ux * ux + vy * vy) + (uy + vx).powi(2)).sqrt()
        })
    }

    /// Swirling strength: the imaginary part of the complex eigenvalues of the gradient, zero
    /// where they are real (Zhou, Adrian, Balachandar & Kendall 1999), with the sign of the
    /// vorticity (Wu & Christensen 2006). Half the vorticity in solid rotation.
    pub fn swirl(&self) -> ScalarField {
        self.each("swirling strength", self.unit(), swirling_strength)
    }

    /// Swirling strength along a straight line, from the gradient read there: between nodes it
    /// keeps its sign and its zeros, which values read from [`Gradient::swirl`] itself do not,
    /// since that has kinks.
    ///
    /// # Errors
    /// [`FieldError::Outside`] when an end is outside the field.
    pub fn swirl_along(
        &self,
        from: (f64, f64),
        to: (f64, f64),
        points: usize,
    ) -> Result<Trace, FieldError> {
        let read = |values: &Array2<f64>| {
            let part = ScalarField {
                grid: self.grid,
                values: values.clone(),
                unit: self.unit(),
                name: "swirling strength".to_owned(),
            };
            part.along(from, to, points)
        };
        let [mut line, uy, vx, vy] = [
            read(&self.ux)?,
            read(&self.uy)?,
            read(&self.vx)?,
            read(&self.vy)?,
        ];
        for (k, value) in line.values.iter_mut().enumerate() {
            *value = swirling_strength(*value, uy.values[k], vx.values[k], vy.values[k]);
        }
        Ok(line)
    }

    /// Q = (|rotation|² - |strain|²) / 2 = -(u_x² + v_y²) / 2 - u_y v_x: above zero where
    /// rotation outweighs strain (Hunt, Wray & Moin 1988, in the plane).
    pub fn q(&self) -> ScalarField {
        self.each("q", self.unit().power(2), |ux, uy, vx, vy| {
            -(ux * ux + vy * vy) / 2.0 - uy * vx
        })
    }
}

/// Imaginary part of the eigenvalues of one gradient, signed by its vorticity.
fn swirling_strength(ux: f64, uy: f64, vx: f64, vy: f64) -> f64 {
    let determinant = ux * vy - uy * vx;
    let trace = ux + vy;
    let squared = determinant - trace * trace / 4.0;
    // The comparison is false for NaN, which must not turn into zero.
    if squared <= 0.0 {
        0.0
    } else {
        squared.sqrt().copysign(vx - uy)
    }
}
