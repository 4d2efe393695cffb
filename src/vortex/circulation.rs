//! Size by largest circulation.
//!
//! Measures the circle round the centre that holds the most circulation: the first maximum of
//! circulation against radius, where the mean vorticity on the circle passes through zero.
//! Circulation is the line integral of the velocity round the circle, so nothing is
//! differentiated and noise averages out along it.
//!
//! Exact answers: shielded Gaussian, radius rc and circulation pi w0 rc²/e; Taylor-Green,
//! sqrt2 k r = 2.404826. It has no answer for an eddy without a shield or a neighbour of the
//! other sense (Lamb-Oseen, Rankine), and says so.

use std::f64::consts::TAU;

use super::NoAnswer;
use super::peak::Peak;
use crate::field::{Place, VectorField};
use crate::quantity::Unit;

/// A maximum counts once the circulation has fallen this far below it, as a part of it. Noise
/// makes shallower ones on the flat far side of an eddy that has none.
const FALL: f64 = 0.05;

/// The parabola that refines the maximum is fitted where the circulation is above this part.
const TOP: f64 = 0.95;

/// Circles are drawn out to this many radii of the vorticity fraction.
const REACH: f64 = 5.0;

/// Circulation against radius of the circle round one eddy's centre.
#[derive(Clone, Debug)]
pub struct CirculationCurve {
    /// Radius of each circle, rising, in `length`.
    pub radius: Vec<f64>,
    /// Circulation round it, positive counter-clockwise, in `unit`.
    pub circulation: Vec<f64>,
    /// Unit of the radii: px or mm.
    pub length: Unit,
    /// Unit of the circulations.
    pub unit: Unit,
}

/// A circle and the circulation round it.
#[derive(Clone, Copy, Debug)]
pub(super) struct Circle {
    pub radius: f64,
    pub circulation: f64,
}

impl CirculationCurve {
    /// Circles round the peak until one meets the edge or a masked cell or is [`REACH`] times
    /// `radius`, the eddy's own.
    pub(super) fn around(field: &VectorField, peak: Peak, radius: f64) -> Self {
        let cell = field.grid.dx.min(field.grid.dy);
        let step = (cell / 4.0).max(radius / 20.0);
        let mut curve = Self {
            radius: Vec::new(),
            circulation: Vec::new(),
            length: field.grid.length,
            unit: field.unit().times(field.grid.length),
        };
        for k in 1..=(REACH * radius / step) as usize {
            let r = k as f64 * step;
            // Rounded: r is a simple multiple of the cell, and cutting off would let the last bit
            // of the unit decide.
            let points = (8.0 * r / cell).clamp(48.0, 180.0).round() as usize;
            let Some(circulation) = round(field, peak, r, points) else {
                break;
            };
            curve.radius.push(r);
            curve.circulation.push(circulation);
        }
        curve
    }

    /// The first maximum of the circulation times `sign`.
    pub(super) fn first_maximum(&self, sign: f64) -> Result<Circle, NoAnswer> {
        let mut best = (0, 0.0);
        for (k, c) in self.circulation.iter().map(|c| c * sign).enumerate() {
            if c > best.1 {
                best = (k, c);
            } else if best.1 > 0.0 && c < (1.0 - FALL) * best.1 {
                return Ok(self.refined(best.0, sign));
            }
        }
        let reach = self.radius.last().copied().unwrap_or(0.0);
        Err(NoAnswer::NoCirculationMaximum {
            reach,
            length: self.length,
        })
    }

    /// The top of the parabola through the circles about the `k`-th, by least squares.
    fn refined(&self, k: usize, sign: f64) -> Circle {
        let high = |m: &usize| self.circulation[*m] * sign > TOP * self.circulation[k] * sign;
        let first = (0..k).rev().take_while(high).last().unwrap_or(k);
        let last = (k..self.radius.len()).take_while(high).last().unwrap_or(k);
        let middle = 0.5 * (self.radius[first] + self.radius[last]);
        let half = 0.5 * (self.radius[last] - self.radius[first]);
        let highest = Circle {
            radius: self.radius[k],
            circulation: self.circulation[k],
        };
        // Sums of powers of t in -1..1, evenly spaced, so the odd ones vanish.
        let (mut n, mut t2, mut t4) = (0.0, 0.0, 0.0);
        let (mut c0, mut c1, mut c2) = (0.0, 0.0, 0.0);
        for m in first..=last {
            let t = (self.radius[m] - middle) / half;
            let c = self.circulation[m];
            (n, t2, t4) = (n + 1.0, t2 + t * t, t4 + t.powi(4));
            (c0, c1, c2) = (c0 + c, c1 + c * t, c2 + c * t * t);
        }
        let bend = (n * c2 - t2 * c0) / (n * t4 - t2 * t2);
        let slope = c1 / t2;
        let top = -slope / (2.0 * bend);
        if !(bend * sign < 0.0 && top.abs() <= 1.0) {
            return highest;
        }
        Circle {
            radius: middle + half * top,
            circulation: (c0 - bend * t2) / n + slope * top + bend * top * top,
        }
    }
}

/// Line integral of the velocity round one circle by `points` evenly spaced values, which for a
/// smooth periodic integrand converges faster than any power; `None` when it meets the edge or a
/// masked cell.
fn round(field: &VectorField, centre: Peak, r: f64, points: usize) -> Option<f64> {
    let mut sum = 0.0;
    for k in 0..points {
        let (sin, cos) = (TAU * k as f64 / points as f64).sin_cos();
        let place = Place::on(&field.grid, centre.x + r * cos, centre.y + r * sin)?;
        sum += place.read(&field.v) * cos - place.read(&field.u) * sin;
    }
    sum.is_finite().then(|| TAU * r * sum / points as f64)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn curve(c: impl Fn(f64) -> f64) -> CirculationCurve {
        let radius: Vec<f64> = (1..100).map(|k| 0.1 * k as f64).collect();
        CirculationCurve {
            circulation: radius.iter().map(|r| c(*r)).collect(),
            radius,
            length: Unit::MM,
            unit: Unit::MM.power(2).per(Unit::S),
        }
    }

    #[test]
    fn the_first_real_maximum_counts_for_either_sense() {
        for sign in [1.0, -1.0] {
            let s = |r: f64| (r / 2.03).powi(2);
            let top = curve(|r| sign * s(r) * (-s(r)).exp());
            let circle = top.first_maximum(sign).unwrap();
            // The parabola misses the skew of the top: 0.25 % of the radius.
            assert!((circle.radius / 2.03 - 1.0).abs() < 4e-3, "{circle:?}");
            assert!((circle.circulation * sign * 1f64.exp() - 1.0).abs() < 2e-3);
        }
    }

    #[test]
    fn a_plateau_with_ripples_has_no_maximum() {
        let plateau = curve(|r| 1.0 - (-r * r).exp() + 0.005 * (9.0 * r).sin());
        let reason = plateau.first_maximum(1.0).unwrap_err();
        assert!(reason.to_string().contains("9.9 mm"), "{reason}");
        assert!(curve(|_| -1.0).first_maximum(1.0).is_err());
    }
}
