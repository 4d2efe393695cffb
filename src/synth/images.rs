//! A flow and a camera to a pair of particle images.

use super::camera::{Exposure, illumination, record};
use super::exposure::{Spot, draw};
use super::particles::{Particle, particles};
use super::{Flow, ImageOptions, SynthError};
use crate::frames::Frame;

/// The two exposures, one frame apart, that a camera takes of particles carried by `flow` (in px
/// and px/frame).
///
/// Particles are carried along their exact paths, half a frame back and half a frame on from
/// where they are at the mid time, so that displacements belong to the mid time. The image of a
/// particle is a Gaussian averaged over each pixel. The flow's x is the column and its y the
/// height above the bottom row: y = (height - 1) - row. One seed gives one pair, whatever the
/// number of threads.
///
/// # Errors
/// [`SynthError`] where an option is out of its range or the flow is too fast for the images.
///
/// ```
/// use kolk::synth::{Flow, ImageOptions, Uniform, particle_images};
/// let flow = Flow::from(Uniform { u: 3.2, v: -1.0 });
/// let options = ImageOptions { width_px: 64, height_px: 48, ..Default::default() };
/// let (first, second) = particle_images(&flow, &options)?;
/// assert_eq!((first.width(), second.height()), (64, 48));
/// # Ok::<(), kolk::synth::SynthError>(())
/// ```
pub fn particle_images(flow: &Flow, options: &ImageOptions) -> Result<(Frame, Frame), SynthError> {
    options.check()?;
    let particles = particles(flow, options)?;
    let [first, second] = [Exposure::First, Exposure::Second].map(|exposure| {
        let seen = particles.iter().filter_map(|p| spot(p, options, exposure));
        let spots: Vec<Spot> = seen.collect();
        let light = draw(&spots, options.width_px, options.height_px);
        record(&light, options, exposure)
    });
    Ok((first, second))
}

fn spot(particle: &Particle, options: &ImageOptions, exposure: Exposure) -> Option<Spot> {
    let (x, y) = particle.at[exposure as usize];
    let light = particle.light[exposure as usize];
    if light == 0.0 {
        return None;
    }
    let (column, row) = (x, options.height_px as f64 - 1.0 - y);
    Some(Spot {
        column,
        row,
        sigma: 0.25 * particle.diameter,
        peak: options.peak_of_full_scale * light * illumination(options, column, row),
    })
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::synth::{LambOseen, Sheet, Uniform};

    fn noisy() -> ImageOptions {
        ImageOptions {
            width_px: 150,
            height_px: 130,
            diameter_spread_px: 0.3,
            out_of_plane_loss: 0.1,
            light_falloff: 0.4,
            background_of_full_scale: 0.05,
            fixed_pattern_of_full_scale: 0.005,
            noise_of_full_scale: 0.01,
            full_well_electrons: Some(20_000.0),
            ..Default::default()
        }
    }

    fn eddy() -> Flow {
        let (x, y, core_radius, circulation) = (70.0, 60.0, 20.0, 600.0);
        Flow::from(LambOseen {
            x,
            y,
            core_radius,
            circulation,
        }) + Uniform { u: 4.0, v: 1.0 }
    }

    #[test]
    fn a_seed_gives_the_same_images_on_any_number_of_threads() {
        let on = |threads: usize| {
            let pool = rayon::ThreadPoolBuilder::new()
                .num_threads(threads)
                .build()
                .unwrap();
            pool.install(|| particle_images(&eddy(), &noisy()).unwrap())
        };
        let one = on(1);
        assert_eq!(one, on(3));
        let other = ImageOptions { seed: 2, ..noisy() };
        assert_ne!(one, particle_images(&eddy(), &other).unwrap());
    }

    #[test]
    fn a_whole_pixel_shift_gives_the_same_image_shifted_and_y_is_up() {
        let options = ImageOptions {
            width_px: 90,
            height_px: 80,
            sheet: Sheet::Flat,
            quantised: false,
            bits: 8,
            ..Default::default()
        };
        let flow = Flow::from(Uniform { u: 7.0, v: 5.0 });
        let (first, second) = particle_images(&flow, &options).unwrap();
        // 7 columns to the right and 5 rows up, also where particles come in at the edges.
        for ((row, column), level) in second.pixels.indexed_iter() {
            let from = (row + 5, column.wrapping_sub(7));
            if let Some(before) = first.pixels.get(from) {
                // Rounding of positions and of f32 levels up to 255.
                assert!((level - before).abs() < 1e-4, "row {row}, column {column}");
            }
        }
        assert!(first.pixels.iter().any(|g| *g > 100.0));
    }

    #[test]
    fn the_mean_grey_level_is_what_the_seeding_gives() {
        let options = ImageOptions {
            peak_of_full_scale: 0.05,
            background_of_full_scale: 0.02,
            bits: 16,
            ..Default::default()
        };
        let (first, _) = particle_images(&eddy(), &options).unwrap();
        let mean = first.pixels.iter().map(|g| f64::from(*g)).sum::<f64>() / 512.0 / 512.0;
        // One particle: 2 pi sigma² times its peak; mean of exp(-8 z²) over |z| < 1/2.
        let sheet = (std::f64::consts::PI / 8.0).sqrt() * libm::erf(2f64.sqrt());
        let one = 0.05 * sheet * std::f64::consts::TAU * 0.6 * 0.6;
        let expected = 65535.0 * (0.06 * one + 0.02);
        // 16000 particles: 0.8 % of their light, and a little for their brightness; 4 times that.
        assert!(
            (mean - expected).abs() < 0.04 * 65535.0 * 0.06 * one,
            "{mean} for {expected}"
        );
    }

    #[test]
    fn options_out_of_range_are_named() {
        let text = |options: ImageOptions| {
            particle_images(&Flow::rest(), &options)
                .unwrap_err()
                .to_string()
        };
        let base = ImageOptions::default;
        let cases = [
            (
                ImageOptions {
                    width_px: 0,
                    ..base()
                },
                "width_px is 0: it must be from 1",
            ),
            (
                ImageOptions {
                    height_px: 40_000,
                    ..base()
                },
                "height_px is 40000",
            ),
            (
                ImageOptions {
                    particle_diameter_px: 0.0,
                    ..base()
                },
                "particle_diameter_px is 0",
            ),
            (
                ImageOptions {
                    seeding_per_px2: -1.0,
                    ..base()
                },
                "seeding_per_px2 is -1",
            ),
            (
                ImageOptions {
                    noise_of_full_scale: f64::NAN,
                    ..base()
                },
                "noise_of_full_scale is NaN",
            ),
            (
                ImageOptions {
                    out_of_plane_loss: 1.5,
                    ..base()
                },
                "out_of_plane_loss is 1.5",
            ),
            (
                ImageOptions {
                    full_well_electrons: Some(0.0),
                    ..base()
                },
                "full_well_electrons is 0",
            ),
            (
                ImageOptions { bits: 7, ..base() },
                "bits is 7: it must be from 8 to 16",
            ),
        ];
        for (options, part) in cases {
            assert!(text(options).contains(part), "{part}");
        }
        let options = r#"{"width_px": 64, "sheet": "flat", "full_well_electrons": 9000}"#;
        let options: ImageOptions = serde_json::from_str(options).unwrap();
        assert_eq!(
            (options.width_px, options.sheet, options.bits),
            (64, Sheet::Flat, 12)
        );
        assert!(serde_json::from_str::<ImageOptions>(r#"{"width": 64}"#).is_err());
    }

    #[test]
    fn an_image_without_particles_is_dark() {
        let options = ImageOptions {
            seeding_per_px2: 0.0,
            ..Default::default()
        };
        let (first, second) = particle_images(&eddy(), &options).unwrap();
        assert!(first.pixels.iter().chain(&second.pixels).all(|g| *g == 0.0));
    }
}
