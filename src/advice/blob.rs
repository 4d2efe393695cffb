//! The image of one particle: a Gaussian averaged over pixels, and what follows from its shape.

use std::f64::consts::{PI, SQRT_2};

/// Arguments at which [`Blob::cosine_area`] is tabulated: from, to, how many.
const TABLE: (f64, f64, usize) = (0.01, 1000.0, 140);

/// A particle image of a diameter, its centre level taken for 1.
pub(super) struct Blob {
    diameter: f64,
    /// Logarithms of the cosine area at arguments in equal steps of their logarithm.
    cosine_area: Vec<f64>,
}

/// Correlation with itself, `lag` px apart along one axis, of a particle image whose light falls
/// to e⁻² at `diameter` px: the Gaussian of variance d²/8 averaged over the triangle that two
/// pixels make, exact; its integral over all lags is 1.
pub(super) fn self_correlation(diameter: f64, lag: f64) -> f64 {
    let spread = diameter / 8f64.sqrt();
    // Second integral of the normal density.
    let twice = |x: f64| {
        0.5 * x * (1.0 + libm::erf(x / (spread * SQRT_2)))
            + spread / (2.0 * PI).sqrt() * (-0.5 * (x / spread).powi(2)).exp()
    };
    twice(lag + 1.0) - 2.0 * twice(lag) + twice(lag - 1.0)
}

impl Blob {
    pub fn new(diameter: f64) -> Self {
        let sigma = diameter / 4.0;
        let along = |x: f64| {
            let end = |x: f64| libm::erf(x / (sigma * SQRT_2));
            end(x + 0.5) - end(x - 0.5)
        };
        // Samples in one quarter of the plane, six to a standard deviation, to where the light
        // has fallen to 1e-8.
        let wide = (sigma * sigma + 1.0 / 12.0).sqrt();
        let step = wide / 6.0;
        let line: Vec<f64> = (0..36)
            .map(|k| along((f64::from(k) + 0.5) * step) / along(0.0))
            .collect();
        let area = |z: f64| {
            let row = |a: &f64| line.iter().map(|b| 1.0 - (z * a * b).cos()).sum::<f64>();
            4.0 * step * step * line.iter().map(row).sum::<f64>()
        };
        let (from, to, count) = TABLE;
        let at = |k: usize| from * (to / from).powf(k as f64 / (count - 1) as f64);
        Self {
            diameter,
            cosine_area: (0..count).map(|k| area(at(k)).ln()).collect(),
        }
    }

    /// The integral of 1 - cos(z g) over the plane, px², g the light of the image over that at
    /// its centre. Between the entries of a table straight in both logarithms.
    pub fn cosine_area(&self, z: f64) -> f64 {
        let (from, to, count) = TABLE;
        let table = &self.cosine_area;
        if z < from {
            return table[0].exp() * (z / from).powi(2);
        }
        let place = (z / from).ln() / (to / from).ln() * (count - 1) as f64;
        let low = (place as usize).min(count - 2);
        let part = place - low as f64;
        (table[low] * (1.0 - part) + table[low + 1] * part).exp()
    }

    /// Variance along an axis of the image with its averaging over pixels, px².
    pub fn variance(&self) -> f64 {
        self.diameter * self.diameter / 16.0 + 1.0 / 12.0
    }

    /// The integral of the image, px²: its light over the level at its centre.
    pub fn area(&self) -> f64 {
        let sigma = self.diameter / 4.0;
        libm::erf(0.5 / (sigma * SQRT_2)).powi(-2)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn correlation_of_an_image_with_itself_is_that_of_its_pixels() {
        // The defining sum over pixels and over where the image lies within them.
        for diameter in [1.2, 2.4, 4.0] {
            let sigma = diameter / 4.0;
            let pixel = |x: f64| {
                0.5 * (libm::erf((x + 0.5) / (sigma * SQRT_2))
                    - libm::erf((x - 0.5) / (sigma * SQRT_2)))
            };
            for lag in 0..4 {
                let lag = f64::from(lag);
                let sum: f64 = (-2000..2000)
                    .map(|k| f64::from(k) * 0.01)
                    .map(|x| pixel(x) * pixel(x + lag) * 0.01)
                    .sum();
                let exact = self_correlation(diameter, lag);
                // Rectangles of 0.01 px on a smooth function.
                assert!((sum - exact).abs() < 1e-9, "{diameter} {lag}: {sum} {exact}");
            }
        }
    }

    #[test]
    fn a_wide_image_has_the_cosine_area_of_a_gaussian() {
        // Pixels do not matter for a wide one: 2π s² (γ + ln z - Ci(z)); decimals of Cin(1) and
        // Cin(10) from Abramowitz & Stegun, table 5.1, from memory.
        let blob = Blob::new(40.0);
        for (z, cin) in [(1.0, 0.239_811_7), (10.0, 2.925_257_2)] {
            let exact = 2.0 * PI * blob.variance() * cin;
            // Straight between entries 8 % apart.
            assert!((blob.cosine_area(z) / exact - 1.0).abs() < 2e-3, "{z}");
        }
    }

    #[test]
    fn area_is_the_light_over_the_centre_level() {
        let blob = Blob::new(2.4);
        // For small z the cosine area is z²/2 times the integral of g²: the self-correlation at
        // no lag over the squared centre level.
        let centre = blob.area().recip();
        let square = self_correlation(2.4, 0.0).powi(2) / (centre * centre);
        assert!((blob.cosine_area(0.005) / (0.5 * 25e-6 * square) - 1.0).abs() < 1e-3);
    }
}
