//! Columns of one length, put together, chosen from and joined.

use super::{Cell, Column};
use crate::quantity::{Measured, Unit};
use crate::store::StoreError;

/// What can go wrong with a table.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum TableError {
    /// A column that is longer or shorter than the others.
    #[error("column {name:?} has {found} rows; the table has {expected}")]
    #[allow(missing_docs)]
    LengthsDiffer {
        name: String,
        expected: usize,
        found: usize,
    },
    /// Two columns of one name.
    #[error("there is a column {0:?} already")]
    Repeated(String),
    /// A column that is not there.
    #[error("there is no column {name:?}{}; the columns are {}", hint(nearest), columns.join(", "))]
    #[allow(missing_docs)]
    NoColumn {
        name: String,
        nearest: Option<String>,
        columns: Vec<String>,
    },
    /// Tables that do not have the same columns in the same order.
    #[error(
        "the tables cannot be joined: column {place} is {left} in the first and {right} in the second"
    )]
    #[allow(missing_docs)]
    ColumnsDiffer {
        place: usize,
        left: String,
        right: String,
    },
    /// Measured values of one column in units that do not go together.
    #[error("column {name:?}, row {row}: {source}")]
    #[allow(missing_docs)]
    Units {
        name: String,
        row: usize,
        source: crate::quantity::UnitMismatch,
    },
    /// A file that is no table.
    #[error("{file}{}: {what}", line.map_or(String::new(), |l| format!(", line {l}")))]
    #[allow(missing_docs)]
    Content {
        file: String,
        line: Option<u64>,
        what: String,
    },
    /// A file that could not be read or written.
    #[error(transparent)]
    Store(#[from] StoreError),
}

fn hint(nearest: &Option<String>) -> String {
    nearest
        .as_ref()
        .map_or(String::new(), |n| format!(" (did you mean {n:?}?)"))
}

/// Columns of one length, each with a heading of its own.
///
/// ```
/// use kolk::quantity::{Measured, Unit};
/// use kolk::table::{Column, Table};
/// # fn main() -> Result<(), kolk::table::TableError> {
/// let mut eddies = Table::new();
/// eddies.push(Column::new("sense", Unit::ONE, ["clockwise", "counter-clockwise"]))?;
/// eddies.push_measured(
///     "diameter",
///     &[
///         Some(Measured::new(11.8, 0.4, Unit::MM)),
///         Some(Measured::without_uncertainty(9.25, Unit::MM)),
///     ],
/// )?;
/// assert_eq!(
///     eddies.to_csv(),
///     "sense,diameter_mm,diameter_unc_mm\nclockwise,11.8,0.4\ncounter-clockwise,9.25,\n"
/// );
/// assert!(eddies.column("diametre").is_err());
/// # Ok(())
/// # }
/// ```
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Table {
    columns: Vec<Column>,
}

impl Table {
    /// A table without columns.
    pub fn new() -> Self {
        Self::default()
    }

    /// A table of these columns.
    ///
    /// # Errors
    /// As [`Table::push`].
    pub fn of(columns: impl IntoIterator<Item = Column>) -> Result<Self, TableError> {
        let mut table = Self::new();
        for column in columns {
            table.push(column)?;
        }
        Ok(table)
    }

    /// Adds a column at the right.
    ///
    /// # Errors
    /// [`TableError::LengthsDiffer`] when it is not as long as the others,
    /// [`TableError::Repeated`] when its heading is taken.
    pub fn push(&mut self, column: Column) -> Result<(), TableError> {
        if !self.columns.is_empty() && column.cells.len() != self.rows() {
            return Err(TableError::LengthsDiffer {
                name: column.name,
                expected: self.rows(),
                found: column.cells.len(),
            });
        }
        if self.columns.iter().any(|c| c.heading() == column.heading()) {
            return Err(TableError::Repeated(column.heading()));
        }
        self.columns.push(column);
        Ok(())
    }

    /// Adds measured values as two columns, `name` and `name_unc`, in the unit of the first value
    /// there is; the uncertainty is a missing cell where it is not known. An empty list or one of
    /// nothing but `None` makes columns of plain numbers.
    ///
    /// # Errors
    /// [`TableError::Units`] when a value cannot be converted to the first one's unit; as
    /// [`Table::push`].
    pub fn push_measured(
        &mut self,
        name: &str,
        values: &[Option<Measured>],
    ) -> Result<(), TableError> {
        let unit = values
            .iter()
            .flatten()
            .next()
            .map_or(Unit::ONE, Measured::unit);
        self.push_measured_in(name, unit, values)
    }

    /// As [`Table::push_measured`], in a unit of the caller's choice, so that a table without
    /// rows has the same headings as one with many.
    ///
    /// # Errors
    /// As [`Table::push_measured`].
    pub fn push_measured_in(
        &mut self,
        name: &str,
        unit: Unit,
        values: &[Option<Measured>],
    ) -> Result<(), TableError> {
        let (mut numbers, mut doubts) = (Vec::new(), Vec::new());
        for (k, value) in values.iter().enumerate() {
            let value = value.as_ref().map(|v| v.to(unit)).transpose();
            let value = value.map_err(|source| TableError::Units {
                name: name.to_owned(),
                row: k + 1,
                source,
            })?;
            numbers.push(Cell::from(value.as_ref().map(Measured::value)));
            doubts.push(Cell::from(value.and_then(|v| v.unc())));
        }
        self.push(Column::new(name, unit, numbers))?;
        self.push(Column::new(&format!("{name}_unc"), unit, doubts))
    }

    /// The columns, from the left.
    pub fn columns(&self) -> &[Column] {
        &self.columns
    }

    /// Number of rows.
    pub fn rows(&self) -> usize {
        self.columns.first().map_or(0, |c| c.cells.len())
    }

    /// True when there are no rows.
    pub fn is_empty(&self) -> bool {
        self.rows() == 0
    }

    /// The column of this name (`diameter`) or heading (`diameter_mm`).
    ///
    /// # Errors
    /// [`TableError::NoColumn`], with the nearest there is.
    pub fn column(&self, name: &str) -> Result<&Column, TableError> {
        let headed = self.columns.iter().find(|c| c.heading() == name);
        let found = headed.or_else(|| self.columns.iter().find(|c| c.name == name));
        found.ok_or_else(|| {
            let columns: Vec<String> = self.columns.iter().map(Column::heading).collect();
            let nearest = columns
                .iter()
                .map(|heading| (strsim::jaro_winkler(heading, name), heading))
                .filter(|(likeness, _)| *likeness > 0.8)
                .max_by(|a, b| a.0.total_cmp(&b.0))
                .map(|(_, heading)| heading.clone());
            TableError::NoColumn {
                name: name.to_owned(),
                nearest,
                columns,
            }
        })
    }

    /// The columns of these names or headings, in the order asked for.
    ///
    /// # Errors
    /// As [`Table::column`] and [`Table::push`].
    pub fn select<'a>(&self, names: impl IntoIterator<Item = &'a str>) -> Result<Self, TableError> {
        let mut table = Self::new();
        for name in names {
            table.push(self.column(name)?.clone())?;
        }
        Ok(table)
    }

    /// These rows, then those of `other`. A table without columns counts as nothing.
    ///
    /// # Errors
    /// [`TableError::ColumnsDiffer`] unless both have the same headings in the same order.
    pub fn followed_by(&self, other: &Table) -> Result<Self, TableError> {
        if self.columns.is_empty() {
            return Ok(other.clone());
        }
        if other.columns.is_empty() {
            return Ok(self.clone());
        }
        let heading = |table: &Table, k: usize| {
            table
                .columns
                .get(k)
                .map_or("missing".to_owned(), |c| format!("{:?}", c.heading()))
        };
        for k in 0..self.columns.len().max(other.columns.len()) {
            let (left, right) = (heading(self, k), heading(other, k));
            if left != right {
                let place = k + 1;
                return Err(TableError::ColumnsDiffer { place, left, right });
            }
        }
        let mut joined = self.clone();
        for (column, more) in joined.columns.iter_mut().zip(&other.columns) {
            column.cells.extend(more.cells.iter().cloned());
        }
        Ok(joined)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn two_rows() -> Table {
        let mut table = Table::of([Column::new("index", Unit::ONE, [1.0, 2.0])]).unwrap();
        let values = [
            Some(Measured::new(11.8, 0.4, Unit::MM)),
            Some(Measured::without_uncertainty(
                1.5,
                Unit::of(crate::quantity::Symbol::Cm),
            )),
        ];
        table.push_measured("diameter", &values).unwrap();
        table
    }

    #[test]
    fn a_measured_value_takes_two_columns_in_one_unit_and_doubt_unknown_is_missing() {
        let table = two_rows();
        let cells = |name: &str| table.column(name).unwrap().cells.clone();
        assert_eq!(
            cells("diameter_mm"),
            [Cell::Number(11.8), Cell::Number(15.0)]
        );
        assert_eq!(cells("diameter_unc"), [Cell::Number(0.4), Cell::Missing]);
    }

    #[test]
    fn px_among_mm_is_refused_with_its_row() {
        let values = [
            Some(Measured::exact(1.0, Unit::MM)),
            Some(Measured::exact(1.0, Unit::PX)),
        ];
        let error = Table::new().push_measured("x", &values).unwrap_err();
        let text = error.to_string();
        assert!(
            text.starts_with("column \"x\", row 2") && text.contains("mm_per_px"),
            "{text}"
        );
    }

    #[test]
    fn joining_needs_the_same_headings() {
        let table = two_rows();
        let twice = table.followed_by(&table).unwrap();
        assert_eq!(twice.rows(), 4);
        assert_eq!(twice.column("index").unwrap().cells[2], Cell::Number(1.0));
        assert_eq!(Table::new().followed_by(&table).unwrap(), table);
        let other = table.select(["index", "diameter_unc"]).unwrap();
        let error = table.followed_by(&other).unwrap_err().to_string();
        assert!(
            error.contains("column 2 is \"diameter_mm\" in the first and \"diameter_unc_mm\""),
            "{error}"
        );
    }

    #[test]
    fn a_wrong_name_is_answered_with_the_nearest() {
        let error = two_rows().column("diametre_mm").unwrap_err().to_string();
        assert!(error.contains("did you mean \"diameter_mm\"?"), "{error}");
        let error = two_rows()
            .push(Column::new("y", Unit::PX, [1.0]))
            .unwrap_err();
        assert!(error.to_string().contains("has 1 rows; the table has 2"));
        let error = two_rows()
            .push(Column::new("index", Unit::ONE, [1.0, 2.0]))
            .unwrap_err();
        assert!(error.to_string().contains("\"index\" already"));
    }
}
