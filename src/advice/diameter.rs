//! How wide particle images are, and how noisy the pixels: from the correlation of an exposure
//! with itself.

use super::blob::self_correlation;
use super::pattern::{LAGS, Sums};

/// Diameters that can be told from each other with the lags there are, px.
const RANGE: (f64, f64) = (0.5, 10.0);

/// What an exposure's correlation with itself says.
#[derive(Clone, Copy, Debug)]
pub(super) struct Width {
    /// e⁻² diameter of the particle images along x and along y, px.
    pub diameter: (f64, f64),
    /// Share of the variance of levelled values that particle images make; the rest is noise.
    pub signal: f64,
}

impl Width {
    /// The diameter of the circle of equal area.
    pub fn mean(&self) -> f64 {
        (self.diameter.0 * self.diameter.1).sqrt()
    }
}

/// Fits the exact correlation of pixel-averaged Gaussian images, whatever their places and
/// brightness, to all lags up to about one diameter but the lag zero, at which noise that
/// differs from pixel to pixel adds.
///
/// Particle images at independent places correlate on average as one with itself, however much
/// they overlap (Campbell's theorem). `None` where nothing correlates.
pub(super) fn width(sums: &Sums) -> Option<Width> {
    let mut found: (f64, f64) = (2.5, 2.5);
    for _ in 0..6 {
        let reach = (found.0.max(found.1)).clamp(2.3, LAGS as f64);
        let fit = Fit::new(sums, reach);
        found.0 = least(|x| fit.misfit((x, found.1)));
        found.1 = least(|y| fit.misfit((found.0, y)));
    }
    let fit = Fit::new(sums, found.0.max(found.1).clamp(2.3, LAGS as f64));
    let signal = fit.height(found).0;
    let inside = |d: f64| d > 1.02 * RANGE.0 && d < 0.98 * RANGE.1;
    (signal > 0.02 && inside(found.0) && inside(found.1)).then_some(Width {
        diameter: found,
        signal: signal.min(1.0),
    })
}

/// The diameter of the range at which `misfit` is least, by golden sections of its logarithm.
fn least(misfit: impl Fn(f64) -> f64) -> f64 {
    let part = (5f64.sqrt() - 1.0) / 2.0;
    let (mut low, mut high) = (RANGE.0.ln(), RANGE.1.ln());
    let at = |x: f64| misfit(x.exp());
    let (mut a, mut b) = (high - part * (high - low), low + part * (high - low));
    let (mut at_a, mut at_b) = (at(a), at(b));
    while high - low > 1e-4 {
        if at_a < at_b {
            (high, b, at_b) = (b, a, at_a);
            a = high - part * (high - low);
            at_a = at(a);
        } else {
            (low, a, at_a) = (a, b, at_b);
            b = low + part * (high - low);
            at_b = at(b);
        }
    }
    (0.5 * (low + high)).exp()
}

/// Correlations at the lags that are fitted: columns, rows, value.
struct Fit(Vec<(usize, i32, f64)>);

impl Fit {
    fn new(sums: &Sums, reach: f64) -> Self {
        let rows = -(LAGS as i32)..=LAGS as i32;
        let lags = rows.flat_map(|row| (0..=LAGS).map(move |column| (column, row)));
        let near = lags.filter(|&(column, row)| {
            // Each lag once: the correlation is the same the other way.
            (column > 0 || row > 0) && (column as f64).hypot(f64::from(row)) <= reach
        });
        Fit(near
            .map(|(column, row)| (column, row, sums.correlation(column, row)))
            .collect())
    }

    /// The height at no lag that fits best, and the squared misfit that is left.
    fn height(&self, (x, y): (f64, f64)) -> (f64, f64) {
        let along = |diameter: f64| -> Vec<f64> {
            let at = |lag: usize| self_correlation(diameter, lag as f64);
            (0..=LAGS).map(|lag| at(lag) / at(0)).collect()
        };
        let (x, y) = (along(x), along(y));
        let (mut with, mut own, mut all) = (0.0, 0.0, 0.0);
        for &(column, row, value) in &self.0 {
            let shape = x[column] * y[row.unsigned_abs() as usize];
            with += shape * value;
            own += shape * shape;
            all += value * value;
        }
        (with / own, all - with * with / own)
    }

    fn misfit(&self, diameter: (f64, f64)) -> f64 {
        self.height(diameter).1
    }
}
