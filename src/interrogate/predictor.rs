//! The displacement found so far, as a smooth field that can be read at every pixel.

use std::ops::Range;

use multiversion::multiversion;
use ndarray::{Array2, ArrayViewMut1, Axis};

use super::layout::Layout;

/// Displacement of each window, px a frame interval; rows and row shifts count downwards.
#[derive(Clone, Debug)]
pub(crate) struct Shifts {
    /// Shift along columns (right).
    pub x: Array2<f64>,
    /// Shift along rows (down).
    pub y: Array2<f64>,
}

impl Shifts {
    /// No displacement.
    pub fn zero(shape: (usize, usize)) -> Self {
        Self {
            x: Array2::zeros(shape),
            y: Array2::zeros(shape),
        }
    }

    /// The shifts with what the next window cannot hold stable removed.
    ///
    /// A window answers the shortest waves with the wrong sign (an even one of side W with
    /// sinc(W/λ), negative for λ between W/2 and W; a tapered one less, and only for shorter
    /// waves): fed back through the predictor they would grow. Each axis is therefore smoothed by the least-squares parabola over about 1.25 W (Savitzky & Golay
    /// 1964), which leaves waves longer than 1.5 W nearly whole. Towards an edge the stretch
    /// shrinks evenly, so that a straight profile stays straight.
    pub fn smoothed(&self, layout: &Layout) -> Self {
        let (rx, ry) = (
            reach(layout.window.width, layout.step_x),
            reach(layout.window.height, layout.step_y),
        );
        let smooth = |values: &Array2<f64>| {
            let mut out = values.clone();
            for line in out.lanes_mut(Axis(1)) {
                smooth_line(line, rx);
            }
            for line in out.lanes_mut(Axis(0)) {
                smooth_line(line, ry);
            }
            out
        };
        Self {
            x: smooth(&self.x),
            y: smooth(&self.y),
        }
    }
}

/// What [`Shifts::smoothed`] leaves of a wave of `cycles` per window step along one axis.
pub(crate) fn smoothing_response(side: usize, step: usize, cycles: f64) -> f64 {
    let turn = std::f64::consts::TAU * cycles;
    match reach(side, step) {
        0 => 1.0,
        1 => (14.0 + 2.0 * turn.cos()) / 16.0,
        m => parabola_weights(m)
            .enumerate()
            .map(|(k, w)| w * (turn * (k as f64 - m as f64)).cos())
            .sum(),
    }
}

/// Windows on either side that the smoothing of the predictor takes in.
fn reach(side: usize, step: usize) -> usize {
    (5 * side) / (8 * step)
}

fn smooth_line(mut line: ArrayViewMut1<f64>, reach: usize) {
    let n = line.len();
    let old: Vec<f64> = line.to_vec();
    for (i, value) in line.iter_mut().enumerate() {
        let m = reach.min(i).min(n - 1 - i);
        *value = match m {
            0 => old[i],
            // Three points fix a parabola; a light pull to their mean still damps the shortest
            // wave the grid carries.
            1 => (old[i - 1] + 14.0 * old[i] + old[i + 1]) / 16.0,
            m => parabola_weights(m)
                .zip(&old[i - m..=i + m])
                .map(|(w, v)| w * v)
                .sum(),
        };
    }
}

/// Weights that give the middle of the least-squares parabola through 2m + 1 even points.
fn parabola_weights(m: usize) -> impl Iterator<Item = f64> {
    let m = m as f64;
    let norm = (2.0 * m - 1.0) * (2.0 * m + 1.0) * (2.0 * m + 3.0) / 3.0;
    let count = 2 * m as usize + 1;
    (0..count).map(move |k| {
        let i = k as f64 - m;
        (3.0 * m * m + 3.0 * m - 1.0 - 5.0 * i * i) / norm
    })
}

/// Shifts between the windows: a natural cubic spline through them along each axis, continued
/// by straight lines past the outermost windows.
pub(crate) struct Predictor {
    coefficients: Axes,
    columns: Runs,
    rows: Vec<Tap>,
    /// Where the windows lie, and how many coefficients stand before the first, along x and y.
    layout: Layout,
    pads: (usize, usize),
}

struct Axes {
    x: Array2<f32>,
    y: Array2<f32>,
}

/// Four neighbouring coefficients and their weights.
#[derive(Clone, Copy)]
struct Tap {
    first: usize,
    weights: [f32; 4],
}

/// The taps of all pixels of a row: those that share their coefficients together.
struct Runs {
    /// First coefficient, and the pixels that begin there.
    runs: Vec<(usize, Range<usize>)>,
    /// Weights of the four coefficients at every pixel.
    weights: [Vec<f32>; 4],
}

impl Runs {
    fn new(taps: &[Tap]) -> Self {
        let mut runs: Vec<(usize, Range<usize>)> = Vec::new();
        for (pixel, tap) in taps.iter().enumerate() {
            match runs.last_mut() {
                Some((first, pixels)) if *first == tap.first => pixels.end = pixel + 1,
                _ => runs.push((tap.first, pixel..pixel + 1)),
            }
        }
        Self {
            runs,
            weights: std::array::from_fn(|k| taps.iter().map(|tap| tap.weights[k]).collect()),
        }
    }

    /// The spline of `coefficients` at every pixel.
    fn read(&self, coefficients: &[f32], out: &mut [f32]) {
        read_runs(&self.runs, &self.weights, coefficients, out);
    }
}

#[allow(
    clippy::needless_range_loop,
    reason = "a loop over lanes of several arrays: the form that vectorises whole"
)]
#[multiversion(targets("x86_64+avx512f+avx512dq+avx512vl+fma", "x86_64+avx2+fma"))]
fn read_runs(
    runs: &[(usize, Range<usize>)],
    weights: &[Vec<f32>; 4],
    coefficients: &[f32],
    out: &mut [f32],
) {
    const BLOCK: usize = 8;
    let [w0, w1, w2, w3] = weights;
    for (first, pixels) in runs {
        let c = &coefficients[*first..*first + 4];
        let (c0, c1, c2, c3) = (c[0], c[1], c[2], c[3]);
        let mut at = pixels.start;
        while at + BLOCK <= pixels.end {
            let range = at..at + BLOCK;
            let w = (
                &w0[range.clone()],
                &w1[range.clone()],
                &w2[range.clone()],
                &w3[range.clone()],
            );
            let mut sum = [0f32; BLOCK];
            for l in 0..BLOCK {
                sum[l] = w.0[l] * c0 + w.1[l] * c1 + w.2[l] * c2 + w.3[l] * c3;
            }
            out[range].copy_from_slice(&sum);
            at += BLOCK;
        }
        for i in at..pixels.end {
            out[i] = w0[i] * c0 + w1[i] * c1 + w2[i] * c2 + w3[i] * c3;
        }
    }
}

impl Predictor {
    /// The spline through `shifts` on `layout`, to be read on an image of `width` x `height` px.
    pub fn new(shifts: &Shifts, layout: &Layout, width: usize, height: usize) -> Self {
        let (columns, pad_x) = taps(layout.first_x(), layout.step_x, layout.columns, width);
        let (rows, pad_y) = taps(layout.first_y(), layout.step_y, layout.rows, height);
        let coefficients = |values: &Array2<f64>| {
            let mut wide = Array2::<f64>::zeros((layout.rows, layout.columns + 2 * pad_x));
            for (line, out) in values.outer_iter().zip(wide.outer_iter_mut()) {
                natural_spline(&line.to_vec(), pad_x, out);
            }
            let mut all = Array2::<f64>::zeros((layout.rows + 2 * pad_y, wide.ncols()));
            for (line, out) in wide.columns().into_iter().zip(all.columns_mut()) {
                natural_spline(&line.to_vec(), pad_y, out);
            }
            all.mapv(|v| v as f32)
        };
        Self {
            coefficients: Axes {
                x: coefficients(&shifts.x),
                y: coefficients(&shifts.y),
            },
            columns: Runs::new(&columns),
            rows,
            layout: *layout,
            pads: (pad_x, pad_y),
        }
    }

    /// Shifts along one image row, written to `dx` and `dy` (one value a column).
    pub fn row(&self, row: usize, dx: &mut [f32], dy: &mut [f32], line: &mut Vec<f32>) {
        for (coefficients, out) in [(&self.coefficients.x, dx), (&self.coefficients.y, dy)] {
            let tap = self.rows[row];
            line.clear();
            line.resize(coefficients.ncols(), 0.0);
            for (k, w) in tap.weights.iter().enumerate() {
                let from = coefficients.row(tap.first + k);
                for (sum, c) in line.iter_mut().zip(from.iter()) {
                    *sum += w * c;
                }
            }
            self.columns.read(line, out);
        }
    }

    /// Shift (x, y) at a point that may lie between pixels.
    pub fn at(&self, x: f64, y: f64) -> (f64, f64) {
        let layout = &self.layout;
        let tx = tap_at((x - layout.first_x()) / layout.step_x as f64, self.pads.0);
        let ty = tap_at((y - layout.first_y()) / layout.step_y as f64, self.pads.1);
        let read = |coefficients: &Array2<f32>| {
            let mut sum = 0.0;
            for (k, wy) in ty.weights.iter().enumerate() {
                for (m, wx) in tx.weights.iter().enumerate() {
                    let c = coefficients[(ty.first + k, tx.first + m)];
                    sum += f64::from(*wy) * f64::from(*wx) * f64::from(c);
                }
            }
            sum
        };
        (read(&self.coefficients.x), read(&self.coefficients.y))
    }
}

/// Taps of every pixel along one axis, and how many coefficients stand before the first node.
fn taps(first: f64, step: usize, nodes: usize, pixels: usize) -> (Vec<Tap>, usize) {
    let step = step as f64;
    let before = (first / step).ceil() as usize + 2;
    let after = ((pixels as f64 - 1.0 - first) / step - (nodes as f64 - 1.0)).ceil() as usize + 3;
    let pad = before.max(after);
    let taps = (0..pixels)
        .map(|p| tap_at((p as f64 - first) / step, pad))
        .collect();
    (taps, pad)
}

fn tap_at(node: f64, pad: usize) -> Tap {
    let floor = node.floor();
    let t = node - floor;
    let u = 1.0 - t;
    let weights = [
        u * u * u,
        4.0 - 6.0 * t * t + 3.0 * t * t * t,
        4.0 - 6.0 * u * u + 3.0 * u * u * u,
        t * t * t,
    ]
    .map(|w| (w / 6.0) as f32);
    Tap {
        first: (floor as isize + pad as isize - 1) as usize,
        weights,
    }
}

/// Cubic B-spline coefficients of the natural spline through `values`, with `pad` more on each
/// side that continue it by straight lines.
fn natural_spline(values: &[f64], pad: usize, mut out: ArrayViewMut1<f64>) {
    let n = values.len();
    // Natural ends make the outermost coefficients equal to the values; what is left is the
    // tridiagonal system (1 4 1)/6, solved by elimination.
    let mut c = values.to_vec();
    if n > 2 {
        let inner = n - 2;
        let mut diagonal = vec![4.0; inner];
        let mut right: Vec<f64> = values[1..n - 1].iter().map(|v| 6.0 * v).collect();
        right[0] -= values[0];
        right[inner - 1] -= values[n - 1];
        for i in 1..inner {
            let factor = 1.0 / diagonal[i - 1];
            diagonal[i] -= factor;
            right[i] -= factor * right[i - 1];
        }
        for i in (0..inner).rev() {
            let above = if i + 1 < inner { c[i + 2] } else { 0.0 };
            c[i + 1] = (right[i] - above) / diagonal[i];
        }
    }
    let (slope_first, slope_last) = if n > 1 {
        (c[1] - c[0], c[n - 1] - c[n - 2])
    } else {
        (0.0, 0.0)
    };
    for (k, value) in out.iter_mut().enumerate() {
        let i = k as isize - pad as isize;
        *value = if i < 0 {
            c[0] + i as f64 * slope_first
        } else if i as usize >= n {
            c[n - 1] + (i as usize + 1 - n) as f64 * slope_last
        } else {
            c[i as usize]
        };
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::interrogate::plan::WindowSize;

    fn layout() -> Layout {
        let window = WindowSize {
            width: 32,
            height: 32,
        };
        Layout::new(window, 0.75, 200, 180).unwrap()
    }

    fn shifts(layout: &Layout, f: impl Fn(f64, f64) -> (f64, f64)) -> Shifts {
        let at = |(j, i): (usize, usize)| {
            f(
                layout.first_x() + (i * layout.step_x) as f64,
                layout.first_y() + (j * layout.step_y) as f64,
            )
        };
        Shifts {
            x: Array2::from_shape_fn(layout.shape(), |ji| at(ji).0),
            y: Array2::from_shape_fn(layout.shape(), |ji| at(ji).1),
        }
    }

    #[test]
    fn a_plane_is_read_exactly_even_past_the_last_window() {
        let layout = layout();
        let plane = |x: f64, y: f64| (1.0 + 0.08 * x - 0.03 * y, -2.0 + 0.01 * x + 0.05 * y);
        let shifts = shifts(&layout, plane).smoothed(&layout);
        let predictor = Predictor::new(&shifts, &layout, 200, 180);
        let (mut dx, mut dy) = (vec![0.0; 200], vec![0.0; 200]);
        for row in [0, 1, 77, 179] {
            predictor.row(row, &mut dx, &mut dy, &mut Vec::new());
            for x in 0..200 {
                let exact = plane(x as f64, row as f64);
                assert!((f64::from(dx[x]) - exact.0).abs() < 1e-4);
                assert!((f64::from(dy[x]) - exact.1).abs() < 1e-4);
            }
        }
    }

    #[test]
    fn the_spline_passes_through_the_windows() {
        let layout = layout();
        let wave = |x: f64, y: f64| ((x / 9.0).sin() * 3.0, (y / 7.0).cos());
        let shifts = shifts(&layout, wave);
        let predictor = Predictor::new(&shifts, &layout, 200, 180);
        for j in 0..layout.rows {
            for i in 0..layout.columns {
                let x = layout.first_x() + (i * layout.step_x) as f64;
                let y = layout.first_y() + (j * layout.step_y) as f64;
                let (dx, dy) = predictor.at(x, y);
                assert!((dx - shifts.x[(j, i)]).abs() < 1e-5);
                assert!((dy - shifts.y[(j, i)]).abs() < 1e-5);
            }
        }
    }

    #[test]
    fn smoothing_keeps_every_unstable_wave_from_growing() {
        // |F (1 - S)| < 1 for all waves the grid carries, F measured on a long line, S that of an
        // even window: the worst case, since a tapered one is never further below zero.
        for (side, step) in [(32, 8), (32, 16), (32, 4), (24, 6), (64, 16)] {
            let reach = (5 * side) / (8 * step);
            for k in 1..=100 {
                let per_node = std::f64::consts::PI * k as f64 / 100.0;
                let n = 101;
                let mut line =
                    ndarray::Array1::from_shape_fn(n, |i| (per_node * (i as f64 - 50.0)).cos());
                smooth_line(line.view_mut(), reach);
                let f = line[50];
                let phase = per_node * side as f64 / step as f64 / 2.0;
                let s = phase.sin() / phase;
                assert!((f * (1.0 - s)).abs() < 1.0, "{side}/{step} at {per_node}");
            }
        }
    }
}
