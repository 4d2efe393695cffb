//! Which column of a table of vectors holds what, and in which unit.

use super::cells::{Cells, Problem, is_gap, number};
use crate::quantity::Unit;

/// A column's place in its row and the factor that brings its numbers to the field's unit.
#[derive(Clone, Copy)]
pub(super) struct Column {
    pub place: usize,
    pub factor: f64,
}

/// The columns of a table of vectors and the units of the field they make.
pub(super) struct VectorColumns {
    pub x: Column,
    pub y: Column,
    pub u: Column,
    pub v: Column,
    pub unc: Option<(Column, Column)>,
    pub status: Option<usize>,
    pub length: Unit,
    pub time: Unit,
}

/// A name found in the heading: where, and the unit it states.
type Found = (usize, Option<Unit>);

impl VectorColumns {
    /// From the heading, or without one the first four columns that hold numbers, in px and
    /// px/frame.
    pub(super) fn of(cells: &Cells<'_>) -> Result<Self, Problem> {
        match &cells.heading {
            Some(names) => Self::named(names),
            None => Self::first_four(cells),
        }
    }

    fn first_four(cells: &Cells<'_>) -> Result<Self, Problem> {
        let Some(row) = cells.rows.first() else {
            return Err(Problem::whole("holds no rows of numbers".to_owned()));
        };
        let numeric = |cell: &&str| number(cell).is_some() || is_gap(cell);
        let places: Vec<usize> = (0..row.cells.len())
            .filter(|&k| numeric(&row.cells[k]))
            .collect();
        let [x, y, u, v, ..] = places[..] else {
            let what = format!(
                "x, y, u and v need four columns of numbers; this line has {}",
                places.len()
            );
            return Err(Problem::at(row.line, what));
        };
        let column = |place| Column { place, factor: 1.0 };
        Ok(Self {
            x: column(x),
            y: column(y),
            u: column(u),
            v: column(v),
            unc: None,
            status: None,
            length: Unit::PX,
            time: Unit::FRAME,
        })
    }

    fn named(names: &[&str]) -> Result<Self, Problem> {
        let need = |keys: &[&str]| -> Result<Found, Problem> {
            find(names, keys)?.ok_or_else(|| {
                if let Some((name, unit)) = with_unknown_unit(names, keys) {
                    return unknown_unit(name, unit);
                }
                Problem::whole(format!(
                    "has no column {}; its columns are {}",
                    keys[0],
                    names.join(", ")
                ))
            })
        };
        let (x, y) = (need(&["x"])?, need(&["y"])?);
        let (u, v) = (need(&["u", "vx"])?, need(&["v", "vy"])?);
        let (length, time) = units(x.1.or(y.1), u.1.or(v.1))?;
        let velocity = length.per(time);
        let in_unit = |(place, unit): Found, default: Option<Unit>, target: Unit| {
            let factor = match unit.or(default) {
                None => Some(1.0),
                Some(unit) => factor(unit, target),
            };
            factor
                .map(|factor| Column { place, factor })
                .ok_or_else(|| {
                    let name = names[place];
                    Problem::whole(format!("column {name} does not convert to {target}"))
                })
        };
        let unc = match (find(names, &["u_unc"])?, find(names, &["v_unc"])?) {
            (Some(a), Some(b)) => Some((
                in_unit(a, u.1, velocity)?,
                in_unit(b, v.1.or(u.1), velocity)?,
            )),
            _ => None,
        };
        Ok(Self {
            x: in_unit(x, y.1, length)?,
            y: in_unit(y, x.1, length)?,
            u: in_unit(u, v.1, velocity)?,
            v: in_unit(v, u.1, velocity)?,
            unc,
            status: find(names, &["status"])?.map(|found| found.0),
            length,
            time,
        })
    }
}

/// The factor from a stated unit to the field's; a displacement in px is one a frame.
fn factor(unit: Unit, target: Unit) -> Option<f64> {
    let stated = if unit == Unit::PX && target == Unit::PX.per(Unit::FRAME) {
        target
    } else {
        unit
    };
    stated.factor_to(target)
}

/// Units of length and time of the field: px and frame, or mm and s.
fn units(length: Option<Unit>, velocity: Option<Unit>) -> Result<(Unit, Unit), Problem> {
    let pixels = (Unit::PX, Unit::FRAME);
    let calibrated = (Unit::MM, Unit::S);
    let fits = |(l, t): (Unit, Unit)| {
        length.is_none_or(|unit| unit.factor_to(l).is_some())
            && velocity.is_none_or(|unit| factor(unit, l.per(t)).is_some())
    };
    let half_stated = length.is_none() != velocity.is_none();
    if fits(pixels) {
        Ok(pixels)
    } else if fits(calibrated) && !half_stated {
        Ok(calibrated)
    } else {
        let say = |unit: Option<Unit>| unit.map_or("no unit".to_owned(), |u| u.to_string());
        Err(Problem::whole(format!(
            "states {} for positions and {} for velocities; name the columns for px and \
             px/frame (x_px, u_px_per_frame) or for a length and a velocity (x_mm, u_mm_per_s)",
            say(length),
            say(velocity)
        )))
    }
}

fn unknown_unit(name: &str, unit: &str) -> Problem {
    Problem::whole(format!(
        "column {name} is in \"{unit}\", which is not made of px, um, mm, cm, m, frame, us, ms, s \
         or deg"
    ))
}

/// The column that would have one of these names if what follows it were a unit.
fn with_unknown_unit<'a>(names: &[&'a str], keys: &[&str]) -> Option<(&'a str, &'a str)> {
    keys.iter().find_map(|key| {
        names.iter().find_map(|name| {
            let name = name.trim();
            let (start, unit) = name.split_once(['_', ' '])?;
            let fits = start.eq_ignore_ascii_case(key) && !unit.starts_with("unc");
            fits.then_some((name, unit))
        })
    })
}

/// The column with one of these names, bare or followed by its unit: `x_mm`, `x [mm]`, `x (mm)`.
fn find(names: &[&str], keys: &[&str]) -> Result<Option<Found>, Problem> {
    for key in keys {
        for (place, name) in names.iter().enumerate() {
            let name = name.trim().to_lowercase();
            let Some(rest) = name.strip_prefix(key) else {
                continue;
            };
            let bracketed = rest.trim_start().starts_with(['[', '(']);
            let unit = if bracketed {
                rest.trim().trim_matches(['[', ']', '(', ')'])
            } else if let Some(unit) = rest.strip_prefix(['_', ' ']) {
                unit
            } else if rest.is_empty() {
                return Ok(Some((place, None)));
            } else {
                continue;
            };
            match Unit::parse(unit) {
                Some(unit) if !unit.is_one() => return Ok(Some((place, Some(unit)))),
                Some(_) => return Ok(Some((place, None))),
                None if bracketed => return Err(unknown_unit(names[place], unit)),
                None => {}
            }
        }
    }
    Ok(None)
}
