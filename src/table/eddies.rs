//! Eddies as rows.

use super::{Column, Table, TableError};
use crate::quantity::{Measured, Unit};
use crate::vortex::{Eddies, Eddy, Method};

/// The eddies of one field: one row an eddy, the strongest circulation first.
///
/// Columns: eddy, x, y, sense, peak_vorticity, circulation, diameter, and the diameter by largest
/// circulation where that has an answer; every measured one with its uncertainty beside it; flags,
/// separated by semicolons. Units are the field's, also when there are no eddies.
///
/// # Errors
/// [`TableError`] never in practice: all eddies of a field share its units.
pub fn eddies(found: &Eddies) -> Result<Table, TableError> {
    let list = &found.list;
    let length = found.field.grid.length;
    let rate = Unit::ONE.per(found.field.time);
    let strength = found.field.unit().times(length);
    let measured = |read: fn(&Eddy) -> Option<Measured>| list.iter().map(read).collect::<Vec<_>>();
    let mut table = Table::of([number("eddy", list.iter().map(|e| e.index))])?;
    table.push_measured_in("x", length, &measured(|e| Some(e.x.clone())))?;
    table.push_measured_in("y", length, &measured(|e| Some(e.y.clone())))?;
    table.push(Column::new(
        "sense",
        Unit::ONE,
        list.iter().map(|e| e.sense.text()),
    ))?;
    let peaks = measured(|e| Some(e.peak_vorticity.clone()));
    table.push_measured_in("peak_vorticity", rate, &peaks)?;
    let circulations = measured(|e| Some(e.circulation.clone()));
    table.push_measured_in("circulation", strength, &circulations)?;
    table.push_measured_in("diameter", length, &measured(|e| Some(e.diameter.clone())))?;
    let largest = measured(|e| e.diameter_by(Method::LargestCirculation).ok());
    table.push_measured_in("diameter_by_largest_circulation", length, &largest)?;
    table.push(Column::new("flags", Unit::ONE, list.iter().map(flags)))?;
    Ok(table)
}

/// The eddies of several fields, one below the other, with the number of the field in front.
///
/// # Errors
/// [`TableError::ColumnsDiffer`] when the fields have different units.
pub fn eddies_of_each(all: &[&Eddies]) -> Result<Table, TableError> {
    let mut whole = Table::new();
    for (index, found) in all.iter().enumerate() {
        let numbers = found.list.iter().map(|_| index);
        let mut part = Table::of([number("field", numbers)])?;
        for column in eddies(found)?.columns() {
            part.push(column.clone())?;
        }
        whole = whole.followed_by(&part)?;
    }
    Ok(whole)
}

fn number(name: &str, numbers: impl Iterator<Item = usize>) -> Column {
    Column::new(name, Unit::ONE, numbers.map(|n| n as f64))
}

fn flags(eddy: &Eddy) -> String {
    let flags = eddy.flags.iter().map(|flag| flag.text());
    flags.collect::<Vec<_>>().join("; ")
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::field::Grid;
    use crate::synth::{Flow, LambOseen, ShieldedGaussian};
    use crate::task::Task;
    use crate::vortex::{EddyOptions, find_eddies};

    fn found() -> Eddies {
        let grid = Grid {
            nx: 81,
            ny: 61,
            x0: 0.0,
            y0: 0.0,
            dx: 2.0,
            dy: 2.0,
            length: Unit::MM,
        };
        let flow = Flow::from(ShieldedGaussian {
            x: 50.0,
            y: 60.0,
            core_radius: 16.0,
            peak_vorticity: 0.3,
        }) + LambOseen {
            x: 120.0,
            y: 60.0,
            core_radius: 8.0,
            circulation: -20.0,
        };
        let field = flow.field(&grid, Unit::S);
        find_eddies(&field, &EddyOptions::default(), &Task::quiet()).unwrap()
    }

    #[test]
    fn every_eddy_is_a_row_with_units_in_the_headings() {
        let found = found();
        let table = eddies(&found).unwrap();
        assert_eq!(table.rows(), found.list.len());
        let header = table.to_csv().lines().next().unwrap().to_owned();
        assert_eq!(
            header,
            "eddy,x_mm,x_unc_mm,y_mm,y_unc_mm,sense,peak_vorticity_per_s,\
             peak_vorticity_unc_per_s,circulation_mm2_per_s,circulation_unc_mm2_per_s,\
             diameter_mm,diameter_unc_mm,diameter_by_largest_circulation_mm,\
             diameter_by_largest_circulation_unc_mm,flags"
        );
    }

    #[test]
    fn fields_without_eddies_leave_no_row_and_keep_the_headings() {
        let with = found();
        let mut without = with.clone();
        without.list.clear();
        let table = eddies_of_each(&[&without, &with]).unwrap();
        assert_eq!(table.rows(), with.list.len());
        assert!(table.column("field").unwrap().numbers().all(|n| n == 1.0));
    }
}
