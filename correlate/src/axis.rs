//! Which transform serves one side of a window.

use super::factors::Factors;
use super::lengths::{
    Length8, Length16, Length24, Length32, Length48, Length64, Length96, Length128, Length256,
};

/// The transform along one side of the windows.
#[allow(
    clippy::large_enum_variant,
    reason = "a plan has two of them; a box would hide the fixed sizes from the compiler"
)]
#[derive(Clone, Debug)]
pub(super) enum Axis {
    Of8(Length8),
    Of16(Length16),
    Of24(Length24),
    Of32(Length32),
    Of48(Length48),
    Of64(Length64),
    Of96(Length96),
    Of128(Length128),
    Of256(Length256),
    Any(Factors),
}

impl Axis {
    /// The fastest transform of `length` samples; `None` below 2 or with a prime factor above 5.
    pub(super) fn new(length: usize) -> Option<Axis> {
        Some(match length {
            8 => Axis::Of8(Length8),
            16 => Axis::Of16(Length16::new()),
            24 => Axis::Of24(Length24::new()),
            32 => Axis::Of32(Length32::new()),
            48 => Axis::Of48(Length48::new()),
            64 => Axis::Of64(Length64::new()),
            96 => Axis::Of96(Length96::new()),
            128 => Axis::Of128(Length128::new()),
            256 => Axis::Of256(Length256::new()),
            _ => Axis::Any(Factors::new(length)?),
        })
    }
}

/// Runs `$call` with `$transform` bound to the transform inside an [`Axis`].
macro_rules! along {
    ($axis:expr, $transform:ident => $call:expr) => {
        match $axis {
            Axis::Of8($transform) => $call,
            Axis::Of16($transform) => $call,
            Axis::Of24($transform) => $call,
            Axis::Of32($transform) => $call,
            Axis::Of48($transform) => $call,
            Axis::Of64($transform) => $call,
            Axis::Of96($transform) => $call,
            Axis::Of128($transform) => $call,
            Axis::Of256($transform) => $call,
            Axis::Any($transform) => $call,
        }
    };
}
pub(super) use along;
