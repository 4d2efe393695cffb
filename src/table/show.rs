//! A table as aligned text for a terminal.

use std::fmt;

use super::{Cell, Column, Table};
use crate::quantity::plain_number;

/// Rows shown before the rest is counted.
const ROWS: usize = 12;
/// Significant digits of the largest number of a column.
const DIGITS: i32 = 5;

/// The column's cells as text, numbers to as many decimals as the largest needs for five digits,
/// common trailing zeros left out.
fn texts(column: &Column, rows: usize) -> Vec<String> {
    let shown = &column.cells[..rows];
    let finite: Vec<f64> = shown
        .iter()
        .filter_map(Cell::number)
        .filter(|v| v.is_finite())
        .collect();
    let largest = finite.iter().fold(0.0, |m: f64, v| m.max(v.abs()));
    let least = finite
        .iter()
        .filter(|v| **v != 0.0)
        .fold(largest, |m, v| m.min(v.abs()));
    let plain = largest == 0.0 || ((1e-4..1e7).contains(&largest) && least > 1e-3 * largest);
    let decimals = if largest == 0.0 {
        0
    } else {
        (DIGITS - 1 - largest.log10().floor() as i32).clamp(0, 8) as usize
    };
    let needed = finite
        .iter()
        .map(|v| {
            let text = format!("{v:.decimals$}");
            text.trim_end_matches('0')
                .rsplit_once('.')
                .map_or(0, |(_, d)| d.len())
        })
        .max()
        .unwrap_or(0);
    shown
        .iter()
        .map(|cell| match cell {
            Cell::Missing => "—".to_owned(),
            Cell::Text(words) => words.replace(['\n', '\r', '\t'], " "),
            Cell::Number(v) if plain && v.is_finite() => format!("{v:.needed$}"),
            Cell::Number(v) => plain_number(*v, DIGITS as usize),
        })
        .collect()
}

impl Table {
    /// The first `rows` rows as aligned text under their headings; numbers shortened for the eye
    /// to five digits, a dash where a cell is missing, and how many rows are left.
    pub fn preview(&self, rows: usize) -> String {
        if self.columns().is_empty() {
            return "an empty table".to_owned();
        }
        let shown = rows.min(self.rows());
        let mut lines = vec![String::new(); shown + 1];
        for (k, column) in self.columns().iter().enumerate() {
            let mut cells = vec![column.heading()];
            cells.extend(texts(column, shown));
            let width = cells.iter().map(|c| c.chars().count()).max().unwrap_or(0);
            let words = column.cells.iter().any(|c| matches!(c, Cell::Text(_)));
            for (line, cell) in lines.iter_mut().zip(cells) {
                if k > 0 {
                    line.push_str("  ");
                }
                let pad = " ".repeat(width - cell.chars().count());
                let (before, after) = if words {
                    ("", pad.as_str())
                } else {
                    (pad.as_str(), "")
                };
                line.push_str(before);
                line.push_str(&cell);
                line.push_str(after);
            }
        }
        let mut lines: Vec<String> = lines.iter().map(|l| l.trim_end().to_owned()).collect();
        match self.rows() - shown {
            0 => {}
            1 => lines.push("… 1 more row".to_owned()),
            left => lines.push(format!("… {left} more rows")),
        }
        if self.is_empty() {
            lines.push("no rows".to_owned());
        }
        lines.join("\n")
    }
}

impl fmt::Display for Table {
    /// The first twelve rows, as [`Table::preview`] shows them.
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(&self.preview(ROWS))
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::quantity::Unit;

    #[test]
    fn columns_line_up_and_the_rest_is_counted() {
        let table = Table::of([
            Column::new("eddy", Unit::ONE, [1.0, 2.0, 10.0]),
            Column::new("sense", Unit::ONE, ["clockwise", "counter-clockwise", ""]),
            Column::new("diameter", Unit::MM, [Some(11.812_345), None, Some(9.5)]),
        ])
        .unwrap();
        let expected = "\
eddy  sense              diameter_mm
   1  clockwise               11.812
   2  counter-clockwise            —
… 1 more row";
        assert_eq!(table.preview(2), expected);
        assert!(
            table
                .to_string()
                .ends_with("  10  —                        9.500")
        );
        assert_eq!(Table::new().to_string(), "an empty table");
        let none = Table::of([Column::new("x", Unit::MM, Vec::<f64>::new())]).unwrap();
        assert_eq!(none.to_string(), "x_mm\nno rows");
    }

    #[test]
    fn numbers_of_many_sizes_keep_their_digits() {
        let column = Column::new("q", Unit::ONE, [1.234_567e-9, 12_345.678, f64::INFINITY]);
        let shown = texts(&column, 3);
        assert_eq!(shown, ["1.2346e-9", "12346", "inf"]);
    }
}
