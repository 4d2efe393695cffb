//! How much a vector may be off, from the two windows that gave it.
//!
//! After the last deformation the two exposures of a window should be the same but for noise.
//! What differs makes the correlation peak lean: each pixel adds
//! c = a(x) b(x + 1) - a(x + 1) b(x) to the difference between the samples right and left of the
//! peak. The sum of c is near zero where the peak is centred; its variance, with the covariance
//! of neighbouring pixels, is the variance of that difference, and the three-point fit turns it
//! into px (Wieneke 2015, Meas. Sci. Technol. 26, 074002).

use ndarray::Array2;

use super::transform::{LANES, Lanes};

/// Pixels on either side over which the contributions of neighbours are taken to be correlated:
/// a little more than the width of a usual particle image.
pub(crate) const REACH: usize = 3;

/// Room for the sums of one window batch.
pub(crate) struct StatisticsScratch {
    soft: Vec<Lanes>,
    lean: Vec<Lanes>,
    sums: Vec<Lanes>,
}

impl StatisticsScratch {
    /// Room for windows of `pixels` px.
    pub fn new(pixels: usize) -> Self {
        Self {
            soft: vec![[0.0; LANES]; pixels],
            lean: vec![[0.0; LANES]; pixels],
            sums: vec![[0.0; LANES]; pixels],
        }
    }
}

/// Variance of (right minus left) and of (below minus above) samples of the smoothed peak, for a
/// batch of windows `a` and `b` of `width` columns, row after row.
#[multiversion::multiversion(targets("x86_64+avx512f+avx512dq+avx512vl+fma", "x86_64+avx2+fma"))]
pub(crate) fn lean_variance(
    a: &[Lanes],
    b: &[Lanes],
    width: usize,
    scratch: &mut StatisticsScratch,
) -> [Lanes; 2] {
    let height = a.len() / width;
    soften(b, width, &mut scratch.soft);
    [(0, 1), (1, 0)].map(|(down, right)| {
        let (rows, columns) = (height - down, width - right);
        let lean = &mut scratch.lean[..rows * columns];
        let mut mean = [0f32; LANES];
        for r in 0..rows {
            let here = r * width;
            let next = (r + down) * width + right;
            for c in 0..columns {
                let (a0, a1) = (&a[here + c], &a[next + c]);
                let (b0, b1) = (&scratch.soft[here + c], &scratch.soft[next + c]);
                let out = &mut lean[r * columns + c];
                for l in 0..LANES {
                    out[l] = a0[l] * b1[l] - a1[l] * b0[l];
                    mean[l] += out[l];
                }
            }
        }
        let n = (rows * columns) as f32;
        for cell in lean.iter_mut() {
            for l in 0..LANES {
                cell[l] -= mean[l] / n;
            }
        }
        spread(lean, columns, &mut scratch.sums)
    })
}

/// Smooths as the peak is smoothed: (1, 6, 1)/8 along rows and columns, edges left as they are.
#[inline(always)]
fn soften(from: &[Lanes], width: usize, to: &mut [Lanes]) {
    const NEAR: f32 = 0.125;
    let height = from.len() / width;
    to.copy_from_slice(from);
    for r in 1..height - 1 {
        for c in 1..width - 1 {
            let p = r * width + c;
            let mut sum = [0f32; LANES];
            for (k, wy) in [NEAR, 1.0 - 2.0 * NEAR, NEAR].into_iter().enumerate() {
                let q = p + k * width - width;
                for l in 0..LANES {
                    sum[l] += wy
                        * (NEAR * (from[q - 1][l] + from[q + 1][l])
                            + (1.0 - 2.0 * NEAR) * from[q][l]);
                }
            }
            to[p] = sum;
        }
    }
}

/// Sum over pixels of each value times the sum of all values within [`REACH`] of it: the
/// variance of the total, covariance of neighbours included.
#[inline(always)]
fn spread(values: &[Lanes], width: usize, sums: &mut [Lanes]) -> Lanes {
    let height = values.len() / width;
    // Running sums along each row, then along columns.
    for r in 0..height {
        let row = &values[r * width..(r + 1) * width];
        let mut run = [0f32; LANES];
        for cell in &row[..REACH.min(width)] {
            for l in 0..LANES {
                run[l] += cell[l];
            }
        }
        for c in 0..width {
            if c + REACH < width {
                for l in 0..LANES {
                    run[l] += row[c + REACH][l];
                }
            }
            if c > REACH {
                for l in 0..LANES {
                    run[l] -= row[c - REACH - 1][l];
                }
            }
            sums[r * width + c] = run;
        }
    }
    let mut total = [0f32; LANES];
    for c in 0..width {
        let mut run = [0f32; LANES];
        for r in 0..REACH.min(height) {
            for l in 0..LANES {
                run[l] += sums[r * width + c][l];
            }
        }
        for r in 0..height {
            if r + REACH < height {
                for l in 0..LANES {
                    run[l] += sums[(r + REACH) * width + c][l];
                }
            }
            if r > REACH {
                for l in 0..LANES {
                    run[l] -= sums[(r - REACH - 1) * width + c][l];
                }
            }
            for l in 0..LANES {
                total[l] += run[l] * values[r * width + c][l];
            }
        }
    }
    total
}

/// Variance, px², of the three-point fit whose middle sample is `top` and whose side samples
/// average `side`, when their difference has the variance `lean`; `None` where there is no peak
/// to speak of.
///
/// `pixels` is how many contributions were summed: taking their mean out took the share
/// (2 [`REACH`] + 1)² / `pixels` of the variance with it, which is given back. An estimate can
/// come out below zero by chance; only a mean of several is an uncertainty ([`pooled`]).
pub(crate) fn variance(lean: f32, top: f32, side: f32, pixels: usize) -> Option<f64> {
    if !(lean.is_finite() && side > 0.0 && top > side) {
        return None;
    }
    let (lean, top, side) = (f64::from(lean), f64::from(top), f64::from(side));
    let box_area = ((2 * REACH + 1) * (2 * REACH + 1)) as f64;
    let kept = (1.0 - box_area / pixels as f64).max(0.25);
    Some(lean / kept / (4.0 * side * (top / side).ln()).powi(2))
}

/// Root of the mean variance over the cells up to `reach` (rows, columns) away that have one.
///
/// One window holds too few particles to say its own variance well; half a window further on
/// every side it is hardly another flow.
pub(crate) fn pooled(
    variances: &Array2<Option<f64>>,
    (j, i): (usize, usize),
    reach: (usize, usize),
) -> Option<f64> {
    let (rows, columns) = variances.dim();
    let (mut sum, mut n) = (0.0, 0.0);
    for jj in j.saturating_sub(reach.0)..=(j + reach.0).min(rows - 1) {
        for ii in i.saturating_sub(reach.1)..=(i + reach.1).min(columns - 1) {
            if let Some(variance) = variances[(jj, ii)] {
                sum += variance;
                n += 1.0;
            }
        }
    }
    (sum > 0.0).then(|| (sum / n).sqrt())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_spread_is_the_plain_double_sum() {
        let (width, height) = (9, 11);
        let values: Vec<Lanes> = (0..width * height)
            .map(|i| std::array::from_fn(|l| ((i * 7 + l * 13) % 23) as f32 - 11.0))
            .collect();
        let mut sums = vec![[0.0; LANES]; width * height];
        let fast = spread(&values, width, &mut sums);
        for l in 0..LANES {
            let mut slow = 0.0;
            for i in 0..width * height {
                for k in 0..width * height {
                    let near = (i / width).abs_diff(k / width) <= REACH
                        && (i % width).abs_diff(k % width) <= REACH;
                    if near {
                        slow += values[i][l] * values[k][l];
                    }
                }
            }
            assert!((fast[l] - slow).abs() < 1e-3 * slow.abs().max(1.0));
        }
    }

    #[test]
    fn the_uncertainty_is_the_slope_of_the_three_point_fit() {
        use crate::interrogate::peak::three_point;
        let (top, side, small) = (1.0f32, 0.6f32, 1e-3f32);
        let d = three_point([side - small / 2.0, top, side + small / 2.0]);
        let many = 1_000_000;
        let u = variance(small * small, top, side, many).unwrap().sqrt();
        assert!((d - u).abs() < 1e-6);
        assert_eq!(variance(1.0, 0.5, 0.6, many), None);
    }
}
