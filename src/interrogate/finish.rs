//! From the windows of the last pass to a field with y up.

use std::sync::Arc;

use ndarray::Array2;

use super::judge::Judged;
use super::layout::Layout;
use super::pass::Finding;
use super::plan::Plan;
use super::response::ErrorModel;
use super::run::{InterrogateError, layouts};
use super::statistics::pooled;
use crate::field::{Grid, Status, VectorField};
use crate::frames::Scale;

/// Turns the last pass into a field with y up and the units of the calibration.
pub(super) fn finish(
    (judged, findings): (Judged, Array2<Finding>),
    model: &ErrorModel,
    layout: &Layout,
    height: usize,
    scale: &Scale,
    label: &str,
) -> VectorField {
    let (_, mm) = scale.length();
    let (_, dt) = scale.time();
    let blank = blank(layout, model, height, scale, label);
    let grid = blank.grid;
    let flip = |(j, i): (usize, usize)| (layout.rows - 1 - j, i);
    let status = Array2::from_shape_fn(grid.shape(), |at| judged.status[flip(at)]);
    let take = |values: &Array2<f64>, factor: f64| {
        Array2::from_shape_fn(grid.shape(), |at| {
            if status[at].has_vector() {
                values[flip(at)] * factor
            } else {
                f64::NAN
            }
        })
    };
    let gain = model.gain;
    let around = (
        3 * layout.window.height / 4 / layout.step_y,
        3 * layout.window.width / 4 / layout.step_x,
    );
    let doubt = |axis: fn(&Finding) -> Option<f64>| {
        let variances = Array2::from_shape_fn(findings.dim(), |at| {
            let measured = judged.status[at] == Status::Measured;
            measured.then(|| axis(&findings[at])).flatten()
        });
        Array2::from_shape_fn(grid.shape(), |at| {
            pooled(&variances, flip(at), around)
                .filter(|_| status[at] == Status::Measured)
                .map_or(f64::NAN, |u| u * gain * mm / dt)
        })
    };
    let unc = Some((doubt(|f| f.variance.0), doubt(|f| f.variance.1)));
    let u = take(&judged.shifts.x, mm / dt);
    let v = take(&judged.shifts.y, -mm / dt);
    VectorField {
        u,
        v,
        status,
        unc,
        ..blank
    }
}

/// The field that a pair of (width, height) px will give by this plan, before anything is
/// measured: its grid, units, window and the correlation of its errors. Every vector is outside.
///
/// # Errors
/// [`InterrogateError::ImageTooSmall`].
pub fn blank_field(
    plan: &Plan,
    (width, height): (usize, usize),
    scale: &Scale,
    label: &str,
) -> Result<VectorField, InterrogateError> {
    let layouts = layouts(plan, width, height, label)?;
    match layouts.last() {
        Some(last) => Ok(blank(last, plan.error_model(), height, scale, label)),
        None => unreachable!("a plan has at least one pass"),
    }
}

fn blank(
    layout: &Layout,
    model: &ErrorModel,
    height: usize,
    scale: &Scale,
    label: &str,
) -> VectorField {
    let (length, mm) = scale.length();
    let lowest = layout.first_y() + ((layout.rows - 1) * layout.step_y) as f64;
    let grid = Grid {
        nx: layout.columns,
        ny: layout.rows,
        x0: layout.first_x() * mm,
        y0: (height as f64 - 1.0 - lowest) * mm,
        dx: layout.step_x as f64 * mm,
        dy: layout.step_y as f64 * mm,
        length,
    };
    let nothing = Array2::from_elem(grid.shape(), f64::NAN);
    VectorField {
        grid,
        time: scale.time().0,
        u: nothing.clone(),
        v: nothing.clone(),
        status: Array2::from_elem(grid.shape(), Status::Outside),
        unc: Some((nothing.clone(), nothing)),
        error_correlation: Some(Arc::clone(&model.correlation)),
        window: Some((
            layout.window.width as f64 * mm,
            layout.window.height as f64 * mm,
        )),
        label: label.to_owned(),
    }
}
