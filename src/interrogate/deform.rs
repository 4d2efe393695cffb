//! Both exposures moved to the mid time: each by half of the predicted shift, in opposite
//! senses, so that a vector belongs to the mid time and to its window's centre
//! (Wereley & Meinhart 2001, Exp. Fluids 31, 258; Scarano 2002, Meas. Sci. Technol. 13, R1).
//!
//! Deformed rows are made when a pass comes to them and live in its band of rows: a deformed
//! image is never stored whole.

use multiversion::multiversion;
use ndarray::Array2;

use super::predictor::Predictor;
use super::spline::{LANES, SplineImage};
use super::transform::lanes_at;

/// Pixels hidden in the first and in the second exposure.
pub(crate) type Masks<'a> = [Option<&'a Array2<bool>>; 2];

/// The two exposures of a pair as they would look at the mid time, row by row.
pub(crate) struct Exposures<'a> {
    source: Source<'a>,
    masks: Masks<'a>,
    /// Columns.
    pub width: usize,
}

enum Source<'a> {
    /// As they are.
    Plain([&'a Array2<f32>; 2]),
    /// The first exposure read at x - d/2 and the second at x + d/2, d the predicted shift.
    Moved([&'a SplineImage; 2], &'a Predictor),
}

/// One row of a pair, and room for its shifts.
pub(crate) struct Row {
    /// First exposure.
    pub first: Vec<f32>,
    /// Second exposure.
    pub second: Vec<f32>,
    /// 1 where both exposures could be read, 0 elsewhere.
    pub lit: Vec<f32>,
    /// Predicted shift at each px, and zeros that fill the last block of lanes.
    shifts: [Vec<f32>; 2],
    line: Vec<f32>,
}

impl Row {
    /// Room for a row of `width` px.
    pub fn new(width: usize) -> Self {
        let zeros = || vec![0f32; width];
        Self {
            first: zeros(),
            second: zeros(),
            lit: zeros(),
            shifts: [(); 2].map(|()| vec![0f32; width.next_multiple_of(LANES)]),
            line: Vec::new(),
        }
    }
}

impl<'a> Exposures<'a> {
    /// The exposures as they are.
    pub fn plain(images: [&'a Array2<f32>; 2], masks: Masks<'a>) -> Self {
        Self {
            width: images[0].ncols(),
            source: Source::Plain(images),
            masks,
        }
    }

    /// The exposures moved by half the predicted shift each.
    pub fn moved(images: [&'a SplineImage; 2], predictor: &'a Predictor, masks: Masks<'a>) -> Self {
        Self {
            width: images[0].width(),
            source: Source::Moved(images, predictor),
            masks,
        }
    }

    /// Makes row number `row`; true when a pixel of it is dark. `out.lit` is written whole in
    /// either case.
    pub fn row(&self, row: usize, out: &mut Row) -> bool {
        out.lit.fill(1.0);
        let mut dark = false;
        match &self.source {
            Source::Plain(images) => {
                for (image, to) in images.iter().zip([&mut out.first, &mut out.second]) {
                    match image.row(row).as_slice() {
                        Some(from) => to.copy_from_slice(from),
                        None => to
                            .iter_mut()
                            .zip(image.row(row))
                            .for_each(|(to, from)| *to = *from),
                    }
                }
                for shifts in &mut out.shifts {
                    shifts.fill(0.0);
                }
            }
            Source::Moved(images, predictor) => {
                let [dx, dy] = &mut out.shifts;
                let width = self.width;
                predictor.row(row, &mut dx[..width], &mut dy[..width], &mut out.line);
                dark = deform_row(
                    *images,
                    row,
                    [dx, dy],
                    [&mut out.first, &mut out.second],
                    &mut out.lit,
                );
            }
        }
        for (mask, half) in self.masks.iter().zip(HALVES) {
            if let Some(mask) = mask {
                dark |= hide(mask, row, half, &out.shifts, &mut out.lit);
            }
        }
        dark
    }
}

/// Shares of the shift by which the first and the second exposure are moved.
const HALVES: [f32; 2] = [-0.5, 0.5];

/// Darkens what one exposure shows of its mask; true when anything was.
fn hide(
    mask: &Array2<bool>,
    row: usize,
    half: f32,
    [dx, dy]: &[Vec<f32>; 2],
    lit: &mut [f32],
) -> bool {
    let (height, width) = mask.dim();
    let at =
        |p: usize, d: f32, n: usize| ((p as f32 + half * d).round().max(0.0) as usize).min(n - 1);
    let mut any = false;
    for (x, lit) in lit.iter_mut().enumerate() {
        if mask[(at(row, dy[x], height), at(x, dx[x], width))] {
            *lit = 0.0;
            any = true;
        }
    }
    any
}

#[inline(always)]
fn halved(shifts: &[f32], start: usize) -> [f32; LANES] {
    let mut lanes = lanes_at(shifts, start);
    for lane in &mut lanes {
        *lane *= 0.5;
    }
    lanes
}

/// Deforms one row of both exposures; true when a pixel of it lies outside either image.
#[multiversion(targets("x86_64+avx512f+avx512dq+avx512vl+fma", "x86_64+avx2+fma"))]
fn deform_row(
    images: [&SplineImage; 2],
    row: usize,
    [dx, dy]: [&[f32]; 2],
    [first, second]: [&mut [f32]; 2],
    lit: &mut [f32],
) -> bool {
    let width = first.len();
    let mut dark = false;
    let mut start = 0;
    while start < width {
        let n = LANES.min(width - start);
        let half = [halved(dx, start), halved(dy, start)];
        let mut values = [[0f32; LANES]; 2];
        if n < LANES || !SplineImage::sample_both(images, (start, row), &half, &mut values) {
            for ((image, sign), values) in images.iter().zip([-1.0, 1.0]).zip(&mut values) {
                let (mut x, mut y) = ([0f32; LANES], [0f32; LANES]);
                for l in 0..LANES {
                    x[l] = (start + l).min(width - 1) as f32 + sign * half[0][l];
                    y[l] = row as f32 + sign * half[1][l];
                }
                let mut inside = [1f32; LANES];
                image.sample(&x, &y, values, &mut inside);
                for (lit, inside) in lit[start..start + n].iter_mut().zip(inside) {
                    *lit *= inside;
                    dark |= inside == 0.0;
                }
            }
        }
        first[start..start + n].copy_from_slice(&values[0][..n]);
        second[start..start + n].copy_from_slice(&values[1][..n]);
        start += n;
    }
    dark
}
