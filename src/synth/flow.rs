//! A sum of exact flows.

use std::fmt::Debug;
use std::ops::Add;
use std::sync::Arc;

use serde::de::{Deserialize, Deserializer, Error};

use crate::field::{Grid, ScalarField, VectorField};
use crate::quantity::Unit;

use super::particles::travel;

/// One exact flow in the plane, steady and free of divergence.
pub trait Element: Debug + Send + Sync {
    /// Velocity (u, v) at the point (x, y).
    fn velocity(&self, x: f64, y: f64) -> (f64, f64);

    /// Vorticity v_x - u_y at the point (x, y); on a line where it jumps, that of one side.
    fn vorticity(&self, x: f64, y: f64) -> f64;
}

/// A sum of [`Element`]s; without any, fluid at rest. Cheap to clone.
///
/// ```
/// use kolk::synth::{Flow, LambOseen, Uniform};
/// let eddy = LambOseen { x: 40.0, y: 30.0, core_radius: 8.0, circulation: 120.0 };
/// let flow = Flow::from(eddy) + Uniform { u: 1.5, v: 0.0 };
/// assert_eq!(flow.velocity(40.0, 30.0), (1.5, 0.0));
/// ```
#[derive(Clone, Debug, Default)]
pub struct Flow {
    elements: Vec<Arc<dyn Element>>,
}

impl Flow {
    /// Fluid at rest.
    pub fn rest() -> Flow {
        Flow::default()
    }

    /// The parts of the sum.
    pub fn elements(&self) -> &[Arc<dyn Element>] {
        &self.elements
    }

    /// Velocity (u, v) at the point (x, y).
    pub fn velocity(&self, x: f64, y: f64) -> (f64, f64) {
        self.elements.iter().fold((0.0, 0.0), |(u, v), element| {
            let (du, dv) = element.velocity(x, y);
            (u + du, v + dv)
        })
    }

    /// Vorticity at the point (x, y).
    pub fn vorticity(&self, x: f64, y: f64) -> f64 {
        self.elements.iter().map(|e| e.vorticity(x, y)).sum()
    }

    /// How far the particle that is at (x, y) at the mid time moves from half the time `dt` before
    /// it to half after it: what two exposures `dt` apart show there. It differs from velocity
    /// times `dt` by a term of order `dt`³ where streamlines curve.
    pub fn displacement(&self, x: f64, y: f64, dt: f64) -> (f64, f64) {
        let (x0, y0) = travel(self, (x, y), -0.5 * dt);
        let (x1, y1) = travel(self, (x, y), 0.5 * dt);
        (x1 - x0, y1 - y0)
    }

    /// The exact velocity at the nodes of `grid`; the flow's lengths are taken to be in
    /// `grid.length` and its times in `time`.
    pub fn field(&self, grid: &Grid, time: Unit) -> VectorField {
        let u = grid.map(|x, y| self.velocity(x, y).0);
        let v = grid.map(|x, y| self.velocity(x, y).1);
        VectorField::new(*grid, time, u, v, "exact flow")
    }

    /// The exact vorticity at the nodes of `grid`, as [`Flow::field`].
    pub fn vorticity_field(&self, grid: &Grid, time: Unit) -> ScalarField {
        ScalarField {
            grid: *grid,
            values: grid.map(|x, y| self.vorticity(x, y)),
            unit: Unit::ONE.per(time),
            name: "vorticity".to_owned(),
        }
    }
}

impl<E: Element + 'static> From<E> for Flow {
    fn from(element: E) -> Flow {
        Flow {
            elements: vec![Arc::new(element)],
        }
    }
}

impl<F: Into<Flow>> Add<F> for Flow {
    type Output = Flow;

    fn add(mut self, other: F) -> Flow {
        self.elements.extend(other.into().elements);
        self
    }
}

/// Reads a length that has to be above zero.
pub(super) fn above_zero<'de, D: Deserializer<'de>>(source: D) -> Result<f64, D::Error> {
    let length = f64::deserialize(source)?;
    if length.is_finite() && length > 0.0 {
        Ok(length)
    } else {
        Err(D::Error::custom(format!(
            "{length} must be a finite number above zero"
        )))
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::synth::{
        LambChaplygin, LambOseen, Rankine, Shear, ShieldedGaussian, SineWave, SolidRotation,
        TaylorGreen, Uniform,
    };
    use proptest::prelude::*;

    /// Every element, none of them at a round place.
    fn elements() -> Vec<(Flow, &'static str)> {
        let (x, y) = (1.3, -0.7);
        let dipole = LambChaplygin {
            x,
            y,
            radius: 6.0,
            speed: 2.5,
            heading_deg: 35.0,
        };
        let rankine = Rankine {
            x,
            y,
            core_radius: 4.0,
            circulation: 60.0,
        };
        let oseen = LambOseen {
            x,
            y,
            core_radius: 4.0,
            circulation: -80.0,
        };
        let shielded = ShieldedGaussian {
            x,
            y,
            core_radius: 4.0,
            peak_vorticity: 1.4,
        };
        let green = TaylorGreen {
            x,
            y,
            wavelength: 18.0,
            peak_vorticity: 1.1,
        };
        let wave = SineWave {
            x,
            wavelength: 12.0,
            amplitude: 2.0,
        };
        vec![
            (Uniform { u: 3.0, v: -2.0 }.into(), "uniform"),
            (Shear { y, rate: 0.3 }.into(), "shear"),
            (SolidRotation { x, y, rate: 0.2 }.into(), "solid rotation"),
            (wave.into(), "sine wave"),
            (oseen.into(), "Lamb-Oseen"),
            (shielded.into(), "shielded Gaussian"),
            (rankine.into(), "Rankine"),
            (green.into(), "Taylor-Green"),
            (dipole.into(), "Lamb-Chaplygin"),
            (Flow::from(oseen) + dipole + green + wave, "a sum"),
        ]
    }

    proptest! {
        #[test]
        fn vorticity_is_the_curl_and_divergence_is_zero(x in -15.0..15.0f64, y in -15.0..15.0f64) {
            // Central differences: truncation h² u'''/6 is near 1e-7 for lengths of 4 and speeds
            // of some units, rounding 1e-15/h smaller still.
            let h = 1e-3;
            let r = (x - 1.3).hypot(y + 0.7);
            // At the rims of core and dipole second derivatives jump.
            prop_assume!((r - 4.0).abs() > 2.0 * h && (r - 6.0).abs() > 2.0 * h);
            for (flow, name) in elements() {
                let (right, left) = (flow.velocity(x + h, y), flow.velocity(x - h, y));
                let (up, down) = (flow.velocity(x, y + h), flow.velocity(x, y - h));
                let curl = (right.1 - left.1 - up.0 + down.0) / (2.0 * h);
                let divergence = (right.0 - left.0 + up.1 - down.1) / (2.0 * h);
                prop_assert!((curl - flow.vorticity(x, y)).abs() < 2e-6, "{name}: curl {curl}");
                prop_assert!(divergence.abs() < 2e-6, "{name}: divergence {divergence}");
            }
        }
    }

    #[test]
    fn velocity_is_smooth_through_the_centre_of_every_element() {
        for (flow, name) in elements() {
            let centre = flow.velocity(1.3, -0.7);
            for (dx, dy) in [(1e-9, 0.0), (0.0, 1e-9), (1e-4, 1e-4)] {
                let near = flow.velocity(1.3 + dx, -0.7 + dy);
                let change = (near.0 - centre.0).hypot(near.1 - centre.1);
                // No velocity gradient here passes 5 a time unit.
                assert!(change < 5.0 * (dx + dy), "{name}: {centre:?} {near:?}");
            }
        }
    }

    #[test]
    fn a_sum_adds_velocities_and_vorticities() {
        let all = elements();
        let sum = all[..9]
            .iter()
            .fold(Flow::rest(), |sum, (flow, _)| sum + flow.clone());
        assert_eq!(sum.elements().len(), 9);
        let add = |f: &dyn Fn(&Flow) -> f64| all[..9].iter().map(|(flow, _)| f(flow)).sum::<f64>();
        assert!((sum.velocity(2.0, 3.0).0 - add(&|f| f.velocity(2.0, 3.0).0)).abs() < 1e-12);
        assert!((sum.velocity(2.0, 3.0).1 - add(&|f| f.velocity(2.0, 3.0).1)).abs() < 1e-12);
        assert!((sum.vorticity(2.0, 3.0) - add(&|f| f.vorticity(2.0, 3.0))).abs() < 1e-12);
        assert_eq!(Flow::rest().velocity(2.0, 3.0), (0.0, 0.0));
    }

    #[test]
    fn fields_are_exact_at_the_nodes_and_carry_units() {
        let grid = Grid {
            nx: 5,
            ny: 4,
            x0: -3.0,
            y0: 2.0,
            dx: 1.5,
            dy: 0.5,
            length: Unit::MM,
        };
        let flow = &elements()[9].0;
        let field = flow.field(&grid, Unit::S);
        assert_eq!(field.unit(), Unit::MM.per(Unit::S));
        assert_eq!((field.u[(3, 2)], field.v[(3, 2)]), flow.velocity(0.0, 3.5));
        let vorticity = flow.vorticity_field(&grid, Unit::S);
        assert_eq!(vorticity.unit.to_string(), "1/s");
        assert_eq!(vorticity.values[(0, 4)], flow.vorticity(3.0, 2.0));
    }

    #[test]
    fn elements_are_read_by_names_with_units_and_bad_ones_refused() {
        let text = r#"{"x_px": 3, "y_px": 4, "core_radius_px": 5, "circulation_px2_per_frame": 6}"#;
        let eddy: LambOseen = serde_json::from_str(text).unwrap();
        assert_eq!(
            (eddy.x, eddy.core_radius, eddy.circulation),
            (3.0, 5.0, 6.0)
        );
        let zero = text.replace('5', "0");
        let error = serde_json::from_str::<LambOseen>(&zero)
            .unwrap_err()
            .to_string();
        assert!(
            error.starts_with("0 must be a finite number above zero"),
            "{error}"
        );
        let other = text.replace("core_radius_px", "radius_mm");
        assert!(serde_json::from_str::<Rankine>(&other).is_err());
    }
}
