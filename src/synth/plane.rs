//! Flows without a vortex: uniform, shear, solid rotation, sine wave.

use std::f64::consts::TAU;

use serde::{Deserialize, Serialize};

use super::Element;
use super::flow::above_zero;

/// The same velocity everywhere.
#[derive(Clone, Copy, Debug, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Uniform {
    /// Velocity along x (option `u_px_per_frame`).
    #[serde(rename = "u_px_per_frame")]
    pub u: f64,
    /// Velocity along y (option `v_px_per_frame`).
    #[serde(rename = "v_px_per_frame")]
    pub v: f64,
}

impl Element for Uniform {
    fn velocity(&self, _x: f64, _y: f64) -> (f64, f64) {
        (self.u, self.v)
    }

    fn vorticity(&self, _x: f64, _y: f64) -> f64 {
        0.0
    }
}

/// Parallel flow u = rate (y - y0): vorticity is -rate.
#[derive(Clone, Copy, Debug, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Shear {
    /// Height of the line at rest (option `y_px`).
    #[serde(rename = "y_px", default)]
    pub y: f64,
    /// du/dy (option `rate_per_frame`).
    #[serde(rename = "rate_per_frame")]
    pub rate: f64,
}

impl Element for Shear {
    fn velocity(&self, _x: f64, y: f64) -> (f64, f64) {
        (self.rate * (y - self.y), 0.0)
    }

    fn vorticity(&self, _x: f64, _y: f64) -> f64 {
        -self.rate
    }
}

/// Rotation as a solid body, counter-clockwise for a positive rate: vorticity is twice the rate.
#[derive(Clone, Copy, Debug, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct SolidRotation {
    /// x of the centre (option `x_px`).
    #[serde(rename = "x_px")]
    pub x: f64,
    /// y of the centre (option `y_px`).
    #[serde(rename = "y_px")]
    pub y: f64,
    /// Angular velocity, radians a time unit (option `rate_per_frame`).
    #[serde(rename = "rate_per_frame")]
    pub rate: f64,
}

impl Element for SolidRotation {
    fn velocity(&self, x: f64, y: f64) -> (f64, f64) {
        (-self.rate * (y - self.y), self.rate * (x - self.x))
    }

    fn vorticity(&self, _x: f64, _y: f64) -> f64 {
        2.0 * self.rate
    }
}

/// Transverse wave v = amplitude sin(2 pi (x - x0) / wavelength): one wavelength at a time, to
/// measure what a method resolves.
#[derive(Clone, Copy, Debug, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct SineWave {
    /// x of a rising zero (option `x_px`).
    #[serde(rename = "x_px", default)]
    pub x: f64,
    /// Length of one wave, not zero (option `wavelength_px`).
    #[serde(rename = "wavelength_px", deserialize_with = "above_zero")]
    pub wavelength: f64,
    /// Largest velocity (option `amplitude_px_per_frame`).
    #[serde(rename = "amplitude_px_per_frame")]
    pub amplitude: f64,
}

impl Element for SineWave {
    fn velocity(&self, x: f64, _y: f64) -> (f64, f64) {
        let phase = TAU * (x - self.x) / self.wavelength;
        (0.0, self.amplitude * phase.sin())
    }

    fn vorticity(&self, x: f64, _y: f64) -> f64 {
        let wavenumber = TAU / self.wavelength;
        self.amplitude * wavenumber * (wavenumber * (x - self.x)).cos()
    }
}
