//! Even lighting: what the sheet and the background do to grey levels over more than a few
//! particle images is taken out before anything is correlated.
//!
//! Left in, a slope of brightness or a reflection that stands still correlates better with itself
//! than the particles do, and a first pass locks on it. Each grey level I becomes
//! (I - m) / √(s² + (0.1 S)²), m and s the mean and standard deviation over a square round the
//! pixel and S that of the whole image: local normalisation, common practice without one source.
//! The square is several particle images wide, so that the pattern itself hardly changes.

use multiversion::multiversion;
use ndarray::{Array2, Axis, s};
use rayon::prelude::*;

use super::spline::LANES;

/// Rows done in one go, whatever the number of threads, so that sums are rounded alike.
const STRETCH: usize = 128;

/// Share of the whole image's standard deviation below which contrast counts as none.
const LEAST_CONTRAST: f64 = 0.1;

/// The image with its lighting made even over squares of `side` px; zeros where it is constant.
pub(crate) fn flattened(image: &Array2<f32>, side: usize) -> Array2<f32> {
    let image = image.as_standard_layout();
    let (height, width) = image.dim();
    let n = image.len() as f64;
    // About a level of the image itself, so that little is lost to rounding; sums of rows first, so
    // that they are the same on any number of threads.
    let about = image.first().copied().unwrap_or_default();
    let rows: Vec<[f64; 2]> = image
        .axis_iter(Axis(0))
        .into_par_iter()
        .map(|row| moments(row.to_slice().unwrap_or_default(), about))
        .collect();
    let sum = |k: usize| rows.iter().map(|row| row[k]).sum::<f64>() / n;
    let (shift, square) = (sum(0), sum(1));
    let mean = f64::from(about) + shift;
    let variance = (square - shift * shift).max(0.0);
    let mut out = Array2::zeros((height, width));
    if variance <= (1e-6 * mean).powi(2) {
        return out;
    }
    let floor = (LEAST_CONTRAST * LEAST_CONTRAST * variance) as f32;
    let half = side / 2;
    out.axis_chunks_iter_mut(Axis(0), STRETCH)
        .into_par_iter()
        .enumerate()
        .for_each_init(
            || Squares::new(width, half),
            |squares, (stretch, mut out)| {
                let top = stretch * STRETCH;
                let row = |r: usize| image.slice(s![r, ..]).to_slice().unwrap_or_default();
                squares.clear();
                for r in top.saturating_sub(half)..(top + half).min(height) {
                    squares.add(row(r), mean as f32, 1.0);
                }
                for (k, mut out) in out.outer_iter_mut().enumerate() {
                    let r = top + k;
                    if r + half < height {
                        squares.add(row(r + half), mean as f32, 1.0);
                    }
                    if k > 0 && r > half {
                        squares.add(row(r - half - 1), mean as f32, -1.0);
                    }
                    let rows = (r + half).min(height - 1) - r.saturating_sub(half) + 1;
                    if let Some(out) = out.as_slice_mut() {
                        squares.flatten(row(r), mean as f32, rows, floor, out);
                    }
                }
            },
        );
    out
}

/// Sums over a band of rows, and along it.
struct Squares {
    half: usize,
    /// Sums of levels and of their squares down each column.
    columns: [Vec<f32>; 2],
    /// The same with zeros on either side, and what sums along the row are doubled in.
    padded: [Vec<f32>; 2],
    longer: Vec<f32>,
    sums: [Vec<f32>; 2],
}

impl Squares {
    fn new(width: usize, half: usize) -> Self {
        let room = |length: usize| [vec![0f32; length], vec![0f32; length]];
        let wide = width + 2 * half + 1;
        Self {
            half,
            columns: room(width),
            padded: room(wide),
            longer: vec![0f32; wide],
            sums: room(wide),
        }
    }

    fn clear(&mut self) {
        for sums in &mut self.columns {
            sums.fill(0.0);
        }
    }

    fn add(&mut self, row: &[f32], mean: f32, sign: f32) {
        let [levels, squares] = &mut self.columns;
        add_row(row, mean, sign, levels, squares);
    }

    /// Flattens a row round which the columns hold the sums of `rows` rows.
    fn flatten(&mut self, row: &[f32], mean: f32, rows: usize, floor: f32, out: &mut [f32]) {
        let (width, half) = (row.len(), self.half);
        for axis in 0..2 {
            let padded = &mut self.padded[axis];
            padded[half..half + width].copy_from_slice(&self.columns[axis]);
            padded[..half].fill(0.0);
            padded[half + width..].fill(0.0);
            run_sums(padded, &mut self.longer, 2 * half + 1, &mut self.sums[axis]);
        }
        let count = |c: usize| {
            let columns = (c + half).min(width - 1) - c.saturating_sub(half) + 1;
            1.0 / (rows * columns) as f32
        };
        let inner = half.min(width)..width.saturating_sub(half).max(half.min(width));
        let whole = 1.0 / (rows * (2 * half + 1)) as f32;
        let [levels, squares] = &self.sums;
        for c in (0..inner.start).chain(inner.end..width) {
            let share = count(c);
            out[c] = flat(row[c] - mean, levels[c] * share, squares[c] * share, floor);
        }
        flatten_inner(row, mean, whole, floor, levels, squares, out, inner);
    }
}

#[inline(always)]
fn flat(level: f32, mean: f32, square: f32, floor: f32) -> f32 {
    let variance = (square - mean * mean).max(0.0);
    (level - mean) / (variance + floor).sqrt()
}

#[multiversion(targets("x86_64+avx512f+avx512dq+avx512vl+fma", "x86_64+avx2+fma"))]
fn add_row(row: &[f32], mean: f32, sign: f32, levels: &mut [f32], squares: &mut [f32]) {
    for ((level, sum), square) in row.iter().zip(levels).zip(squares) {
        let level = level - mean;
        *sum += sign * level;
        *square += sign * level * level;
    }
}

#[allow(clippy::too_many_arguments, reason = "slices of one row, side by side")]
#[multiversion(targets("x86_64+avx512f+avx512dq+avx512vl+fma", "x86_64+avx2+fma"))]
fn flatten_inner(
    row: &[f32],
    mean: f32,
    share: f32,
    floor: f32,
    levels: &[f32],
    squares: &[f32],
    out: &mut [f32],
    columns: std::ops::Range<usize>,
) {
    let out = &mut out[columns.clone()];
    let (row, levels, squares) = (
        &row[columns.clone()],
        &levels[columns.clone()],
        &squares[columns],
    );
    for (((out, level), sum), square) in out.iter_mut().zip(row).zip(levels).zip(squares) {
        *out = flat(level - mean, sum * share, square * share, floor);
    }
}

/// Sum of a row's levels less `about`, and of their squares.
#[multiversion(targets("x86_64+avx512f+avx512dq+avx512vl+fma", "x86_64+avx2+fma"))]
fn moments(row: &[f32], about: f32) -> [f64; 2] {
    let (blocks, rest) = row.as_chunks::<LANES>();
    let (mut sum, mut square) = ([0f32; LANES], [0f32; LANES]);
    for block in blocks {
        for l in 0..LANES {
            let level = block[l] - about;
            sum[l] += level;
            square[l] += level * level;
        }
    }
    for (l, level) in rest.iter().enumerate() {
        let level = level - about;
        sum[l] += level;
        square[l] += level * level;
    }
    [sum, square].map(|lanes| lanes.iter().map(|x| f64::from(*x)).sum())
}

/// Sums of `length` values from each place on, by doubling; `runs` is used up, and holds the
/// values at first.
#[multiversion(targets("x86_64+avx512f+avx512dq+avx512vl+fma", "x86_64+avx2+fma"))]
fn run_sums(runs: &mut Vec<f32>, longer: &mut Vec<f32>, length: usize, sums: &mut [f32]) {
    sums.fill(0.0);
    // `runs` holds sums of `run` values; the bits of `length` say which of them make it up.
    let (mut run, mut done) = (1, 0);
    while done < length {
        if length & run != 0 {
            for (sum, more) in sums.iter_mut().zip(&runs[done.min(runs.len())..]) {
                *sum += more;
            }
            done += run;
        }
        let ahead = &runs[run.min(runs.len())..];
        for ((longer, here), ahead) in longer.iter_mut().zip(runs.iter()).zip(ahead) {
            *longer = here + ahead;
        }
        let end = ahead.len();
        longer[end..].copy_from_slice(&runs[end..]);
        std::mem::swap(runs, longer);
        run *= 2;
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn each_level_is_freed_of_the_mean_and_the_scatter_of_its_square() {
        let (height, width, side) = (150, 61, 25);
        let image = Array2::from_shape_fn((height, width), |(r, c)| {
            100.0 + 0.7 * c as f32 + 5.0 * ((r * 31 + c * 17) % 23) as f32
        });
        let n = image.len() as f64;
        let mean = image.iter().map(|x| f64::from(*x)).sum::<f64>() / n;
        let whole = image
            .iter()
            .map(|x| (f64::from(*x) - mean).powi(2))
            .sum::<f64>()
            / n;
        let flat = flattened(&image, side);
        for (r, c) in [(0, 0), (3, 30), (70, 60), (127, 5), (128, 12), (149, 48)] {
            let half = side / 2;
            let square = image.slice(s![
                r.max(half) - half..(r + half + 1).min(height),
                c.max(half) - half..(c + half + 1).min(width)
            ]);
            let n = square.len() as f64;
            let m = square.iter().map(|x| f64::from(*x)).sum::<f64>() / n;
            let v = square
                .iter()
                .map(|x| (f64::from(*x) - m).powi(2))
                .sum::<f64>()
                / n;
            let exact = (f64::from(image[(r, c)]) - m) / (v + 0.01 * whole).sqrt();
            assert!((f64::from(flat[(r, c)]) - exact).abs() < 2e-4, "{r} {c}");
        }
    }

    #[test]
    fn a_constant_image_becomes_nothing_and_small_ones_are_no_trouble() {
        for shape in [(1, 1), (8, 8), (3, 200), (200, 3)] {
            assert!(
                flattened(&Array2::from_elem(shape, 7.0), 25)
                    .iter()
                    .all(|x| *x == 0.0)
            );
            let uneven = Array2::from_shape_fn(shape, |(r, c)| ((r * 5 + c * 3) % 7) as f32);
            assert!(flattened(&uneven, 25).iter().all(|x| x.is_finite()));
        }
    }
}
