//! Quintic B-spline interpolation of an image (Unser, Aldroubi & Eden 1993, IEEE Trans. Signal
//! Process. 41, 821): the image is filtered once into coefficients, then read anywhere with
//! 6 x 6 of them.
//!
//! Degree five is the choice because particle images are only two to three px wide: half of
//! their spectrum lies where a cubic spline already shifts phases, which would show as a
//! displacement error that repeats every px.

use ndarray::{Array2, Axis};
use rayon::prelude::*;

/// Pixels that a tap may reach past the image on every side, and room for a whole lane block.
const MARGIN: usize = 24;

/// How many px one call of [`SplineImage::sample`] reads.
pub(crate) const LANES: usize = 16;

/// Poles of the quintic B-spline's interpolation filter: the roots inside the unit circle of
/// z^4 + 26 z^3 + 66 z^2 + 26 z + 1.
const POLES: [f32; 2] = [-0.430_575_35, -0.043_096_29];

/// An image as B-spline coefficients, mirrored past its edges.
pub(crate) struct SplineImage {
    coefficients: Vec<f32>,
    stride: usize,
    width: usize,
    height: usize,
}

impl SplineImage {
    /// Filters `image` (row 0 at the top) into coefficients.
    pub fn new(image: &Array2<f32>) -> Self {
        let (height, width) = image.dim();
        let mut work = image.as_standard_layout().into_owned();
        work.axis_chunks_iter_mut(Axis(0), LANES)
            .into_par_iter()
            .for_each(|mut rows| {
                let mut block = vec![[0f32; LANES]; width];
                for (lane, row) in rows.outer_iter().enumerate() {
                    for (cell, value) in block.iter_mut().zip(row.iter()) {
                        cell[lane] = *value;
                    }
                }
                filter(&mut block);
                for (lane, mut row) in rows.outer_iter_mut().enumerate() {
                    for (cell, value) in block.iter().zip(row.iter_mut()) {
                        *value = cell[lane];
                    }
                }
            });
        let columns: Vec<Vec<[f32; LANES]>> = work
            .axis_chunks_iter(Axis(1), LANES)
            .into_par_iter()
            .map(|columns| {
                let mut block = vec![[0f32; LANES]; height];
                for (cell, row) in block.iter_mut().zip(columns.outer_iter()) {
                    for (c, value) in cell.iter_mut().zip(row.iter()) {
                        *c = *value;
                    }
                }
                filter(&mut block);
                block
            })
            .collect();
        let stride = width + 2 * MARGIN;
        let mut coefficients = vec![0f32; stride * (height + 2 * MARGIN)];
        coefficients
            .par_chunks_mut(stride)
            .enumerate()
            .for_each(|(padded_row, out)| {
                let row = mirror(padded_row as isize - MARGIN as isize, height);
                let (before, rest) = out.split_at_mut(MARGIN);
                let (inside, after) = rest.split_at_mut(width);
                for (place, block) in inside.chunks_mut(LANES).zip(&columns) {
                    place.copy_from_slice(&block[row][..place.len()]);
                }
                for (k, value) in before.iter_mut().enumerate() {
                    *value = inside[mirror(k as isize - MARGIN as isize, width)];
                }
                for (k, value) in after.iter_mut().enumerate() {
                    *value = inside[mirror((width + k) as isize, width)];
                }
            });
        Self {
            coefficients,
            stride,
            width,
            height,
        }
    }

    /// Reads the image at [`LANES`] points (column, row); a point outside the image gives false
    /// in `lit` and the value at the nearest edge.
    #[inline(always)]
    pub fn sample(
        &self,
        x: &[f32; LANES],
        y: &[f32; LANES],
        out: &mut [f32; LANES],
        lit: &mut [bool; LANES],
    ) {
        let right = (self.width - 1) as f32;
        let bottom = (self.height - 1) as f32;
        let mut tx = [0f32; LANES];
        let mut ty = [0f32; LANES];
        // Where the first tap of each lane lies, counted from where it would lie without shift.
        let mut base = [0i32; LANES];
        let stride = self.stride as i32;
        for l in 0..LANES {
            let (cx, cy) = (x[l].clamp(0.0, right), y[l].clamp(0.0, bottom));
            lit[l] = cx == x[l] && cy == y[l];
            let (fx, fy) = (cx.floor(), cy.floor());
            tx[l] = cx - fx;
            ty[l] = cy - fy;
            base[l] =
                (fy as i32 + MARGIN as i32 - 2) * stride + fx as i32 + MARGIN as i32 - 2 - l as i32;
        }
        let wx = weights(&tx);
        let wy = weights(&ty);
        // Neighbouring px nearly always share one whole-px shift, and then their taps are
        // contiguous; where the shift steps inside the block, each distinct one is read in turn.
        let mut done = [false; LANES];
        for first in 0..LANES {
            if done[first] {
                continue;
            }
            let here = base[first];
            let mut sum = [0f32; LANES];
            for (k, wyk) in wy.iter().enumerate() {
                let start = (here + k as i32 * stride) as usize;
                let row: &[f32; LANES + 5] =
                    match self.coefficients[start..start + LANES + 5].try_into() {
                        Ok(row) => row,
                        Err(_) => unreachable!("the slice has the array's length"),
                    };
                let mut along = [0f32; LANES];
                for (m, wxm) in wx.iter().enumerate() {
                    for l in 0..LANES {
                        along[l] += wxm[l] * row[m + l];
                    }
                }
                for l in 0..LANES {
                    sum[l] += wyk[l] * along[l];
                }
            }
            for l in 0..LANES {
                if base[l] == here {
                    out[l] = sum[l];
                    done[l] = true;
                }
            }
        }
    }
}

/// Index mirrored about the first and last sample.
fn mirror(i: isize, n: usize) -> usize {
    if n == 1 {
        return 0;
    }
    let period = 2 * (n as isize - 1);
    let i = i.rem_euclid(period);
    i.min(period - i) as usize
}

/// Turns samples into B-spline coefficients along one line, for many lines side by side.
fn filter(line: &mut [[f32; LANES]]) {
    let n = line.len();
    if n < 2 {
        return;
    }
    let gain: f32 = POLES.iter().map(|z| (1.0 - z) * (1.0 - 1.0 / z)).product();
    for cell in line.iter_mut() {
        for c in cell.iter_mut() {
            *c *= gain;
        }
    }
    for z in POLES {
        // The causal sum over the mirrored past, cut where z^k is below single precision.
        let reach = 24.min(2 * n - 2);
        let mut start = [0f32; LANES];
        let mut power = 1.0;
        for k in 0..reach {
            let cell = &line[mirror(k as isize, n)];
            for l in 0..LANES {
                start[l] += power * cell[l];
            }
            power *= z;
        }
        line[0] = start;
        for i in 1..n {
            let before = line[i - 1];
            for l in 0..LANES {
                line[i][l] += z * before[l];
            }
        }
        let (before, last) = (line[n - 2], line[n - 1]);
        for l in 0..LANES {
            line[n - 1][l] = z / (z * z - 1.0) * (last[l] + z * before[l]);
        }
        for i in (0..n - 1).rev() {
            let after = line[i + 1];
            for l in 0..LANES {
                line[i][l] = z * (after[l] - line[i][l]);
            }
        }
    }
}

/// Weights of the six taps at -2 … 3 for fractions `t` in [0, 1): the quintic B-spline's six
/// polynomial pieces, arranged so that they share their even and odd parts.
#[inline(always)]
fn weights(t: &[f32; LANES]) -> [[f32; LANES]; 6] {
    let mut w = [[0f32; LANES]; 6];
    for l in 0..LANES {
        let f = t[l];
        let f2 = f * f;
        w[5][l] = f * f2 * f2 / 120.0;
        let a = f2 - f;
        let a2 = a * a;
        let c = f - 0.5;
        let b = a * (a - 3.0);
        w[0][l] = (0.2 + a + a2) / 24.0 - w[5][l];
        let even = (a * (a - 5.0) + 9.2) / 24.0;
        let odd = -c * (b + 4.0) / 12.0;
        w[2][l] = even + odd;
        w[3][l] = even - odd;
        let even = (1.8 - b) / 16.0;
        let odd = c * (a2 - a - 5.0) / 24.0;
        w[1][l] = even + odd;
        w[4][l] = even - odd;
    }
    w
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Quintic B-spline from its definition by truncated powers (Schoenberg 1946).
    fn definition(x: f64) -> f64 {
        let binomial = [1.0, 6.0, 15.0, 20.0, 15.0, 6.0, 1.0];
        (0..7)
            .map(|k| {
                let sign = if k % 2 == 0 { 1.0 } else { -1.0 };
                sign * binomial[k] * (x + 3.0 - k as f64).max(0.0).powi(5)
            })
            .sum::<f64>()
            / 120.0
    }

    #[test]
    fn weights_are_the_quintic_b_spline() {
        for step in 0..16 {
            let t = step as f64 / 16.0;
            let w = weights(&[t as f32; LANES]);
            for (k, w) in w.iter().enumerate() {
                let exact = definition(t + 2.0 - k as f64);
                assert!((f64::from(w[3]) - exact).abs() < 1e-6, "tap {k} at {t}");
            }
        }
    }

    #[test]
    fn samples_come_back_and_a_quintic_is_read_exactly() {
        let poly = |x: f64, y: f64| {
            let (x, y) = (x / 20.0 - 1.0, y / 16.0 - 1.0);
            1.0 + x - 2.0 * x.powi(5) + 0.5 * y.powi(4) * x - y.powi(3)
        };
        let image = Array2::from_shape_fn((33, 41), |(r, c)| poly(c as f64, r as f64) as f32);
        let spline = SplineImage::new(&image);
        let mut out = [0.0; LANES];
        let mut lit = [false; LANES];
        for row in 0..33 {
            let x: [f32; LANES] = std::array::from_fn(|l| 12.0 + l as f32);
            spline.sample(&x, &[row as f32; LANES], &mut out, &mut lit);
            for l in 0..LANES {
                assert!((out[l] - image[(row, 12 + l)]).abs() < 2e-5);
            }
        }
        // Away from the mirrored edges the spline reproduces quintics; a shift that steps
        // inside the block must not matter.
        let x: [f32; LANES] = std::array::from_fn(|l| 14.0 + 0.73 * l as f32);
        let y: [f32; LANES] = std::array::from_fn(|l| 12.0 + 0.4 * l as f32);
        spline.sample(&x, &y, &mut out, &mut lit);
        for l in 0..LANES {
            let exact = poly(f64::from(x[l]), f64::from(y[l]));
            assert!(
                (f64::from(out[l]) - exact).abs() < 1e-4,
                "{l}: {} {exact}",
                out[l]
            );
            assert!(lit[l]);
        }
    }

    #[test]
    fn points_outside_are_dark() {
        let image = Array2::from_elem((20, 20), 1.0);
        let spline = SplineImage::new(&image);
        let (mut out, mut lit) = ([0.0; LANES], [true; LANES]);
        let x: [f32; LANES] = std::array::from_fn(|l| -8.0 + l as f32 * 2.0);
        spline.sample(&x, &[19.5; LANES], &mut out, &mut lit);
        assert!(lit.iter().all(|l| !l));
        spline.sample(&x, &[19.0; LANES], &mut out, &mut lit);
        assert_eq!(lit.iter().filter(|l| **l).count(), 10);
    }
}
