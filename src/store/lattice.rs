//! The regular grid that scattered coordinates lie on.

/// Evenly spaced positions along one axis.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Ladder {
    pub first: f64,
    pub spacing: f64,
    pub count: usize,
}

/// Why coordinates are not evenly spaced.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) enum Uneven {
    /// Fewer than two different positions.
    TooFew,
    /// This coordinate (its index) is off the spacing most others keep.
    Off { index: usize, spacing: f64 },
    /// The positions are too far apart for their number.
    TooWide,
}

/// How far from its node a coordinate may lie, in spacings: files round.
const SLACK: f64 = 0.05;

/// Positions along one axis of more than this are a mistake, not a measurement.
const MOST: f64 = 1e6;

impl Ladder {
    /// The ladder through finite coordinates given in any order, each any number of times. Rungs
    /// may be missing as long as more than half of those present have a neighbour.
    pub(super) fn through(coordinates: &[f64]) -> Result<Ladder, Uneven> {
        let mut sorted = coordinates.to_vec();
        sorted.sort_by(f64::total_cmp);
        let (Some(&first), Some(&last)) = (sorted.first(), sorted.last()) else {
            return Err(Uneven::TooFew);
        };
        let span = last - first;
        if !span.is_finite() {
            return Err(Uneven::TooWide);
        }
        let rounding = 1e-12 * first.abs().max(last.abs());
        let steps: Vec<f64> = sorted
            .windows(2)
            .map(|pair| pair[1] - pair[0])
            .filter(|step| *step > rounding)
            .collect();
        let mut ranked = steps.clone();
        ranked.sort_by(f64::total_cmp);
        let Some(&typical) = ranked.get(ranked.len().saturating_sub(1) / 2) else {
            return Err(Uneven::TooFew);
        };
        // Rounding each step on its own keeps the rounding of the file from adding up.
        let rungs: f64 = steps.iter().map(|step| (step / typical).round()).sum();
        if rungs > MOST {
            return Err(Uneven::TooWide);
        }
        let spacing = span / rungs;
        let ladder = Ladder {
            first,
            spacing,
            count: rungs as usize + 1,
        };
        match coordinates.iter().position(|&c| ladder.rung(c).is_none()) {
            None => Ok(ladder),
            Some(first_off) => {
                // One far end off its rung bends the mean spacing: the typical one lays the blame.
                let typical_ladder = Ladder {
                    spacing: typical,
                    ..ladder
                };
                let off = |c: &f64| typical_ladder.rung(*c).is_none();
                Err(Uneven::Off {
                    index: coordinates.iter().position(off).unwrap_or(first_off),
                    spacing: typical,
                })
            }
        }
    }

    /// The rung a coordinate lies on.
    pub(super) fn rung(&self, coordinate: f64) -> Option<usize> {
        let t = (coordinate - self.first) / self.spacing;
        let near = (t - t.round()).abs() <= SLACK;
        (near && t > -0.5 && t < self.count as f64 - 0.5).then(|| t.round() as usize)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn missing_rungs_and_rounded_coordinates_are_found() {
        let ladder = Ladder::through(&[7.0, 1.0, 3.0, 5.0, 1.0, 13.0]).unwrap();
        let expected = Ladder {
            first: 1.0,
            spacing: 2.0,
            count: 7,
        };
        assert_eq!(ladder, expected);
        // 1/3 to three digits, 700 of them: the rounding must not add up to a rung.
        let thirds: Vec<f64> = (0..700)
            .map(|k| (k as f64 / 3.0 * 1e3).round() / 1e3)
            .collect();
        let ladder = Ladder::through(&thirds).unwrap();
        assert_eq!(ladder.count, 700);
        assert!((ladder.spacing - 1.0 / 3.0).abs() < 1e-5);
    }

    #[test]
    fn the_odd_one_out_is_named() {
        let off = Ladder::through(&[0.0, 1.0, 2.0, 3.3, 4.0, 5.0]);
        assert!(matches!(off, Err(Uneven::Off { index: 3, .. })), "{off:?}");
        let last = Ladder::through(&[0.0, 1.0, 2.0, 3.0, 4.0, 5.4]);
        assert!(
            matches!(last, Err(Uneven::Off { index: 5, .. })),
            "{last:?}"
        );
        assert_eq!(Ladder::through(&[2.0, 2.0]), Err(Uneven::TooFew));
        assert_eq!(Ladder::through(&[]), Err(Uneven::TooFew));
        assert_eq!(Ladder::through(&[0.0, 1.0, 1e11]), Err(Uneven::TooWide));
        assert_eq!(Ladder::through(&[-1e308, 1e308]), Err(Uneven::TooWide));
    }
}
