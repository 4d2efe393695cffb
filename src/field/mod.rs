//! Fields on a regular grid: vectors, scalars, gradients, and reading them between the nodes.
//!
//! Arrays have shape (ny, nx); row 0 is the lowest row, so that index (j, i) sits at
//! x = x0 + i dx, y = y0 + j dy. A cell without a value holds NaN. Nothing here knows where a
//! field came from, and nothing here finds eddies.

mod arithmetic;
mod derivative;
mod gradient;
mod grid;
mod sample;
mod scalar;
mod scheme;
mod vector;

pub use arithmetic::Operand;
pub use gradient::Gradient;
pub use grid::{FieldError, Grid};
pub use sample::Trace;
pub(crate) use sample::{Place, on_lattice};
pub use scalar::ScalarField;
pub use scheme::Scheme;
pub use vector::{ErrorCorrelation, Status, VectorField};

#[cfg(test)]
mod gradient_tests;
