//! Lengths and points as scripts give them: plain numbers in the field's own unit, or measured
//! values that bring theirs.

use rhai::Dynamic;

use super::super::argument::{Argument, NumberOr, Shape};
use super::super::call::Call;
use super::super::fault::Fault;
use crate::quantity::{Measured, Unit};

/// One coordinate or length.
#[derive(Clone, Debug)]
pub(super) struct Length(NumberOr<Measured>);

/// A point `[x, y]`.
#[derive(Clone, Debug)]
pub(super) struct Point(Length, Length);

impl Length {
    /// The number in `unit`.
    pub(super) fn within(&self, unit: Unit) -> Result<f64, Fault> {
        match &self.0 {
            NumberOr::Number(x) => Ok(*x),
            NumberOr::Other(m) => Ok(m.to(unit)?.value()),
        }
    }
}

impl Point {
    /// Both numbers in `unit`.
    pub(super) fn within(&self, unit: Unit) -> Result<(f64, f64), Fault> {
        Ok((self.0.within(unit)?, self.1.within(unit)?))
    }
}

impl Argument for Length {
    fn shape() -> Shape {
        NumberOr::<Measured>::shape()
    }

    fn take(given: Option<&mut Dynamic>, call: &Call) -> Result<Self, Fault> {
        NumberOr::take(given, call).map(Length)
    }
}

impl Argument for Point {
    fn shape() -> Shape {
        Shape::of("point [x, y] of numbers or measured values")
    }

    fn take(given: Option<&mut Dynamic>, call: &Call) -> Result<Self, Fault> {
        let wrong = || Fault::new("takes a point [x, y] of numbers or measured values");
        let list = given.map(|value| value.clone().into_array());
        let Some(Ok(mut list)) = list else {
            return Err(wrong());
        };
        match list.as_mut_slice() {
            [x, y] => {
                let length = |value| Length::take(Some(value), call).map_err(|_| wrong());
                Ok(Point(length(x)?, length(y)?))
            }
            _ => Err(wrong()),
        }
    }
}
