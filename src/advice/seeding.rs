//! How many particle images there are, overlapping or not: from the spread of grey levels.

use super::blob::Blob;
use super::diameter::Width;
use super::pattern::Sums;

/// Arguments of the characteristic function: from, to, how many.
const ARGUMENTS: (f64, f64, usize) = (0.03, 5.0, 40);

/// Brightness across a sheet that is tried: exp(-c z²), z from -1/2 to 1/2. 0 is a flat sheet, 8
/// a Gaussian one down to e⁻² of its middle.
const SHEETS: [f64; 6] = [0.0, 1.0, 2.0, 4.0, 6.0, 8.0];

/// Levels across half a sheet.
const DEPTHS: usize = 16;

/// What the spread of grey levels says.
#[derive(Clone, Copy, Debug)]
pub(super) struct Seeding {
    /// Particle images a px²: those brighter than e⁻² of the brightest.
    pub per_px2: f64,
    /// Centre of the brightest over the root mean square of levelled values.
    pub peak: f64,
    /// Mean of the centres over that of the brightest.
    pub mean_brightness: f64,
}

/// Fits the characteristic function of a sum of particle images at independent places with noise.
///
/// With λ images a px² of centre level a, drawn from that of a sheet, and shape g, and normal
/// noise of variance s²,
///
///   ln |mean of exp(i t y)| = -λ <∫(1 - cos(t a g)) dA> - s² t²/2
///
/// exactly, however much they overlap (Campbell 1909; Rice 1944; from memory). At large t the
/// integral grows as the logarithm of t a with a factor that does not depend on a: this is what
/// tells many faint images from few bright ones. Fitted are λ and s² (linear), the level of the
/// brightest and how brightness is spread. s² is drawn towards what the correlation with itself
/// says. Saturated images and a background that varies within 64 px are not in this model.
pub(super) fn seeding(sums: &Sums, width: &Width) -> Seeding {
    let blob = Blob::new(width.mean());
    let (from, to, count) = ARGUMENTS;
    // Pixels less what neighbours have in common.
    let independent = sums.pixels / (4.0 * std::f64::consts::PI * blob.variance()).max(1.0);
    let points: Vec<Point> = (0..count)
        .map(|k| from * (to / from).powf(k as f64 / (count - 1) as f64))
        .filter_map(|t| {
            let fall = -sums.log_characteristic(t);
            let size = (-2.0 * fall).exp();
            // Lost in the scatter of a mean over that many.
            (fall.is_finite() && size * independent > 30.0).then(|| Point {
                t,
                fall,
                // 1 % beside that scatter: the contrast by which values are levelled.
                weight: 1.0 / ((0.01 * fall).powi(2) + 0.5 / (independent * size)),
            })
        })
        .collect();
    let noise = (1.0 - width.signal).max(0.0);
    let fits = SHEETS.map(|sheet| Spread::new(sheet).fit(&points, &blob, noise));
    let best = fits.into_iter().min_by(|a, b| a.1.total_cmp(&b.1));
    best.map_or_else(|| unreachable!("there are sheets"), |(seeding, _)| seeding)
}

struct Point {
    t: f64,
    /// -ln of the modulus.
    fall: f64,
    weight: f64,
}

/// Brightness of particle images over that of the brightest.
struct Spread([f64; DEPTHS]);

impl Spread {
    fn new(sheet: f64) -> Self {
        let depth = |k: usize| (k as f64 + 0.5) / (2 * DEPTHS) as f64;
        Spread(std::array::from_fn(|k| {
            (-sheet * depth(k) * depth(k)).exp()
        }))
    }

    /// The best fit with this spread, and its misfit.
    fn fit(&self, points: &[Point], blob: &Blob, noise: f64) -> (Seeding, f64) {
        let at = |log: f64| self.at(log.exp(), points, blob, noise);
        // A first look at every 15 %, then golden sections about the best.
        let logs = || (0..36).map(|k| 0.14 * f64::from(k));
        let start = logs()
            .min_by(|a, b| at(*a).1.total_cmp(&at(*b).1))
            .unwrap_or(0.0);
        let part = (5f64.sqrt() - 1.0) / 2.0;
        let (mut low, mut high) = (start - 0.14, start + 0.14);
        while high - low > 1e-3 {
            let (a, b) = (high - part * (high - low), low + part * (high - low));
            if at(a).1 < at(b).1 {
                high = b;
            } else {
                low = a;
            }
        }
        let peak = 0.5 * (low + high);
        let (per_px2, misfit) = at(peak);
        let mean_brightness = self.0.iter().sum::<f64>() / DEPTHS as f64;
        let seeding = Seeding {
            per_px2,
            peak: peak.exp(),
            mean_brightness,
        };
        (seeding, misfit)
    }

    /// λ that fits best with this level of the brightest, and the misfit.
    fn at(&self, peak: f64, points: &[Point], blob: &Blob, noise: f64) -> (f64, f64) {
        // The correlation with itself knows the share of noise to about 0.02.
        let trust = 1.0 / (0.02f64 * 0.02);
        let mut sums = [0.0, 0.0, trust, 0.0, trust * noise, trust * noise * noise];
        for Point { t, fall, weight } in points {
            let area = |a: &f64| blob.cosine_area(t * peak * a);
            let area = self.0.iter().map(area).sum::<f64>() / DEPTHS as f64;
            let square = 0.5 * t * t;
            let terms = [
                area * area,
                area * square,
                square * square,
                area * fall,
                square * fall,
                fall * fall,
            ];
            for (sum, term) in sums.iter_mut().zip(terms) {
                *sum += weight * term;
            }
        }
        let [aa, at, tt, af, tf, ff] = sums;
        let determinant = aa * tt - at * at;
        let density = (af * tt - tf * at) / determinant;
        let variance = (tf * aa - af * at) / determinant;
        (density, ff - density * af - variance * tf)
    }
}
