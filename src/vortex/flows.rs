//! Exact velocities for the tests of this room.

use crate::field::{Grid, VectorField};
use crate::quantity::Unit;

/// A velocity as a function of position.
pub(super) type Flow = Box<dyn Fn(f64, f64) -> (f64, f64)>;

pub(super) fn square_grid(nodes: usize, spacing: f64) -> Grid {
    Grid {
        nx: nodes,
        ny: nodes,
        x0: 0.0,
        y0: 0.0,
        dx: spacing,
        dy: spacing,
        length: Unit::PX,
    }
}

pub(super) fn field(grid: Grid, flow: &Flow) -> VectorField {
    let u = grid.map(|x, y| flow(x, y).0);
    let v = grid.map(|x, y| flow(x, y).1);
    VectorField::new(grid, Unit::FRAME, u, v, "exact")
}

/// A vortex with the given circulation inside radius r.
fn vortex(x0: f64, y0: f64, inside: impl Fn(f64) -> f64 + 'static) -> Flow {
    Box::new(move |x, y| {
        let (x, y) = (x - x0, y - y0);
        let r2 = x * x + y * y;
        if r2 == 0.0 {
            return (0.0, 0.0);
        }
        let turn = inside(r2.sqrt()) / (std::f64::consts::TAU * r2);
        (-turn * y, turn * x)
    })
}

/// w = w0 exp(-r²/rc²).
pub(super) fn lamb_oseen(x: f64, y: f64, rc: f64, w0: f64) -> Flow {
    let all = std::f64::consts::PI * rc * rc * w0;
    vortex(x, y, move |r| -all * (-(r / rc).powi(2)).exp_m1())
}

/// w = w0 (1 - r²/rc²) exp(-r²/rc²).
pub(super) fn shielded_gaussian(x: f64, y: f64, rc: f64, w0: f64) -> Flow {
    vortex(x, y, move |r| {
        std::f64::consts::PI * w0 * r * r * (-(r / rc).powi(2)).exp()
    })
}

/// w = w0 inside radius a, none outside.
pub(super) fn rankine(x: f64, y: f64, a: f64, w0: f64) -> Flow {
    vortex(x, y, move |r| std::f64::consts::PI * w0 * r.min(a).powi(2))
}

/// w = w0 cos(kx) cos(ky).
pub(super) fn taylor_green(k: f64, w0: f64) -> Flow {
    let a = w0 / (2.0 * k);
    Box::new(move |x, y| {
        (
            -a * (k * x).cos() * (k * y).sin(),
            a * (k * x).sin() * (k * y).cos(),
        )
    })
}

pub(super) fn sum(flows: Vec<Flow>) -> Flow {
    Box::new(move |x, y| {
        flows.iter().fold((0.0, 0.0), |(u, v), flow| {
            let (du, dv) = flow(x, y);
            (u + du, v + dv)
        })
    })
}
