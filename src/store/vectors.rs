//! Vector fields as text: one row a node, units in the column names.

use std::fs;
use std::io::{self, Write};
use std::path::Path;

use ndarray::Array2;

use super::cells::{Cells, Problem, Row, cut, is_gap, number};
use super::lattice::{Ladder, Uneven};
use super::vector_columns::{Column, VectorColumns};
use super::{StoreError, write_atomically};
use crate::field::{Grid, Status, VectorField};

/// Writes a field as comma-separated values, a row a node, the lowest row of the grid first.
///
/// The heading is `x_mm,y_mm,u_mm_per_s,v_mm_per_s,u_unc_mm_per_s,v_unc_mm_per_s,status` with
/// the field's own units; the uncertainty columns stand only where the field has them. Numbers
/// have every digit they need to be read back as they were; a missing one is an empty cell. The
/// window and the label do not fit the format.
///
/// # Errors
/// [`StoreError`] when the file cannot be written; an earlier one is then as it was.
pub fn save_vectors(field: &VectorField, path: &Path) -> Result<(), StoreError> {
    write_atomically(path, |file| write_rows(field, file))
}

fn write_rows(field: &VectorField, file: &mut dyn Write) -> io::Result<()> {
    let length = field.grid.length.header();
    let velocity = field.unit().header();
    write!(file, "x_{length},y_{length},u_{velocity},v_{velocity}")?;
    if field.unc.is_some() {
        write!(file, ",u_unc_{velocity},v_unc_{velocity}")?;
    }
    writeln!(file, ",status")?;
    for ((j, i), status) in field.status.indexed_iter() {
        write!(file, "{},{}", field.grid.x(i), field.grid.y(j))?;
        let unc = field.unc.as_ref();
        let arrays = [
            Some(&field.u),
            Some(&field.v),
            unc.map(|u| &u.0),
            unc.map(|u| &u.1),
        ];
        for array in arrays.into_iter().flatten() {
            match array[(j, i)] {
                value if value.is_finite() => write!(file, ",{value}")?,
                _ => write!(file, ",")?,
            }
        }
        writeln!(file, ",{}", status.text())?;
    }
    Ok(())
}

/// Reads any table of x, y, u, v on a regular grid, in whatever order its rows stand.
///
/// Cells are separated by commas, semicolons, tabs or blanks; with semicolons or tabs a decimal
/// comma is understood. Lines that begin with # or % are comment. A heading names the columns (`x_mm`,
/// `x [mm]`, `x (mm)` or bare `x`; `vx`, `vy` serve for u, v; other columns are ignored); without
/// one the first four columns of numbers are x, y, u, v. Lengths other than px are brought to mm,
/// velocities to mm/s; a table that states no units is taken to be in px and px/frame.
/// Uncertainties and status are read where they stand as [`save_vectors`] writes them.
///
/// A node without a row, or whose u or v is empty or not a number, is masked.
///
/// # Errors
/// [`StoreError::Read`] when the file cannot be read, [`StoreError::Content`] with the line when
/// what it holds is not such a table.
pub fn read_vectors(path: &Path) -> Result<VectorField, StoreError> {
    let file = path.display().to_string();
    let bytes = fs::read(path).map_err(|source| StoreError::Read {
        file: file.clone(),
        source,
    })?;
    let label = path
        .file_name()
        .map_or(file.clone(), |name| name.to_string_lossy().into_owned());
    field_of(&String::from_utf8_lossy(&bytes), &label).map_err(|problem| StoreError::Content {
        file,
        line: problem.line,
        what: problem.what,
    })
}

fn field_of(text: &str, label: &str) -> Result<VectorField, Problem> {
    if text.contains('\0') {
        return Err(Problem::whole(
            "is no text; a table of vectors has x, y, u and v in columns of numbers".to_owned(),
        ));
    }
    let cells = cut(text)?;
    let columns = VectorColumns::of(&cells)?;
    let nodes = Nodes::of(&cells, &columns)?;
    let grid = nodes.grid;
    let values = |column| nodes.values(&cells, column);
    let mut field = VectorField::new(
        grid,
        columns.time,
        values(columns.u)?,
        values(columns.v)?,
        label,
    );
    if let Some((u, v)) = columns.unc {
        field.unc = Some((values(u)?, values(v)?));
    }
    if let Some(place) = columns.status {
        nodes.mark(&cells, place, &mut field)?;
    }
    Ok(field)
}

/// The grid of a table and the node each of its rows belongs to.
struct Nodes {
    grid: Grid,
    of_rows: Vec<(usize, usize)>,
}

impl Nodes {
    fn of(cells: &Cells<'_>, columns: &VectorColumns) -> Result<Self, Problem> {
        let x = coordinates(&cells.rows, columns.x, "x")?;
        let y = coordinates(&cells.rows, columns.y, "y")?;
        let along_x = ladder(&x, &cells.rows, "x")?;
        let along_y = ladder(&y, &cells.rows, "y")?;
        let (nx, ny) = (along_x.count, along_y.count);
        // A grid that is almost all gaps is a wrong spacing, and could be too big to hold.
        if nx as f64 * ny as f64 > 100.0 * x.len() as f64 {
            return Err(Problem::whole(format!(
                "has {} rows for a grid of {nx} x {ny} nodes, which its x and y seem to make: \
                 they do not lie on a regular grid",
                x.len()
            )));
        }
        let grid = Grid {
            nx,
            ny,
            x0: along_x.first,
            y0: along_y.first,
            dx: along_x.spacing,
            dy: along_y.spacing,
            length: columns.length,
        };
        let node = |k: usize| Some((along_y.rung(y[k])?, along_x.rung(x[k])?));
        let of_rows: Vec<_> = (0..x.len()).filter_map(node).collect();
        let nodes = Self { grid, of_rows };
        nodes.refuse_doubles(&cells.rows, (&x, &y))?;
        Ok(nodes)
    }

    fn refuse_doubles(&self, rows: &[Row<'_>], (x, y): (&[f64], &[f64])) -> Result<(), Problem> {
        let mut taken: Array2<Option<usize>> = Array2::from_elem(self.grid.shape(), None);
        for (k, &node) in self.of_rows.iter().enumerate() {
            if let Some(earlier) = taken[node].replace(k) {
                let what = format!(
                    "is a second row for the node ({}, {}) of line {}",
                    x[k], y[k], rows[earlier].line
                );
                return Err(Problem::at(rows[k].line, what));
            }
        }
        Ok(())
    }

    /// One column on the grid; NaN for gaps and for nodes without a row.
    fn values(&self, cells: &Cells<'_>, column: Column) -> Result<Array2<f64>, Problem> {
        let mut values = Array2::from_elem(self.grid.shape(), f64::NAN);
        for (row, &node) in cells.rows.iter().zip(&self.of_rows) {
            let cell = row.cells[column.place];
            if is_gap(cell) {
                continue;
            }
            let value = number(cell).ok_or_else(|| not_a_number(row, cell, column.place))?;
            let value = value * column.factor;
            values[node] = if value.is_finite() { value } else { f64::NAN };
        }
        Ok(values)
    }

    /// Gives each vector the status its row states; one said to be masked or outside is dropped.
    fn mark(
        &self,
        cells: &Cells<'_>,
        place: usize,
        field: &mut VectorField,
    ) -> Result<(), Problem> {
        for (row, &node) in cells.rows.iter().zip(&self.of_rows) {
            let cell = row.cells[place];
            let Some(status) = Status::parse(cell) else {
                let what = format!(
                    "has the status \"{cell}\"; it can be measured, replaced, masked or outside"
                );
                return Err(Problem::at(row.line, what));
            };
            if !status.has_vector() {
                field.u[node] = f64::NAN;
                field.v[node] = f64::NAN;
                field.status[node] = status;
            } else if field.status[node].has_vector() {
                field.status[node] = status;
            }
        }
        Ok(())
    }
}

fn not_a_number(row: &Row<'_>, cell: &str, place: usize) -> Problem {
    let what = format!("\"{cell}\" in column {} is not a number", place + 1);
    Problem::at(row.line, what)
}

fn coordinates(rows: &[Row<'_>], column: Column, name: &str) -> Result<Vec<f64>, Problem> {
    rows.iter()
        .map(|row| {
            let cell = row.cells[column.place];
            match number(cell) {
                Some(value) if (value * column.factor).is_finite() => Ok(value * column.factor),
                Some(_) => Err(Problem::at(row.line, format!("{name} is {cell}"))),
                None if is_gap(cell) => Err(Problem::at(row.line, format!("{name} is missing"))),
                None => Err(not_a_number(row, cell, column.place)),
            }
        })
        .collect()
}

fn ladder(coordinates: &[f64], rows: &[Row<'_>], name: &str) -> Result<Ladder, Problem> {
    Ladder::through(coordinates).map_err(|uneven| match uneven {
        Uneven::TooFew => Problem::whole(format!(
            "has too few rows: a grid needs at least two different {name}, in {} rows there {}",
            coordinates.len(),
            if coordinates.is_empty() {
                "is none"
            } else {
                "is one"
            },
        )),
        Uneven::Off { index, spacing } => Problem::at(
            rows[index].line,
            format!(
                "{name} = {} is off the regular spacing of {} that the other rows keep",
                coordinates[index],
                crate::quantity::plain_number(spacing, 6)
            ),
        ),
        Uneven::TooWide => Problem::whole(format!(
            "has {name} that are not evenly spaced: they spread too far for the steps between them"
        )),
    })
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::quantity::Unit;
    use proptest::prelude::*;

    fn sample(length: Unit, time: Unit) -> VectorField {
        let grid = Grid {
            nx: 5,
            ny: 4,
            x0: 15.5,
            y0: 7.1,
            dx: 0.8,
            dy: 0.4,
            length,
        };
        let u = grid.map(|x, y| (x * y).sin() / 3.0);
        let v = grid.map(|x, y| x - y * 1e-7);
        let mut field = VectorField::new(grid, time, u, v, "sample");
        field.unc = Some((grid.map(|x, _| x * 0.01), grid.map(|_, y| y * 0.01)));
        field.status[(2, 1)] = Status::Replaced;
        for (node, status) in [((0, 0), Status::Masked), ((3, 4), Status::Outside)] {
            field.u[node] = f64::NAN;
            field.v[node] = f64::NAN;
            field.status[node] = status;
        }
        field
    }

    fn text_of(field: &VectorField) -> String {
        let mut bytes = Vec::new();
        write_rows(field, &mut bytes).unwrap();
        String::from_utf8(bytes).unwrap()
    }

    fn assert_same(a: &VectorField, b: &VectorField) {
        assert!(a.grid.coincides_with(&b.grid), "{:?} {:?}", a.grid, b.grid);
        assert_eq!((a.grid.length, a.time), (b.grid.length, b.time));
        assert_eq!(a.status, b.status);
        let same = |a: &Array2<f64>, b: &Array2<f64>| {
            a.iter()
                .zip(b)
                .all(|(a, b)| a == b || (a.is_nan() && b.is_nan()))
        };
        assert!(same(&a.u, &b.u) && same(&a.v, &b.v));
        match (&a.unc, &b.unc) {
            (Some(a), Some(b)) => assert!(same(&a.0, &b.0) && same(&a.1, &b.1)),
            (None, None) => {}
            _ => panic!("one has uncertainties, the other not"),
        }
    }

    #[test]
    fn what_is_saved_is_read_back() {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("flow.csv");
        for (length, time) in [(Unit::PX, Unit::FRAME), (Unit::MM, Unit::S)] {
            let mut field = sample(length, time);
            save_vectors(&field, &path).unwrap();
            let back = read_vectors(&path).unwrap();
            assert_same(&field, &back);
            assert_eq!(back.label, "flow.csv");
            field.unc = None;
            save_vectors(&field, &path).unwrap();
            assert_same(&field, &read_vectors(&path).unwrap());
        }
    }

    #[test]
    fn the_heading_carries_the_units() {
        let heading = |field: &VectorField| text_of(field).lines().next().unwrap().to_owned();
        let mut field = sample(Unit::MM, Unit::S);
        assert_eq!(
            heading(&field),
            "x_mm,y_mm,u_mm_per_s,v_mm_per_s,u_unc_mm_per_s,v_unc_mm_per_s,status"
        );
        field.unc = None;
        assert_eq!(heading(&field), "x_mm,y_mm,u_mm_per_s,v_mm_per_s,status");
        let field = sample(Unit::PX, Unit::FRAME);
        assert!(heading(&field).starts_with("x_px,y_px,u_px_per_frame,v_px_per_frame,"));
    }

    proptest! {
        #[test]
        fn the_order_of_rows_does_not_matter(
            order in Just((0..20).collect::<Vec<usize>>()).prop_shuffle()
        ) {
            let field = sample(Unit::MM, Unit::S);
            let text = text_of(&field);
            let lines: Vec<&str> = text.lines().collect();
            let mut shuffled = vec![lines[0]];
            shuffled.extend(order.iter().map(|&k| lines[k + 1]));
            assert_same(&field, &field_of(&shuffled.join("\n"), "sample").unwrap());
        }

        #[test]
        fn no_text_makes_the_reader_panic(text in "([-0-9.eE,; \t\n\"#%xyuvnaN_\\[\\]()mps/]|.){0,200}") {
            let _ = field_of(&text, "hostile");
        }

        #[test]
        fn no_numbers_make_the_reader_panic(
            rows in prop::collection::vec(prop::array::uniform4(any::<f64>()), 0..30)
        ) {
            let line = |r: &[f64; 4]| format!("{:e} {:e} {:e} {:e}\n", r[0], r[1], r[2], r[3]);
            let _ = field_of(&rows.iter().map(line).collect::<String>(), "hostile");
        }
    }

    #[test]
    fn tables_of_other_makers_are_read() {
        let plain = "0 0 1 2\n1 0 3 4\n0 1 5 6\n1 1 7 8\n";
        let field = field_of(plain, "f").unwrap();
        assert_eq!((field.grid.length, field.time), (Unit::PX, Unit::FRAME));
        assert_eq!((field.u[(1, 0)], field.v[(1, 0)]), (5.0, 6.0));
        let same = [
            "# x y u v\n0\t0\t1\t2\n1\t0\t3\t4\n0\t1\t5\t6\n1\t1\t7\t8\n",
            "x;y;u;v\r\n0,0;0,0;1,0;2\r\n1;0;3;4\r\n0;1;5;6\r\n1;1;7;8\r\n",
            "\u{feff}v,u,y,x,quality\n2,1,0,0,1\n4,3,0,1,1\n6,5,1,0,1\n8,7,1,1,1\n",
            "% comment\n\n\"x [px]\",\"y [px]\",\"u [px]\",\"v [px]\"\n0,0,1,2\n1,0,3,4\n0,1,5,6\n1,1,7,8",
            "x (px) ; y (px) ; vx (px/frame) ; vy (px/frame)\n0;0;1;2\n1;0;3;4\n0;1;5;6\n1;1;7;8",
        ];
        for text in same {
            assert_same(&field, &field_of(text, "f").unwrap());
        }
        let metres =
            "x [m],y [m],u [m/s],v [cm/s]\n0,0,1,2\n0.001,0,3,4\n0,0.001,5,6\n0.001,0.001,7,8";
        let field = field_of(metres, "f").unwrap();
        assert_eq!((field.grid.length, field.time), (Unit::MM, Unit::S));
        assert!((field.grid.dx - 1.0).abs() < 1e-12);
        assert_eq!((field.u[(0, 0)], field.v[(0, 0)]), (1000.0, 20.0));
    }

    #[test]
    fn gaps_and_missing_rows_are_masked() {
        let text = "x,y,u,v\n0,0,1,2\n1,0,NaN,4\n2,0,,\n0,1,5,6\n2,1,inf,8\n0,2,1,1\n1,2,1,1\n";
        let field = field_of(text, "f").unwrap();
        assert_eq!(field.grid.shape(), (3, 3));
        assert_eq!(field.count(Status::Measured), 4);
        assert_eq!(field.count(Status::Masked), 5);
        assert!(field.v[(0, 1)].is_nan());
    }

    #[test]
    fn wrong_tables_are_refused_with_line_and_reason() {
        let grid = "0 0 1 2\n1 0 3 4\n2 0 3 4\n3 0 3 4\n4 1 5 6\n1 1 7 8\n";
        let cases = [
            ("", None, "holds no rows"),
            ("# nothing\n", None, "holds no rows"),
            ("x,y,u\n", None, "no column v; its columns are x, y, u"),
            ("x,y,u,v\n", None, "too few rows"),
            (
                "1 2 3\n4 5 6\n",
                Some(1),
                "four columns of numbers; this line has 3",
            ),
            ("0 0 1 2\n", None, "at least two different x"),
            ("0 0 1 2\n1 0 1 2\n", None, "at least two different y"),
            (
                "x,y,u,v\n0,0,1,2\n1,0,three,4\n0,1,1,1\n",
                Some(3),
                "\"three\" in column 3",
            ),
            ("x,y,u,v\n0,0,1,2\n1,,3,4\n", Some(3), "y is missing"),
            ("x,y,u,v\n0,0,1,2\n1,inf,3,4\n", Some(3), "y is inf"),
            ("0 0 1 2\n1 0 3\n", Some(2), "has 3 cells where 4"),
            (
                "x_mm,y_mm,u,v\n0,0,1,2\n",
                None,
                "states mm for positions and no unit",
            ),
            (
                "x_mm,y_mm,u_px_per_frame,v_px_per_frame\n0,0,1,2\n",
                None,
                "px/frame for velocities",
            ),
            (
                "x [furlong],y,u,v\n0,0,1,2\n",
                None,
                "\"furlong\", which is not made of",
            ),
            (
                "x,y,u,v,status\n0,0,1,2,good\n1,1,1,1,measured\n",
                Some(2),
                "status \"good\"",
            ),
            (
                &format!("{grid}1 0 9 9\n"),
                Some(7),
                "second row for the node (1, 0) of line 2",
            ),
            (
                &format!("{grid}1.4 1 9 9\n"),
                Some(7),
                "x = 1.4 is off the regular spacing of 1",
            ),
            ("0 0 1 2\n1 0 3 4\n1e9 1 5 6\n", None, "not evenly spaced"),
        ];
        for (text, line, message) in cases {
            let problem = field_of(text, "f").unwrap_err();
            assert!(problem.what.contains(message), "{text:?}: {}", problem.what);
            assert_eq!(problem.line, line, "{text:?}");
        }
        let missing = read_vectors(Path::new("no/such.csv")).unwrap_err();
        assert!(
            missing
                .to_string()
                .starts_with("no/such.csv cannot be read")
        );
    }
}
