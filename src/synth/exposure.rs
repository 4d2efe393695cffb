//! Particle images on the pixels of one exposure.

use std::f64::consts::{FRAC_PI_2, SQRT_2};

use ndarray::Array2;
use rayon::prelude::*;

/// Standard deviations to which the image of a particle is drawn; beyond, less than 2e-9 of its
/// light is lost.
pub(super) const REACH: f64 = 6.0;

/// Rows drawn by one piece of work.
const BAND: usize = 32;

/// The image of one particle: a Gaussian of light.
#[derive(Clone, Copy, Debug)]
pub(super) struct Spot {
    /// Column of its centre; pixel centres have whole numbers.
    pub column: f64,
    /// Row of its centre, from the top.
    pub row: f64,
    /// Standard deviation of the Gaussian: a quarter of the e^-2 diameter, px.
    pub sigma: f64,
    /// Light at its centre.
    pub peak: f64,
}

/// The light on each pixel, shape (height, width): the mean over the pixel's square of the sum of
/// all spots, exact through the error function. The same for any number of threads, as bands of
/// rows are drawn apart and each adds its spots in order.
pub(super) fn draw(spots: &[Spot], width: usize, height: usize) -> Array2<f64> {
    let mut light = Array2::zeros((height, width));
    let bands = spots_of_bands(spots, height);
    light
        .axis_chunks_iter_mut(ndarray::Axis(0), BAND)
        .into_par_iter()
        .zip(&bands)
        .enumerate()
        .for_each(|(band, (mut rows, indices))| {
            let mut across = Vec::new();
            for &index in indices {
                let top = band * BAND;
                add_spot(&spots[index as usize], top, &mut rows, &mut across);
            }
        });
    light
}

/// For each band of rows, the spots that reach into it, in order.
fn spots_of_bands(spots: &[Spot], height: usize) -> Vec<Vec<u32>> {
    let mut bands = vec![Vec::new(); height.div_ceil(BAND)];
    for (index, spot) in (0..).zip(spots) {
        if let Some((first, last)) = reached(spot.row, spot.sigma, 0, height) {
            for band in &mut bands[first / BAND..=last / BAND] {
                band.push(index);
            }
        }
    }
    bands
}

/// First and last of the pixels `from..to` that a spot about `centre` reaches.
fn reached(centre: f64, sigma: f64, from: usize, to: usize) -> Option<(usize, usize)> {
    let first = (centre - REACH * sigma).round().max(from as f64);
    let last = (centre + REACH * sigma).round().min(to as f64 - 1.0);
    (first <= last).then_some((first as usize, last as usize))
}

fn add_spot(
    spot: &Spot,
    top: usize,
    rows: &mut ndarray::ArrayViewMut2<'_, f64>,
    across: &mut Vec<f64>,
) {
    let (height, width) = rows.dim();
    let Some((first_row, last_row)) = reached(spot.row, spot.sigma, top, top + height) else {
        return;
    };
    let Some((first, last)) = reached(spot.column, spot.sigma, 0, width) else {
        return;
    };
    across.clear();
    across.extend(shares(spot.column, spot.sigma, first, last));
    let down = shares(spot.row, spot.sigma, first_row, last_row);
    for (row, share) in (first_row - top..).zip(down) {
        let factor = spot.peak * share;
        let pixels = rows.slice_mut(ndarray::s![row, first..=last]);
        for (pixel, across) in pixels.into_iter().zip(&*across) {
            *pixel += factor * across;
        }
    }
}

/// Means of exp(-(p - centre)² / 2 sigma²) over the pixels `first..=last`, each from p - 1/2 to
/// p + 1/2: sigma sqrt(pi/2) (erf(b) - erf(a)).
fn shares(centre: f64, sigma: f64, first: usize, last: usize) -> impl Iterator<Item = f64> {
    let edge = move |p: f64| libm::erf((p - 0.5 - centre) / (SQRT_2 * sigma));
    let factor = sigma * FRAC_PI_2.sqrt();
    let mut left = edge(first as f64);
    (first..=last).map(move |p| {
        let right = edge(p as f64 + 1.0);
        let share = factor * (right - left);
        left = right;
        share
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    const SPOT: Spot = Spot {
        column: 15.3,
        row: 33.8,
        sigma: 0.6,
        peak: 0.7,
    };

    #[test]
    fn a_pixel_is_the_mean_of_the_gaussian_over_its_square() {
        let light = draw(&[SPOT], 32, 70);
        // Outside check: the midpoint rule on 200 x 200 points of the pixel, error near 1e-6.
        for (row, column) in [(34, 15), (33, 16), (32, 15), (35, 13), (31, 17)] {
            let mut sum = 0.0;
            for i in 0..200 {
                for j in 0..200 {
                    let x = column as f64 - 0.5 + (f64::from(i) + 0.5) / 200.0 - SPOT.column;
                    let y = row as f64 - 0.5 + (f64::from(j) + 0.5) / 200.0 - SPOT.row;
                    // exp(-2) at half the e^-2 diameter of 4 sigma.
                    sum += SPOT.peak * (-2.0 * (x * x + y * y) / (1.2f64 * 1.2)).exp();
                }
            }
            assert!((light[(row, column)] - sum / 40_000.0).abs() < 1e-5);
        }
    }

    #[test]
    fn the_light_of_a_particle_and_its_centre_are_exact() {
        for sigma in [0.25, 0.6, 1.25] {
            let light = draw(&[Spot { sigma, ..SPOT }], 32, 70);
            let total = light.sum();
            let expected = 2.0 * std::f64::consts::PI * sigma * sigma * 0.7;
            // Pixels tile the plane: only what lies beyond REACH is missing.
            assert!((total / expected - 1.0).abs() < 1e-8);
            let column = light
                .indexed_iter()
                .map(|((_, c), l)| c as f64 * l)
                .sum::<f64>()
                / total;
            let row = light
                .indexed_iter()
                .map(|((r, _), l)| r as f64 * l)
                .sum::<f64>()
                / total;
            // Poisson summation: sampling moves the centroid of pixel means by at most
            // exp(-2 pi² sigma²) / pi, and higher terms that are far smaller.
            let moved =
                (-2.0 * (std::f64::consts::PI * sigma).powi(2)).exp() / std::f64::consts::PI;
            let allowed = 1.01 * moved + 1e-8;
            assert!((column - 15.3).abs() < allowed && (row - 33.8).abs() < allowed);
        }
    }

    #[test]
    fn spots_across_bands_and_edges_are_what_one_large_image_shows() {
        let spots: Vec<Spot> = (0..200)
            .map(|n| Spot {
                column: f64::from(n * 37 % 120) - 10.3,
                row: f64::from(n * 53 % 130) - 10.6,
                sigma: 0.4 + f64::from(n % 5),
                peak: 0.5,
            })
            .collect();
        let small = draw(&spots, 100, 110);
        let shift = |s: &Spot| Spot {
            column: s.column + 40.0,
            row: s.row + 45.0,
            ..*s
        };
        let moved: Vec<Spot> = spots.iter().map(shift).collect();
        let large = draw(&moved, 200, 210);
        let part = large.slice(ndarray::s![45..155, 40..140]);
        assert!(small.iter().zip(part).all(|(a, b)| (a - b).abs() < 1e-12));
    }

    #[test]
    fn spots_that_miss_the_image_leave_no_light() {
        for (column, row) in [(-50.0, 5.0), (5.0, 1e9), (1e300, 5.0), (-1e300, f64::NAN)] {
            let spot = Spot {
                column,
                row,
                ..SPOT
            };
            assert_eq!(draw(&[spot], 10, 10).sum(), 0.0);
        }
    }
}
