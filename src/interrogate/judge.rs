//! Which vectors of a pass are kept, and what is put in place of the others.

use ndarray::{Array2, s};

use super::layout::Layout;
use super::pass::Finding;
use super::plan::Plan;
use super::predictor::Shifts;
use super::run::Stage;
use super::significance::significant;
use super::validate::{MedianTest, fill};
use crate::field::Status;

/// The vectors of one pass after validation.
pub(super) struct Judged {
    /// Displacements; of windows without a vector, what their neighbours suggest.
    pub shifts: Shifts,
    /// What each is worth.
    pub status: Array2<Status>,
}

/// Adds residuals to the predictor, rejects what stands out, and fills the gaps.
pub(super) fn judge(
    findings: &Array2<Finding>,
    stage: &Stage,
    hidden: Option<&Array2<bool>>,
    plan: &Plan,
    last: bool,
) -> Judged {
    let options = plan.options();
    let layout = &stage.layout;
    let mut predicted = Shifts::zero(layout.shape());
    if let Some(predictor) = &stage.predictor {
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
        good = layout.cells(|at| {
            let d = (shifts.x[at], shifts.y[at]);
            signal[at] && test.fits(&shifts, &good, at, d)
        });
    }
    if last {
        good = significant(&shifts, findings, &good, layout);
    }
    fill(&mut shifts, &good);
    let none = !good.iter().any(|good| *good);
    let status = Array2::from_shape_fn(layout.shape(), |at| {
        if good[at] {
            Status::Measured
        } else if !lit[at] && behind_mask(layout, at, findings[at].lit, hidden) {
            Status::Masked
        } else if !lit[at] || none {
            Status::Outside
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
