//! The array of eddies of Taylor and Green.

use std::f64::consts::{SQRT_2, TAU};

use serde::{Deserialize, Serialize};

use super::Element;
use super::flow::above_zero;

/// First zero of the Bessel function J0, recomputed in `bessel_roots_are_roots`.
const J0_ROOT: f64 = 2.404_825_557_695_773;

/// Chequered array of eddies, w = w0 cos(k (x - x0)) cos(k (y - y0)) with k = 2 pi / wavelength
/// (Taylor & Green 1937, from memory): an eddy at every half wavelength, neighbours of opposite
/// sense.
#[derive(Clone, Copy, Debug, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct TaylorGreen {
    /// x of the centre of one counter-clockwise eddy (option `x_px`).
    #[serde(rename = "x_px", default)]
    pub x: f64,
    /// y of that centre (option `y_px`).
    #[serde(rename = "y_px", default)]
    pub y: f64,
    /// Distance between eddies of one sense along x and y, not zero (option `wavelength_px`).
    #[serde(rename = "wavelength_px", deserialize_with = "above_zero")]
    pub wavelength: f64,
    /// w0 (option `peak_vorticity_per_frame`).
    #[serde(rename = "peak_vorticity_per_frame")]
    pub peak_vorticity: f64,
}

impl TaylorGreen {
    fn wavenumber(&self) -> f64 {
        TAU / self.wavelength
    }

    /// Circulation inside the circle of radius `r` about a counter-clockwise centre:
    /// 2 pi w0 r J1(sqrt2 k r) / (sqrt2 k), as the mean of w over a circle is w0 J0(sqrt2 k r).
    pub fn circulation_within(&self, r: f64) -> f64 {
        let k = SQRT_2 * self.wavenumber();
        TAU * self.peak_vorticity * r * libm::j1(k * r) / k
    }

    /// Radius of the circle of largest circulation: sqrt2 k r = 2.404826.
    pub fn largest_circulation_radius(&self) -> f64 {
        J0_ROOT / (SQRT_2 * self.wavenumber())
    }
}

impl Element for TaylorGreen {
    fn velocity(&self, x: f64, y: f64) -> (f64, f64) {
        let k = self.wavenumber();
        let ((sx, cx), (sy, cy)) = ((k * (x - self.x)).sin_cos(), (k * (y - self.y)).sin_cos());
        let speed = self.peak_vorticity / (2.0 * k);
        (-speed * cx * sy, speed * sx * cy)
    }

    fn vorticity(&self, x: f64, y: f64) -> f64 {
        let k = self.wavenumber();
        self.peak_vorticity * (k * (x - self.x)).cos() * (k * (y - self.y)).cos()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const ARRAY: TaylorGreen = TaylorGreen {
        x: 2.0,
        y: -1.0,
        wavelength: 40.0,
        peak_vorticity: 0.5,
    };

    #[test]
    fn bessel_roots_are_roots() {
        // 2.40483: Abramowitz & Stegun, table 9.5, from memory.
        assert!(libm::j0(J0_ROOT).abs() < 1e-15);
        assert!((J0_ROOT - 2.40483).abs() < 5e-6);
    }

    #[test]
    fn circulation_within_is_the_sum_of_vorticity_over_the_disc() {
        for r in [1.0, 7.0, 11.0, 16.0] {
            let (rings, spokes) = (2000, 64);
            let mut sum = 0.0;
            for ring in 0..rings {
                let radius = r * (f64::from(ring) + 0.5) / f64::from(rings);
                for spoke in 0..spokes {
                    let (sin, cos) = (TAU * f64::from(spoke) / f64::from(spokes)).sin_cos();
                    let area = TAU * radius * r / f64::from(rings * spokes);
                    sum += area * ARRAY.vorticity(2.0 + radius * cos, -1.0 + radius * sin);
                }
            }
            // Midpoint rule: (1/2000)² of the whole.
            assert!(
                (sum / ARRAY.circulation_within(r) - 1.0).abs() < 1e-6,
                "r {r}"
            );
        }
    }

    #[test]
    fn the_radius_of_largest_circulation_is_a_maximum() {
        let r = ARRAY.largest_circulation_radius();
        let most = ARRAY.circulation_within(r);
        assert!(most > ARRAY.circulation_within(0.99 * r));
        assert!(most > ARRAY.circulation_within(1.01 * r));
    }
}
