//! The travelling vortex pair of Lamb and Chaplygin.

use serde::{Deserialize, Serialize};

use super::Element;
use super::flow::above_zero;

/// First positive zero of the Bessel function J1: wavenumber times radius.
const J1_ROOT: f64 = 3.831_705_970_207_512;

/// Where J1 is largest, and that largest value.
const J1_PEAK: (f64, f64) = (1.841_183_781_340_659, 0.581_865_224_281_596);

/// Vortex pair that travels unchanged, its vorticity inside a circle: Lamb-Chaplygin dipole (Lamb
/// 1906; Chaplygin 1903; Meleshko & van Heijst 1994 for the history; citations from memory).
///
/// With the heading along x and polar coordinates about the centre, inside the radius a
/// w = -2 U k J1(k r) sin(theta) / J0(k a), k a = 3.831706; outside there is none. For U above
/// zero the eddy on the left of the heading turns counter-clockwise. Velocities are those seen by
/// someone at rest, with the dipole at (x, y) at this moment; put `x` and `y` where it is at each.
#[derive(Clone, Copy, Debug, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct LambChaplygin {
    /// x of the centre (option `x_px`).
    #[serde(rename = "x_px")]
    pub x: f64,
    /// y of the centre (option `y_px`).
    #[serde(rename = "y_px")]
    pub y: f64,
    /// Radius of the circle that holds all vorticity; above zero (option `radius_px`).
    #[serde(rename = "radius_px", deserialize_with = "above_zero")]
    pub radius: f64,
    /// U, the speed it travels at (option `speed_px_per_frame`).
    #[serde(rename = "speed_px_per_frame")]
    pub speed: f64,
    /// Direction it travels in, degrees counter-clockwise from x.
    #[serde(default)]
    pub heading_deg: f64,
}

impl LambChaplygin {
    /// The same dipole after it travelled for `time`.
    pub fn moved(self, time: f64) -> LambChaplygin {
        let (ux, uy) = self.heading();
        LambChaplygin {
            x: self.x + self.speed * time * ux,
            y: self.y + self.speed * time * uy,
            ..self
        }
    }

    /// Points of largest vorticity: the counter-clockwise eddy's (for a positive speed) and the
    /// clockwise one's, each 0.480513 radii beside the centre.
    pub fn eddy_centres(&self) -> [(f64, f64); 2] {
        let (ux, uy) = self.heading();
        let beside = J1_PEAK.0 / self.wavenumber();
        [
            (self.x - beside * uy, self.y + beside * ux),
            (self.x + beside * uy, self.y - beside * ux),
        ]
    }

    /// Largest vorticity, 11.0708 U / a; the other eddy's is its negative.
    pub fn peak_vorticity(&self) -> f64 {
        self.amplitude() * J1_PEAK.1
    }

    /// Circulation of the counter-clockwise eddy (half the circle), 6.8305 U a; the other's is
    /// its negative.
    pub fn eddy_circulation(&self) -> f64 {
        self.region(0.0).1
    }

    /// Area of the part of one eddy where vorticity is above `fraction` (0 to 1) of its peak, and
    /// the circulation in it.
    pub fn fraction_region(&self, fraction: f64) -> (f64, f64) {
        self.region(fraction.clamp(0.0, 1.0))
    }

    /// Sums rings of half the circle: at radius r, sin(theta) must pass f J1_PEAK / J1(k r).
    fn region(&self, fraction: f64) -> (f64, f64) {
        const RINGS: usize = 20_000;
        let k = self.wavenumber();
        let dr = self.radius / RINGS as f64;
        let ring = |n: usize| {
            let r = (n as f64 + 0.5) * dr;
            let level = libm::j1(k * r);
            let least = fraction * J1_PEAK.1 / level;
            if least >= 1.0 {
                return (0.0, 0.0);
            }
            let angle = std::f64::consts::PI - 2.0 * least.asin();
            let circulation = self.amplitude() * level * 2.0 * (1.0 - least * least).sqrt();
            (angle * r * dr, circulation * r * dr)
        };
        (0..RINGS)
            .map(ring)
            .fold((0.0, 0.0), |(a, c), (da, dc)| (a + da, c + dc))
    }

    fn wavenumber(&self) -> f64 {
        J1_ROOT / self.radius
    }

    /// Factor of J1(k r) sin(theta) in the vorticity.
    fn amplitude(&self) -> f64 {
        -2.0 * self.speed * self.wavenumber() / libm::j0(J1_ROOT)
    }

    /// Unit vector of the heading.
    fn heading(&self) -> (f64, f64) {
        let (sin, cos) = self.heading_deg.to_radians().sin_cos();
        (cos, sin)
    }

    /// Position in the frame of the dipole: along and to the left of the heading.
    fn along_and_left(&self, x: f64, y: f64) -> (f64, f64) {
        let (ux, uy) = self.heading();
        let (dx, dy) = (x - self.x, y - self.y);
        (dx * ux + dy * uy, dy * ux - dx * uy)
    }

    /// Velocity along and to the left of the heading, from the stream function
    /// psi = U a² sin(theta) / r outside, and inside
    /// psi = U r sin(theta) - 2 U J1(k r) sin(theta) / (k J0(k a)), u = psi_y, v = -psi_x.
    fn velocity_along_and_left(&self, p: f64, q: f64) -> (f64, f64) {
        let r2 = p * p + q * q;
        if r2 >= self.radius.powi(2) {
            let strength = self.speed * self.radius.powi(2) / (r2 * r2);
            return (strength * (p * p - q * q), strength * 2.0 * p * q);
        }
        let k = self.wavenumber();
        let kr = k * r2.sqrt();
        // psi = U q + c f(r) q with f = J1(kr)/(kr); f'/r = -J2(kr)/r², J2(kr) = 2 f - J0(kr).
        // Series about the centre; where they hand over the neglected terms are below 1e-14.
        let (f, slope) = if kr < 1e-3 {
            (0.5 - kr * kr / 16.0, -k * k * (0.125 - kr * kr / 96.0))
        } else {
            let f = libm::j1(kr) / kr;
            (f, -(2.0 * f - libm::j0(kr)) / r2)
        };
        let c = -2.0 * self.speed / libm::j0(J1_ROOT);
        (self.speed + c * (f + slope * q * q), -c * slope * p * q)
    }
}

impl Element for LambChaplygin {
    fn velocity(&self, x: f64, y: f64) -> (f64, f64) {
        let (p, q) = self.along_and_left(x, y);
        let (along, left) = self.velocity_along_and_left(p, q);
        let (ux, uy) = self.heading();
        (along * ux - left * uy, along * uy + left * ux)
    }

    fn vorticity(&self, x: f64, y: f64) -> f64 {
        let (p, q) = self.along_and_left(x, y);
        let r = p.hypot(q);
        if r >= self.radius || r == 0.0 {
            return 0.0;
        }
        self.amplitude() * libm::j1(self.wavenumber() * r) * q / r
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::f64::consts::PI;

    const DIPOLE: LambChaplygin = LambChaplygin {
        x: 4.0,
        y: -3.0,
        radius: 10.0,
        speed: 2.0,
        heading_deg: 25.0,
    };

    /// The point at (along, left) of the dipole's centre.
    fn point(along: f64, left: f64) -> (f64, f64) {
        let (ux, uy) = DIPOLE.heading();
        (4.0 + along * ux - left * uy, -3.0 + along * uy + left * ux)
    }

    #[test]
    fn bessel_roots_are_roots() {
        // 3.83171, 1.84118 and 0.58187: Abramowitz & Stegun, table 9.5, from memory.
        assert!(libm::j1(J1_ROOT).abs() < 1e-15 && (J1_ROOT - 3.83171).abs() < 5e-6);
        let (at, peak) = J1_PEAK;
        // J1'(z) = J0(z) - J1(z)/z
        assert!((libm::j0(at) - libm::j1(at) / at).abs() < 1e-15);
        assert!((libm::j1(at) - peak).abs() < 1e-15);
    }

    #[test]
    fn velocity_is_continuous_across_the_rim() {
        for degrees in [0.0f64, 20.0, 90.0, 200.0, 315.0] {
            let (sin, cos) = degrees.to_radians().sin_cos();
            let at = |r: f64| {
                let (x, y) = point(r * cos, r * sin);
                DIPOLE.velocity(x, y)
            };
            let (inside, outside) = (at(10.0 - 1e-9), at(10.0 + 1e-9));
            assert!(
                (inside.0 - outside.0).abs() < 1e-8,
                "{inside:?} {outside:?}"
            );
            assert!(
                (inside.1 - outside.1).abs() < 1e-8,
                "{inside:?} {outside:?}"
            );
        }
    }

    #[test]
    fn seen_from_the_dipole_the_rim_is_a_streamline() {
        let (ux, uy) = DIPOLE.heading();
        for degrees in (0..360).step_by(15) {
            let (sin, cos) = f64::from(degrees).to_radians().sin_cos();
            let (x, y) = point(10.0 * cos, 10.0 * sin);
            let (u, v) = DIPOLE.velocity(x, y);
            let outward = (u - 2.0 * ux) * (x - 4.0) + (v - 2.0 * uy) * (y + 3.0);
            assert!(outward.abs() < 1e-12);
        }
    }

    #[test]
    fn it_travels_unchanged() {
        // Steady Euler flow in its own frame: (velocity - U) . grad w = 0 at every point inside.
        let h = 1e-4;
        let (ux, uy) = DIPOLE.heading();
        for (along, left) in [
            (1.0, 2.0),
            (-3.0, 4.0),
            (5.0, -6.0),
            (0.5, 8.0),
            (-7.0, -1.0),
        ] {
            let (x, y) = point(along, left);
            let (u, v) = DIPOLE.velocity(x, y);
            let wx = (DIPOLE.vorticity(x + h, y) - DIPOLE.vorticity(x - h, y)) / (2.0 * h);
            let wy = (DIPOLE.vorticity(x, y + h) - DIPOLE.vorticity(x, y - h)) / (2.0 * h);
            let change = (u - 2.0 * ux) * wx + (v - 2.0 * uy) * wy;
            assert!(change.abs() < 1e-8, "{change}");
        }
    }

    #[test]
    fn it_moves_along_its_heading_with_the_counter_clockwise_eddy_on_the_left() {
        let later = DIPOLE.moved(3.0);
        assert!((later.x - 4.0 - 6.0 * 25f64.to_radians().cos()).abs() < 1e-12);
        assert!((later.y + 3.0 - 6.0 * 25f64.to_radians().sin()).abs() < 1e-12);
        let (left_x, left_y) = point(0.0, 5.0);
        assert!(DIPOLE.vorticity(left_x, left_y) > 0.0);
        let (right_x, right_y) = point(0.0, -5.0);
        assert!(DIPOLE.vorticity(right_x, right_y) < 0.0);
    }

    #[test]
    fn its_eddies_have_the_known_place_peak_and_circulation() {
        // 0.48051 a, 11.07 U/a and 6.83 U a: Meleshko & van Heijst 1994, from memory.
        let [(x, y), (x2, y2)] = DIPOLE.eddy_centres();
        assert!(((x - 4.0).hypot(y + 3.0) / 10.0 - 0.480_51).abs() < 5e-6);
        let peak = DIPOLE.peak_vorticity();
        assert!((peak * 10.0 / 2.0 - 11.07).abs() < 5e-3);
        assert!((DIPOLE.vorticity(x, y) - peak).abs() < 1e-12);
        assert!((DIPOLE.vorticity(x2, y2) + peak).abs() < 1e-12);
        for (dx, dy) in [(0.1, 0.0), (-0.1, 0.0), (0.0, 0.1), (0.0, -0.1)] {
            assert!(DIPOLE.vorticity(x + dx, y + dy) < peak);
        }
        assert!((DIPOLE.eddy_circulation() / 20.0 - 6.83).abs() < 5e-3);
    }

    #[test]
    fn the_circulation_of_an_eddy_is_the_integral_round_its_half_circle() {
        const STEPS: usize = 20_000;
        let (ux, uy) = DIPOLE.heading();
        let mut sum = 0.0;
        for n in 0..STEPS {
            let t = (n as f64 + 0.5) / STEPS as f64;
            let (x, y) = point(-10.0 + 20.0 * t, 0.0);
            let (u, v) = DIPOLE.velocity(x, y);
            sum += (u * ux + v * uy) * 20.0 / STEPS as f64;
            let (sin, cos) = (PI * t).sin_cos();
            let (x, y) = point(10.0 * cos, 10.0 * sin);
            let (u, v) = DIPOLE.velocity(x, y);
            let (along, left) = (u * ux + v * uy, v * ux - u * uy);
            sum += (left * cos - along * sin) * 10.0 * PI / STEPS as f64;
        }
        assert!((sum / DIPOLE.eddy_circulation() - 1.0).abs() < 1e-6);
    }

    #[test]
    fn the_region_above_a_fraction_of_the_peak_is_that_counted_on_a_fine_grid() {
        let (area, circulation) = DIPOLE.fraction_region(0.25);
        let step = 0.01;
        let (mut cells, mut sum) = (0.0, 0.0);
        for i in -1000..1000 {
            for j in 0..1000 {
                let (x, y) = point((f64::from(i) + 0.5) * step, (f64::from(j) + 0.5) * step);
                let w = DIPOLE.vorticity(x, y);
                if w > 0.25 * DIPOLE.peak_vorticity() {
                    cells += 1.0;
                    sum += w;
                }
            }
        }
        // Counting cells errs by some cells of the boundary: 20 long, 0.01 wide, mostly cancelling.
        assert!((cells * step * step / area - 1.0).abs() < 1e-4);
        assert!((sum * step * step / circulation - 1.0).abs() < 1e-4);
        assert_eq!(DIPOLE.fraction_region(1.0).0, 0.0);
        assert!((DIPOLE.fraction_region(0.0).0 - 50.0 * PI).abs() < 1e-6);
    }
}
