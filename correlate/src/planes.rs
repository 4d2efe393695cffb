//! Room for the planes of a batch.

use std::ops::{Deref, DerefMut};

use super::lanes::LANES;

/// Planes of a batch, lane-interleaved: [(row * width + column) * LANES + lane].
///
/// A plain slice of numbers, but one that starts at the boundary of a cache line: stores of
/// whole vectors that straddle two lines would cost a twentieth of the kernel's time.
#[derive(Debug)]
pub struct Planes {
    storage: Vec<f32>,
    start: usize,
    length: usize,
}

impl Planes {
    /// Zeros for `length` values.
    pub(super) fn new(length: usize) -> Planes {
        let storage = vec![0.0; length + LANES];
        let line = size_of::<f32>() * LANES;
        // Only speed hangs on the alignment, so a refusal to tell it is no error.
        let start = storage.as_ptr().align_offset(line).min(LANES);
        Planes {
            storage,
            start,
            length,
        }
    }
}

impl Deref for Planes {
    type Target = [f32];
    fn deref(&self) -> &[f32] {
        &self.storage[self.start..self.start + self.length]
    }
}

impl DerefMut for Planes {
    fn deref_mut(&mut self) -> &mut [f32] {
        &mut self.storage[self.start..self.start + self.length]
    }
}
