//! The particle pattern of an exposure without its background, and sums over it that can be
//! added up: lag correlations and the spread of grey levels.

use std::ops::Range;

use ndarray::{Array2, Zip};
use rayon::prelude::*;

/// Half side, px, of the square whose mean is background and whose contrast levels the light.
const AROUND: usize = 32;

/// A part of an image larger than this is looked at in some of its rows.
const MOST_PIXELS: usize = 1 << 20;

/// Largest lag along each axis, px.
pub(super) const LAGS: usize = 8;

/// Spread of levelled grey values: from, width of an interval, how many.
const LEVELS: (f32, f32, usize) = (-10.0, 0.02, 8000);

/// One exposure, what is slow taken out; 0 where nothing can be said.
pub(super) struct Pattern {
    /// Grey level less the mean of what is lit up to 32 px away, over `contrast`: uneven light is
    /// levelled. 0 where hidden.
    pub levelled: Array2<f32>,
    /// Root mean square of grey levels about that mean.
    pub contrast: Array2<f32>,
    /// What counts; `None` where all does.
    pub hidden: Option<Array2<bool>>,
}

impl Pattern {
    pub fn of(image: &Array2<f32>, hidden: Option<&Array2<bool>>) -> Pattern {
        let lit = hidden.map(|hidden| hidden.map(|hidden| f32::from(u8::from(!hidden))));
        let mean = local_mean(image, lit.as_ref(), AROUND);
        let mut raised = image - &mean;
        if let Some(lit) = &lit {
            raised *= lit;
        }
        let square = local_mean(&raised.map(|r| r * r), lit.as_ref(), AROUND);
        let square = local_mean(&square, lit.as_ref(), AROUND / 2);
        let contrast = square.map(|square| square.sqrt());
        let level = |raised: &f32, contrast: &f32| {
            if *contrast > 0.0 {
                raised / contrast
            } else {
                0.0
            }
        };
        Pattern {
            levelled: Zip::from(&raised).and(&contrast).map_collect(level),
            contrast,
            hidden: hidden.cloned(),
        }
    }

    /// Sums over the pixels of a part of it, of a large one over some of its rows.
    pub fn sums(&self, rows: Range<usize>, columns: Range<usize>) -> Sums {
        let apart = (rows.len() * columns.len()).div_ceil(MOST_PIXELS);
        let rows: Vec<usize> = rows.step_by(apart).collect();
        let stretches: Vec<Sums> = rows
            .par_chunks(32)
            .map(|rows| {
                let mut sums = Sums::default();
                for row in rows {
                    for column in columns.clone() {
                        sums.take(self, *row, column);
                    }
                }
                sums
            })
            .collect();
        // Added in order: the number of threads does not change the result.
        stretches.into_iter().fold(Sums::default(), Sums::plus)
    }

    /// Whether a pixel is lit and something is known of it.
    fn counts(&self, at: (usize, usize)) -> bool {
        self.contrast[at] > 0.0 && self.hidden.as_ref().is_none_or(|hidden| !hidden[at])
    }
}

/// Mean over the lit pixels up to `half` px away along each axis; 0 where there are none.
fn local_mean(image: &Array2<f32>, lit: Option<&Array2<f32>>, half: usize) -> Array2<f32> {
    let sums = Summed::of(image, lit);
    let counts = lit.map(|lit| Summed::of(lit, None));
    Array2::from_shape_fn(image.dim(), |at| {
        let (sum, area) = sums.about(at, half);
        let count = counts.as_ref().map_or(area, |lit| lit.about(at, half).0);
        if count > 0.0 {
            (sum / count) as f32
        } else {
            0.0
        }
    })
}

/// Sums over all pixels above and left of each corner.
pub(super) struct Summed(Array2<f64>);

impl Summed {
    /// Of the image, times its weights.
    pub fn of(image: &Array2<f32>, weights: Option<&Array2<f32>>) -> Summed {
        let (rows, columns) = image.dim();
        let mut sums = Array2::zeros((rows + 1, columns + 1));
        for row in 0..rows {
            let mut along = 0.0;
            for column in 0..columns {
                let at = (row, column);
                along += f64::from(image[at] * weights.map_or(1.0, |weights| weights[at]));
                sums[(row + 1, column + 1)] = sums[(row, column + 1)] + along;
            }
        }
        Summed(sums)
    }

    /// The sum over the square up to `half` px from a pixel, as far as it is in the image, and
    /// how many pixels those are.
    pub fn about(&self, (row, column): (usize, usize), half: usize) -> (f64, f64) {
        let (rows, columns) = self.0.dim();
        let ends = |at: usize, n: usize| (at.saturating_sub(half), (at + half + 1).min(n - 1));
        let ((top, bottom), (left, right)) = (ends(row, rows), ends(column, columns));
        let sum = self.0[(bottom, right)] - self.0[(top, right)] - self.0[(bottom, left)]
            + self.0[(top, left)];
        (sum, ((bottom - top) * (right - left)) as f64)
    }
}

/// What adds up over pixels, exposures and pairs.
#[derive(Clone)]
pub(super) struct Sums {
    /// Pixels.
    pub pixels: f64,
    /// Products of levelled values (0..=LAGS columns, -LAGS..=LAGS rows) apart, and their number.
    products: Vec<(f64, f64)>,
    /// Of the contrast, and of one over its square.
    contrasts: (f64, f64),
    /// How many levelled values in each interval.
    levels: Vec<u32>,
}

impl Default for Sums {
    fn default() -> Self {
        Sums {
            pixels: 0.0,
            products: vec![(0.0, 0.0); (LAGS + 1) * (2 * LAGS + 1)],
            contrasts: (0.0, 0.0),
            levels: vec![0; LEVELS.2],
        }
    }
}

impl Sums {
    fn take(&mut self, pattern: &Pattern, row: usize, column: usize) {
        if !pattern.counts((row, column)) {
            return;
        }
        let value = pattern.levelled[(row, column)];
        let (rows, columns) = pattern.levelled.dim();
        self.pixels += 1.0;
        let place = ((value - LEVELS.0) / LEVELS.1) as usize;
        self.levels[place.min(LEVELS.2 - 1)] += 1;
        let contrast = f64::from(pattern.contrast[(row, column)]);
        self.contrasts.0 += contrast;
        self.contrasts.1 += contrast.powi(-2);
        let right = (column + LAGS + 1).min(columns);
        for down in 0..2 * LAGS + 1 {
            let Some(other) = (row + down).checked_sub(LAGS).filter(|other| *other < rows) else {
                continue;
            };
            let sums = &mut self.products[down * (LAGS + 1)..];
            for (sum, there) in sums.iter_mut().zip(column..right) {
                if pattern.hidden.as_ref().is_some_and(|h| h[(other, there)]) {
                    continue;
                }
                sum.0 += f64::from(value * pattern.levelled[(other, there)]);
                sum.1 += 1.0;
            }
        }
    }

    /// The sums of both.
    pub fn plus(mut self, other: Sums) -> Sums {
        self.pixels += other.pixels;
        for (a, b) in self.products.iter_mut().zip(&other.products) {
            *a = (a.0 + b.0, a.1 + b.1);
        }
        self.contrasts.0 += other.contrasts.0;
        self.contrasts.1 += other.contrasts.1;
        for (a, b) in self.levels.iter_mut().zip(&other.levels) {
            *a += b;
        }
        self
    }

    /// Mean product of levelled values (columns, rows) apart.
    pub fn correlation(&self, columns: usize, rows: i32) -> f64 {
        let down = (rows + LAGS as i32) as usize;
        let (sum, count) = self.products[down * (LAGS + 1) + columns];
        if count > 0.0 { sum / count } else { 0.0 }
    }

    /// Grey levels that the levelled value 1 stands for: on average over the image, and for noise
    /// that is the same everywhere, whose share is large where the light is weak.
    pub fn contrast(&self) -> (f64, f64) {
        let (mean, inverse_square) = self.contrasts;
        (mean / self.pixels, (self.pixels / inverse_square).sqrt())
    }

    /// Logarithm of the modulus of the mean of exp(i t y) over the levelled values y, minus
    /// infinity where it is zero. Values are taken for the middles of their intervals, which are
    /// narrow against 1/t.
    pub fn log_characteristic(&self, t: f64) -> f64 {
        let (mut cosine, mut sine, mut count) = (0.0, 0.0, 0.0);
        for (k, n) in self.levels.iter().enumerate() {
            if *n > 0 {
                let level = f64::from(LEVELS.0) + (k as f64 + 0.5) * f64::from(LEVELS.1);
                let (s, c) = (t * level).sin_cos();
                let n = f64::from(*n);
                (cosine, sine, count) = (cosine + n * c, sine + n * s, count + n);
            }
        }
        0.5 * ((cosine * cosine + sine * sine) / (count * count)).ln()
    }
}
