//! Whether vectors are pulled to whole px: what they themselves show of it.

use std::f64::consts::{PI, TAU};

use ndarray::Array2;

use crate::field::{Status, VectorField};

/// Intervals of a fraction of a px.
const INTERVALS: usize = 20;

/// Waves of displacement that are fitted: period in px, and part of a turn by which they are
/// ahead. The first two are pulls to whole and to even px. Nothing has the others' period and
/// phase: what they come out as is what flow alone can feign.
const WAVES: [(f64, f64); 8] = [
    (1.0, 0.0),
    (2.0, 0.0),
    (1.0, 0.25),
    (2.0, 0.25),
    (0.7, 0.0),
    (0.7, 0.25),
    (1.4, 0.0),
    (1.4, 0.25),
];

/// How strongly vectors are pulled to multiples of `period` px.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Pull {
    /// 1 or 2 px: exposures are each moved by half of a displacement, so that what is locked in
    /// one of them comes back every 2 px.
    pub period_px: f64,
    /// Largest error of a vector, px: that of a vector a quarter of the period from a multiple,
    /// towards it. Below zero away from it.
    pub amplitude_px: f64,
    /// Standard uncertainty of it, px, what flow alone can feign included.
    pub unc_px: f64,
    /// Mean of cos(2π d/period) over the vectors' components d; 0 where displacements are spread
    /// evenly over whole periods, 1 where all are multiples.
    pub cosine: f64,
    /// Scatter of that mean among as many independent even displacements.
    pub cosine_unc: f64,
}

/// What the vectors of one or more fields show of locking.
#[derive(Clone, Debug, PartialEq)]
pub struct Locking {
    /// Pulls to whole and to even px; `None` where the vectors cannot tell: they span less than
    /// 1 px, or are too few.
    pub pulls: Option<[Pull; 2]>,
    /// Range of the displacements along the axis along which it is larger, px, of 98 % of the
    /// vectors.
    pub span_px: f64,
    /// Share of the components whose displacement has a fraction in each of 20 intervals of 0 to
    /// 1 px.
    pub shares: [f64; INTERVALS],
    /// Mean over those of the departure from the smooth field about each, px; NaN without any.
    pub departures: [f64; INTERVALS],
}

/// Mean square of the wave of 1 px that must be left to see; 1/2 is a whole one.
const LEAST_SEEN: f64 = 0.008;

/// Sums over fields.
#[derive(Default)]
pub(super) struct Fits {
    /// For each wave and block of vectors: products of departure and wave, squares of the wave.
    blocks: Vec<[(f64, f64); WAVES.len()]>,
    cosines: [f64; 2],
    components: f64,
    independent: f64,
    span: f64,
    counts: [f64; INTERVALS],
    departures: [(f64, f64); INTERVALS],
}

impl Fits {
    /// Takes in a field in px and frames.
    pub fn take(&mut self, field: &VectorField) {
        let side = field.window.map_or(field.grid.dx, |(width, _)| width);
        let apart = (side / field.grid.dx).round().max(1.0);
        let measured = |values: &Array2<f64>| {
            Array2::from_shape_fn(values.dim(), |at| {
                if field.status[at] == Status::Measured {
                    values[at]
                } else {
                    f64::NAN
                }
            })
        };
        for values in [measured(&field.u), measured(&field.v)] {
            self.take_component(&values, (side, field.grid.dx, field.grid.dy), apart);
        }
    }

    fn take_component(&mut self, d: &Array2<f64>, (side, dx, dy): (f64, f64, f64), apart: f64) {
        let mut sorted: Vec<f64> = d.iter().copied().filter(|d| d.is_finite()).collect();
        sorted.sort_by(f64::total_cmp);
        let n = sorted.len();
        if n == 0 {
            return;
        }
        self.span = self.span.max(sorted[(n - 1) * 99 / 100] - sorted[(n - 1) / 100]);
        self.components += n as f64;
        self.independent += n as f64 / (apart * apart);
        for (sum, period) in self.cosines.iter_mut().zip([1.0, 2.0]) {
            *sum += sorted.iter().map(|d| (TAU * d / period).cos()).sum::<f64>();
        }
        let half = (apart as usize).max(2);
        let departure = departure(d, half);
        let waves = WAVES.map(|(period, ahead)| {
            self::departure(&wave(d, period, ahead, (side, dx, dy)), half)
        });
        let block = 2 * half;
        let (rows, columns) = d.dim();
        for top in (0..rows).step_by(block) {
            for left in (0..columns).step_by(block) {
                let mut sums = [(0.0, 0.0); WAVES.len()];
                for j in top..(top + block).min(rows) {
                    for i in left..(left + block).min(columns) {
                        for (sum, wave) in sums.iter_mut().zip(&waves) {
                            let (r, q) = (departure[(j, i)], wave[(j, i)]);
                            if r.is_finite() && q.is_finite() {
                                *sum = (sum.0 + r * q, sum.1 + q * q);
                            }
                        }
                    }
                }
                if sums.iter().any(|sum| sum.1 > 0.0) {
                    self.blocks.push(sums);
                }
            }
        }
        for (d, r) in d.iter().zip(&departure) {
            if d.is_finite() {
                let k = ((d - d.floor()) * INTERVALS as f64) as usize;
                let k = k.min(INTERVALS - 1);
                self.counts[k] += 1.0;
                if r.is_finite() {
                    let sum = &mut self.departures[k];
                    *sum = (sum.0 + r, sum.1 + 1.0);
                }
            }
        }
    }

    pub fn result(&self) -> Locking {
        let all = self.components.max(1.0);
        let mean = |(sum, n): (f64, f64)| if n > 0.0 { sum / n } else { f64::NAN };
        Locking {
            pulls: self.pulls(),
            span_px: self.span,
            shares: self.counts.map(|count| count / all),
            departures: self.departures.map(mean),
        }
    }

    fn pulls(&self) -> Option<[Pull; 2]> {
        if self.blocks.len() < 16 || self.span < 1.0 {
            return None;
        }
        // What windows mean, and smooth fields follow, shows nothing.
        let seen = self.blocks.iter().map(|block| block[0].1).sum::<f64>();
        if seen < LEAST_SEEN * self.components {
            return None;
        }
        let fits: Vec<(f64, f64)> = (0..WAVES.len())
            .map(|wave| {
                let of = |block: &[(f64, f64); WAVES.len()]| block[wave];
                let (with, own) = self.blocks.iter().map(of).fold((0.0, 0.0), |s, b| {
                    (s.0 + b.0, s.1 + b.1)
                });
                let amplitude = with / own;
                let off = |(with, own): (f64, f64)| (with - amplitude * own).powi(2);
                let square = self.blocks.iter().map(of).map(off).sum::<f64>();
                (amplitude, square.sqrt() / own)
            })
            .collect();
        let feigned = fits[2..].iter().map(|(a, _)| a * a).sum::<f64>() / (fits.len() - 2) as f64;
        let pull = |wave: usize| {
            let (amplitude, scatter) = fits[wave];
            Pull {
                period_px: WAVES[wave].0,
                // A vector a quarter of a period above a multiple is pulled down.
                amplitude_px: -amplitude,
                unc_px: (scatter * scatter + feigned).sqrt(),
                cosine: self.cosines[wave] / self.components,
                cosine_unc: (0.5 / self.independent).sqrt(),
            }
        };
        Some([pull(0), pull(1)])
    }
}

/// sin(2π (d/period + ahead)) as a window of that side means it over a displacement that varies
/// evenly within it; NaN where its neighbours are not known.
fn wave(
    d: &Array2<f64>,
    period: f64,
    ahead: f64,
    (side, dx, dy): (f64, f64, f64),
) -> Array2<f64> {
    let (rows, columns) = d.dim();
    Array2::from_shape_fn((rows, columns), |(j, i)| {
        if j == 0 || i == 0 || j + 1 == rows || i + 1 == columns {
            return f64::NAN;
        }
        let across = (d[(j, i + 1)] - d[(j, i - 1)]) / (2.0 * dx);
        let up = (d[(j + 1, i)] - d[(j - 1, i)]) / (2.0 * dy);
        let left = |slope: f64| tapered_mean(slope * side / period);
        (TAU * (d[(j, i)] / period + ahead)).sin() * left(across) * left(up)
    })
}

/// Mean of cos(2π cycles t/2) over -1 <= t <= 1 with the weight 1 - t² of the windows.
pub(super) fn tapered_mean(cycles: f64) -> f64 {
    let z = PI * cycles;
    if z.abs() < 1e-2 {
        1.0 - z * z / 10.0
    } else {
        3.0 * (z.sin() - z * z.cos()) / (z * z * z)
    }
}

/// What is left of the values less the quadratic surface fitted to those up to `half` nodes away;
/// NaN where one of them is.
fn departure(values: &Array2<f64>, half: usize) -> Array2<f64> {
    let m = half as f64;
    let offsets: Vec<f64> = (0..=2 * half).map(|k| k as f64 - m).collect();
    let moment = |n: i32| offsets.iter().map(|x| x.powi(n)).sum::<f64>();
    let (zero, two, four) = (moment(0), moment(2), moment(4));
    // Least squares of a + b (x² + y²): its value at the middle; odd terms drop out.
    let (s0, s2, s4) = (zero * zero, two * zero, four * zero + two * two);
    let determinant = s0 * s4 - 2.0 * s2 * s2;
    let weight = |x: f64, y: f64| (s4 - s2 * (x * x + y * y)) / determinant;
    let (rows, columns) = values.dim();
    let inside = |at: usize, n: usize| at >= half && at + half < n;
    Array2::from_shape_fn(values.dim(), |(j, i)| {
        if !inside(j, rows) || !inside(i, columns) {
            return f64::NAN;
        }
        let mut smooth = 0.0;
        for (y, row) in offsets.iter().zip(j - half..) {
            for (x, column) in offsets.iter().zip(i - half..) {
                smooth += weight(*x, *y) * values[(row, column)];
            }
        }
        values[(j, i)] - smooth
    })
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::field::Grid;
    use crate::quantity::Unit;

    fn field(nx: usize, ny: usize, u: impl Fn(f64, f64) -> f64) -> VectorField {
        let grid = Grid {
            nx,
            ny,
            x0: 16.0,
            y0: 16.0,
            dx: 8.0,
            dy: 8.0,
            length: Unit::PX,
        };
        let u = grid.map(u);
        let mut field = VectorField::new(grid, Unit::FRAME, u.clone(), u, "made");
        field.window = Some((32.0, 32.0));
        field
    }

    #[test]
    fn a_quadratic_surface_leaves_nothing() {
        let surface = |x: f64, y: f64| 3.0 - 0.02 * x + 1e-4 * x * x - 2e-4 * x * y + 3e-4 * y * y;
        let left = departure(&field(20, 20, surface).u, 4);
        let largest = left.iter().filter(|r| r.is_finite()).fold(0.0f64, |m, r| m.max(r.abs()));
        assert!(largest < 1e-9, "{largest}");
        assert_eq!(left.iter().filter(|r| r.is_finite()).count(), 12 * 12);
    }

    #[test]
    fn a_pull_put_into_vectors_comes_out() {
        for (period, amplitude) in [(1.0, 0.05), (1.0, 0.0), (2.0, 0.04), (2.0, -0.04)] {
            let pulled = |x: f64, y: f64| {
                let d = 0.013 * x + 0.006 * y;
                d - amplitude * (TAU * d / period).sin()
            };
            let mut fits = Fits::default();
            fits.take(&field(60, 60, pulled));
            let pulls = fits.result().pulls.unwrap();
            let found = pulls[usize::from(period == 2.0)];
            // The wave that windows mean is fitted; the one put in here is not lessened so: by
            // the means over 0.42 and 0.19 cycles, or half as many at a period of 2 px.
            let cycles = 32.0 / period;
            let lessened = tapered_mean(0.013 * cycles) * tapered_mean(0.006 * cycles);
            let expected = amplitude / lessened;
            assert!(
                (found.amplitude_px - expected).abs() < 0.1 * expected.abs() + 0.001,
                "{period} {amplitude}: {found:?}, expected {expected}"
            );
        }
    }

    #[test]
    fn vectors_that_span_less_than_a_pixel_say_nothing() {
        let mut fits = Fits::default();
        fits.take(&field(40, 40, |x, _| 0.002 * x));
        let locking = fits.result();
        assert!(locking.pulls.is_none());
        assert!((locking.shares.iter().sum::<f64>() - 1.0).abs() < 1e-12);
    }
}
