//! Quintic B-spline interpolation of an image (Unser, Aldroubi & Eden 1993, IEEE Trans. Signal
//! Process. 41, 821): the image is filtered once into coefficients, then read anywhere with
//! 6 x 6 of them.
//!
//! Degree five is the choice because particle images are only two to three px wide: half of
//! their spectrum lies where a cubic spline already shifts phases, which would show as a
//! displacement error that repeats every px.

use multiversion::multiversion;
use ndarray::{Array2, ArrayViewMut2, Axis, s};
use rayon::prelude::*;

use super::transform::{deinterleave, interleave, lanes_at};

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
        let stride = width + 2 * MARGIN;
        let mut coefficients = Array2::<f32>::zeros((height + 2 * MARGIN, stride));
        let mut inside =
            coefficients.slice_mut(s![MARGIN..MARGIN + height, MARGIN..MARGIN + width]);
        inside
            .axis_chunks_iter_mut(Axis(0), LANES)
            .into_par_iter()
            .zip(image.as_standard_layout().axis_chunks_iter(Axis(0), LANES))
            .for_each_init(Vec::new, |block, (mut to, rows)| {
                block.resize(width * LANES, 0f32);
                let mut from = [&[][..]; LANES];
                for (place, row) in from.iter_mut().zip(rows.outer_iter()) {
                    *place = row.to_slice().unwrap_or_default();
                }
                interleave(&from, block);
                filter(block.as_chunks_mut().0);
                let mut back = [(); LANES].map(|()| &mut [][..]);
                for (place, row) in back.iter_mut().zip(to.outer_iter_mut()) {
                    *place = row.into_slice().unwrap_or_default();
                }
                deinterleave(block, &mut back);
            });
        inside
            .axis_chunks_iter_mut(Axis(1), STRIP)
            .into_par_iter()
            .for_each(|mut columns| filter_down(&mut columns));
        let mut coefficients = coefficients.into_raw_vec_and_offset().0;
        // The margins: columns of every row, then whole rows.
        for row in coefficients.chunks_mut(stride).skip(MARGIN).take(height) {
            for k in 0..MARGIN {
                row[k] = row[MARGIN + mirror(k as isize - MARGIN as isize, width)];
                row[MARGIN + width + k] = row[MARGIN + mirror((width + k) as isize, width)];
            }
        }
        for k in 0..MARGIN {
            for (to, from) in [
                (k, k as isize - MARGIN as isize),
                (MARGIN + height + k, (height + k) as isize),
            ] {
                let from = (MARGIN + mirror(from, height)) * stride;
                coefficients.copy_within(from..from + stride, to * stride);
            }
        }
        Self {
            coefficients,
            stride,
            width,
            height,
        }
    }

    /// Columns of the image.
    pub fn width(&self) -> usize {
        self.width
    }

    /// Reads two images of one size round [`LANES`] pixels of one row that begin at `start`
    /// (column, row): the first at the pixel less `half` (along columns, along rows), the second
    /// at the pixel plus `half`. False, and nothing is read, unless all points lie inside and the
    /// whole px of `half` differ by one at most.
    ///
    /// The two points of a pixel are mirror images, and so are their weights.
    #[inline(always)]
    pub fn sample_both(
        images: [&Self; 2],
        start: (usize, usize),
        half: &[[f32; LANES]; 2],
        out: &mut [[f32; LANES]; 2],
    ) -> bool {
        let image = images[1];
        let (mut t, mut step) = ([[0f32; LANES]; 2], [[0f32; LANES]; 2]);
        let (mut low, mut steps) = ([0i32; 2], [false; 2]);
        let mut near = true;
        for axis in 0..2 {
            let mut floor = [0f32; LANES];
            for l in 0..LANES {
                floor[l] = half[axis][l].floor();
                t[axis][l] = half[axis][l] - floor[l];
            }
            let lowest = floor[0].min(floor[LANES - 1]);
            for l in 0..LANES {
                step[axis][l] = floor[l] - lowest;
                near &= (step[axis][l] == 0.0) | (step[axis][l] == 1.0);
                steps[axis] |= step[axis][l] != 0.0;
            }
            low[axis] = lowest as i32;
        }
        let fits = |axis: usize, start: usize, length: usize, image: usize| {
            let (start, end) = (start as i32, (start + length) as i32);
            // The point of pixel p lies within p + low to p + low + 2, its mirror image likewise.
            start + low[axis].min(-low[axis] - 2) >= 0
                && end + (low[axis] + 2).max(-low[axis]) <= image as i32
        };
        if !near || !fits(0, start.0, LANES, image.width) || !fits(1, start.1, 1, image.height) {
            return false;
        }
        let w = [weights(&t[0]), weights(&t[1])];
        let from = [start.0 as i32, start.1 as i32];
        match steps {
            [false, false] => Self::sum_both(images, from, low, &w[0], &w[1], out),
            [true, false] => {
                Self::sum_both(images, from, low, &spread(&w[0], &step[0]), &w[1], out);
            }
            [false, true] => {
                Self::sum_both(images, from, low, &w[0], &spread(&w[1], &step[1]), out);
            }
            [true, true] => {
                let (wx, wy) = (spread(&w[0], &step[0]), spread(&w[1], &step[1]));
                Self::sum_both(images, from, low, &wx, &wy, out);
            }
        }
        true
    }

    #[inline(always)]
    fn sum_both<const X: usize, const Y: usize>(
        images: [&Self; 2],
        from: [i32; 2],
        low: [i32; 2],
        wx: &[[f32; LANES]; X],
        wy: &[[f32; LANES]; Y],
        out: &mut [[f32; LANES]; 2],
    ) {
        images[1].sum([from[0] + low[0], from[1] + low[1]], wx, wy, &mut out[1]);
        // Taps -2 ... X - 3 from `low` on become those from -low - (X - 3) on, weights reversed.
        let mirrored = |from: i32, low: i32, taps: usize| from - low + 5 - taps as i32;
        let low = [mirrored(from[0], low[0], X), mirrored(from[1], low[1], Y)];
        let (mut rx, mut ry) = (*wx, *wy);
        rx.reverse();
        ry.reverse();
        images[0].sum(low, &rx, &ry, &mut out[0]);
    }

    /// Reads the image at [`LANES`] points (column, row); a point outside gives 0 in `inside` and
    /// the value at the nearest edge.
    #[inline(always)]
    pub fn sample(
        &self,
        x: &[f32; LANES],
        y: &[f32; LANES],
        out: &mut [f32; LANES],
        inside: &mut [f32; LANES],
    ) {
        let right = (self.width - 1) as f32;
        let bottom = (self.height - 1) as f32;
        let mut t = [[0f32; LANES]; 2];
        // The whole px of each point; along the row counted from where it would lie unmoved.
        let mut at = [[0i32; LANES]; 2];
        for l in 0..LANES {
            let (cx, cy) = (x[l].clamp(0.0, right), y[l].clamp(0.0, bottom));
            inside[l] = if cx == x[l] && cy == y[l] { 1.0 } else { 0.0 };
            let (fx, fy) = (cx.floor(), cy.floor());
            t[0][l] = cx - fx;
            t[1][l] = cy - fy;
            at[0][l] = whole(fx) - l as i32;
            at[1][l] = whole(fy);
        }
        self.sum_in_turn(at, &[weights(&t[0]), weights(&t[1])], out);
    }

    /// The taps from `low` (column, row) on, weighed and summed.
    #[inline(always)]
    fn sum<const X: usize, const Y: usize>(
        &self,
        low: [i32; 2],
        wx: &[[f32; LANES]; X],
        wy: &[[f32; LANES]; Y],
        out: &mut [f32; LANES],
    ) {
        let start = (low[1] + MARGIN as i32 - 2) as usize * self.stride
            + (low[0] + MARGIN as i32 - 2) as usize;
        let mut sum = [0f32; LANES];
        for (k, wyk) in wy.iter().enumerate() {
            let row = &self.coefficients[start + k * self.stride..][..LANES + X];
            let mut along = [0f32; LANES];
            for (m, wxm) in wx.iter().enumerate() {
                // By value: one plain load a tap, where a shared row would be shuffled.
                let taps = lanes_at(row, m);
                for l in 0..LANES {
                    along[l] += wxm[l] * taps[l];
                }
            }
            for l in 0..LANES {
                sum[l] += wyk[l] * along[l];
            }
        }
        *out = sum;
    }

    /// The same for points anywhere: those that share their whole px, one group after the other.
    fn sum_in_turn(
        &self,
        at: [[i32; LANES]; 2],
        w: &[[[f32; LANES]; 6]; 2],
        out: &mut [f32; LANES],
    ) {
        let mut done = [false; LANES];
        for first in 0..LANES {
            if done[first] {
                continue;
            }
            let here = [at[0][first], at[1][first]];
            let mut sum = [0f32; LANES];
            self.sum(here, &w[0], &w[1], &mut sum);
            for l in 0..LANES {
                if [at[0][l], at[1][l]] == here {
                    out[l] = sum[l];
                    done[l] = true;
                }
            }
        }
    }
}

/// Six weights, in lanes where `step` is 1 moved on by one, as seven.
#[inline(always)]
fn spread(w: &[[f32; LANES]; 6], step: &[f32; LANES]) -> [[f32; LANES]; 7] {
    let mut out = [[0f32; LANES]; 7];
    for (k, out) in out.iter_mut().enumerate() {
        for l in 0..LANES {
            let here = if k < 6 { w[k][l] } else { 0.0 };
            let later = if k > 0 { w[k - 1][l] } else { 0.0 };
            out[l] = if step[l] == 0.0 { here } else { later };
        }
    }
    out
}

/// A whole number within 2^22 of 0 as an integer: from the bits of its sum with 1.5 * 2^23, which
/// whole vectors can do, where a cast that minds every range is done one by one.
#[inline(always)]
fn whole(x: f32) -> i32 {
    const SHIFT: f32 = 12_582_912.0;
    (x + SHIFT).to_bits() as i32 - SHIFT.to_bits() as i32
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

/// What scales samples so that the recursions of all poles leave their sum whole.
fn gain() -> f32 {
    POLES.iter().map(|z| (1.0 - z) * (1.0 - 1.0 / z)).product()
}

/// Terms of the causal sum over the mirrored past of `n` samples; z^k is below single precision
/// after them.
fn past(n: usize) -> usize {
    24.min(2 * n - 2)
}

/// Turns samples into B-spline coefficients along one line, for many lines side by side.
#[multiversion(targets("x86_64+avx512f+avx512dq+avx512vl+fma", "x86_64+avx2+fma"))]
fn filter(line: &mut [[f32; LANES]]) {
    let n = line.len();
    if n < 2 {
        return;
    }
    let gain = gain();
    for cell in line.iter_mut() {
        for c in cell.iter_mut() {
            *c *= gain;
        }
    }
    for z in POLES {
        let mut carry = [0f32; LANES];
        let mut power = 1.0;
        for k in 0..past(n) {
            let cell = line[mirror(k as isize, n)];
            for l in 0..LANES {
                carry[l] += power * cell[l];
            }
            power *= z;
        }
        line[0] = carry;
        for cell in &mut line[1..] {
            for l in 0..LANES {
                carry[l] = cell[l] + z * carry[l];
            }
            *cell = carry;
        }
        let before = line[n - 2];
        for l in 0..LANES {
            carry[l] = z / (z * z - 1.0) * (carry[l] + z * before[l]);
        }
        line[n - 1] = carry;
        for cell in line[..n - 1].iter_mut().rev() {
            for l in 0..LANES {
                carry[l] = z * (carry[l] - cell[l]);
            }
            *cell = carry;
        }
    }
}

/// Columns filtered together where they stand: few enough to stay in the nearer caches.
const STRIP: usize = 64;

/// [`filter`] down the columns of a strip of an image; the same arithmetic, row by row.
fn filter_down(strip: &mut ArrayViewMut2<f32>) {
    let (n, _) = strip.dim();
    if n < 2 {
        return;
    }
    let mut carry = [0f32; STRIP];
    let gain = gain();
    for r in 0..n {
        each(strip, r, &mut carry, |_, here| (here * gain, 0.0));
    }
    for z in POLES {
        carry.fill(0.0);
        let mut power = 1.0;
        for k in 0..past(n) {
            let p = power;
            let row = mirror(k as isize, n);
            each(strip, row, &mut carry, move |sum, here| {
                (here, sum + p * here)
            });
            power *= z;
        }
        each(strip, 0, &mut carry, |sum, _| (sum, sum));
        for r in 1..n {
            each(strip, r, &mut carry, move |before, here| {
                let now = here + z * before;
                (now, now)
            });
        }
        // The carry holds the last row; the one before it goes in too.
        let before = strip.row(n - 2).to_owned();
        for (carry, before) in carry.iter_mut().zip(&before) {
            *carry = z / (z * z - 1.0) * (*carry + z * before);
        }
        each(strip, n - 1, &mut carry, |sum, _| (sum, sum));
        for r in (0..n - 1).rev() {
            each(strip, r, &mut carry, move |after, here| {
                let now = z * (after - here);
                (now, now)
            });
        }
    }
}

/// Replaces every value of a row, and what is carried along with it, by what `step` makes of
/// (carried, value): (new value, newly carried).
#[inline(always)]
fn each(
    strip: &mut ArrayViewMut2<f32>,
    row: usize,
    carry: &mut [f32; STRIP],
    step: impl Fn(f32, f32) -> (f32, f32),
) {
    if let Some(row) = strip.row_mut(row).into_slice() {
        for (value, carry) in row.iter_mut().zip(carry) {
            (*value, *carry) = step(*carry, *value);
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
        let mut lit = [0f32; LANES];
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
            assert!(lit[l] == 1.0);
        }
    }

    #[test]
    fn mirrored_points_are_read_as_single_ones_are() {
        let image = |seed: usize| {
            Array2::from_shape_fn((40, 70), |(r, c)| ((r * 31 + c * 17 + seed) % 23) as f32)
        };
        let splines = [SplineImage::new(&image(1)), SplineImage::new(&image(8))];
        let both = [&splines[0], &splines[1]];
        let mut read = 0;
        for (k, (from, slope)) in [
            (0.0, 0.0),
            (0.3, 0.01),
            (-0.2, 0.03),
            (2.95, 0.01),
            (-4.1, 0.02),
            (1.5, 0.2),
            (9.0, 0.0),
        ]
        .into_iter()
        .enumerate()
        {
            for start in [(0, 0), (8, 3), (27, 20), (54, 39)] {
                let half = [
                    std::array::from_fn(|l| from + slope * l as f32),
                    std::array::from_fn(|l| 0.4 * from - slope * l as f32),
                ];
                let mut fast = [[0.0; LANES]; 2];
                if !SplineImage::sample_both(both, start, &half, &mut fast) {
                    continue;
                }
                read += 1;
                for (image, sign) in [(0, -1.0), (1, 1.0)] {
                    let x = std::array::from_fn(|l| (start.0 + l) as f32 + sign * half[0][l]);
                    let y = std::array::from_fn(|l| start.1 as f32 + sign * half[1][l]);
                    let (mut slow, mut inside) = ([0.0; LANES], [0.0; LANES]);
                    both[image].sample(&x, &y, &mut slow, &mut inside);
                    for l in 0..LANES {
                        assert_eq!(inside[l], 1.0);
                        // Points rounded to single precision differ by 4e-6 px.
                        assert!(
                            (fast[image][l] - slow[l]).abs() < 2e-3,
                            "case {k} at {start:?}"
                        );
                    }
                }
            }
        }
        assert!(read >= 8, "only {read} blocks were read");
    }

    #[test]
    fn points_outside_are_dark() {
        let image = Array2::from_elem((20, 20), 1.0);
        let spline = SplineImage::new(&image);
        let (mut out, mut lit) = ([0.0; LANES], [1f32; LANES]);
        let x: [f32; LANES] = std::array::from_fn(|l| -8.0 + l as f32 * 2.0);
        spline.sample(&x, &[19.5; LANES], &mut out, &mut lit);
        assert!(lit.iter().all(|l| *l == 0.0));
        spline.sample(&x, &[19.0; LANES], &mut out, &mut lit);
        assert_eq!(lit.iter().filter(|l| **l == 1.0).count(), 10);
    }
}
