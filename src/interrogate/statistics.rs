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

/// Rows kept while sums over 2 [`REACH`] + 1 of them move on.
const RING: usize = 2 * REACH + 2;

/// Room for the sums of one window batch.
pub(crate) struct StatisticsScratch {
    /// Both windows smoothed.
    soft: [Vec<Lanes>; 2],
    /// Contributions, and their sums along the row: [`RING`] rows each.
    lean: Vec<Lanes>,
    along: Vec<Lanes>,
    /// Sums over the box round each px; a row.
    boxes: Vec<Lanes>,
}

impl StatisticsScratch {
    /// Room for windows of `pixels` px in rows of `width`.
    pub fn new(pixels: usize, width: usize) -> Self {
        let room = |cells: usize| vec![[0.0; LANES]; cells];
        Self {
            soft: [room(pixels), room(pixels)],
            lean: room(RING * width),
            along: room(RING * width),
            boxes: room(width),
        }
    }
}

/// Variance of (right minus left) and of (below minus above) samples of the smoothed peak, for a
/// batch of windows `a` and `b` of `width` columns, row after row.
pub(crate) fn lean_variance(
    a: &[Lanes],
    b: &[Lanes],
    width: usize,
    scratch: &mut StatisticsScratch,
) -> [Lanes; 2] {
    let [soft_a, soft_b] = &mut scratch.soft;
    soften(a, width, soft_a);
    soften(b, width, soft_b);
    [
        spread::<0, 1>(width, scratch),
        spread::<1, 0>(width, scratch),
    ]
}

/// Weights of a pixel and of the next in [`soften`]: (1 ± √½)/2, the sum of whose products with
/// themselves, one apart, and of whose squares are 1/8 and 6/8.
const SOFT: [f32; 2] = [0.853_553_4, 0.146_446_6];

/// Smooths one exposure so that the correlation of two such is smoothed as the peak is, by
/// (1, 6, 1)/8 along rows and columns: a kernel of two px on each axis does that, being the root
/// of the other. Both exposures must be smoothed alike, or a perfect pair would show
/// contributions that are not noise.
#[allow(
    clippy::needless_range_loop,
    reason = "the column counts in four rows at once"
)]
#[multiversion::multiversion(targets("x86_64+avx512f+avx512dq+avx512vl+fma", "x86_64+avx2+fma"))]
fn soften(from: &[Lanes], width: usize, to: &mut [Lanes]) {
    let height = from.len() / width;
    for r in 0..height {
        let here = &from[r * width..][..width];
        // The window ends in zeros.
        let below = from.get((r + 1) * width..).unwrap_or_default();
        let to = &mut to[r * width..][..width];
        let blend = |c: usize| {
            let mut sum = [0f32; LANES];
            let next = below.get(c).unwrap_or(&[0.0; LANES]);
            for l in 0..LANES {
                sum[l] = SOFT[0] * here[c][l] + SOFT[1] * next[l];
            }
            sum
        };
        let mut now = blend(0);
        for c in 0..width {
            let next = if c + 1 < width {
                blend(c + 1)
            } else {
                [0.0; LANES]
            };
            for l in 0..LANES {
                to[c][l] = SOFT[0] * now[l] + SOFT[1] * next[l];
            }
            now = next;
        }
    }
}

/// Variance, by lane, of the sum over px of a(x) b(x + d) - a(x + d) b(x), the windows smoothed
/// and d = (`RIGHT`, `DOWN`) px: each contribution less the mean of all times the same within
/// [`REACH`] of it, summed.
///
/// With c the contributions, m their mean and n the px within reach of each, that is
/// sum c box(c) - 2 m sum n c + m² sum n, so that c is made once and never stored whole.
#[multiversion::multiversion(targets("x86_64+avx512f+avx512dq+avx512vl+fma", "x86_64+avx2+fma"))]
fn spread<const DOWN: usize, const RIGHT: usize>(
    width: usize,
    scratch: &mut StatisticsScratch,
) -> Lanes {
    let within = |i: usize, n: usize| (i + REACH).min(n - 1) - i.saturating_sub(REACH) + 1;
    let StatisticsScratch {
        soft,
        lean,
        along,
        boxes,
    } = scratch;
    let [a, b] = soft;
    let (rows, columns) = (a.len() / width - DOWN, width - RIGHT);
    let boxes = &mut boxes[..columns];
    boxes.fill([0.0; LANES]);
    let place = |r: usize| (r % RING) * width;
    let (mut total, mut sum, mut counted) = ([0f32; LANES], [0f32; LANES], [0f32; LANES]);
    for r in 0..rows + REACH {
        if r < rows {
            let (here, there) = (r * width, (r + DOWN) * width + RIGHT);
            let (a0, a1) = (&a[here..][..columns], &a[there..][..columns]);
            let (b0, b1) = (&b[here..][..columns], &b[there..][..columns]);
            let lean = &mut lean[place(r)..][..columns];
            let n_row = within(r, rows) as f32;
            for c in 0..columns {
                let n = n_row * within(c, columns) as f32;
                let mut out = [0f32; LANES];
                for l in 0..LANES {
                    out[l] = a0[c][l] * b1[c][l] - a1[c][l] * b0[c][l];
                    sum[l] += out[l];
                    counted[l] += n * out[l];
                }
                lean[c] = out;
            }
            let along = &mut along[place(r)..][..columns];
            let mut run = [0f32; LANES];
            for cell in &lean[..REACH.min(columns)] {
                for l in 0..LANES {
                    run[l] += cell[l];
                }
            }
            for c in 0..columns {
                if c + REACH < columns {
                    for l in 0..LANES {
                        run[l] += lean[c + REACH][l];
                    }
                }
                if c > REACH {
                    for l in 0..LANES {
                        run[l] -= lean[c - REACH - 1][l];
                    }
                }
                along[c] = run;
                for l in 0..LANES {
                    boxes[c][l] += run[l];
                }
            }
        }
        if r > 2 * REACH {
            for (sum, old) in boxes.iter_mut().zip(&along[place(r - 2 * REACH - 1)..]) {
                for l in 0..LANES {
                    sum[l] -= old[l];
                }
            }
        }
        if r >= REACH {
            for (sum, c) in boxes.iter().zip(&lean[place(r - REACH)..]) {
                for l in 0..LANES {
                    total[l] += sum[l] * c[l];
                }
            }
        }
    }
    let all = |n: usize| (0..n).map(|i| within(i, n)).sum::<usize>() as f32;
    let pairs = all(rows) * all(columns);
    let n = (rows * columns) as f32;
    let mut out = [0f32; LANES];
    for l in 0..LANES {
        let mean = sum[l] / n;
        out[l] = total[l] - 2.0 * mean * counted[l] + mean * mean * pairs;
    }
    out
}

/// Variance, px², of the three-point fit whose middle sample is `top` and whose side samples
/// average `side`, when their difference has the variance `lean`; `None` where there is no peak
/// to speak of.
///
/// `pixels` is how many contributions were summed: taking their mean out took a share of the
/// variance with it, which is given back ([`share_kept`]). An estimate can come out below zero by
/// chance; only a mean of several is an uncertainty ([`pooled`]).
pub(crate) fn variance(lean: f32, top: f32, side: f32, pixels: usize) -> Option<f64> {
    if !(lean.is_finite() && side > 0.0 && top > side) {
        return None;
    }
    let (lean, top, side) = (f64::from(lean), f64::from(top), f64::from(side));
    let kept = share_kept(pixels, 1.0);
    Some(lean / kept / (4.0 * side * (top / side).ln()).powi(2))
}

/// Share of the variance of a sum of `pixels` contributions that is left when their mean is taken
/// out: all but (2 [`REACH`] + 1)² / `pixels`, times how much of the variance of that mean there
/// was, `of_mean`, as the passes before may have taken it out already.
pub(crate) fn share_kept(pixels: usize, of_mean: f64) -> f64 {
    let box_area = ((2 * REACH + 1) * (2 * REACH + 1)) as f64;
    (1.0 - of_mean * box_area / pixels as f64).max(0.25)
}

/// Root of the mean variance over the cells up to `reach` (rows, columns) away that have one.
///
/// One window holds too few particles to say its own variance well, and those within half a
/// window share most of them; a little further on every side it is hardly another flow.
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
        // Windows longer and shorter than the sums reach.
        for (width, height) in [(9, 11), (4, 4), (16, 5), (32, 32)] {
            let pixel = |i: usize, l: usize, k: usize| ((i * k + l * 13) % 23) as f32 - 11.0;
            let windows = [7, 5].map(|k| -> Vec<Lanes> {
                (0..width * height)
                    .map(|i| std::array::from_fn(|l| pixel(i, l, k)))
                    .collect()
            });
            let mut scratch = StatisticsScratch::new(width * height, width);
            let fast = lean_variance(&windows[0], &windows[1], width, &mut scratch);
            let [a, b] = &scratch.soft;
            for (axis, (down, right)) in [(0, 1), (1, 0)].into_iter().enumerate() {
                let (rows, columns) = (height - down, width - right);
                for l in [0, 7, LANES - 1] {
                    let lean: Vec<f64> = (0..rows * columns)
                        .map(|i| {
                            let here = i / columns * width + i % columns;
                            let there = here + down * width + right;
                            f64::from(a[here][l] * b[there][l] - a[there][l] * b[here][l])
                        })
                        .collect();
                    let mean = lean.iter().sum::<f64>() / lean.len() as f64;
                    let mut slow = 0.0;
                    let mut size = 0.0;
                    for i in 0..lean.len() {
                        for k in 0..lean.len() {
                            let near = (i / columns).abs_diff(k / columns) <= REACH
                                && (i % columns).abs_diff(k % columns) <= REACH;
                            if near {
                                slow += (lean[i] - mean) * (lean[k] - mean);
                                size += ((lean[i] - mean) * (lean[k] - mean)).abs();
                            }
                        }
                    }
                    let off = (f64::from(fast[axis][l]) - slow).abs();
                    assert!(off < 1e-5 * size, "{width} x {height}: {off} of {size}");
                }
            }
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
