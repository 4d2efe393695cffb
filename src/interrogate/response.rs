//! What the passes of a plan make of a wave: of a true one, and of noise.
//!
//! A window of weight g answers a wave of displacement with S, the transform of g. A pass adds
//! S (truth - prediction) to the prediction, and the prediction is the smoothed result of the
//! pass before, F T. So T grows from pass to pass as T' = S + (1 - S) F T. Noise enters a window
//! by the same weights as displacement, so T is also what the passes make of noise: its spectrum
//! gives the gain against a single pass and the correlation of errors between neighbours.

use std::sync::Arc;

use ndarray::Array2;

use super::layout::Layout;
use super::smoothing::AlongAxis;
use super::statistics::REACH;
use super::taper::Taper;
use crate::field::ErrorCorrelation;

/// Wave numbers along each axis from 0 to half a cycle a px, in steps.
const STEPS: usize = 96;

/// Area, px², over which the light of an even spread of particles equals that of one particle met
/// at random, the brighter more often: mean of the squared energies of particle images over their
/// squared mean, 1.6 in a Gaussian sheet, over 0.06 particles a px². Sparser particles clump
/// more; the uncertainty is then some per cent too small.
const CLUMP_PX2: f64 = 27.0;

/// What becomes of a single window's error in the finished field.
#[derive(Clone, Debug, PartialEq)]
pub(crate) struct ErrorModel {
    /// Factor from the uncertainty a last window shows by itself to that of the vector: what the
    /// passes before hid from it, and what they add.
    pub gain: f64,
    /// How errors of neighbours go together.
    pub correlation: Arc<ErrorCorrelation>,
}

/// The transfer of waves by a sequence of passes, on a lattice of wave numbers.
#[derive(Clone, Debug)]
pub(crate) struct Response {
    /// Largest wave number of the lattice, cycles a px, on each axis.
    limit: (f64, f64),
    /// Transfer at (row: along y, column: along x).
    transfer: Vec<f64>,
    /// Transfer of the last window alone.
    single: Vec<f64>,
    /// Transfer of the last pass's predictor; zero when it had none.
    predicted: Vec<f64>,
}

impl Response {
    /// Follows the passes laid out by `layouts`.
    pub fn new(layouts: &[Layout]) -> Option<Self> {
        let last = layouts.last()?;
        // The weights end a window's spectrum well before four cycles a window.
        let limit = |side: usize| (4.0 / side as f64).min(0.5);
        let limit = (limit(last.window.width), limit(last.window.height));
        let mut transfer: Option<Vec<f64>> = None;
        let mut single = Vec::new();
        let mut predicted = Vec::new();
        let mut before: Option<&Layout> = None;
        for layout in layouts {
            let [x, y] = [
                (limit.0, layout.window.width),
                (limit.1, layout.window.height),
            ]
            .map(|(limit, side)| {
                let taper = Taper::new(side);
                (0..STEPS)
                    .map(|k| taper.response(limit * k as f64 / (STEPS - 1) as f64))
                    .collect::<Vec<_>>()
            });
            single = outer(&y, &x);
            predicted = match (&transfer, before) {
                (Some(old), Some(before)) => smoothing(before, limit)
                    .iter()
                    .zip(old)
                    .map(|(f, t)| f * t)
                    .collect(),
                _ => vec![0.0; single.len()],
            };
            let pass = |(s, p): (&f64, &f64)| s + (1.0 - s) * p;
            transfer = Some(single.iter().zip(&predicted).map(pass).collect());
            before = Some(layout);
        }
        Some(Self {
            limit,
            transfer: transfer?,
            single,
            predicted,
        })
    }

    /// Ratio of the random error after all passes to that of the last window alone.
    pub fn gain(&self) -> f64 {
        let flat = vec![1.0; STEPS];
        let power = |t: &[f64]| sum(t, &flat, &flat);
        (power(&self.transfer) / power(&self.single)).sqrt()
    }

    /// Share of the noise that is left to see in the deformed images of the last pass, to sums
    /// that join pixels up to `reach` apart on each axis: the predictor has already followed,
    /// and so taken out, its longest waves.
    ///
    /// What is taken out with a pixel's own noise is taken from all pixels joined with it, and by
    /// as much as they shine. Light comes in particles: round a pixel that shines there is more
    /// than in a square of that size anywhere, by what one particle is worth ([`CLUMP_PX2`]).
    pub fn left_to_see(&self, reach: usize) -> f64 {
        // The spectrum of such sums: a box of 2 reach + 1 px on each axis.
        let along = |k: f64| -> f64 {
            let turn = std::f64::consts::TAU * k;
            1.0 + 2.0 * (1..=reach).map(|m| (turn * m as f64).cos()).sum::<f64>()
        };
        let cell = 4.0 * self.limit.0 * self.limit.1 / ((STEPS - 1) * (STEPS - 1)) as f64;
        let axis = |limit: f64| -> Vec<f64> {
            let at = |k: usize| along(limit * k as f64 / (STEPS - 1) as f64);
            (0..STEPS).map(at).collect()
        };
        let (x, y) = (axis(self.limit.0), axis(self.limit.1));
        let end = |k: usize| if k == 0 || k == STEPS - 1 { 0.5 } else { 1.0 };
        let mut gone = 0.0;
        for (j, y) in y.iter().enumerate() {
            for (i, x) in x.iter().enumerate() {
                let p = self.predicted[j * STEPS + i];
                gone += end(i) * end(j) * (x * y + CLUMP_PX2) * (1.0 - (1.0 - p).powi(2));
            }
        }
        (1.0 - gone * cell).max(0.1)
    }

    /// Correlation of the errors of two vectors (dx, dy) px apart.
    pub fn correlation(&self, dx: f64, dy: f64) -> f64 {
        let along = |limit: f64, d: f64| -> Vec<f64> {
            let turn = std::f64::consts::TAU * limit * d / (STEPS - 1) as f64;
            (0..STEPS).map(|k| (turn * k as f64).cos()).collect()
        };
        let flat = vec![1.0; STEPS];
        let (x, y) = (along(self.limit.0, dx), along(self.limit.1, dy));
        sum(&self.transfer, &x, &y) / sum(&self.transfer, &flat, &flat)
    }

    /// The model for vectors on `last`, the last layout; errors are taken to be independent where
    /// windows no longer overlap.
    pub fn error_model(&self, last: &Layout) -> ErrorModel {
        let reach = |side: usize, step: usize| side.div_ceil(step);
        let shape = (
            reach(last.window.height, last.step_y) + 1,
            reach(last.window.width, last.step_x) + 1,
        );
        let correlation = Array2::from_shape_fn(shape, |(j, i)| {
            self.correlation((i * last.step_x) as f64, (j * last.step_y) as f64)
        });
        ErrorModel {
            gain: self.gain() / self.left_to_see(REACH).sqrt(),
            correlation: Arc::new(ErrorCorrelation::new(correlation)),
        }
    }

    /// Amplitude found of a wave along one axis with this length, px.
    pub fn amplitude(&self, wavelength_px: f64) -> f64 {
        let k = 1.0 / wavelength_px / self.limit.0 * (STEPS - 1) as f64;
        if k > (STEPS - 1) as f64 {
            return 0.0;
        }
        let low = (k.floor() as usize).min(STEPS - 2);
        let t = (k - low as f64).min(1.0);
        self.transfer[low] * (1.0 - t) + self.transfer[low + 1] * t
    }
}

/// Trapezoidal sum over the lattice of the squared transfer times x(kx) y(ky).
fn sum(transfer: &[f64], x: &[f64], y: &[f64]) -> f64 {
    let end = |k: usize| if k == 0 || k == STEPS - 1 { 0.5 } else { 1.0 };
    let mut sum = 0.0;
    for (j, (row, y)) in transfer.chunks_exact(STEPS).zip(y).enumerate() {
        let along = row.iter().zip(x).enumerate();
        sum += end(j) * y * along.map(|(i, (t, x))| end(i) * t * t * x).sum::<f64>();
    }
    sum
}

fn outer(rows: &[f64], columns: &[f64]) -> Vec<f64> {
    rows.iter()
        .flat_map(|r| columns.iter().map(move |c| r * c))
        .collect()
}

/// Response of the predictor's smoothing; nothing passes that the grid of windows cannot carry.
fn smoothing(layout: &Layout, limit: (f64, f64)) -> Vec<f64> {
    let along = |limit: f64, side: usize, step: usize| -> Vec<AlongAxis> {
        (0..STEPS)
            .map(|k| limit * k as f64 / (STEPS - 1) as f64 * step as f64)
            .map(|cycles| AlongAxis::new(side, step, cycles))
            .collect()
    };
    let x = along(limit.0, layout.window.width, layout.step_x);
    let y = along(limit.1, layout.window.height, layout.step_y);
    y.iter()
        .flat_map(|y| x.iter().map(move |x| x.across(y)))
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::interrogate::plan::WindowSize;

    fn layouts(passes: &[usize], overlap: f64) -> Vec<Layout> {
        passes
            .iter()
            .map(|&side| {
                let window = WindowSize {
                    width: side,
                    height: side,
                };
                Layout::new(window, overlap, 512, 512).unwrap()
            })
            .collect()
    }

    #[test]
    fn one_pass_has_no_gain_and_the_correlation_of_its_overlap() {
        let response = Response::new(&layouts(&[32], 0.5)).unwrap();
        assert!((response.gain() - 1.0).abs() < 1e-12);
        assert!((response.correlation(0.0, 0.0) - 1.0).abs() < 1e-12);
        // Weights 1 - t² on [-1, 1] shifted by half a side (t by 1):
        // ∫(1 - t²)(1 - (t - 1)²) over [0, 1] / ∫(1 - t²)² = (11/30)/(16/15) = 0.34375.
        assert!((response.correlation(16.0, 0.0) - 0.343_75).abs() < 0.01);
        assert!(response.correlation(40.0, 0.0).abs() < 0.01);
    }

    #[test]
    fn repeated_passes_settle() {
        let few = Response::new(&layouts(&[64, 32, 32, 32], 0.75)).unwrap();
        let many = Response::new(&layouts(&[64, 32, 32, 32, 32, 32, 32, 32, 32], 0.75)).unwrap();
        let most =
            Response::new(&layouts(&[64, 32, 32, 32, 32, 32, 32, 32, 32, 32], 0.75)).unwrap();
        assert!(many.gain() < 1.15 * few.gain());
        assert!((many.gain() - most.gain()).abs() < 1e-3);
        assert!(many.amplitude(48.0) > few.amplitude(48.0));
    }
}
