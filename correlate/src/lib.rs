//! Correlation planes of many windows side by side: the heart of the interrogation's speed.
//!
//! [`LANES`] window pairs are transformed together, one in each lane of the vector registers, so
//! that all arithmetic is on whole vectors and nothing is shuffled. Every lane goes through the same
//! operations in the same order whatever the others hold, and no product is fused with a sum: a
//! window's plane is the same to the last bit in any lane, beside any neighbours, on any number of
//! threads and with any set of vector instructions. Those are chosen when the program runs.
//!
//! | file | what it holds |
//! | --- | --- |
//! | `windows.rs` | window pixels side by side: by regrouping an image, or gathered |
//! | `moments.rs` | mean and energy of each window |
//! | `butterfly.rs`, `lanes.rs` | one-dimensional transforms over lanes |
//! | `lengths.rs`, `factors.rs`, `axis.rs` | the usual lengths, all others, the choice between them |
//! | `spectrum.rs` | the three sweeps from window pairs to planes |
//! | `planes.rs` | room for the planes of a batch |
//! | `peaks.rs` | where the planes are highest |
//! | `direct.rs` | the slow, obvious reference |
//!
//! What does not live here: where windows lie, what is done to images before, sub-pixel fits.
//!
//! Planes are circular sums R(m, n) = sum of first(i, j) second(i + m, j + n), not divided by
//! anything: [`Moments::normalization`] makes them coefficients. m counts image rows, **downwards**.
//!
//! Two shortcuts were weighed for the last passes, where only offsets of a few px matter. A direct
//! sum over 9 x 9 offsets of a 32 x 32 window is 166 thousand operations against 59 thousand for all
//! three sweeps, and an inverse transform of 9 outputs by sums costs more than one of 32 by
//! butterflies. What pays is leaving out rows of the plane: the `reach` of
//! [`Correlator::correlate`].

#![allow(
    clippy::needless_range_loop,
    reason = "loops over lanes index several arrays of fixed size: the form that vectorises whole"
)]

mod axis;
mod butterfly;
mod direct;
mod factors;
mod lanes;
mod lengths;
mod moments;
mod peaks;
mod planes;
mod spectrum;
#[cfg(test)]
mod tests;
mod windows;

pub use direct::{centred, correlate_directly};
pub use lanes::{LANES, Lanes};

pub use moments::Moments;
pub use peaks::{Peak, Peaks, Search};
pub use planes::Planes;
pub use spectrum::lanes_at;

pub use windows::{
    Layout, Polyphase, PolyphaseRow, WindowColumns, Windows, copy_weighted, deinterleave, gather,
    interleave,
};

use axis::{Axis, along};
use lanes::Phasor;

/// Why a window size or its weights cannot be used.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum TransformError {
    /// A side is too short or has a prime factor above 5.
    #[error(
        "a window side of {length} px cannot be transformed: it must be at least 2 and have no \
         prime factor but 2, 3 and 5 (the nearest such: {below} and {above})"
    )]
    Length {
        /// The side asked for, px.
        length: usize,
        /// The largest possible side below it, px.
        below: usize,
        /// The smallest possible side above it, px.
        above: usize,
    },
    /// The weights are not one for each pixel.
    #[error("{given} window weights for a window of {needed} px")]
    Weights {
        /// Weights given.
        given: usize,
        /// Pixels in the window.
        needed: usize,
    },
}

/// The plan for windows of one size. Immutable: make it once a pass and share it among threads.
#[derive(Clone, Debug)]
pub struct Correlator {
    height: usize,
    width: usize,
    rows: Axis,
    columns: Axis,
    weights: Vec<f32>,
}

/// What a thread needs to correlate; made once by [`Correlator::scratch`], reused for every batch.
#[derive(Clone, Debug)]
pub struct Scratch {
    spectrum: Vec<Phasor>,
    work: Vec<Phasor>,
    maxima: Vec<Lanes>,
}

impl Correlator {
    /// A plan for windows of `height` x `width` px. 8, 16, 24, 32, 48, 64, 96, 128 and 256 are fast
    /// in either direction; all other products of 2, 3 and 5 take about twice as long.
    ///
    /// # Errors
    /// [`TransformError::Length`] for a side below 2 or with another prime factor.
    ///
    /// ```
    /// use kolk_correlate::Correlator;
    /// assert!(Correlator::new(32, 48).is_ok());
    /// assert!(Correlator::new(32, 34).is_err());
    /// ```
    pub fn new(height: usize, width: usize) -> Result<Correlator, TransformError> {
        Ok(Correlator {
            height,
            width,
            rows: axis(width)?,
            columns: axis(height)?,
            weights: Vec::new(),
        })
    }

    /// The same plan with window weights, [row * width + column], not negative: windows are
    /// multiplied by them after removal of their weighted mean.
    ///
    /// # Errors
    /// [`TransformError::Weights`] unless there is one weight for each pixel of the window.
    pub fn weighted(mut self, weights: Vec<f32>) -> Result<Correlator, TransformError> {
        let needed = self.height * self.width;
        if weights.len() != needed {
            let given = weights.len();
            return Err(TransformError::Weights { given, needed });
        }
        self.weights = weights;
        Ok(self)
    }

    /// Rows of a window, px.
    pub fn height(&self) -> usize {
        self.height
    }

    /// Columns of a window, px.
    pub fn width(&self) -> usize {
        self.width
    }

    /// Values in the planes of a batch: height x width x [`LANES`].
    pub fn planes_length(&self) -> usize {
        self.height * self.width * LANES
    }

    /// Working space for one thread.
    pub fn scratch(&self) -> Scratch {
        let spectrum = self.height * spectrum::stride(self.width);
        let work = spectrum::work_length(self.height, self.width);
        Scratch {
            spectrum: vec![Phasor::ZERO; spectrum],
            work: vec![Phasor::ZERO; work],
            maxima: vec![[0.0; LANES]; self.height],
        }
    }

    /// Room for the planes of a batch; a slice of [`Self::planes_length`] numbers.
    pub fn planes(&self) -> Planes {
        Planes::new(self.planes_length())
    }

    /// Correlates a batch of window pairs.
    ///
    /// The planes come lane-interleaved in circular order: offset (m, n) of window `lane` at
    /// `planes[(m * width + n) * LANES + lane]`, negative offsets counted from the end. Only rows
    /// with |m| <= `reach` are sure to be written (`usize::MAX` for all): the others may hold
    /// what they held. What `scratch` and `planes` held before does not matter.
    ///
    /// # Panics
    /// If windows reach beyond their images, `planes` is shorter than [`Self::planes_length`], or
    /// `scratch` was made for another size of window.
    pub fn correlate(
        &self,
        windows: &Windows,
        reach: usize,
        planes: &mut [f32],
        scratch: &mut Scratch,
    ) -> Moments {
        let (height, width) = (self.height, self.width);
        let Scratch { spectrum, work, .. } = scratch;
        let means = moments::means(windows, (height, width), &self.weights);
        let energy = along!(&self.rows, transform => spectrum::forward_rows(
            transform, height, windows, &self.weights, &means, spectrum, work
        ));
        along!(&self.columns, transform => spectrum::columns(transform, width, spectrum, work));
        along!(&self.rows, transform => spectrum::inverse_rows(
            transform, height, reach, spectrum, work, planes
        ));
        Moments::new(&means, &energy, height * width)
    }

    /// The highest peak of each plane and the highest beside it, within the search rectangle.
    /// `planes` are those of [`Self::correlate`], with a reach of no less than the search's.
    pub fn peaks(&self, planes: &[f32], search: &Search, scratch: &mut Scratch) -> Peaks {
        let shape = (self.height, self.width);
        peaks::search(planes, shape, search, &mut scratch.maxima)
    }

    /// The N x N values around `peak` in the plane of one lane, rows from the top; N odd. The plane is
    /// circular, so there is no edge.
    pub fn neighbourhood<const N: usize>(
        &self,
        planes: &[f32],
        lane: usize,
        peak: &Peak,
    ) -> [[f32; N]; N] {
        peaks::neighbourhood(planes, (self.height, self.width), lane, peak)
    }
}

/// The transform along a side, or an error that names the nearest sides there are.
fn axis(length: usize) -> Result<Axis, TransformError> {
    Axis::new(length).ok_or_else(|| TransformError::Length {
        length,
        below: (2..length)
            .rev()
            .find(|&n| Axis::new(n).is_some())
            .unwrap_or(2),
        above: (length.max(2)..)
            .find(|&n| Axis::new(n).is_some())
            .unwrap_or(2),
    })
}
