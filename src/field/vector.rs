//! A vector field and what is known of each of its vectors.

use std::sync::Arc;

use ndarray::{Array2, Zip};

use super::{Grid, ScalarField};
use crate::quantity::Unit;

/// What a vector is worth.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Status {
    /// Found by correlation and accepted.
    Measured,
    /// Rejected by validation and filled in from its neighbours: not data.
    Replaced,
    /// Hidden by a mask, or absent from the file: no vector.
    Masked,
    /// The window, moved with the flow, leaves the image, or not one vector of the field could be
    /// measured that it might be filled in from: no vector.
    Outside,
}

impl Status {
    /// The word used in tables and files.
    pub fn text(self) -> &'static str {
        match self {
            Status::Measured => "measured",
            Status::Replaced => "replaced",
            Status::Masked => "masked",
            Status::Outside => "outside",
        }
    }

    /// Reads what [`Status::text`] writes.
    pub fn parse(text: &str) -> Option<Status> {
        [
            Status::Measured,
            Status::Replaced,
            Status::Masked,
            Status::Outside,
        ]
        .into_iter()
        .find(|s| s.text() == text)
    }

    /// True where there is a vector at all.
    pub fn has_vector(self) -> bool {
        matches!(self, Status::Measured | Status::Replaced)
    }
}

/// How the errors of vectors near each other go together: windows that overlap share pixels, and
/// with them noise.
#[derive(Clone, Debug, PartialEq)]
pub struct ErrorCorrelation {
    values: Array2<f64>,
}

impl ErrorCorrelation {
    /// From the correlation at (rows, columns) apart, that at (0, 0) being 1. Further apart than
    /// `values` goes, errors are independent.
    pub fn new(values: Array2<f64>) -> Self {
        Self { values }
    }

    /// The correlations at (rows, columns) apart, as far as errors go together.
    pub fn values(&self) -> &Array2<f64> {
        &self.values
    }

    /// Correlation, -1 to 1, of the errors of one component of two vectors that many rows and
    /// columns apart.
    pub fn at(&self, rows: isize, columns: isize) -> f64 {
        let at = (rows.unsigned_abs(), columns.unsigned_abs());
        self.values.get(at).copied().unwrap_or(0.0)
    }
}

/// Velocities on a regular grid, in `grid.length` per `time`.
///
/// Invariant: `u` and `v` are finite exactly where [`Status::has_vector`] holds, NaN elsewhere.
#[derive(Clone, Debug)]
pub struct VectorField {
    /// Where the vectors are.
    pub grid: Grid,
    /// Unit of time: frame or s.
    pub time: Unit,
    /// Velocity along x (right).
    pub u: Array2<f64>,
    /// Velocity along y (up).
    pub v: Array2<f64>,
    /// What each vector is worth.
    pub status: Array2<Status>,
    /// Standard uncertainty of `u` and of `v`, where it is known.
    pub unc: Option<(Array2<f64>, Array2<f64>)>,
    /// Correlation of the errors of neighbours, where it is known.
    pub error_correlation: Option<Arc<ErrorCorrelation>>,
    /// Side of the window each vector is a mean over, in grid lengths, where it is known.
    pub window: Option<(f64, f64)>,
    /// What the field is of: a file, a pair, a flow.
    pub label: String,
}

impl VectorField {
    /// A field with no doubt said and every finite vector taken as measured, the others masked.
    ///
    /// `u` and `v` have the grid's shape (ny, nx) or this panics.
    pub fn new(grid: Grid, time: Unit, u: Array2<f64>, v: Array2<f64>, label: &str) -> Self {
        assert_eq!(u.dim(), grid.shape(), "u has the grid's shape");
        assert_eq!(v.dim(), grid.shape(), "v has the grid's shape");
        let (mut u, mut v) = (u, v);
        let status = Zip::from(&mut u).and(&mut v).map_collect(|u, v| {
            if u.is_finite() && v.is_finite() {
                Status::Measured
            } else {
                (*u, *v) = (f64::NAN, f64::NAN);
                Status::Masked
            }
        });
        Self {
            grid,
            time,
            u,
            v,
            status,
            unc: None,
            error_correlation: None,
            window: None,
            label: label.to_owned(),
        }
    }

    /// Unit of the velocities.
    pub fn unit(&self) -> Unit {
        self.grid.length.per(self.time)
    }

    fn scalar(&self, values: Array2<f64>, name: &str) -> ScalarField {
        ScalarField {
            grid: self.grid,
            values,
            unit: self.unit(),
            name: name.to_owned(),
        }
    }

    /// Velocity along x as a scalar field.
    pub fn u(&self) -> ScalarField {
        self.scalar(self.u.clone(), "u")
    }

    /// Velocity along y as a scalar field.
    pub fn v(&self) -> ScalarField {
        self.scalar(self.v.clone(), "v")
    }

    /// Magnitude of the velocity.
    pub fn speed(&self) -> ScalarField {
        let values = Zip::from(&self.u)
            .and(&self.v)
            .map_collect(|u, v| u.hypot(*v));
        self.scalar(values, "speed")
    }

    /// How many vectors have this status.
    pub fn count(&self, status: Status) -> usize {
        self.status.iter().filter(|s| **s == status).count()
    }
}
