//! The demonstration: a laboratory basin whose tidal inlet ejects a vortex pair.
//!
//! Everything here is invented. The camera sees 512 x 512 px of the basin, 0.2 mm each, in pairs
//! of exposures 10 ms apart, one pair every 0.2 s. A vortex pair from the inlet on the left
//! crosses it; an older counter-clockwise eddy above and a clockwise one below slowly decay.

use super::{Flow, ImageOptions, LambChaplygin, LambOseen, SynthError, particle_images};
use crate::frames::Frame;

/// Length of a pixel of the demonstration, mm.
pub const MM_PER_PX: f64 = 0.2;
/// Time between the exposures of a pair, s.
pub const DT_S: f64 = 0.01;
/// Pairs of the recording.
pub const PAIRS: usize = 12;

/// Frame intervals between pairs.
const INTERVAL: f64 = 20.0;
/// Kinematic viscosity of water at 20 °C, 1.0 mm²/s, in px² a frame.
const VISCOSITY: f64 = 1.0 / (MM_PER_PX * MM_PER_PX) * DT_S;
/// The contour the true sizes are for, as a fraction of the peak vorticity.
const FRACTION: f64 = 0.25;

/// The exact answer for one eddy of the demonstration, in mm and s.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct TrueEddy {
    /// Which eddy: "inlet left", "inlet right", "upper" or "lower".
    pub name: &'static str,
    /// Centre.
    pub x_mm: f64,
    /// Centre, y up from the lowest pixel row.
    pub y_mm: f64,
    /// Circulation inside the contour of a quarter of the peak vorticity.
    pub circulation_mm2_per_s: f64,
    /// Diameter of the circle with the area inside that contour.
    pub diameter_mm: f64,
}

fn parts(pair: usize) -> (LambChaplygin, [(&'static str, LambOseen); 2]) {
    let time = pair as f64 * INTERVAL;
    let dipole = LambChaplygin {
        x: 96.0,
        y: 232.0,
        radius: 72.0,
        speed: 1.2,
        heading_deg: 8.0,
    };
    let upper = LambOseen {
        x: 118.0,
        y: 414.0,
        core_radius: 27.0,
        circulation: 580.0,
    };
    let lower = LambOseen {
        x: 402.0,
        y: 92.0,
        core_radius: 31.0,
        circulation: -640.0,
    };
    (
        dipole.moved(time),
        [
            ("upper", upper.aged(VISCOSITY, time)),
            ("lower", lower.aged(VISCOSITY, time)),
        ],
    )
}

/// The flow at the mid time of a pair, px and frame.
pub fn flow(pair: usize) -> Flow {
    let (dipole, [(_, upper), (_, lower)]) = parts(pair);
    Flow::from(dipole) + upper + lower
}

/// The exact eddies at the mid time of a pair.
///
/// Each is exact for its part of the flow alone; the others' vorticity at its contour is below
/// 1e-4 of its peak.
pub fn true_eddies(pair: usize) -> Vec<TrueEddy> {
    let (dipole, round) = parts(pair);
    let area = MM_PER_PX * MM_PER_PX;
    let eddy = |name, (x, y): (f64, f64), circulation: f64, diameter: f64| TrueEddy {
        name,
        x_mm: x * MM_PER_PX,
        y_mm: y * MM_PER_PX,
        circulation_mm2_per_s: circulation * area / DT_S,
        diameter_mm: diameter * MM_PER_PX,
    };
    let (region, circulation) = dipole.fraction_region(FRACTION);
    let across = 2.0 * (region / std::f64::consts::PI).sqrt();
    let [left, right] = dipole.eddy_centres();
    let mut eddies = vec![
        eddy("inlet left", left, circulation, across),
        eddy("inlet right", right, -circulation, across),
    ];
    eddies.extend(round.map(|(name, part)| {
        let radius = part.fraction_radius(FRACTION);
        let circulation = part.circulation_within(radius);
        eddy(name, (part.x, part.y), circulation, 2.0 * radius)
    }));
    eddies
}

/// The two exposures of a pair as a 12-bit camera would see them: noise, uneven light, haze, and
/// some particles leaving the sheet. Always the same for the same pair.
///
/// # Errors
/// [`SynthError`] never in practice: the options are fixed and checked in a test.
pub fn exposures(pair: usize) -> Result<(Frame, Frame), SynthError> {
    particle_images(
        &flow(pair),
        &ImageOptions {
            out_of_plane_loss: 0.05,
            light_falloff: 0.4,
            background_of_full_scale: 0.04,
            fixed_pattern_of_full_scale: 0.004,
            noise_of_full_scale: 0.01,
            full_well_electrons: Some(12_000.0),
            diameter_spread_px: 0.3,
            seed: 100 + pair as u64,
            ..ImageOptions::default()
        },
    )
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_parts_are_far_enough_apart_for_their_own_exact_answers() {
        for pair in 0..PAIRS {
            let whole = flow(pair);
            for eddy in true_eddies(pair) {
                let (x, y) = (eddy.x_mm / MM_PER_PX, eddy.y_mm / MM_PER_PX);
                let alone = match eddy.name {
                    "upper" | "lower" => {
                        let (_, round) = parts(pair);
                        let part = round[usize::from(eddy.name == "lower")].1;
                        part.peak_vorticity()
                    }
                    _ => parts(pair).0.peak_vorticity() * eddy.circulation_mm2_per_s.signum(),
                };
                assert!(
                    (whole.vorticity(x, y) / alone - 1.0).abs() < 1e-4,
                    "{pair} {eddy:?}"
                );
                // Whole inside the picture, with room for the windows at the edge.
                let reach = eddy.diameter_mm / 2.0 / MM_PER_PX + 16.0;
                assert!(
                    x > reach && x < 511.0 - reach && y > reach && y < 511.0 - reach,
                    "{pair} {eddy:?}"
                );
            }
        }
    }

    #[test]
    fn a_pair_can_be_drawn_and_never_moves_more_than_a_quarter_of_a_window() {
        let (first, second) = exposures(0).unwrap();
        assert_eq!((first.width(), first.height()), (512, 512));
        assert_ne!(first.pixels, second.pixels);
        let fastest = (0..512 * 512)
            .map(|i| {
                let (u, v) = flow(3).velocity(f64::from(i % 512), f64::from(i / 512));
                u.hypot(v)
            })
            .fold(0.0, f64::max);
        assert!(fastest > 2.0 && fastest < 16.0, "{fastest}");
    }
}
