//! Which vectors stand out from their neighbours, and what is put in their place.

use ndarray::Array2;

use super::predictor::Shifts;

/// Limits of the normalized median test.
#[derive(Clone, Copy, Debug)]
pub(crate) struct MedianTest {
    /// Largest normalized residual accepted.
    pub limit: f64,
    /// Displacement noise that is tolerated everywhere, px.
    pub floor_px: f64,
}

impl MedianTest {
    /// Normalized residual of `shift` at (row, column) among its up to eight neighbours for
    /// which `good` is true (Westerweel & Scarano 2005, Exp. Fluids 39, 1096): per component
    /// |d - median| / (median of |neighbour - median| + floor), the two joined as a length.
    /// `None` with fewer than three neighbours, when nothing can be said.
    pub fn residual(
        &self,
        shifts: &Shifts,
        good: &Array2<bool>,
        (j, i): (usize, usize),
        shift: (f64, f64),
    ) -> Option<f64> {
        let (rows, columns) = good.dim();
        let mut around = [(0.0, 0.0); 8];
        let mut n = 0;
        for jj in j.saturating_sub(1)..=(j + 1).min(rows - 1) {
            for ii in i.saturating_sub(1)..=(i + 1).min(columns - 1) {
                if (jj, ii) != (j, i) && good[(jj, ii)] {
                    around[n] = (shifts.x[(jj, ii)], shifts.y[(jj, ii)]);
                    n += 1;
                }
            }
        }
        if n < 3 {
            return None;
        }
        Some(self.joined(&around[..n], shift))
    }

    /// Distance of `shift` from the median of at most eight others, in units of their scatter.
    fn joined(&self, others: &[(f64, f64)], shift: (f64, f64)) -> f64 {
        let n = others.len();
        let one = |component: fn(&(f64, f64)) -> f64, value: f64| {
            let mut values = [0.0; 8];
            for (v, other) in values.iter_mut().zip(others) {
                *v = component(other);
            }
            let middle = median(&mut values[..n]);
            for v in &mut values[..n] {
                *v = (*v - middle).abs();
            }
            (value - middle).abs() / (median(&mut values[..n]) + self.floor_px)
        };
        one(|d| d.0, shift.0).hypot(one(|d| d.1, shift.1))
    }

    /// True when either residual is within the limit: the vector fits its neighbours.
    pub fn fits(
        &self,
        shifts: &Shifts,
        good: &Array2<bool>,
        at: (usize, usize),
        shift: (f64, f64),
    ) -> bool {
        let within = |residual: Option<f64>| residual.is_some_and(|r| r <= self.limit);
        within(self.residual(shifts, good, at, shift))
            || within(self.line_residual(shifts, good, at, shift))
    }
}

impl MedianTest {
    /// The same residual against what lines through the cell lead to expect ([`along_lines`]),
    /// whose median and scatter take the place of the neighbours'. One wild neighbour spoils one
    /// line of four. `None` with fewer than three lines.
    ///
    /// On the crest of a wave, or at the edge of a sheared field, the neighbours lie on one side
    /// of a perfect vector and the plain test rejects it; this one does not.
    pub fn line_residual(
        &self,
        shifts: &Shifts,
        good: &Array2<bool>,
        at: (usize, usize),
        shift: (f64, f64),
    ) -> Option<f64> {
        let (lines, n) = along_lines(shifts, good, at, (1, 1));
        (n >= 3).then(|| self.joined(&lines[..n], shift))
    }
}

/// What each of the four lines through a cell leads to expect there, from good cells only, taken
/// every `stride` (rows, columns): the
/// cubic through ±1 and ±2, (4 (n₁ + n₋₁) - (n₂ + n₋₂)) / 6; the middle of ±1 where ±2 are not
/// both good; and on one side alone the straight continuation 2 n₁ - n₂.
pub(crate) fn along_lines(
    shifts: &Shifts,
    good: &Array2<bool>,
    (j, i): (usize, usize),
    stride: (usize, usize),
) -> ([(f64, f64); 4], usize) {
    let (rows, columns) = good.dim();
    let cell = |dj: isize, di: isize| {
        let jj = j.checked_add_signed(dj).filter(|jj| *jj < rows)?;
        let ii = i.checked_add_signed(di).filter(|ii| *ii < columns)?;
        good[(jj, ii)].then(|| (shifts.x[(jj, ii)], shifts.y[(jj, ii)]))
    };
    let mix = |terms: &[(f64, (f64, f64))]| {
        let sum = |part: fn(&(f64, f64)) -> f64| terms.iter().map(|(w, d)| w * part(d)).sum();
        (sum(|d| d.0), sum(|d| d.1))
    };
    let line = |(dj, di): (isize, isize)| {
        let (dj, di) = (dj * stride.0 as isize, di * stride.1 as isize);
        let at = |k: isize| cell(k * dj, k * di);
        match (at(-2), at(-1), at(1), at(2)) {
            (Some(a), Some(b), Some(c), Some(d)) => {
                let (near, far) = (4.0 / 6.0, -1.0 / 6.0);
                Some(mix(&[(near, b), (near, c), (far, a), (far, d)]))
            }
            (_, Some(b), Some(c), _) => Some(mix(&[(0.5, b), (0.5, c)])),
            (_, None, Some(c), Some(d)) => Some(mix(&[(2.0, c), (-1.0, d)])),
            (Some(a), Some(b), None, _) => Some(mix(&[(2.0, b), (-1.0, a)])),
            _ => None,
        }
    };
    let mut expected = [(0.0, 0.0); 4];
    let mut n = 0;
    for point in [(0, 1), (1, 0), (1, 1), (1, -1)]
        .into_iter()
        .filter_map(line)
    {
        expected[n] = point;
        n += 1;
    }
    (expected, n)
}

/// Median of a non-empty slice, which is sorted on the way.
pub(crate) fn median(values: &mut [f64]) -> f64 {
    values.sort_unstable_by(f64::total_cmp);
    let n = values.len();
    (values[n / 2] + values[(n - 1) / 2]) / 2.0
}

/// Fills every cell where `good` is false from the filled ones around it, the nearest first: by
/// the median of what lines through it lead to expect where there are three, else by the mean of
/// its neighbours. With no good cell at all nothing changes.
pub(crate) fn fill(shifts: &mut Shifts, good: &Array2<bool>) {
    let (rows, columns) = good.dim();
    let mut filled = good.clone();
    let mut left: Vec<(usize, usize)> = good
        .indexed_iter()
        .filter(|(_, good)| !**good)
        .map(|(at, _)| at)
        .collect();
    while !left.is_empty() {
        let mut round = Vec::new();
        left.retain(|&(j, i)| {
            let (mut x, mut y, mut n) = (0.0, 0.0, 0.0);
            for jj in j.saturating_sub(1)..=(j + 1).min(rows - 1) {
                for ii in i.saturating_sub(1)..=(i + 1).min(columns - 1) {
                    if filled[(jj, ii)] {
                        x += shifts.x[(jj, ii)];
                        y += shifts.y[(jj, ii)];
                        n += 1.0;
                    }
                }
            }
            let (lines, count) = along_lines(shifts, &filled, (j, i), (1, 1));
            if count >= 3 {
                let middle = |part: fn(&(f64, f64)) -> f64| {
                    let mut values: [f64; 4] = std::array::from_fn(|k| part(&lines[k]));
                    median(&mut values[..count])
                };
                round.push(((j, i), middle(|d| d.0), middle(|d| d.1)));
            } else if n > 0.0 {
                round.push(((j, i), x / n, y / n));
            }
            n == 0.0
        });
        if round.is_empty() {
            return;
        }
        for (at, x, y) in round {
            (shifts.x[at], shifts.y[at]) = (x, y);
            filled[at] = true;
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn ramp() -> Shifts {
        Shifts {
            x: Array2::from_shape_fn((6, 7), |(j, i)| 1.0 + 0.2 * i as f64 - 0.1 * j as f64),
            y: Array2::from_shape_fn((6, 7), |(j, i)| 0.3 * j as f64 + 0.05 * i as f64),
        }
    }

    #[test]
    fn a_lone_outlier_is_rejected_anywhere_and_its_neighbours_are_kept() {
        let test = MedianTest {
            limit: 2.0,
            floor_px: 0.1,
        };
        for at in [(0, 0), (0, 3), (3, 3), (5, 6)] {
            let mut shifts = ramp();
            shifts.x[at] += 4.0;
            let good = Array2::from_elem((6, 7), true);
            for j in 0..6 {
                for i in 0..7 {
                    let d = (shifts.x[(j, i)], shifts.y[(j, i)]);
                    let fits = test.fits(&shifts, &good, (j, i), d);
                    assert_eq!(fits, (j, i) != at, "{j} {i}");
                }
            }
        }
    }

    #[test]
    fn the_crest_of_a_wave_is_kept_and_an_outlier_on_it_is_not() {
        let test = MedianTest {
            limit: 2.0,
            floor_px: 0.1,
        };
        let wave = |j: usize| 2.0 * (std::f64::consts::TAU * j as f64 / 8.0).cos();
        let mut shifts = Shifts {
            x: Array2::from_shape_fn((13, 9), |(j, _)| wave(j)),
            y: Array2::zeros((13, 9)),
        };
        let good = Array2::from_elem((13, 9), true);
        assert!(test.residual(&shifts, &good, (8, 4), (2.0, 0.0)).unwrap() > test.limit);
        assert!(test.fits(&shifts, &good, (8, 4), (2.0, 0.0)));
        shifts.x[(8, 4)] = 5.0;
        assert!(!test.fits(&shifts, &good, (8, 4), (5.0, 0.0)));
        assert!(test.fits(&shifts, &good, (7, 4), (wave(7), 0.0)));
    }

    #[test]
    fn filling_uses_only_good_cells_and_reaches_all() {
        let mut shifts = ramp();
        let mut good = Array2::from_elem((6, 7), false);
        good[(2, 2)] = true;
        shifts.x.fill(99.0);
        shifts.x[(2, 2)] = 3.0;
        fill(&mut shifts, &good);
        assert!(shifts.x.iter().all(|x| *x == 3.0));
    }
}
