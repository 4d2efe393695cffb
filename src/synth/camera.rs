//! Light to grey levels: shot noise, the camera's pattern, read-out noise, depth.

use ndarray::{Array2, Axis};
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use rand_distr::{Distribution, Poisson, StandardNormal};
use rayon::prelude::*;

use super::ImageOptions;
use crate::frames::Frame;

/// Which exposure of the pair.
#[derive(Clone, Copy, Debug)]
pub(super) enum Exposure {
    First,
    Second,
}

/// Illumination of the sheet at a pixel, 1 where it is brightest and 1 - `light_falloff` in the
/// farthest corner: a Gaussian about a place at 0.4 of the width and 0.4 of the height from the
/// top left.
pub(super) fn illumination(options: &ImageOptions, column: f64, row: f64) -> f64 {
    if options.light_falloff == 0.0 {
        return 1.0;
    }
    let part = |at: f64, length: usize| (at + 0.5) / length as f64 - 0.4;
    let (x, y) = (part(column, options.width_px), part(row, options.height_px));
    // In the far corner x = y = 0.6. A falloff of 1 would need an infinite exponent.
    let darkest = (1.0 - options.light_falloff).max(1e-6);
    darkest.powf((x * x + y * y) / (2.0 * 0.6 * 0.6))
}

/// What the camera makes of `light`, in fractions of full scale, shape (rows, columns).
///
/// Every row draws its noise from a stream of random numbers of its own, so that threads do not
/// change the result.
pub(super) fn record(light: &Array2<f64>, options: &ImageOptions, exposure: Exposure) -> Frame {
    let mut pixels = Array2::zeros(light.dim());
    pixels
        .axis_iter_mut(Axis(0))
        .into_par_iter()
        .zip(light.axis_iter(Axis(0)))
        .enumerate()
        .for_each(|(row, (pixels, light))| {
            let mut noise = row_noise(options, exposure, row);
            let mut pattern = row_pattern(options, row);
            for ((column, pixel), light) in pixels.into_iter().enumerate().zip(light) {
                let haze = options.background_of_full_scale;
                let haze = haze * illumination(options, column as f64, row as f64);
                let level = shot(light + haze, options, &mut noise)
                    + spread(options.fixed_pattern_of_full_scale, &mut pattern)
                    + spread(options.noise_of_full_scale, &mut noise);
                *pixel = grey(level, options);
            }
        });
    Frame {
        pixels,
        bits: options.bits,
    }
}

/// Stream 0 of the seed belongs to the particles; each row of each exposure has its own.
fn row_noise(options: &ImageOptions, exposure: Exposure, row: usize) -> ChaCha8Rng {
    let mut random = ChaCha8Rng::seed_from_u64(options.seed);
    random.set_stream(1 + 2 * row as u64 + exposure as u64);
    random
}

fn row_pattern(options: &ImageOptions, row: usize) -> ChaCha8Rng {
    let mut random = ChaCha8Rng::seed_from_u64(options.fixed_pattern_seed);
    random.set_stream(row as u64);
    random
}

/// Electrons are counted one by one: Poisson about their expected number.
fn shot(level: f64, options: &ImageOptions, random: &mut ChaCha8Rng) -> f64 {
    let Some(well) = options.full_well_electrons else {
        return level;
    };
    // No light, no electrons: the distribution is refused for a mean of zero.
    Poisson::new(level * well).map_or(0.0, |electrons| electrons.sample(random) / well)
}

/// A normal deviation; draws nothing where there is none.
fn spread(deviation: f64, random: &mut ChaCha8Rng) -> f64 {
    if deviation == 0.0 {
        return 0.0;
    }
    deviation * random.sample::<f64, _>(StandardNormal)
}

fn grey(level: f64, options: &ImageOptions) -> f32 {
    let full = options.full_scale();
    let level = (level * full).clamp(0.0, full);
    if options.quantised {
        level.round() as f32
    } else {
        level as f32
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn flat(level: f64) -> Array2<f64> {
        Array2::from_elem((200, 250), level)
    }

    fn levels(options: &ImageOptions, level: f64, exposure: Exposure) -> Vec<f64> {
        let options = ImageOptions {
            width_px: 250,
            height_px: 200,
            ..options.clone()
        };
        let frame = record(&flat(level), &options, exposure);
        frame
            .pixels
            .iter()
            .map(|g| f64::from(*g) / options.full_scale())
            .collect()
    }

    fn mean_and_variance(levels: &[f64]) -> (f64, f64) {
        let n = levels.len() as f64;
        let mean = levels.iter().sum::<f64>() / n;
        (
            mean,
            levels.iter().map(|l| (l - mean).powi(2)).sum::<f64>() / (n - 1.0),
        )
    }

    fn exact() -> ImageOptions {
        ImageOptions {
            quantised: false,
            bits: 16,
            ..Default::default()
        }
    }

    #[test]
    fn noise_and_pattern_have_the_spread_asked_for() {
        // 50000 pixels: the variance is known to 0.63 %, the mean to 0.45 % of the spread; 4
        // standard deviations of each.
        let close = |levels: &[f64], mean: f64, variance: f64| {
            let (m, v) = mean_and_variance(levels);
            assert!((v / variance - 1.0).abs() < 0.026, "{v} for {variance}");
            assert!((m - mean).abs() < 0.018 * variance.sqrt(), "{m} for {mean}");
        };
        let noise = ImageOptions {
            noise_of_full_scale: 0.02,
            ..exact()
        };
        close(&levels(&noise, 0.3, Exposure::First), 0.3, 4e-4);
        let pattern = ImageOptions {
            fixed_pattern_of_full_scale: 0.03,
            ..exact()
        };
        close(&levels(&pattern, 0.3, Exposure::First), 0.3, 9e-4);
        // Poisson: the variance of the electrons is their mean, few or many.
        let shot = ImageOptions {
            full_well_electrons: Some(10_000.0),
            ..exact()
        };
        close(&levels(&shot, 0.3, Exposure::First), 0.3, 0.3 / 10_000.0);
        let few = ImageOptions {
            full_well_electrons: Some(20.0),
            ..exact()
        };
        close(&levels(&few, 0.2, Exposure::First), 0.2, 0.2 / 20.0);
        assert!(
            levels(&shot, 0.0, Exposure::First)
                .iter()
                .all(|l| *l == 0.0)
        );
    }

    #[test]
    fn noise_is_new_in_every_exposure_and_the_pattern_stays() {
        let both = ImageOptions {
            noise_of_full_scale: 0.02,
            ..exact()
        };
        let other = ImageOptions {
            seed: 2,
            ..both.clone()
        };
        let product = |a: &[f64], b: &[f64]| {
            let sum: f64 = a.iter().zip(b).map(|(a, b)| (a - 0.3) * (b - 0.3)).sum();
            sum / (a.len() as f64 * 4e-4)
        };
        let first = levels(&both, 0.3, Exposure::First);
        // Correlation of independent noise: 1/sqrt(50000) = 0.0045.
        assert!(product(&first, &levels(&both, 0.3, Exposure::Second)).abs() < 0.018);
        assert!(product(&first, &levels(&other, 0.3, Exposure::First)).abs() < 0.018);
        let pattern = ImageOptions {
            fixed_pattern_of_full_scale: 0.02,
            ..exact()
        };
        let other = ImageOptions {
            seed: 2,
            ..pattern.clone()
        };
        let first = levels(&pattern, 0.3, Exposure::First);
        assert_eq!(first, levels(&pattern, 0.3, Exposure::Second));
        assert_eq!(first, levels(&other, 0.3, Exposure::First));
        let camera = ImageOptions {
            fixed_pattern_seed: 5,
            ..pattern
        };
        assert!(product(&first, &levels(&camera, 0.3, Exposure::First)).abs() < 0.018);
    }

    #[test]
    fn levels_are_whole_and_end_at_full_scale() {
        for bits in [8, 12, 16] {
            let options = ImageOptions {
                width_px: 250,
                height_px: 200,
                noise_of_full_scale: 0.4,
                bits,
                ..Default::default()
            };
            let frame = record(&flat(0.5), &options, Exposure::First);
            let full = options.full_scale() as f32;
            assert_eq!(frame.bits, bits);
            assert!(
                frame
                    .pixels
                    .iter()
                    .all(|g| g.fract() == 0.0 && (0.0..=full).contains(g))
            );
            assert!(
                frame.pixels.iter().any(|g| *g == full) && frame.pixels.iter().any(|g| *g == 0.0)
            );
        }
    }

    #[test]
    fn uneven_light_falls_as_far_as_asked() {
        let options = ImageOptions {
            light_falloff: 0.7,
            ..Default::default()
        };
        let at = |column, row| illumination(&options, column, row);
        assert!((at(0.4 * 512.0 - 0.5, 0.4 * 512.0 - 0.5) - 1.0).abs() < 1e-12);
        assert!((at(511.5, 511.5) - 0.3).abs() < 1e-12);
        assert!(at(0.0, 0.0) > 0.3 && at(0.0, 0.0) < 1.0);
        let dark = ImageOptions {
            light_falloff: 1.0,
            ..options
        };
        assert!((0.0..2e-6).contains(&illumination(&dark, 511.5, 511.5)));
    }

    #[test]
    fn background_lies_under_everything_and_follows_the_light() {
        let options = ImageOptions {
            width_px: 250,
            height_px: 200,
            background_of_full_scale: 0.2,
            light_falloff: 0.5,
            ..exact()
        };
        let frame = record(&flat(0.1), &options, Exposure::First);
        let level = |row, column| f64::from(frame.pixels[(row, column)]) / options.full_scale();
        let expected = |row: usize, column: usize| {
            0.1 + 0.2 * illumination(&options, column as f64, row as f64)
        };
        for (row, column) in [(0, 0), (80, 100), (199, 249)] {
            assert!((level(row, column) - expected(row, column)).abs() < 1e-6);
        }
    }
}
