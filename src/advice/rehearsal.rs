//! A plan rehearsed: the pull to whole px that it shows on synthetic images like the recording's.

use std::f64::consts::TAU;

use super::AdviceError;
use super::blob::Blob;
use super::images::Particles;
use super::locking::tapered_mean;
use crate::field::Status;
use crate::frames::Scale;
use crate::interrogate::{Plan, interrogate_images};
use crate::synth::{Flow, ImageOptions, Shear, Sheet, particle_images};
use crate::task::Task;

/// Sides of the synthetic images, px.
const SIDES: (usize, usize) = (256, 512);

/// Centre of the brightest particle image and background, of full scale.
const PEAK: f64 = 0.4;
const BACKGROUND: f64 = 0.2;

/// Errors of vectors from synthetic images like those of a recording.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Rehearsal {
    /// Pulls to multiples of 1 and 2 px: the largest error of a vector towards them, px.
    pub pulls_px: [f64; 2],
    /// Root mean square of all errors of a component, px.
    pub error_px: f64,
}

/// Errors of the plan in an even shear, in which displacement grows by 1 px over two windows of
/// the last pass, on images with the diameter, seeding, noise and loss of these.
///
/// The pull is fitted to the errors, which are known exactly here, as a sine of the true
/// displacement.
pub(super) fn rehearse(
    particles: &Particles,
    kept: f64,
    plan: &Plan,
    task: &Task,
) -> Result<Rehearsal, AdviceError> {
    let windows = plan.windows();
    let last = windows.last().map_or(32, |w| w.width.max(w.height));
    let largest = windows.iter().map(|w| w.width.max(w.height)).max();
    let side = (12 * last).clamp(SIDES.0, SIDES.1).max(2 * largest.unwrap_or(last));
    // What the pixels leave of the peak of the light that options give.
    let sigma = particles.width.mean() / 4.0;
    let pixels = TAU * sigma * sigma / Blob::new(particles.width.mean()).area();
    let noise = (1.0 - particles.width.signal).max(0.0).sqrt() / particles.seeding.peak;
    let options = ImageOptions {
        width_px: side,
        height_px: side,
        seeding_per_px2: particles.seeding.per_px2.min(0.5),
        particle_diameter_px: particles.width.mean(),
        peak_of_full_scale: PEAK,
        background_of_full_scale: BACKGROUND,
        noise_of_full_scale: (noise * pixels * PEAK).min(0.2),
        out_of_plane_loss: (1.0 - kept).clamp(0.0, 0.9),
        sheet: if particles.seeding.mean_brightness > 0.8 {
            Sheet::Flat
        } else {
            Sheet::Gaussian
        },
        bits: 16,
        ..ImageOptions::default()
    };
    let rate = 0.5 / last as f64;
    let flow = Flow::from(Shear {
        y: 0.5 * (side as f64 - 1.0),
        rate,
    });
    let (first, second) = particle_images(&flow, &options)?;
    let field = interrogate_images(
        &first.pixels,
        &second.pixels,
        [None, None],
        plan,
        &Scale::default(),
        "rehearsal",
        task,
    )?;
    let mut fits = [(0.0, 0.0); 2];
    let (mut square, mut count) = (0.0, 0.0);
    for (at, status) in field.status.indexed_iter() {
        if *status != Status::Measured {
            continue;
        }
        let (u, v) = flow.displacement(field.grid.x(at.1), field.grid.y(at.0), 1.0);
        let off = (field.u[at] - u, field.v[at] - v);
        square += 0.5 * (off.0 * off.0 + off.1 * off.1);
        count += 1.0;
        for (fit, period) in fits.iter_mut().zip([1.0, 2.0]) {
            let wave = (TAU * u / period).sin() * tapered_mean(rate * last as f64 / period);
            *fit = (fit.0 + off.0 * wave, fit.1 + wave * wave);
        }
    }
    Ok(Rehearsal {
        pulls_px: fits.map(|(with, own)| if own > 0.0 { 0.0 - with / own } else { f64::NAN }),
        error_px: (square / f64::max(count, 1.0)).sqrt(),
    })
}
