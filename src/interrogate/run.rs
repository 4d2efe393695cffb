//! From a pair to its vector field.

use std::sync::Arc;

use ndarray::{Array2, s};

use super::deform::Deformed;
use super::hidden::{evened, in_either};
use super::layout::Layout;
use super::pass::{Finding, Pass};
use super::plan::{Plan, WindowSize};
use super::predictor::{Predictor, Shifts};
use super::response::ErrorModel;
use super::spline::SplineImage;
use super::statistics::pooled;
use super::validate::{MedianTest, fill};
use crate::field::{Grid, Status, VectorField};
use crate::frames::{FrameError, Pair, Scale};
use crate::task::{Cancelled, Task};

/// Number of the method: raised with every change that gives the same images and plan other
/// numbers, so that fields on disk are not taken for what would now be computed.
pub const ALGORITHM: u32 = 1;

/// Why a pair could not be interrogated.
#[derive(Debug, thiserror::Error)]
pub enum InterrogateError {
    /// The image is smaller than the window.
    #[error(
        "{label}: the image is {width} x {height} px, smaller than the window of {window_width} x {window_height} px; choose a smaller window in windows_px"
    )]
    #[allow(missing_docs)]
    ImageTooSmall {
        label: String,
        width: usize,
        height: usize,
        window_width: usize,
        window_height: usize,
    },
    /// The two exposures differ in size.
    #[error("{label}: the exposures differ in size, {first} and {second} px")]
    #[allow(missing_docs)]
    SizesDiffer {
        label: String,
        first: String,
        second: String,
    },
    /// The mask does not fit the image.
    #[error("{label}: the mask is {mask} px, the image {image} px")]
    #[allow(missing_docs)]
    MaskSize {
        label: String,
        mask: String,
        image: String,
    },
    /// A frame could not be read.
    #[error(transparent)]
    Frame(#[from] FrameError),
    /// A window that cannot be transformed; a checked plan has none.
    #[error(transparent)]
    Window(#[from] super::transform::TransformError),
    /// The person who started it stopped it.
    #[error(transparent)]
    Cancelled(#[from] Cancelled),
}

/// Interrogates one pair: [`interrogate_images`] on its two exposures and what its masks hide of
/// each, in the units of its calibration.
///
/// # Errors
/// [`InterrogateError`] when a frame cannot be read, sizes do not fit, or `task` was cancelled.
pub fn interrogate(pair: &Pair, plan: &Plan, task: &Task) -> Result<VectorField, InterrogateError> {
    let (first, second) = pair.load()?;
    let hidden = pair.hidden(&first, &second)?;
    interrogate_images(
        &first.pixels,
        &second.pixels,
        [hidden[0].as_ref(), hidden[1].as_ref()],
        plan,
        &pair.scale(),
        pair.label(),
        task,
    )
}

/// Interrogates two exposures given as grey levels (row 0 at the top, equal shapes).
///
/// Pixels where `masks` is true, one mask for each exposure, are used by no window. The result is on the grid of the plan's
/// last pass, y up, in mm and s when `scale` is a calibration and in px and frames otherwise.
/// Each vector is the displacement of its window's pattern over the frame interval, at the mid
/// time and at the window's centre, divided by the interval.
///
/// # Errors
/// [`InterrogateError`] when sizes do not fit, or when `task` was cancelled.
pub fn interrogate_images(
    first: &Array2<f32>,
    second: &Array2<f32>,
    masks: [Option<&Array2<bool>>; 2],
    plan: &Plan,
    scale: &Scale,
    label: &str,
    task: &Task,
) -> Result<VectorField, InterrogateError> {
    let (height, width) = first.dim();
    let size = |(h, w): (usize, usize)| format!("{w} x {h}");
    if second.dim() != first.dim() {
        return Err(InterrogateError::SizesDiffer {
            label: label.to_owned(),
            first: size(first.dim()),
            second: size(second.dim()),
        });
    }
    if let Some(mask) = masks.into_iter().flatten().find(|m| m.dim() != first.dim()) {
        return Err(InterrogateError::MaskSize {
            label: label.to_owned(),
            mask: size(mask.dim()),
            image: size(first.dim()),
        });
    }
    let layouts = layouts(plan, width, height, label)?;
    let either = in_either(masks);
    let mask = either.as_ref();
    let (first, second) = (&*evened(first, masks[0]), &*evened(second, masks[1]));
    let mut splines: Option<[SplineImage; 2]> = None;
    let mut known: Option<(Shifts, Layout)> = None;
    let mut last = None;
    for (pass, layout) in layouts.iter().enumerate() {
        task.check()?;
        let (predictor, images) = match &known {
            None => (None, Deformed::untouched(first, second, mask)),
            Some((shifts, on)) => {
                let [a, b] = match splines.take() {
                    Some(made) => made,
                    // Each takes a while on a large image.
                    None => {
                        let a = SplineImage::new(first);
                        task.check()?;
                        [a, SplineImage::new(second)]
                    }
                };
                let [a, b] = splines.insert([a, b]);
                task.check()?;
                let predictor = Predictor::new(&shifts.smoothed(on), on, width, height);
                let images = Deformed::new(a, b, &predictor, masks, (height, width));
                (Some(predictor), images)
            }
        };
        task.check()?;
        let reach = reach(layout.window, pass == 0);
        let is_last = pass + 1 == layouts.len();
        let findings = Pass::new(&images, layout, reach, is_last)?.run(task)?;
        let judged = judge(&findings, layout, predictor.as_ref(), mask, plan);
        known = Some((judged.shifts.clone(), *layout));
        last = Some((judged, *layout, findings));
    }
    match last {
        Some((judged, layout, findings)) => Ok(finish(
            (judged, findings),
            plan.error_model(),
            &layout,
            height,
            scale,
            label,
        )),
        None => unreachable!("a plan has at least one pass"),
    }
}

fn layouts(
    plan: &Plan,
    width: usize,
    height: usize,
    label: &str,
) -> Result<Vec<Layout>, InterrogateError> {
    plan.windows()
        .iter()
        .map(|&window| {
            Layout::new(window, plan.options().overlap, width, height).ok_or_else(|| {
                InterrogateError::ImageTooSmall {
                    label: label.to_owned(),
                    width,
                    height,
                    window_width: window.width,
                    window_height: window.height,
                }
            })
        })
        .collect()
}

/// How far a peak is sought: half the window while nothing is known, a quarter of it once a
/// predictor carries the bulk of the motion.
fn reach(window: WindowSize, first: bool) -> (usize, usize) {
    let along = |side: usize| {
        if first {
            side / 2 - 1
        } else {
            (side / 4).max(2).min(side / 2 - 1)
        }
    };
    (along(window.width), along(window.height))
}

/// The vectors of one pass after validation.
struct Judged {
    shifts: Shifts,
    status: Array2<Status>,
}

/// Adds residuals to the predictor, rejects what stands out, and fills the gaps.
fn judge(
    findings: &Array2<Finding>,
    layout: &Layout,
    predictor: Option<&Predictor>,
    mask: Option<&Array2<bool>>,
    plan: &Plan,
) -> Judged {
    let options = plan.options();
    let mut predicted = Shifts::zero(layout.shape());
    if let Some(predictor) = predictor {
        for j in 0..layout.rows {
            for i in 0..layout.columns {
                let x = layout.first_x() + (i * layout.step_x) as f64;
                let y = layout.first_y() + (j * layout.step_y) as f64;
                (predicted.x[(j, i)], predicted.y[(j, i)]) = predictor.at(x, y);
            }
        }
    }
    let mut shifts = predicted;
    for (at, finding) in findings.indexed_iter() {
        shifts.x[at] += finding.shift.0;
        shifts.y[at] += finding.shift.1;
    }
    let lit = findings.map(|f| f64::from(f.lit) >= options.least_lit);
    let signal = findings.map(|f| f64::from(f.lit) >= options.least_lit && f.height > 0.0);
    let test = MedianTest {
        limit: options.median_limit,
        floor_px: options.median_floor_px,
    };
    let mut good = signal.clone();
    // The second round judges among what the first one left.
    for _ in 0..2 {
        let before = good.clone();
        for (at, candidate) in signal.indexed_iter() {
            if *candidate {
                let d = (shifts.x[at], shifts.y[at]);
                good[at] = test.fits(&shifts, &before, at, d);
            }
        }
    }
    fill(&mut shifts, &good);
    let status = Array2::from_shape_fn(layout.shape(), |at| {
        if good[at] {
            Status::Measured
        } else if !lit[at] {
            if behind_mask(layout, at, findings[at].lit, mask) {
                Status::Masked
            } else {
                Status::Outside
            }
        } else {
            Status::Replaced
        }
    });
    Judged { shifts, status }
}

/// True when a window of which the share `lit` is left lost more of it to the mask than to the
/// edge of the image.
fn behind_mask(
    layout: &Layout,
    (j, i): (usize, usize),
    lit: f32,
    mask: Option<&Array2<bool>>,
) -> bool {
    let Some(mask) = mask else { return false };
    let (top, left) = layout.corner(j, i);
    let (height, width) = (layout.window.height, layout.window.width);
    let hidden = mask
        .slice(s![top..top + height, left..left + width])
        .iter()
        .filter(|hidden| **hidden)
        .count();
    2.0 * hidden as f32 >= (1.0 - lit) * (width * height) as f32
}

/// Turns the last pass into a field with y up and the units of the calibration.
fn finish(
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
        layout.window.height / 2 / layout.step_y,
        layout.window.width / 2 / layout.step_x,
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
