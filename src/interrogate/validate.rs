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
        let one = |component: fn(&(f64, f64)) -> f64, value: f64| {
            let mut values = [0.0; 8];
            for (v, neighbour) in values.iter_mut().zip(&around[..n]) {
                *v = component(neighbour);
            }
            let middle = median(&mut values[..n]);
            for v in &mut values[..n] {
                *v = (*v - middle).abs();
            }
            (value - middle).abs() / (median(&mut values[..n]) + self.floor_px)
        };
        Some(one(|d| d.0, shift.0).hypot(one(|d| d.1, shift.1)))
    }
}

/// Median of a non-empty slice, which is sorted on the way.
pub(crate) fn median(values: &mut [f64]) -> f64 {
    values.sort_unstable_by(f64::total_cmp);
    let n = values.len();
    (values[n / 2] + values[(n - 1) / 2]) / 2.0
}

/// Fills every cell where `good` is false from the good ones around it, the nearest first, each
/// as the mean of its filled neighbours. With no good cell at all nothing changes.
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
            if n > 0.0 {
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
                    let r = test.residual(&shifts, &good, (j, i), d).unwrap();
                    assert_eq!(r > test.limit, (j, i) == at, "{j} {i}: {r}");
                }
            }
        }
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
