//! One-dimensional transforms of many windows side by side.
//!
//! Every sample is a vector over [`LANES`] windows, so each butterfly is plain arithmetic on whole
//! vectors: nothing is ever shuffled between lanes, and no lane can feel its neighbours.
//! Self-sorting mixed-radix decomposition (Cooley & Tukey 1965; the Stockham ordering is common
//! practice): at each step sample q + s (p + m k) of k = 0..R goes through one butterfly of R
//! points, is turned by exp(-2 pi i p k / (R m)), and lands at q + s (R p + k).
//!
//! The loop over lanes is the inner one, over local arrays of fixed size: that is the form the
//! compiler turns into vector registers whole. Everything is `inline(always)` so that it is
//! compiled anew inside each run-time-dispatched caller.

use super::butterfly::{Butterfly, Sample, product};

/// Windows transformed together.
pub const LANES: usize = 16;

/// One real sample of every lane.
pub type Lanes = [f32; LANES];

/// One complex sample of every lane.
#[derive(Clone, Copy, Debug)]
#[repr(C, align(64))]
pub(super) struct Phasor {
    pub(super) re: Lanes,
    pub(super) im: Lanes,
}

impl Phasor {
    pub(super) const ZERO: Phasor = Phasor {
        re: [0.0; LANES],
        im: [0.0; LANES],
    };
}

/// Where the samples of a transform come from: one or two stored samples and a factor, combined
/// lane by lane in the registers of the first step.
pub(super) trait Source {
    /// Reads what sample `index` is made from.
    fn fetch(&self, index: usize) -> Phasor;
    /// Reads the other part of what sample `index` is made from.
    #[inline(always)]
    fn partner(&self, _index: usize) -> Phasor {
        Phasor::ZERO
    }
    /// Reads the factor of sample `index`.
    #[inline(always)]
    fn factor(&self, _index: usize) -> f32 {
        0.0
    }
    /// The sample in one lane; called once for every sample and lane.
    #[inline(always)]
    fn lane(&mut self, here: Sample, _partner: Sample, _factor: f32, _lane: usize) -> Sample {
        here
    }
}

/// Samples as they stand in a buffer.
pub(super) struct Buffer<'a>(pub(super) &'a [Phasor]);

impl Source for Buffer<'_> {
    #[inline(always)]
    fn fetch(&self, index: usize) -> Phasor {
        self.0[index]
    }
}

/// Where the transformed samples go.
pub(super) trait Sink {
    /// Takes sample `index`.
    fn put(&mut self, index: usize, value: &Phasor);
}

/// Samples in order into a buffer.
pub(super) struct Whole<'a>(pub(super) &'a mut [Phasor]);

impl Sink for Whole<'_> {
    #[inline(always)]
    fn put(&mut self, index: usize, value: &Phasor) {
        self.0[index] = *value;
    }
}

/// A transform of one length along one axis, all lanes at once.
pub(super) trait Transform {
    /// Samples in a transform.
    fn length(&self) -> usize;

    /// X_k = sum_j x_j exp(-2 pi i j k / length) from `source` into `sink`, in every lane.
    /// `work` holds at least twice the length; what it held before does not matter.
    fn apply<S: Source, T: Sink>(&self, source: &mut S, work: &mut [Phasor], sink: &mut T);
}

/// One step: `groups` (m) times `stride` (s) butterflies of R points, their outputs turned by
/// `turns[p][k]` unless it is the last step, where every factor is 1.
#[inline(always)]
pub(super) fn step<const R: usize, const TURNED: bool, B: Butterfly<R>, S: Source, T: Sink>(
    groups: usize,
    stride: usize,
    turns: &[[Sample; R]],
    source: &mut S,
    sink: &mut T,
) {
    let unturned = [(1.0, 0.0); R];
    group::<R, false, B, S, T>(0, groups, stride, &unturned, source, sink);
    if TURNED {
        for p in 1..groups {
            group::<R, true, B, S, T>(p, groups, stride, &turns[p], source, sink);
        }
    }
}

/// The butterflies of group `p` of a step.
#[inline(always)]
fn group<const R: usize, const TURNED: bool, B: Butterfly<R>, S: Source, T: Sink>(
    p: usize,
    groups: usize,
    stride: usize,
    turn: &[Sample; R],
    source: &mut S,
    sink: &mut T,
) {
    for q in 0..stride {
        let mut x = [Phasor::ZERO; R];
        let mut partner = [Phasor::ZERO; R];
        let mut factor = [0.0; R];
        for k in 0..R {
            let index = q + stride * (p + groups * k);
            x[k] = source.fetch(index);
            partner[k] = source.partner(index);
            factor[k] = source.factor(index);
        }
        let mut y = [Phasor::ZERO; R];
        for l in 0..LANES {
            let mut z = [(0.0, 0.0); R];
            for k in 0..R {
                let here = (x[k].re[l], x[k].im[l]);
                let other = (partner[k].re[l], partner[k].im[l]);
                z[k] = source.lane(here, other, factor[k], l);
            }
            z = B::apply(z);
            (y[0].re[l], y[0].im[l]) = z[0];
            for k in 1..R {
                let turned = if TURNED { product(z[k], turn[k]) } else { z[k] };
                (y[k].re[l], y[k].im[l]) = turned;
            }
        }
        for k in 0..R {
            sink.put(q + stride * (R * p + k), &y[k]);
        }
    }
}

/// exp(-2 pi i p k / (groups R)) by group p and output k.
pub(super) fn turns<const R: usize>(groups: usize) -> Vec<[Sample; R]> {
    let whole = (groups * R) as f64;
    (0..groups)
        .map(|p| {
            std::array::from_fn(|k| {
                let angle = -std::f64::consts::TAU * (p * k) as f64 / whole;
                (libm::cos(angle) as f32, libm::sin(angle) as f32)
            })
        })
        .collect()
}
