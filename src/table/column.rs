//! A named column of cells in one unit.

use super::Cell;
use crate::quantity::Unit;

/// Cells that share a name and a unit.
#[derive(Clone, Debug, PartialEq)]
pub struct Column {
    /// What the cells are, without the unit: `diameter`.
    pub name: String,
    /// The unit of its numbers.
    pub unit: Unit,
    /// The cells, one a row.
    pub cells: Vec<Cell>,
}

impl Column {
    /// A column of `cells`: numbers, options of numbers, or words.
    pub fn new<C: Into<Cell>>(name: &str, unit: Unit, cells: impl IntoIterator<Item = C>) -> Self {
        Self {
            name: name.to_owned(),
            unit,
            cells: cells.into_iter().map(Into::into).collect(),
        }
    }

    /// Name and unit in one word, as files have it: `diameter_mm`, or the name alone for plain
    /// numbers and words.
    pub fn heading(&self) -> String {
        match self.unit.header().as_str() {
            "" => self.name.clone(),
            unit => format!("{}_{unit}", self.name),
        }
    }

    /// Name and unit of a heading: the longest ending after an underscore that is a unit is
    /// taken for it.
    pub fn parse_heading(heading: &str) -> (String, Unit) {
        heading
            .match_indices('_')
            .filter(|(k, _)| *k > 0)
            .find_map(|(k, _)| {
                let unit = Unit::parse(&heading[k + 1..]).filter(|u| !u.is_one())?;
                // Only the spelling that headings have: `mm_s` is no unit of ours, `mm_per_s` is.
                (unit.header() == heading[k + 1..]).then(|| (heading[..k].to_owned(), unit))
            })
            .unwrap_or_else(|| (heading.to_owned(), Unit::ONE))
    }

    /// The numbers, in order, without the other cells.
    pub fn numbers(&self) -> impl Iterator<Item = f64> + '_ {
        self.cells.iter().filter_map(Cell::number)
    }

    /// Mean of the numbers; `None` where there is none.
    pub fn mean(&self) -> Option<f64> {
        let count = self.numbers().count();
        (count > 0).then(|| self.numbers().sum::<f64>() / count as f64)
    }

    /// Sample standard deviation of the numbers (n − 1 below); `None` for fewer than two.
    pub fn spread(&self) -> Option<f64> {
        let (count, mean) = (self.numbers().count(), self.mean()?);
        let squares: f64 = self.numbers().map(|v| (v - mean) * (v - mean)).sum();
        (count > 1).then(|| (squares / (count - 1) as f64).sqrt())
    }

    /// Least and greatest number; `None` where there is none.
    pub fn range(&self) -> Option<(f64, f64)> {
        self.numbers().fold(None, |range, v| {
            let (lo, hi) = range.unwrap_or((v, v));
            Some((v.min(lo), v.max(hi)))
        })
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_heading_gives_back_name_and_unit() {
        let circulation = Unit::MM.power(2).per(Unit::S);
        for (name, unit) in [
            ("diameter", Unit::MM),
            ("diameter_unc", Unit::MM),
            ("circulation", circulation),
            ("peak_vorticity", Unit::ONE.per(Unit::FRAME)),
            ("sense", Unit::ONE),
            ("eddy_1", Unit::ONE),
            ("x", Unit::PX),
            ("pair_of_two", Unit::ONE),
        ] {
            let column = Column::new(name, unit, [1.0]);
            let back = Column::parse_heading(&column.heading());
            assert_eq!(back, (name.to_owned(), unit));
        }
    }

    #[test]
    fn mean_and_spread_skip_what_is_missing() {
        let column = Column::new("d", Unit::MM, [Some(2.0), None, Some(4.0), Some(9.0)]);
        // By hand: mean 5, deviations -3, -1, 4, squares 26, 26/2 = 13.
        assert_eq!(column.mean(), Some(5.0));
        assert_eq!(column.spread(), Some(13.0f64.sqrt()));
        assert_eq!(column.range(), Some((2.0, 9.0)));
        let words = Column::new("sense", Unit::ONE, ["clockwise"]);
        assert_eq!((words.mean(), words.spread()), (None, None));
    }
}
