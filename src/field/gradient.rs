//! Under construction.
/// Velocity-gradient field.
#[derive(Clone, Debug)]
pub struct Gradient;
/// Difference scheme.
#[derive(Clone, Copy, Debug)]
pub enum Scheme {
    /// Central differences.
    Central,
    /// Least squares.
    LeastSquares,
}
