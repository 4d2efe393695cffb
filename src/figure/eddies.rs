//! Eddies as outlines, and the transect through one.

use super::figure::Figure;
use super::outlines::{Outline, OutlineSet};
use super::transect::{Transect, transect};
use crate::field::FieldError;
use crate::quantity::plain_number;
use crate::vortex::{Eddies, Eddy, EddyOptions, Flag};

/// A transect reaches this many diameters to each side of the core, as far as the field goes.
const REACH: f64 = 1.5;

/// Points of a transect.
const POINTS: usize = 241;

impl From<&Eddies> for OutlineSet {
    /// The boundary of every eddy by vorticity fraction, with its number; dashed where a flag
    /// casts doubt on it.
    fn from(found: &Eddies) -> Self {
        let outline = |eddy: &Eddy| Outline {
            polygon: eddy.outline.clone(),
            centre: [eddy.x.value(), eddy.y.value()],
            label: eddy.index.to_string(),
            clockwise: eddy.sense.sign() < 0.0,
            flagged: eddy.flags.iter().any(|f| *f != Flag::NoCirculationMaximum),
        };
        Self {
            length: found.field.grid.length,
            list: found.list.iter().map(outline).collect(),
        }
    }
}

/// Vorticity and swirling strength along x through the core of one eddy, with the level and the
/// boundaries of the vorticity fraction marked.
///
/// # Errors
/// [`FieldError`] when the eddy does not belong to these fields.
pub fn eddy_transect(found: &Eddies, eddy: &Eddy) -> Result<Figure, FieldError> {
    let grid = &found.vorticity.grid;
    let (x, y) = (eddy.x.value(), eddy.y.value());
    let reach = REACH * eddy.diameter.value();
    let from = ((x - reach).max(grid.x0), y);
    let to = ((x + reach).min(grid.x1()), y);
    let scheme = found.options.scheme.unwrap_or(EddyOptions::DEFAULT_SCHEME);
    let gradient = found.field.gradient(scheme)?;
    let traces = [
        found.vorticity.along(from, to, POINTS)?,
        gradient.swirl_along(from, to, POINTS)?,
    ];
    let percent = plain_number(100.0 * found.options.fraction, 3);
    let level = found.options.fraction * eddy.peak_vorticity.value();
    let marks = Transect {
        core: Some(x - from.0),
        level: Some((level, format!("{percent} % of the peak"))),
        boundaries: crossings(&eddy.outline, y)
            .into_iter()
            .map(|crossing| (crossing - from.0, "boundary".to_owned()))
            .collect(),
    };
    Ok(transect(&traces, &marks))
}

/// Where a closed outline crosses the height `y`, from the left.
fn crossings(outline: &[[f64; 2]], y: f64) -> Vec<f64> {
    let next = outline.iter().cycle().skip(1);
    let mut found: Vec<f64> = outline
        .iter()
        .zip(next)
        .filter(|(a, b)| (a[1] < y) != (b[1] < y))
        .map(|(a, b)| a[0] + (y - a[1]) / (b[1] - a[1]) * (b[0] - a[0]))
        .collect();
    found.sort_by(f64::total_cmp);
    found
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::field::Grid;
    use crate::quantity::Unit;
    use crate::synth::{Flow, ShieldedGaussian};
    use crate::task::Task;
    use crate::vortex::{EddyOptions, find_eddies};

    #[test]
    fn an_outline_is_crossed_on_both_sides() {
        let square = [[0.0, 0.0], [2.0, 0.0], [2.0, 2.0], [0.0, 2.0]];
        assert_eq!(crossings(&square, 0.5), [0.0, 2.0]);
        assert!(crossings(&square, 3.0).is_empty());
    }

    #[test]
    fn swirl_along_a_transect_never_changes_sign_where_it_ends() {
        // Coarse on purpose: four nodes a core radius, where the kink of the swirl shows most.
        let grid = Grid {
            nx: 41,
            ny: 41,
            x0: 0.0,
            y0: 0.0,
            dx: 2.0,
            dy: 2.0,
            length: Unit::MM,
        };
        let flow = Flow::from(ShieldedGaussian {
            x: 40.0,
            y: 41.0,
            core_radius: 8.0,
            peak_vorticity: -0.3,
        });
        let gradient = flow
            .field(&grid, Unit::S)
            .gradient(EddyOptions::DEFAULT_SCHEME)
            .unwrap();
        let line = gradient
            .swirl_along((20.0, 41.0), (60.0, 41.0), 401)
            .unwrap();
        let core = |x: f64| (x - 40.0).abs() < 9.0;
        let wrong = line
            .x
            .iter()
            .zip(&line.values)
            .filter(|(x, s)| core(**x) && **s > 0.0);
        assert_eq!(wrong.count(), 0);
    }

    #[test]
    fn a_transect_can_be_drawn_of_an_eddy_near_the_edge() {
        let grid = Grid {
            nx: 41,
            ny: 41,
            x0: 0.0,
            y0: 0.0,
            dx: 2.0,
            dy: 2.0,
            length: Unit::MM,
        };
        let flow = Flow::from(ShieldedGaussian {
            x: 20.0,
            y: 40.0,
            core_radius: 15.0,
            peak_vorticity: -0.3,
        });
        let field = flow.field(&grid, Unit::S);
        let found = find_eddies(&field, &EddyOptions::default(), &Task::quiet()).unwrap();
        let outlines = OutlineSet::from(&found);
        assert!(outlines.list[0].clockwise);
        let figure = eddy_transect(&found, &found.list[0]).unwrap();
        assert!(figure.svg().unwrap().contains("25 % of the peak"));
    }
}
