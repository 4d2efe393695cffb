//! Whether a correlation peak could be chance.
//!
//! Windows that hold no common pattern have planes all the same, and those have a highest place.
//! How far a peak stands out of its plane, in units of the plane's own scatter, and how far above
//! the next peak, tells one from the other; so does what windows beside it say that share no pixel
//! with it. Where particles are few even the best chance peak stands out, so that a peak alone is
//! trusted only among windows that agree.

use ndarray::Array2;

use super::layout::Layout;
use super::pass::Finding;
use super::peak::Patch;
use super::predictor::Shifts;
use super::validate::along_lines;
use multiversion::multiversion;

use super::transform::{LANES, Lanes, lanes_at};

/// Sums over the searched part of the planes of a batch.
pub(crate) struct Background {
    sum: Lanes,
    squares: Lanes,
    samples: usize,
}

impl Background {
    /// Over the samples up to `reach` (columns, rows) from the middle of planes of `size`
    /// (columns, rows).
    pub fn of(planes: &[f32], size: (usize, usize), reach: (usize, usize)) -> Self {
        sums(planes, size, reach)
    }

    /// Mean, and scatter about it, of the plane in one lane without the samples of `peak`.
    pub fn without(&self, lane: usize, peak: &Patch) -> (f64, f64) {
        let scatter = Scatter {
            sum: f64::from(self.sum[lane]),
            squares: f64::from(self.squares[lane]),
            samples: self.samples,
        };
        scatter.without(peak)
    }
}

/// Sums over the searched part of one plane.
pub(crate) struct Scatter {
    sum: f64,
    squares: f64,
    samples: usize,
}

impl Scatter {
    /// Over these samples.
    pub fn of(samples: impl Iterator<Item = f32>) -> Self {
        let none = Self {
            sum: 0.0,
            squares: 0.0,
            samples: 0,
        };
        samples.map(f64::from).fold(none, |s, r| Self {
            sum: s.sum + r,
            squares: s.squares + r * r,
            samples: s.samples + 1,
        })
    }

    /// Mean, and scatter about it, without the samples of `peak`.
    pub fn without(&self, peak: &Patch) -> (f64, f64) {
        let taken = || peak.as_flattened().iter().map(|r| f64::from(*r));
        let n = (self.samples as f64 - 25.0).max(1.0);
        let mean = (self.sum - taken().sum::<f64>()) / n;
        let square = (self.squares - taken().map(|r| r * r).sum::<f64>()) / n;
        (mean, (square - mean * mean).max(0.0).sqrt())
    }
}

#[multiversion(targets("x86_64+avx512f+avx512dq+avx512vl+fma", "x86_64+avx2+fma"))]
fn sums(planes: &[f32], (width, height): (usize, usize), reach: (usize, usize)) -> Background {
    let (mut sum, mut squares) = ([0f32; LANES], [0f32; LANES]);
    let mut samples = 0;
    for down in (0..=reach.1).chain(height - reach.1..height) {
        for part in [0..reach.0 + 1, width - reach.0..width] {
            for column in part {
                let r = lanes_at(planes, (down * width + column) * LANES);
                for l in 0..LANES {
                    sum[l] += r[l];
                    squares[l] += r[l] * r[l];
                }
                samples += 1;
            }
        }
    }
    Background {
        sum,
        squares,
        samples,
    }
}

/// Peaks taken for real without the word of their neighbours: 2 % of the windows of 32 px in
/// unrelated images of 0.06 particles a px² reach this, and all in related ones.
const PROMINENT: (f32, f32) = (6.0, 1.3);

/// Peaks that need no agreement when nearly all about them are as clear: a flow that turns within a
/// window or two leads no line to expect anything.
const CLEAR: (f32, f32) = (8.0, 2.0);

/// Prominence that one line of neighbours in agreement makes up for.
const FAIR: f32 = 5.0;

/// Correlation coefficient that counts as prominent: a texture coarser than particle images has
/// peaks so broad that nothing in the plane is away from them.
const HIGH: f32 = 0.7;

/// What the windows that share no pixel with one say of it.
#[derive(Clone, Copy, PartialEq)]
enum Support {
    /// There are too few to say anything.
    Silent,
    Given,
    Refused,
}

/// Which of the windows that are `good` so far hold a peak that is no chance.
///
/// A window is supported when two of the four lines through it, over windows that share no pixel
/// with it, lead to expect its shift to within 1/32 of the window, or one does and its peak is
/// fairly prominent. One that is not supported stays if its peak is prominent by itself and at
/// least half of the up to eight independent windows about it that have anything to say for
/// themselves are supported.
pub(crate) fn significant(
    shifts: &Shifts,
    findings: &Array2<Finding>,
    good: &Array2<bool>,
    layout: &Layout,
) -> Array2<bool> {
    let window = layout.window;
    let stride = (
        window.height.div_ceil(layout.step_y),
        window.width.div_ceil(layout.step_x),
    );
    let tolerance = window.width.min(window.height) as f64 / 32.0;
    let support = Array2::from_shape_fn(good.dim(), |at| {
        if !good[at] {
            return Support::Refused;
        }
        let (lines, n) = along_lines(shifts, good, at, stride);
        let off = |line: &(f64, f64)| (line.0 - shifts.x[at]).hypot(line.1 - shifts.y[at]);
        let agreeing = lines[..n]
            .iter()
            .filter(|line| off(line) <= tolerance)
            .count();
        match agreeing {
            0 if n == 0 => Support::Silent,
            0 => Support::Refused,
            1 if findings[at].prominence < FAIR && findings[at].height < HIGH => Support::Refused,
            _ => Support::Given,
        }
    });
    let clear = Array2::from_shape_fn(good.dim(), |at| {
        let finding = &findings[at];
        let clear = finding.prominence >= CLEAR.0 && finding.ratio >= CLEAR.1;
        good[at] && (support[at] == Support::Given || clear)
    });
    Array2::from_shape_fn(good.dim(), |at| {
        let finding = &findings[at];
        let prominent = (finding.prominence >= PROMINENT.0 && finding.ratio >= PROMINENT.1)
            || finding.height >= HIGH;
        good[at]
            && (support[at] == Support::Given
                || (prominent && in_company(&support, at, stride))
                || (clear[at] && nearly_all(&clear, at, stride)))
    })
}

/// The up to nine places a stride apart about one, and itself.
fn about(
    (rows, columns): (usize, usize),
    (j, i): (usize, usize),
    stride: (usize, usize),
) -> impl Iterator<Item = (usize, usize)> {
    let along = |at: usize, stride: usize, n: usize| {
        let after = Some(at + stride).filter(|at| *at < n);
        [at.checked_sub(stride), Some(at), after]
            .into_iter()
            .flatten()
    };
    along(j, stride.0, rows).flat_map(move |jj| along(i, stride.1, columns).map(move |ii| (jj, ii)))
}

/// True where seven in eight of the independent windows about one are clear.
fn nearly_all(clear: &Array2<bool>, at: (usize, usize), stride: (usize, usize)) -> bool {
    let others = about(clear.dim(), at, stride).filter(|other| *other != at);
    let (all, yes) = others.fold((0, 0), |(all, yes), other| {
        (all + 1, yes + usize::from(clear[other]))
    });
    8 * yes >= 7 * all
}

/// True unless most of the independent windows about one are refused support.
fn in_company(support: &Array2<Support>, at: (usize, usize), stride: (usize, usize)) -> bool {
    let (mut given, mut refused) = (0, 0);
    for other in about(support.dim(), at, stride).filter(|other| *other != at) {
        match support[other] {
            Support::Given => given += 1,
            Support::Refused => refused += 1,
            Support::Silent => {}
        }
    }
    given >= refused
}
