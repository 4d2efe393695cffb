//! What is taken out of the displacement found so far before the next pass follows it.
//!
//! A window answers the shortest waves with the wrong sign (an even one of side W with
//! sinc(W/λ), negative for λ between W/2 and W; a tapered one less, and only for shorter waves):
//! fed back through the predictor they would grow. Each node is therefore replaced by the middle
//! of a paraboloid, a0 + a1 x + a2 y + a3 x² + a4 xy + a5 y², fitted by least squares to the
//! nodes of a rectangle of about 1.25 W by 1.25 W round it (Savitzky & Golay 1964, in two
//! directions), which leaves waves along either axis longer than 1.5 W nearly whole.
//!
//! With P the parabola fitted along one axis and M the mean over the same nodes, the middle of
//! the paraboloid is Px My + Mx Py - Mx My: of the functions it is made of, each of the three
//! terms gives x², y² and xy at most one part too many. Parabolas along one axis after the other, Px Py,
//! would keep waves along an axis just as well but let diagonal ones pass that are 1.4 times
//! shorter, and their noise with them: 8 % more in the vectors after four passes.

use ndarray::{Array2, ArrayViewMut1, Axis};

use super::layout::Layout;
use super::predictor::Shifts;

impl Shifts {
    /// The shifts with what the next window cannot hold stable removed. Towards an edge the
    /// rectangle shrinks evenly, so that a plane stays a plane.
    pub fn smoothed(&self, layout: &Layout) -> Self {
        let (rx, ry) = (
            reach(layout.window.width, layout.step_x),
            reach(layout.window.height, layout.step_y),
        );
        Self {
            x: paraboloid(&self.x, rx, ry),
            y: paraboloid(&self.y, rx, ry),
        }
    }
}

/// Middle of the paraboloid over up to `rx` nodes to the right and left and `ry` above and below.
fn paraboloid(values: &Array2<f64>, rx: usize, ry: usize) -> Array2<f64> {
    let along = |values: &Array2<f64>, axis: Axis, reach: usize, weights: Weights| {
        let mut out = values.clone();
        for line in out.lanes_mut(axis) {
            smooth_line(line, reach, weights);
        }
        out
    };
    let (x, y) = (Axis(1), Axis(0));
    let mean = along(values, x, rx, Weights::Mean);
    // Px My + Mx Py - Mx My = My (Px - Mx) + Py Mx.
    let rest = along(values, x, rx, Weights::Parabola) - &mean;
    along(&rest, y, ry, Weights::Mean) + along(&mean, y, ry, Weights::Parabola)
}

/// What the two parts of the smoothing leave of a wave along one axis.
pub(crate) struct AlongAxis {
    parabola: f64,
    mean: f64,
}

impl AlongAxis {
    /// A wave of `cycles` per step of windows that are `side` px long along the axis and `step` px apart;
    /// nothing is left of one that such a grid does not carry.
    pub fn new(side: usize, step: usize, cycles: f64) -> Self {
        let left = |weights: Weights| match cycles {
            0.0..=0.5 => weights.response(reach(side, step), cycles),
            _ => 0.0,
        };
        Self {
            parabola: left(Weights::Parabola),
            mean: left(Weights::Mean),
        }
    }

    /// What [`Shifts::smoothed`] leaves of the product of this wave and one along the other axis.
    pub fn across(&self, other: &AlongAxis) -> f64 {
        self.parabola * other.mean + self.mean * other.parabola - self.mean * other.mean
    }
}

/// Nodes on either side that the smoothing takes in.
fn reach(side: usize, step: usize) -> usize {
    (5 * side) / (8 * step)
}

#[derive(Clone, Copy)]
enum Weights {
    /// Those that give the middle of the least-squares parabola.
    Parabola,
    Mean,
}

impl Weights {
    /// The weight of the node `k` from the middle of 2 `reach` + 1.
    fn at(self, reach: usize, k: isize) -> f64 {
        let (m, i) = (reach as f64, k as f64);
        match (self, reach) {
            (_, 0) => 1.0,
            (Weights::Mean, _) => 1.0 / (2.0 * m + 1.0),
            // Three points fix a parabola; a light pull to their mean still damps the shortest
            // wave the grid carries.
            (Weights::Parabola, 1) => [14.0, 1.0][k.unsigned_abs()] / 16.0,
            (Weights::Parabola, _) => {
                let norm = (2.0 * m - 1.0) * (2.0 * m + 1.0) * (2.0 * m + 3.0) / 3.0;
                (3.0 * m * m + 3.0 * m - 1.0 - 5.0 * i * i) / norm
            }
        }
    }

    /// What is left of a wave of `cycles` per node.
    fn response(self, reach: usize, cycles: f64) -> f64 {
        let m = reach as isize;
        let turn = std::f64::consts::TAU * cycles;
        (-m..=m)
            .map(|k| self.at(reach, k) * (turn * k as f64).cos())
            .sum()
    }
}

fn smooth_line(mut line: ArrayViewMut1<f64>, reach: usize, weights: Weights) {
    let n = line.len();
    let old: Vec<f64> = line.to_vec();
    for (i, value) in line.iter_mut().enumerate() {
        let m = reach.min(i).min(n - 1 - i);
        let near = old[i - m..=i + m].iter().zip(-(m as isize)..);
        *value = near.map(|(v, k)| weights.at(m, k) * v).sum();
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Row by row from the bottom left, `f(x, y)` about the middle of 11 x 9 nodes.
    fn field(f: impl Fn(f64, f64) -> f64) -> Array2<f64> {
        Array2::from_shape_fn((9, 11), |(j, i)| f(i as f64 - 5.0, j as f64 - 4.0))
    }

    #[test]
    fn the_middle_is_that_of_the_paraboloid_of_least_squares() {
        // The paraboloid is kept whole, and what no paraboloid can follow, being at right angles to
        // all six functions on the 5 x 5 nodes, is gone: x²y² with its own means taken out, on
        // nodes whose x² and y² average 2.
        let kept = field(|x, y| 1.0 + 0.3 * x - 0.2 * y + 0.5 * x * x - 0.4 * x * y + 0.1 * y * y);
        let gone = field(|x, y| (x * x - 2.0) * (y * y - 2.0) + x * (y * y - 2.0));
        let middle = (4, 5);
        let smooth = paraboloid(&(&kept + &gone), 2, 2);
        assert!((smooth[middle] - kept[middle]).abs() < 1e-12);
        // Elsewhere too the paraboloid stays, but at the edge, where there are too few nodes.
        let smooth = paraboloid(&kept, 2, 2);
        for j in 2..7 {
            for i in 2..9 {
                assert!((smooth[(j, i)] - kept[(j, i)]).abs() < 1e-12, "{j} {i}");
            }
        }
    }

    #[test]
    fn the_response_is_what_smoothing_leaves() {
        for ((rx, ry), (cx, cy)) in [
            ((2, 2), (0.17, 0.11)),
            ((2, 1), (0.1, 0.3)),
            ((3, 0), (0.2, 0.1)),
        ] {
            let wave = field(|x, y| {
                (std::f64::consts::TAU * cx * x).cos() * (std::f64::consts::TAU * cy * y).cos()
            });
            let left = paraboloid(&wave, rx, ry)[(4, 5)];
            // Windows whose reach is the one asked for.
            let side = |reach: usize| (8 * reach).div_ceil(5);
            let told = AlongAxis::new(side(rx), 1, cx).across(&AlongAxis::new(side(ry), 1, cy));
            assert!((left - told).abs() < 1e-12, "{left} told {told}");
        }
    }

    #[test]
    fn smoothing_keeps_every_unstable_wave_from_growing() {
        // |F (1 - S)| < 1 for all waves the grid carries, S that of an even window: the worst
        // case, since a tapered one is never further below zero.
        for (side, step) in [(32, 8), (32, 16), (32, 4), (24, 6), (64, 16)] {
            for (kx, ky) in (1..=50).flat_map(|kx| (0..=50).map(move |ky| (kx, ky))) {
                let cycles = [kx, ky].map(|k| k as f64 / 100.0);
                let [x, y] = cycles.map(|cycles| AlongAxis::new(side, step, cycles));
                let f = x.across(&y);
                let sinc = |cycles: f64| {
                    let phase = std::f64::consts::PI * cycles * side as f64 / step as f64;
                    if phase == 0.0 {
                        1.0
                    } else {
                        phase.sin() / phase
                    }
                };
                let s = sinc(cycles[0]) * sinc(cycles[1]);
                assert!((f * (1.0 - s)).abs() < 1.0, "{side}/{step} at {cycles:?}");
            }
        }
    }
}
