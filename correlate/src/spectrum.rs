//! From window pairs to spectra to correlation planes, in three sweeps over one batch.
//!
//! 1. [`forward_rows`]: z = a + i b (the two real windows of a pair as one complex one, common
//!    practice), means removed, weighted, transformed along rows.
//! 2. [`columns`]: columns k and -k of Z are transformed; by Hermitian symmetry they hold both
//!    spectra, A = (Z(k) + conj Z(-k)) / 2 and B = (Z(k) - conj Z(-k)) / 2i, so conj(A) B is formed
//!    at once and transformed back while it is still in the nearest cache. Half of the columns
//!    suffice, the plane being real.
//! 3. [`inverse_rows`]: rows r and -r of the plane, both real, return as one complex transform.
//!
//! For windows of W x W that is 2 W forward and W inverse complex transforms of length W for each
//! pair, against 3 W for three separate real 2-D transforms. Both windows of a transform, and
//! both rows, belong to one pair: what is in the other lanes never touches a result.

use multiversion::multiversion;

use super::butterfly::Sample;
use super::lanes::{LANES, Lanes, Phasor, Sink, Source, Transform, Whole};
use super::windows::Windows;

/// Sixteen ones.
const ONES: Lanes = [1.0; LANES];

/// One row of both windows, means removed: first + i second. Adds up their energies.
struct Row<'a> {
    first: &'a [f32],
    second: &'a [f32],
    columns: &'a [usize],
    means: Phasor,
    energy: Phasor,
}

impl Source for Row<'_> {
    #[inline(always)]
    fn fetch(&self, index: usize) -> Phasor {
        let start = self.columns[index];
        Phasor {
            re: lanes_at(self.first, start),
            im: lanes_at(self.second, start),
        }
    }

    #[inline(always)]
    fn lane(&mut self, here: Sample, _: Sample, _: f32, l: usize) -> Sample {
        let (first, second) = (here.0 - self.means.re[l], here.1 - self.means.im[l]);
        self.energy.re[l] += first * first;
        self.energy.im[l] += second * second;
        (first, second)
    }
}

/// A [`Row`] whose pixels are weighted by their place in the window and by what is lit.
struct WeightedRow<'a> {
    row: Row<'a>,
    lit: Option<&'a [f32]>,
    weights: &'a [f32],
}

impl Source for WeightedRow<'_> {
    #[inline(always)]
    fn fetch(&self, index: usize) -> Phasor {
        self.row.fetch(index)
    }

    #[inline(always)]
    fn partner(&self, index: usize) -> Phasor {
        let mut partner = Phasor::ZERO;
        partner.re = match self.lit {
            Some(lit) => lanes_at(lit, self.row.columns[index]),
            None => ONES,
        };
        partner
    }

    #[inline(always)]
    fn factor(&self, index: usize) -> f32 {
        if self.weights.is_empty() {
            1.0
        } else {
            self.weights[index]
        }
    }

    #[inline(always)]
    fn lane(&mut self, here: Sample, lit: Sample, factor: f32, l: usize) -> Sample {
        let weight = factor * lit.0;
        let row = &mut self.row;
        let first = weight * (here.0 - row.means.re[l]);
        let second = weight * (here.1 - row.means.im[l]);
        row.energy.re[l] += first * first;
        row.energy.im[l] += second * second;
        (first, second)
    }
}

/// The [`LANES`] numbers from `start` on: one whole vector.
///
/// # Panics
/// If there are fewer.
#[inline(always)]
pub fn lanes_at(pixels: &[f32], start: usize) -> Lanes {
    let mut lanes = [0.0; LANES];
    lanes.copy_from_slice(&pixels[start..start + LANES]);
    lanes
}

/// One column of the spectrum.
struct Column<'a> {
    spectrum: &'a [Phasor],
    stride: usize,
    column: usize,
}

impl Source for Column<'_> {
    #[inline(always)]
    fn fetch(&self, index: usize) -> Phasor {
        self.spectrum[index * self.stride + self.column]
    }
}

/// conj(A) B of one column from Z there and in the mirrored column; swapped, as it goes into an
/// inverse transform.
struct Product<'a> {
    here: &'a [Phasor],
    mirrored: &'a [Phasor],
    scale: f32,
}

/// conj(A) B times four, from z = Z(k) and m = Z(-k).
#[inline(always)]
fn cross(z: Sample, m: Sample) -> Sample {
    let (sum_re, sum_im) = (z.0 + m.0, z.1 - m.1);
    let (difference_re, difference_im) = (z.0 - m.0, z.1 + m.1);
    (
        sum_re * difference_im - sum_im * difference_re,
        -(sum_re * difference_re + sum_im * difference_im),
    )
}

impl Source for Product<'_> {
    #[inline(always)]
    fn fetch(&self, index: usize) -> Phasor {
        self.here[index]
    }

    #[inline(always)]
    fn partner(&self, index: usize) -> Phasor {
        self.mirrored[if index == 0 {
            0
        } else {
            self.mirrored.len() - index
        }]
    }

    #[inline(always)]
    fn lane(&mut self, here: Sample, mirrored: Sample, _: f32, _: usize) -> Sample {
        let product = cross(here, mirrored);
        (product.1 * self.scale, product.0 * self.scale)
    }
}

/// One column of the spectrum, to be written over; swapped back.
struct ColumnSink<'a> {
    spectrum: &'a mut [Phasor],
    stride: usize,
    column: usize,
}

impl Sink for ColumnSink<'_> {
    #[inline(always)]
    fn put(&mut self, index: usize, value: &Phasor) {
        let place = &mut self.spectrum[index * self.stride + self.column];
        place.re = value.im;
        place.im = value.re;
    }
}

/// Half the spectra q1, q2 of two rows of the plane as q1 + i q2, the other half by symmetry;
/// swapped.
struct RowPair<'a> {
    one: &'a [Phasor],
    other: &'a [Phasor],
    length: usize,
}

impl Source for RowPair<'_> {
    #[inline(always)]
    fn fetch(&self, index: usize) -> Phasor {
        self.one[index.min(self.length - index)]
    }

    #[inline(always)]
    fn partner(&self, index: usize) -> Phasor {
        self.other[index.min(self.length - index)]
    }

    #[inline(always)]
    fn factor(&self, index: usize) -> f32 {
        if index > self.length / 2 { -1.0 } else { 1.0 }
    }

    #[inline(always)]
    fn lane(&mut self, one: Sample, other: Sample, sign: f32, _: usize) -> Sample {
        (sign * one.1 + other.0, one.0 - sign * other.1)
    }
}

/// Two rows of the plane, swapped back.
struct TwoRows<'a> {
    planes: &'a mut [f32],
    one: usize,
    other: usize,
}

impl Sink for TwoRows<'_> {
    #[inline(always)]
    fn put(&mut self, index: usize, value: &Phasor) {
        let (one, other) = ((self.one + index) * LANES, (self.other + index) * LANES);
        self.planes[one..one + LANES].copy_from_slice(&value.im);
        self.planes[other..other + LANES].copy_from_slice(&value.re);
    }
}

/// Places between the starts of two rows of the spectrum: one more than the width, so that a
/// column does not fall into a few sets of the cache.
pub(super) fn stride(width: usize) -> usize {
    width + 1
}

/// Places `work` needs for windows of `height` x `width`.
pub(super) fn work_length(height: usize, width: usize) -> usize {
    2 * width.max(height) + 2 * height
}

/// Transforms the rows of both windows into `spectrum`, with `means` (first, second) removed, and
/// returns their energies (first, second): the sums of squares of what was transformed.
#[multiversion(targets(
    "x86_64+avx512f+avx512vl+avx512bw+avx512dq+avx2+fma",
    "x86_64+avx2+fma"
))]
pub(super) fn forward_rows<T: Transform>(
    transform: &T,
    height: usize,
    windows: &Windows,
    weights: &[f32],
    means: &Phasor,
    spectrum: &mut [Phasor],
    work: &mut [Phasor],
) -> Phasor {
    let width = transform.length();
    let columns = &windows.layout.columns[..width];
    let plain = weights.is_empty() && windows.lit.is_none();
    let mut energy = Phasor::ZERO;
    for r in 0..height {
        let mut row = Row {
            first: windows.row(windows.first, r),
            second: windows.row(windows.second, r),
            columns,
            means: *means,
            energy: Phasor::ZERO,
        };
        let mut sink = Whole(&mut spectrum[r * stride(width)..][..width]);
        if plain {
            transform.apply(&mut row, work, &mut sink);
        } else {
            let weights = if weights.is_empty() {
                weights
            } else {
                &weights[r * width..][..width]
            };
            let lit = windows.lit.map(|lit| windows.row(lit, r));
            let mut weighted = WeightedRow { row, lit, weights };
            transform.apply(&mut weighted, work, &mut sink);
            row = weighted.row;
        }
        for l in 0..LANES {
            energy.re[l] += row.energy.re[l];
            energy.im[l] += row.energy.im[l];
        }
    }
    energy
}

/// Turns the row spectra of z into those of the correlation plane, in columns 0 to width / 2.
#[multiversion(targets(
    "x86_64+avx512f+avx512vl+avx512bw+avx512dq+avx2+fma",
    "x86_64+avx2+fma"
))]
pub(super) fn columns<T: Transform>(
    transform: &T,
    width: usize,
    spectrum: &mut [Phasor],
    work: &mut [Phasor],
) {
    let (height, stride) = (transform.length(), stride(width));
    let scale = 0.25 / (width * height) as f32;
    let (one, rest) = work.split_at_mut(height);
    let (other, work) = rest.split_at_mut(height);
    for column in 0..width / 2 + 1 {
        let mirror = if column == 0 { 0 } else { width - column };
        let mut source = Column {
            spectrum,
            stride,
            column,
        };
        transform.apply(&mut source, work, &mut Whole(one));
        if mirror == column {
            other.copy_from_slice(one);
        } else {
            source.column = mirror;
            transform.apply(&mut source, work, &mut Whole(other));
        }
        let mut product = Product {
            here: one,
            mirrored: other,
            scale,
        };
        let mut sink = ColumnSink {
            spectrum,
            stride,
            column,
        };
        transform.apply(&mut product, work, &mut sink);
    }
}

/// Transforms back the rows of the planes up to `reach` from row 0 on either side.
#[multiversion(targets(
    "x86_64+avx512f+avx512vl+avx512bw+avx512dq+avx2+fma",
    "x86_64+avx2+fma"
))]
pub(super) fn inverse_rows<T: Transform>(
    transform: &T,
    height: usize,
    reach: usize,
    spectrum: &[Phasor],
    work: &mut [Phasor],
    planes: &mut [f32],
) {
    let (width, stride) = (transform.length(), stride(transform.length()));
    for r in 0..=reach.min((height - 1) / 2) {
        // Row 0 has no mirror image; it goes with the middle row where there is one.
        let other = match r {
            0 if height.is_multiple_of(2) => height / 2,
            0 => 0,
            _ => height - r,
        };
        let mut source = RowPair {
            one: &spectrum[r * stride..][..width / 2 + 1],
            other: &spectrum[other * stride..][..width / 2 + 1],
            length: width,
        };
        let mut sink = TwoRows {
            planes,
            one: r * width,
            other: other * width,
        };
        transform.apply(&mut source, work, &mut sink);
    }
}
