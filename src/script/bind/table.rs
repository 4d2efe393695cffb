//! Tables.

use std::path::Path;
use std::sync::Arc;

use rhai::{Array, Dynamic};

use super::super::call::Call;
use super::super::draft::Room;
use super::super::fault::Fault;
use super::super::kind::{Kind, kind_name, number, with_article};
use super::vortex::FoundEddies;
use crate::quantity::{Measured, Unit};
use crate::table::{Cell, Column, Table, eddies, eddies_of_each};
use crate::vortex::Eddies;

/// Rows a table shows of itself.
const SHOWN: usize = 12;

impl Kind for Table {
    const NAME: &'static str = "table";
    const ABOUT: &'static str = "Columns of numbers, words and gaps, each under a heading that carries \
        its unit (diameter_mm). It prints its first rows.";

    fn show(&self) -> String {
        let holds_something = |column: &&Column| column.cells.iter().any(|c| *c != Cell::Missing);
        let full: Vec<_> = self
            .columns()
            .iter()
            .filter(holds_something)
            .cloned()
            .collect();
        let left_out = self.columns().len() - full.len();
        match Table::of(full) {
            Ok(shown) if left_out > 0 && !self.is_empty() => {
                let columns = if left_out == 1 { "column" } else { "columns" };
                format!(
                    "{}\n({left_out} {columns} without values not shown)",
                    shown.preview(SHOWN)
                )
            }
            _ => self.preview(SHOWN),
        }
    }
}

macro_rules! with_a_table {
    ($code:literal) => {
        concat!(
            "let t = table([[\"run\", [1, 2, 3]], [\"width_mm\", [11.8, 9.2, 10]]]);\n",
            $code
        )
    };
}

/// Writes the records.
pub(super) fn records(room: &mut Room) {
    room.kind::<Table>();
    making(room);
    of_eddies(room);
    choosing(room);
    files(room);
}

fn making(room: &mut Room) {
    room.function("table")
        .about(
            "A table of columns, each given as [heading, list]. A heading carries the unit of its \
             numbers (width_mm); measured values bring their own, or are converted to the heading's, and take two \
             columns, themselves and their uncertainty. A list of the eddies of several fields, as all.eddies() gives \
             it, makes one table with the number of the field in front.",
        )
        .words("make build columns rows spreadsheet")
        .input("columns", "", "the columns, from the left; or the eddies of several fields")
        .errors("columns differ in length, a heading stands twice, or a cell is no number or text")
        .example(
            "table([[\"width\", [measured(11.8, 0.4, \"mm\")]], [\"run\", [1]]])",
            "width_mm  width_unc_mm  run\n    11.8           0.4    1",
        )
        .example(
            "let flow = shielded_gaussian(#{ x_px: 50, y_px: 50, core_radius_px: 15, peak_vorticity_per_frame: 0.3 }).field(#{ nx: 51, ny: 51, spacing_px: 2 });\n[flow.eddies(), flow.eddies()].table().column(\"field\")",
            "[0, 1]",
        )
        .does(build);
}

fn build(columns: Vec<Dynamic>) -> Result<Table, Fault> {
    let found: Vec<_> = columns.iter().filter_map(of_a_field).collect();
    if !found.is_empty() && found.len() == columns.len() {
        let found: Vec<&Eddies> = found.iter().map(|f| &**f).collect();
        return Ok(eddies_of_each(&found)?);
    }
    let mut table = Table::new();
    for column in columns {
        let wrong =
            || Fault::new("a column is given as [heading, list], such as [\"width_mm\", [1, 2]]");
        let mut parts = column.into_array().map_err(|_| wrong())?.into_iter();
        let (Some(heading), Some(cells), None) = (parts.next(), parts.next(), parts.next()) else {
            return Err(wrong());
        };
        let heading = heading.into_string().map_err(|_| wrong())?;
        let cells = cells.into_array().map_err(|_| wrong())?;
        push(&mut table, &heading, &cells)?;
    }
    Ok(table)
}

fn push(table: &mut Table, heading: &str, cells: &Array) -> Result<(), Fault> {
    let measured = |cell: &Dynamic| cell.read_lock::<Arc<Measured>>().map(|m| (**m).clone());
    if cells.iter().any(|cell| measured(cell).is_some()) {
        let values = cells
            .iter()
            .enumerate()
            .map(|(row, cell)| match measured(cell) {
                Some(value) => Ok(Some(value)),
                None if cell.is_unit() => Ok(None),
                None => Err(misfit(heading, row, cell, "a measured value or ()")),
            })
            .collect::<Result<Vec<_>, _>>()?;
        // A heading that states a unit is kept to it: values are converted or refused.
        return Ok(match Column::parse_heading(heading) {
            (_, unit) if unit.is_one() => table.push_measured(heading, &values),
            (name, unit) => table.push_measured_in(&name, unit, &values),
        }?);
    }
    let (name, unit) = Column::parse_heading(heading);
    let cells = cells
        .iter()
        .enumerate()
        .map(|(row, cell)| {
            plain(cell).ok_or_else(|| misfit(heading, row, cell, "a number, text or ()"))
        })
        .collect::<Result<Vec<_>, _>>()?;
    let unit = if cells.iter().any(|c| matches!(c, Cell::Text(_))) {
        Unit::ONE
    } else {
        unit
    };
    let name = if unit.is_one() { heading } else { &name };
    Ok(table.push(Column::new(name, unit, cells))?)
}

fn plain(cell: &Dynamic) -> Option<Cell> {
    if cell.is_unit() {
        return Some(Cell::Missing);
    }
    if let Some(x) = number(cell) {
        return Some(if x.is_nan() {
            Cell::Missing
        } else {
            Cell::Number(x)
        });
    }
    if cell.is_string() || cell.is_bool() {
        return Some(Cell::Text(cell.to_string()));
    }
    None
}

fn misfit(heading: &str, row: usize, cell: &Dynamic, wanted: &str) -> Fault {
    let found = with_article(kind_name(cell));
    Fault::new(format!(
        "column {heading}, row {}: {wanted} is needed, not {found}",
        row + 1
    ))
}

fn of_eddies(room: &mut Room) {
    room.method::<FoundEddies>("table")
        .about("The eddies as a table, one row an eddy, with units in the headings.")
        .words("csv columns export results")
        .example(
            "let flow = shielded_gaussian(#{ x_px: 50, y_px: 50, core_radius_px: 15, peak_vorticity_per_frame: 0.3 }).field(#{ nx: 51, ny: 51, spacing_px: 2 });\nflow.eddies().table().column(\"x_px\")",
            "[50]",
        )
        .does(|found: &FoundEddies| eddies(&found.0));
}

/// The eddies of a field, where the value is that.
fn of_a_field(value: &Dynamic) -> Option<Arc<Eddies>> {
    value
        .read_lock::<Arc<FoundEddies>>()
        .map(|found| Arc::clone(&found.0))
}

fn choosing(room: &mut Room) {
    room.method::<Table>("len")
        .about("How many rows the table has.")
        .words("count rows size number")
        .unit("count")
        .example(with_a_table!("t.len()"), "3")
        .does(|table: &Table| table.rows());
    room.property::<Table>("headings")
        .about("The headings of the columns, from the left.")
        .words("columns names units")
        .example(with_a_table!("t.headings"), "[\"run\", \"width_mm\"]")
        .does(|table: &Table| {
            table
                .columns()
                .iter()
                .map(Column::heading)
                .collect::<Vec<_>>()
        });
    room.method::<Table>("column")
        .about("The cells of a column as a list; () where one is missing. Where a column has no unit and only whole numbers, they can pick items of a list.")
        .words("values list cells pick")
        .input(
            "name",
            "",
            "its heading (width_mm) or its name without the unit (width)",
        )
        .unit("as its heading says")
        .errors("there is no such column")
        .example(
            with_a_table!("t.column(\"width\").mean()"),
            "10.3333333333333",
        )
        .does(|table: &Table, name: String| {
            let column = table.column(&name)?;
            // Counts and numbers of things pick items of a list, which only whole numbers do.
            let whole = column.unit.is_one() && column.numbers().all(|n| n.fract() == 0.0 && n.abs() < 1e15);
            let cells = column.cells.iter().map(|c| match c {
                Cell::Number(n) if whole => Dynamic::from(*n as rhai::INT),
                c => cell(c),
            });
            Ok::<Vec<Dynamic>, Fault>(cells.collect())
        });
    room.method::<Table>("select")
        .about("The table of these columns, in this order.")
        .words("choose columns subset")
        .input("names", "", "headings, or names without the unit")
        .errors("there is no such column, or one is named twice")
        .example(
            with_a_table!("t.select([\"width\"]).headings"),
            "[\"width_mm\"]",
        )
        .does(|table: &Table, names: Vec<String>| table.select(names.iter().map(String::as_str)));
    room.operator::<Table>("+")
        .about("The rows of both, those of the left side first.")
        .words("join append rows below concatenate")
        .input("other", "", "a table with the same headings")
        .errors("the headings differ")
        .example(with_a_table!("(t + t).len()"), "6")
        .does(|a: &Table, b: Arc<Table>| a.followed_by(&b));
}

fn cell(cell: &Cell) -> Dynamic {
    match cell {
        Cell::Number(x) => Dynamic::from_float(*x),
        Cell::Text(text) => Dynamic::from(text.clone()),
        Cell::Missing => Dynamic::UNIT,
    }
}

/// The name of a file that is to hold a table as text.
pub(super) fn table_name(file: &str) -> Result<&str, Fault> {
    let ending = Path::new(file.trim()).extension();
    let ending = ending.map(|e| e.to_string_lossy().to_lowercase());
    // A name that is empty is refused as that.
    match ending.as_deref() {
        Some("csv" | "txt" | "dat") => Ok(file),
        _ if file.trim().is_empty() => Ok(file),
        Some("svg" | "png") => Err(wrong_ending(file)
            .hint("a picture is drawn first: figure().arrows(field).save(...), figure().line(x, y).save(...)")),
        _ => Err(wrong_ending(file)),
    }
}

fn wrong_ending(file: &str) -> Fault {
    Fault::new(format!(
        "columns of numbers do not go into {file}: end the name in .csv, .txt or .dat"
    ))
}

fn files(room: &mut Room) {
    room.method::<Table>("save")
        .about("Writes the table as CSV.")
        .words("write export csv file")
        .input("file", "", "file name, below the output folder")
        .errors("the name does not end in .csv, .txt or .dat, or the file cannot be written")
        .example(with_a_table!("t.save(\"widths.csv\")"), "")
        .does(|table: &Table, file: String, call: Call| {
            call.write(table_name(&file)?, |path| table.save(path))
        });
    room.function("read_table")
        .about("The table in a CSV file whose first line holds the headings.")
        .words("open load import csv file")
        .input("file", "", "file name")
        .errors("the file cannot be read or is no such table")
        .example(
            with_a_table!("t.save(\"widths.csv\");\nread_table(\"out/widths.csv\").len()"),
            "3",
        )
        .does(|file: String, call: Call| {
            let path = call.existing(&file)?;
            Ok::<_, Fault>(Table::read(&path)?)
        });
}
