//! Where particles are at the two exposures, and how bright.

use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use rand_distr::StandardNormal;
use rayon::prelude::*;

use super::{Flow, ImageOptions, Sheet, SynthError};

/// Particles of one pair: 20 million, some 2 GB.
const MOST_PARTICLES: usize = 20_000_000;

/// One particle as the two exposures see it; positions in the flow's coordinates.
#[derive(Clone, Copy, Debug)]
pub(super) struct Particle {
    /// At half a frame before the mid time and half a frame after.
    pub at: [(f64, f64); 2],
    /// Share of the light in the middle of the sheet; 0 out of it.
    pub light: [f64; 2],
    /// e^-2 diameter of its image, px.
    pub diameter: f64,
}

/// Particles in and around the image, spread evenly at the mid time; as the flow is free of
/// divergence they are spread evenly at the exposures too. The same for any number of threads.
pub(super) fn particles(flow: &Flow, options: &ImageOptions) -> Result<Vec<Particle>, SynthError> {
    let margin = margin(flow, options)?;
    let (width, height) = (options.width_px as f64, options.height_px as f64);
    // Pixel centres have whole coordinates: the image reaches from -0.5 to width - 0.5.
    let side = |length: f64| (-0.5 - margin, length - 0.5 + margin);
    let ((left, right), (low, high)) = (side(width), side(height));
    // The sheet is 1 thick; those that will enter and those that have left count too.
    let depth = 1.0 + options.out_of_plane_loss;
    let wanted = options.seeding_per_px2 * (right - left) * (high - low) * depth;
    if wanted > MOST_PARTICLES as f64 {
        return Err(SynthError::TooManyParticles {
            particles: wanted,
            most: MOST_PARTICLES,
        });
    }
    let mut random = ChaCha8Rng::seed_from_u64(options.seed);
    let seeds: Vec<_> = (0..wanted.round() as usize)
        .map(|_| {
            let x = left + (right - left) * random.random::<f64>();
            let y = low + (high - low) * random.random::<f64>();
            let z = depth * (random.random::<f64>() - 0.5);
            let diameter = diameter(options, random.sample(StandardNormal));
            (x, y, z, diameter)
        })
        .collect();
    let expose = |&(x, y, z, diameter): &(f64, f64, f64, f64)| {
        let half = 0.5 * options.out_of_plane_loss;
        Particle {
            at: [-0.5, 0.5].map(|time| travel(flow, (x, y), time)),
            light: [z - half, z + half].map(|z| sheet_light(options.sheet, z)),
            diameter,
        }
    };
    Ok(seeds.par_iter().map(expose).collect())
}

/// Width of the band around the image from which particles reach it in half a frame.
fn margin(flow: &Flow, options: &ImageOptions) -> Result<f64, SynthError> {
    const SAMPLES: usize = 64;
    let (width, height) = (options.width_px as f64, options.height_px as f64);
    // The image and a quarter of it all round.
    let place = |n: usize, length: f64| length * (1.5 * n as f64 / SAMPLES as f64 - 0.25);
    let speeds = (0..=SAMPLES).flat_map(|i| {
        (0..=SAMPLES).map(move |j| {
            let (u, v) = flow.velocity(place(i, width), place(j, height));
            u.hypot(v)
        })
    });
    let fastest = speeds
        .map(|speed| {
            if speed.is_finite() {
                speed
            } else {
                f64::INFINITY
            }
        })
        .fold(0.0, f64::max);
    let limit = width.max(height);
    if fastest >= limit {
        return Err(SynthError::TooFast {
            speed: fastest,
            width: options.width_px,
            height: options.height_px,
            limit,
        });
    }
    let widest = options.particle_diameter_px + 3.0 * options.diameter_spread_px;
    // A quarter more than half the largest displacement seen, as the samples may miss it; the
    // image of a particle reaches at most one and a half diameters (exposure::REACH).
    Ok(0.625 * fastest + 1.5 * widest + 1.0)
}

fn diameter(options: &ImageOptions, deviation: f64) -> f64 {
    let mean = options.particle_diameter_px;
    (mean + options.diameter_spread_px * deviation.clamp(-3.0, 3.0)).max(0.25 * mean)
}

/// Light at depth `z` in sheet thicknesses from its middle; the thickness is the e^-2 diameter.
fn sheet_light(sheet: Sheet, z: f64) -> f64 {
    match sheet {
        _ if z.abs() > 0.5 => 0.0,
        Sheet::Gaussian => (-8.0 * z * z).exp(),
        Sheet::Flat => 1.0,
    }
}

/// Where the particle at `start` is after `time` (before, if negative).
///
/// Fourth-order Runge-Kutta steps (Kutta 1901), halved until the end moves by less than 1e-7 of
/// the way travelled; the remaining error is some 15 times smaller where the flow is smooth. At a
/// kink of the velocity, such as the edge of a Rankine core, 256 steps are the end.
pub(super) fn travel(flow: &Flow, start: (f64, f64), time: f64) -> (f64, f64) {
    let mut coarse = steps(flow, start, time, 1);
    for halvings in 1..=8 {
        let fine = steps(flow, start, time, 1 << halvings);
        let change = (fine.0 - coarse.0).hypot(fine.1 - coarse.1);
        let way = (fine.0 - start.0).hypot(fine.1 - start.1);
        // The second term is what rounding of the position itself makes.
        if change <= 1e-7 * way + 1e-13 * (start.0.abs() + start.1.abs()) {
            return fine;
        }
        coarse = fine;
    }
    coarse
}

fn steps(flow: &Flow, start: (f64, f64), time: f64, count: u32) -> (f64, f64) {
    let h = time / f64::from(count);
    (0..count).fold(start, |(x, y), _| {
        let (u1, v1) = flow.velocity(x, y);
        let (u2, v2) = flow.velocity(x + 0.5 * h * u1, y + 0.5 * h * v1);
        let (u3, v3) = flow.velocity(x + 0.5 * h * u2, y + 0.5 * h * v2);
        let (u4, v4) = flow.velocity(x + h * u3, y + h * v3);
        (
            x + h / 6.0 * (u1 + 2.0 * u2 + 2.0 * u3 + u4),
            y + h / 6.0 * (v1 + 2.0 * v2 + 2.0 * v3 + v4),
        )
    })
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::synth::{LambOseen, SolidRotation, Uniform};

    #[test]
    fn paths_in_a_vortex_are_exact_to_a_millionth_of_a_pixel() {
        // On a circle a particle turns by the angle circulation(r) / (2 pi r²) a frame. The
        // fastest turns 2.5 radians a frame, far beyond any recording.
        for circulation in [10.0, 300.0, 2000.0] {
            let eddy = LambOseen {
                x: 250.0,
                y: 260.0,
                core_radius: 11.0,
                circulation,
            };
            let flow = Flow::from(eddy);
            for r in [0.3, 4.0, 12.0, 40.0, 200.0] {
                let rate = eddy.circulation_within(r) / (std::f64::consts::TAU * r * r);
                for time in [-0.5, 0.5] {
                    let (x, y) = travel(&flow, (250.0 + r, 260.0), time);
                    let (sin, cos) = (rate * time).sin_cos();
                    let error = (x - 250.0 - r * cos).hypot(y - 260.0 - r * sin);
                    assert!(error < 1e-6, "circulation {circulation}, r {r}: {error}");
                }
            }
        }
    }

    #[test]
    fn a_particle_is_displaced_between_the_exposures_as_the_flow_says() {
        let flow = Flow::from(SolidRotation {
            x: 20.0,
            y: 30.0,
            rate: 0.2,
        });
        let options = ImageOptions {
            width_px: 64,
            height_px: 48,
            ..Default::default()
        };
        for particle in particles(&flow, &options).unwrap() {
            let [(x0, y0), (x1, y1)] = particle.at;
            // The chord of a rotation by 0.2 about the point at the mid time.
            let (mx, my) = (0.5 * (x0 + x1) - 20.0, 0.5 * (y0 + y1) - 30.0);
            let (x, y) = (20.0 + mx / 0.1f64.cos(), 30.0 + my / 0.1f64.cos());
            let (dx, dy) = flow.displacement(x, y, 1.0);
            assert!((x1 - x0 - dx).hypot(y1 - y0 - dy) < 1e-6);
            let chord = 2.0 * 0.1f64.sin() * (x - 20.0).hypot(y - 30.0);
            assert!((dx.hypot(dy) - chord).abs() < 1e-6);
        }
    }

    #[test]
    fn seeding_is_as_asked_in_every_part_of_both_exposures() {
        let eddy = LambOseen {
            x: 140.0,
            y: 90.0,
            core_radius: 30.0,
            circulation: 1500.0,
        };
        let flow = Flow::from(eddy) + Uniform { u: 9.0, v: -6.0 };
        let options = ImageOptions {
            width_px: 300,
            height_px: 200,
            seeding_per_px2: 0.06,
            out_of_plane_loss: 0.2,
            ..Default::default()
        };
        let particles = particles(&flow, &options).unwrap();
        for exposure in 0..2 {
            for (left, low) in [
                (0.0, 0.0),
                (200.0, 0.0),
                (0.0, 100.0),
                (200.0, 100.0),
                (100.0, 50.0),
            ] {
                let inside = |p: &&Particle| {
                    let (x, y) = p.at[exposure];
                    let along = (left - 0.5..left + 99.5).contains(&x);
                    along && (low - 0.5..low + 99.5).contains(&y) && p.light[exposure] > 0.0
                };
                let count = particles.iter().filter(inside).count() as f64;
                // 600 expected, Poisson: within 4 standard deviations in each of ten parts.
                assert!(
                    (count - 600.0).abs() < 4.0 * 600f64.sqrt(),
                    "{count} at {left}, {low}"
                );
            }
        }
    }

    #[test]
    fn out_of_plane_motion_takes_the_share_asked_for_and_brings_as_many() {
        let options = ImageOptions {
            out_of_plane_loss: 0.3,
            ..Default::default()
        };
        let particles = particles(&Flow::rest(), &options).unwrap();
        let count = |test: &dyn Fn([f64; 2]) -> bool| {
            particles.iter().filter(|p| test(p.light)).count() as f64
        };
        let first = count(&|light| light[0] > 0.0);
        let lost = count(&|light| light[0] > 0.0 && light[1] == 0.0);
        let came = count(&|light| light[0] == 0.0 && light[1] > 0.0);
        // Binomial of some 16000: 4 standard deviations are 0.015.
        assert!((lost / first - 0.3).abs() < 0.015 && (came / first - 0.3).abs() < 0.015);
    }

    #[test]
    fn sheet_light_falls_to_e_to_the_minus_2_at_its_edge() {
        assert_eq!(sheet_light(Sheet::Gaussian, 0.0), 1.0);
        assert!((sheet_light(Sheet::Gaussian, 0.5) - (-2f64).exp()).abs() < 1e-15);
        assert_eq!(sheet_light(Sheet::Gaussian, 0.51), 0.0);
        assert_eq!(sheet_light(Sheet::Flat, -0.5), 1.0);
    }

    #[test]
    fn a_flow_too_fast_and_too_much_seeding_are_refused() {
        let options = ImageOptions {
            width_px: 64,
            height_px: 64,
            ..Default::default()
        };
        let error = particles(&Uniform { u: 64.0, v: 0.0 }.into(), &options).unwrap_err();
        assert!(error.to_string().contains("below 64 px/frame"), "{error}");
        let error = particles(
            &Uniform {
                u: f64::NAN,
                v: 0.0,
            }
            .into(),
            &options,
        )
        .unwrap_err();
        assert!(matches!(error, SynthError::TooFast { .. }));
        let (width_px, height_px, seeding_per_px2) = (32768, 32768, 100.0);
        let options = ImageOptions {
            width_px,
            height_px,
            seeding_per_px2,
            ..options
        };
        let error = particles(&Flow::rest(), &options).unwrap_err();
        assert!(
            error.to_string().contains("seeding_per_px2 less"),
            "{error}"
        );
    }
}
