//! Tables as comma-separated values (RFC 4180) and back.

use std::path::Path;

use super::{Column, Table, TableError};
use crate::quantity::Unit;
use crate::store::{StoreError, write_atomically};

impl Table {
    /// The table as CSV: one line of headings, one a row, each ended by a line feed.
    ///
    /// Numbers have the fewest digits that give them back exactly; missing cells are empty.
    pub fn to_csv(&self) -> String {
        let mut writer = csv::WriterBuilder::new().from_writer(Vec::new());
        let mut records = vec![
            self.columns()
                .iter()
                .map(Column::heading)
                .collect::<Vec<_>>(),
        ];
        for row in 0..self.rows() {
            records.push(
                self.columns()
                    .iter()
                    .map(|c| c.cells[row].written())
                    .collect(),
            );
        }
        for record in records.into_iter().filter(|r| !r.is_empty()) {
            // Writing records of one length to memory cannot fail.
            let _ = writer.write_record(record);
        }
        let bytes = writer.into_inner().unwrap_or_default();
        String::from_utf8_lossy(&bytes).into_owned()
    }

    /// Writes the table as CSV; the file appears whole or not at all.
    ///
    /// # Errors
    /// [`TableError::Store`] when the file cannot be written.
    pub fn save(&self, path: &Path) -> Result<(), TableError> {
        let text = self.to_csv();
        write_atomically(path, |file| file.write_all(text.as_bytes()))?;
        Ok(())
    }

    /// Reads a table that [`Table::save`] wrote, or any CSV with one line of headings.
    ///
    /// The unit is read from the end of each heading ([`Column::parse_heading`]). A column whose
    /// filled cells are all numbers is one of numbers, any other one of words; empty cells and NaN
    /// are missing.
    ///
    /// # Errors
    /// [`TableError::Store`] when the file cannot be read; [`TableError::Content`] when it is no
    /// such table, naming the line.
    pub fn read(path: &Path) -> Result<Self, TableError> {
        let file = path.display().to_string();
        let bytes = std::fs::read(path).map_err(|source| StoreError::Read {
            file: file.clone(),
            source,
        })?;
        Self::from_csv(&bytes, &file)
    }

    /// Reads a table from the bytes of a CSV file; `file` is what messages call it.
    ///
    /// # Errors
    /// As [`Table::read`].
    pub fn from_csv(bytes: &[u8], file: &str) -> Result<Self, TableError> {
        let content = |line: Option<u64>, what: String| TableError::Content {
            file: file.to_owned(),
            line,
            what,
        };
        let bytes = bytes.strip_prefix(b"\xef\xbb\xbf").unwrap_or(bytes);
        let mut reader = csv::ReaderBuilder::new()
            .trim(csv::Trim::All)
            .from_reader(bytes);
        let headings = reader
            .headers()
            .map_err(|e| content(line_of(&e), plain(&e)))?
            .clone();
        if headings.is_empty() {
            return Err(content(
                None,
                "the file is empty; a table starts with a line of headings".to_owned(),
            ));
        }
        let mut words: Vec<Vec<String>> = vec![Vec::new(); headings.len()];
        for record in reader.records() {
            let record = record.map_err(|e| content(line_of(&e), plain(&e)))?;
            for (column, field) in words.iter_mut().zip(&record) {
                column.push(field.to_owned());
            }
        }
        let mut table = Table::new();
        for (heading, words) in headings.iter().zip(words) {
            let (name, unit) = Column::parse_heading(heading);
            table
                .push(column_of(&name, unit, words))
                .map_err(|e| content(Some(1), e.to_string()))?;
        }
        Ok(table)
    }
}

fn column_of(name: &str, unit: Unit, words: Vec<String>) -> Column {
    let numbers: Option<Vec<Option<f64>>> = words
        .iter()
        .map(|w| {
            if w.is_empty() {
                Some(None)
            } else {
                w.parse().ok().map(Some)
            }
        })
        .collect();
    match numbers {
        Some(numbers) => Column::new(name, unit, numbers),
        None => Column::new(name, unit, words),
    }
}

fn line_of(error: &csv::Error) -> Option<u64> {
    error.position().map(csv::Position::line)
}

fn plain(error: &csv::Error) -> String {
    match error.kind() {
        csv::ErrorKind::UnequalLengths {
            expected_len, len, ..
        } => {
            format!("{len} fields where the headings are {expected_len}")
        }
        csv::ErrorKind::Utf8 { .. } => "not text in UTF-8".to_owned(),
        _ => "not comma-separated values".to_owned(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    proptest! {
        #[test]
        fn every_number_and_word_comes_back_exactly(
            numbers in proptest::collection::vec(proptest::num::f64::NORMAL | proptest::num::f64::SUBNORMAL | proptest::num::f64::ZERO | proptest::num::f64::INFINITE, 1..20),
            word in "[a-z\",;\n é²]{0,12}x",
        ) {
            let count = numbers.len();
            let table = Table::of([
                Column::new("circulation", Unit::MM.power(2).per(Unit::S), numbers.clone()),
                Column::new("remark", Unit::ONE, vec![word.trim(); count]),
                Column::new("doubt", Unit::MM, vec![None::<f64>; count]),
            ]).unwrap();
            let back = Table::from_csv(table.to_csv().as_bytes(), "t.csv").unwrap();
            prop_assert_eq!(&back, &table);
            let bits = |t: &Table| t.columns()[0].numbers().map(f64::to_bits).collect::<Vec<_>>();
            prop_assert_eq!(bits(&back), bits(&table));
        }
    }

    #[test]
    fn a_missing_number_is_an_empty_field() {
        let table = Table::of([
            Column::new("a", Unit::MM, [1.0, f64::NAN]),
            Column::new("b", Unit::ONE, ["x", ""]),
        ])
        .unwrap();
        assert_eq!(table.to_csv(), "a_mm,b\n1,x\n,\n");
        assert_eq!(Table::new().to_csv(), "");
    }

    #[test]
    fn bad_files_are_refused_by_line() {
        let error = |text: &[u8]| Table::from_csv(text, "t.csv").unwrap_err().to_string();
        assert_eq!(
            error(b"a,b\n1,2\n3\n"),
            "t.csv, line 3: 1 fields where the headings are 2"
        );
        assert_eq!(
            error(b"a,a\n1,2\n"),
            "t.csv, line 1: there is a column \"a\" already"
        );
        assert!(error(b"").contains("the file is empty"));
        assert!(error(b"a\n\xff\xfe\n").contains("not text in UTF-8"));
        let gone = Table::read(Path::new("no/such.csv"))
            .unwrap_err()
            .to_string();
        assert!(gone.starts_with("no/such.csv cannot be read"), "{gone}");
    }
}
