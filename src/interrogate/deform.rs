//! Both exposures moved to the mid time: each by half of the predicted shift, in opposite
//! senses, so that a vector belongs to the mid time and to its window's centre
//! (Wereley & Meinhart 2001, Exp. Fluids 31, 258; Scarano 2002, Meas. Sci. Technol. 13, R1).

use multiversion::multiversion;
use ndarray::Array2;
use rayon::prelude::*;

use super::predictor::Predictor;
use super::spline::{LANES, SplineImage};

/// The two exposures of a pair as they would look at the mid time.
pub(crate) struct Deformed {
    /// First exposure, row after row.
    pub first: Vec<f32>,
    /// Second exposure.
    pub second: Vec<f32>,
    /// 1 where both exposures could be read, 0 elsewhere; `None` when all could.
    pub lit: Option<Vec<f32>>,
    /// Columns.
    pub width: usize,
}

impl Deformed {
    /// The exposures as they are; dark where `mask` is true.
    pub fn untouched(
        first: &Array2<f32>,
        second: &Array2<f32>,
        mask: Option<&Array2<bool>>,
    ) -> Self {
        Self {
            first: first.iter().copied().collect(),
            second: second.iter().copied().collect(),
            lit: mask.map(|m| {
                m.iter()
                    .map(|hidden| f32::from(u8::from(!hidden)))
                    .collect()
            }),
            width: first.ncols(),
        }
    }

    /// Reads the first exposure at x - d/2 and the second at x + d/2, d the predicted shift; dark
    /// where either is read from a pixel that its mask hides.
    pub fn new(
        first: &SplineImage,
        second: &SplineImage,
        predictor: &Predictor,
        masks: [Option<&Array2<bool>>; 2],
        (height, width): (usize, usize),
    ) -> Self {
        let mut out = Self {
            first: vec![0.0; width * height],
            second: vec![0.0; width * height],
            lit: None,
            width,
        };
        let mut lit = vec![1f32; width * height];
        let rows = out
            .first
            .par_chunks_mut(width)
            .zip(out.second.par_chunks_mut(width))
            .zip(lit.par_chunks_mut(width))
            .enumerate();
        let dark = rows
            .map_init(
                || (vec![0f32; width], vec![0f32; width], Vec::new()),
                |(dx, dy, line), (row, ((a, b), lit))| {
                    predictor.row(row, dx, dy, line);
                    let dark = deform_row([first, second], row, [dx, dy], [a, b], lit);
                    dark | hide(masks, row, [dx, dy], lit)
                },
            )
            .reduce(|| false, |a, b| a | b);
        if dark {
            out.lit = Some(lit);
        }
        out
    }
}

/// Darkens what each exposure shows of its mask; true when anything was.
fn hide(
    masks: [Option<&Array2<bool>>; 2],
    row: usize,
    [dx, dy]: [&[f32]; 2],
    lit: &mut [f32],
) -> bool {
    let mut any = false;
    for (mask, half) in masks.into_iter().zip([-0.5f32, 0.5]) {
        let Some(mask) = mask else { continue };
        let (height, width) = mask.dim();
        for (x, lit) in lit.iter_mut().enumerate() {
            let at = |p: usize, d: f32, n: usize| {
                ((p as f32 + half * d).round().max(0.0) as usize).min(n - 1)
            };
            if mask[(at(row, dy[x], height), at(x, dx[x], width))] {
                *lit = 0.0;
                any = true;
            }
        }
    }
    any
}

/// Deforms one row of both exposures; true when a pixel of it is not lit.
#[multiversion(targets("x86_64+avx512f+avx512dq+avx512vl+fma", "x86_64+avx2+fma"))]
fn deform_row(
    images: [&SplineImage; 2],
    row: usize,
    [dx, dy]: [&[f32]; 2],
    out: [&mut [f32]; 2],
    lit: &mut [f32],
) -> bool {
    let width = dx.len();
    let mut dark = false;
    for ((image, half), out) in images.into_iter().zip([-0.5f32, 0.5]).zip(out) {
        let mut start = 0;
        while start < width {
            let n = LANES.min(width - start);
            let (mut x, mut y) = ([0f32; LANES], [row as f32; LANES]);
            for l in 0..LANES {
                // Past the end of the row the last pixel is read again and not kept.
                let column = (start + l).min(width - 1);
                x[l] = column as f32 + half * dx[column];
                y[l] = row as f32 + half * dy[column];
            }
            let (mut values, mut inside) = ([0f32; LANES], [true; LANES]);
            image.sample(&x, &y, &mut values, &mut inside);
            out[start..start + n].copy_from_slice(&values[..n]);
            for (l, inside) in inside[..n].iter().enumerate() {
                if !inside {
                    lit[start + l] = 0.0;
                    dark = true;
                }
            }
            start += n;
        }
    }
    dark
}
