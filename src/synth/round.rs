//! Vortices of circular streamlines: Lamb-Oseen (and Burgers), shielded Gaussian, Rankine.

use std::f64::consts::{E, PI, TAU};

use serde::{Deserialize, Serialize};

use super::Element;
use super::flow::above_zero;

/// s with exp(s) = 1 + 2 s: (radius of largest speed / core radius)² of a Lamb-Oseen vortex,
/// found by Newton's method in `the_radius_of_largest_speed_is_the_root_of_its_equation`.
const LARGEST_SPEED_ROOT: f64 = 1.256_431_208_626_17;

/// Velocity about (x0, y0) with angular velocity `rate` at (x, y).
fn turning(x: f64, y: f64, x0: f64, y0: f64, rate: impl Fn(f64) -> f64) -> (f64, f64) {
    let (dx, dy) = (x - x0, y - y0);
    let rate = rate(dx * dx + dy * dy);
    (-rate * dy, rate * dx)
}

fn distance2(x: f64, y: f64, x0: f64, y0: f64) -> f64 {
    (x - x0).powi(2) + (y - y0).powi(2)
}

/// Vortex with vorticity w = circulation / (pi rc²) exp(-r²/rc²) (Oseen 1912; Lamb 1932, art.
/// 334a; citations from memory).
///
/// It diffuses with rc² growing as 4 nu t ([`LambOseen::aged`]); held steady by an axial strain
/// rate it is the in-plane part of the Burgers vortex ([`LambOseen::burgers`]).
#[derive(Clone, Copy, Debug, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct LambOseen {
    /// x of the centre (option `x_px`).
    #[serde(rename = "x_px")]
    pub x: f64,
    /// y of the centre (option `y_px`).
    #[serde(rename = "y_px")]
    pub y: f64,
    /// rc, where vorticity is 1/e of its peak; above zero (option `core_radius_px`).
    #[serde(rename = "core_radius_px", deserialize_with = "above_zero")]
    pub core_radius: f64,
    /// Total circulation, positive counter-clockwise (option `circulation_px2_per_frame`).
    #[serde(rename = "circulation_px2_per_frame")]
    pub circulation: f64,
}

impl LambOseen {
    /// The Burgers vortex of this kinematic viscosity and axial strain rate, both above zero:
    /// rc² = 4 viscosity / strain (Burgers 1948, from memory). Only its motion in the plane of
    /// rotation, without the inflow.
    pub fn burgers(x: f64, y: f64, viscosity: f64, strain: f64, circulation: f64) -> LambOseen {
        LambOseen {
            x,
            y,
            core_radius: (4.0 * viscosity / strain).sqrt(),
            circulation,
        }
    }

    /// The same vortex after it diffused for `time` under a kinematic viscosity.
    pub fn aged(self, viscosity: f64, time: f64) -> LambOseen {
        LambOseen {
            core_radius: (self.core_radius.powi(2) + 4.0 * viscosity * time).sqrt(),
            ..self
        }
    }

    /// Vorticity at the centre.
    pub fn peak_vorticity(&self) -> f64 {
        self.circulation / (PI * self.core_radius.powi(2))
    }

    /// Circulation inside radius `r`; it grows for ever towards the total.
    pub fn circulation_within(&self, r: f64) -> f64 {
        -self.circulation * (-(r / self.core_radius).powi(2)).exp_m1()
    }

    /// Radius of largest speed, 1.12091 rc; swirling strength is above zero exactly inside it.
    pub fn largest_speed_radius(&self) -> f64 {
        LARGEST_SPEED_ROOT.sqrt() * self.core_radius
    }

    /// Radius where vorticity has fallen to `fraction` (0 to 1) of its peak; the circulation
    /// inside is 1 - `fraction` of the total.
    pub fn fraction_radius(&self, fraction: f64) -> f64 {
        self.core_radius * (-fraction.ln()).sqrt()
    }
}

impl Element for LambOseen {
    fn velocity(&self, x: f64, y: f64) -> (f64, f64) {
        let rc2 = self.core_radius.powi(2);
        turning(x, y, self.x, self.y, |r2| {
            let s = r2 / rc2;
            // (1 - exp(-s)) / s, which is 1 at the centre.
            let shape = if s == 0.0 { 1.0 } else { -(-s).exp_m1() / s };
            self.circulation / (TAU * rc2) * shape
        })
    }

    fn vorticity(&self, x: f64, y: f64) -> f64 {
        let s = distance2(x, y, self.x, self.y) / self.core_radius.powi(2);
        self.peak_vorticity() * (-s).exp()
    }
}

/// Vortex in a shield of opposite vorticity, w = w0 (1 - r²/rc²) exp(-r²/rc²), of no circulation
/// in all (Carton, Flierl & Polvani 1989 for the family, from memory).
#[derive(Clone, Copy, Debug, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct ShieldedGaussian {
    /// x of the centre (option `x_px`).
    #[serde(rename = "x_px")]
    pub x: f64,
    /// y of the centre (option `y_px`).
    #[serde(rename = "y_px")]
    pub y: f64,
    /// rc, where vorticity changes its sign; above zero (option `core_radius_px`).
    #[serde(rename = "core_radius_px", deserialize_with = "above_zero")]
    pub core_radius: f64,
    /// w0, vorticity at the centre (option `peak_vorticity_per_frame`).
    #[serde(rename = "peak_vorticity_per_frame")]
    pub peak_vorticity: f64,
}

impl ShieldedGaussian {
    /// Circulation inside radius `r`: pi w0 r² exp(-r²/rc²).
    pub fn circulation_within(&self, r: f64) -> f64 {
        PI * self.peak_vorticity * r * r * (-(r / self.core_radius).powi(2)).exp()
    }

    /// The largest circulation inside any circle, pi w0 rc² / e, reached at r = rc.
    pub fn largest_circulation(&self) -> f64 {
        PI * self.peak_vorticity * self.core_radius.powi(2) / E
    }

    /// Radius of largest speed, rc / sqrt 2.
    pub fn largest_speed_radius(&self) -> f64 {
        self.core_radius / 2f64.sqrt()
    }
}

impl Element for ShieldedGaussian {
    fn velocity(&self, x: f64, y: f64) -> (f64, f64) {
        turning(x, y, self.x, self.y, |r2| {
            0.5 * self.peak_vorticity * (-r2 / self.core_radius.powi(2)).exp()
        })
    }

    fn vorticity(&self, x: f64, y: f64) -> f64 {
        let s = distance2(x, y, self.x, self.y) / self.core_radius.powi(2);
        self.peak_vorticity * (1.0 - s) * (-s).exp()
    }
}

/// Solid rotation inside the core, no vorticity outside (Rankine 1872, from memory).
#[derive(Clone, Copy, Debug, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Rankine {
    /// x of the centre (option `x_px`).
    #[serde(rename = "x_px")]
    pub x: f64,
    /// y of the centre (option `y_px`).
    #[serde(rename = "y_px")]
    pub y: f64,
    /// Radius of the core, also that of largest speed; above zero (option `core_radius_px`).
    #[serde(rename = "core_radius_px", deserialize_with = "above_zero")]
    pub core_radius: f64,
    /// Circulation of the core, positive counter-clockwise (option
    /// `circulation_px2_per_frame`).
    #[serde(rename = "circulation_px2_per_frame")]
    pub circulation: f64,
}

impl Rankine {
    /// Circulation inside radius `r`.
    pub fn circulation_within(&self, r: f64) -> f64 {
        self.circulation * (r / self.core_radius).powi(2).min(1.0)
    }
}

impl Element for Rankine {
    fn velocity(&self, x: f64, y: f64) -> (f64, f64) {
        let rc2 = self.core_radius.powi(2);
        turning(x, y, self.x, self.y, |r2| {
            self.circulation / (TAU * r2.max(rc2))
        })
    }

    fn vorticity(&self, x: f64, y: f64) -> f64 {
        let rc2 = self.core_radius.powi(2);
        if distance2(x, y, self.x, self.y) <= rc2 {
            self.circulation / (PI * rc2)
        } else {
            0.0
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Circulation round the circle of radius `r`, by the trapezoid rule, exact for circles.
    fn round_trip(element: &dyn Element, x: f64, y: f64, r: f64) -> f64 {
        const POINTS: usize = 64;
        let part = |n: usize| {
            let (sin, cos) = (TAU * n as f64 / POINTS as f64).sin_cos();
            let (u, v) = element.velocity(x + r * cos, y + r * sin);
            (v * cos - u * sin) * TAU * r / POINTS as f64
        };
        (0..POINTS).map(part).sum()
    }

    fn speed(element: &dyn Element, r: f64) -> f64 {
        element.velocity(3.0 + r, -2.0).1.abs()
    }

    const OSEEN: LambOseen = LambOseen {
        x: 3.0,
        y: -2.0,
        core_radius: 5.0,
        circulation: -70.0,
    };
    const SHIELDED: ShieldedGaussian = ShieldedGaussian {
        x: 3.0,
        y: -2.0,
        core_radius: 5.0,
        peak_vorticity: 0.8,
    };
    const RANKINE: Rankine = Rankine {
        x: 3.0,
        y: -2.0,
        core_radius: 5.0,
        circulation: 40.0,
    };

    #[test]
    fn circulation_within_is_the_integral_of_velocity_round_the_circle() {
        for r in [0.01, 1.0, 4.9, 5.1, 9.0, 30.0] {
            let pairs = [
                (
                    round_trip(&OSEEN, 3.0, -2.0, r),
                    OSEEN.circulation_within(r),
                ),
                (
                    round_trip(&SHIELDED, 3.0, -2.0, r),
                    SHIELDED.circulation_within(r),
                ),
                (
                    round_trip(&RANKINE, 3.0, -2.0, r),
                    RANKINE.circulation_within(r),
                ),
            ];
            for (integral, formula) in pairs {
                assert!(
                    (integral - formula).abs() < 1e-12 * (1.0 + formula.abs()),
                    "r {r}"
                );
            }
        }
    }

    #[test]
    fn the_radius_of_largest_speed_is_the_root_of_its_equation() {
        let mut s = 1.25f64;
        for _ in 0..20 {
            s -= (s.exp() - 1.0 - 2.0 * s) / (s.exp() - 2.0);
        }
        assert!((s - LARGEST_SPEED_ROOT).abs() < 1e-14);
        let cases: [(&dyn Element, f64); 3] = [
            (&OSEEN, OSEEN.largest_speed_radius()),
            (&SHIELDED, SHIELDED.largest_speed_radius()),
            (&RANKINE, RANKINE.core_radius),
        ];
        for (element, r) in cases {
            let top = speed(element, r);
            assert!(top > speed(element, 0.99 * r) && top > speed(element, 1.01 * r));
        }
    }

    #[test]
    fn a_lamb_oseen_vortex_has_its_textbook_proportions() {
        // Exact relations worked out from w = w0 exp(-r²/rc²); the decimals from memory.
        let rmax = OSEEN.largest_speed_radius() / OSEEN.core_radius;
        assert!((rmax - 1.12091).abs() < 5e-6);
        let share = OSEEN.circulation_within(5.0 * rmax) / OSEEN.circulation;
        assert!((share - 0.71533).abs() < 5e-6);
        let quarter = OSEEN.fraction_radius(0.25);
        assert!((quarter / 5.0 - 1.17741).abs() < 5e-6);
        assert!((OSEEN.circulation_within(quarter) / OSEEN.circulation - 0.75).abs() < 1e-12);
        assert!(
            (OSEEN.vorticity(3.0, -2.0 + quarter) / OSEEN.peak_vorticity() - 0.25).abs() < 1e-12
        );
    }

    #[test]
    fn a_shielded_vortex_has_its_largest_circulation_where_vorticity_changes_sign() {
        assert!(SHIELDED.vorticity(8.0, -2.0).abs() < 1e-15);
        let most = SHIELDED.largest_circulation();
        assert!((SHIELDED.circulation_within(5.0) - most).abs() < 1e-12);
        assert!(SHIELDED.circulation_within(4.9) < most && SHIELDED.circulation_within(5.1) < most);
        assert!(SHIELDED.circulation_within(60.0) < 1e-12);
    }

    #[test]
    fn diffusion_widens_the_core_and_keeps_the_circulation() {
        // The vorticity equation w_t = nu (w_xx + w_yy), differences in time and space.
        let (nu, dt, h) = (0.3, 1e-4, 1e-2);
        let w = |t: f64, dx: f64, dy: f64| OSEEN.aged(nu, t).vorticity(5.0 + dx, -1.0 + dy);
        let rate = (w(1.0 + dt, 0.0, 0.0) - w(1.0 - dt, 0.0, 0.0)) / (2.0 * dt);
        let around = w(1.0, h, 0.0) + w(1.0, -h, 0.0) + w(1.0, 0.0, h) + w(1.0, 0.0, -h);
        let laplacian = (around - 4.0 * w(1.0, 0.0, 0.0)) / (h * h);
        assert!((rate - nu * laplacian).abs() < 1e-4 * rate.abs());
        let burgers = LambOseen::burgers(0.0, 0.0, 0.25, 0.04, 10.0);
        assert!((burgers.core_radius - 5.0).abs() < 1e-12);
    }
}
