//! Units and measured values: what every number of the project carries.
//!
//! [`Unit`] is a product of powers of the few symbols the trade uses (px, mm, s, frame, …).
//! [`Measured`] is a number with its unit and its standard uncertainty, known, unknown or zero;
//! uncertainty propagates to first order and values that share a source stay correlated
//! (JCGM 100:2008, 5.1 and 5.2). No statistics live here.

mod measured;
mod unit;

pub(crate) use measured::plain_number;
pub use measured::{Measured, UnitMismatch};
pub use unit::{Symbol, Unit};
