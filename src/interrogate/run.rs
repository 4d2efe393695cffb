//! From a pair to its vector field.

use std::borrow::Cow;

use ndarray::Array2;

use super::deform::{Exposures, Masks};
use super::finish::finish;
use super::flatten::flattened;
use super::hidden::{evened, in_either};
use super::judge::judge;
use super::layout::Layout;
use super::pass::{Finding, Pass};
use super::plan::{Plan, WindowSize};
use super::predictor::{Predictor, Shifts};
use super::spline::SplineImage;
use crate::field::VectorField;
use crate::frames::{FrameError, Pair, Scale};
use crate::task::{Cancelled, Task};

/// Number of the method: raised with every change that gives the same images and plan other
/// numbers, so that fields on disk are not taken for what would now be computed.
pub const ALGORITHM: u32 = 2;

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
/// Pixels where `masks` is true, one mask for each exposure, are used by no window. The result is
/// on the grid of the plan's last pass, y up, in mm and s when `scale` is a calibration and in px
/// and frames otherwise. Each vector is the displacement of its window's pattern over the frame
/// interval, at the mid time and at the window's centre, divided by the interval.
///
/// # Errors
/// [`InterrogateError`] when sizes do not fit, or when `task` was cancelled.
pub fn interrogate_images(
    first: &Array2<f32>,
    second: &Array2<f32>,
    masks: Masks,
    plan: &Plan,
    scale: &Scale,
    label: &str,
    task: &Task,
) -> Result<VectorField, InterrogateError> {
    let mut images = Images::new([first, second], masks, plan, label)?;
    let stage = before_last_pass(&mut images, plan, label, task)?;
    let exposures = images.exposures(stage.predictor.as_ref());
    let findings = Pass::new(&stage.layout, stage.reach, true)?.run(&exposures, task)?;
    let hidden = in_either(masks);
    let judged = judge(&findings, &stage, hidden.as_ref(), plan, true);
    Ok(finish(
        (judged, findings),
        plan.error_model(),
        &stage.layout,
        first.nrows(),
        scale,
        label,
    ))
}

/// Runs every pass but the last over one pair, and gives what the last has before it.
///
/// # Errors
/// As [`interrogate_images`].
pub(super) fn before_last_pass(
    images: &mut Images,
    plan: &Plan,
    label: &str,
    task: &Task,
) -> Result<Stage, InterrogateError> {
    let hidden = in_either(images.masks);
    stages(
        plan,
        images.size(),
        label,
        hidden.as_ref(),
        |stage, last| {
            task.check()?;
            if stage.predictor.is_some() {
                images.prepare(task)?;
            }
            if last {
                return Ok(None);
            }
            let exposures = images.exposures(stage.predictor.as_ref());
            let pass = Pass::new(&stage.layout, stage.reach, false)?;
            if !plan.options().join_neighbours {
                return Ok(Some(pass.run(&exposures, task)?));
            }
            let mut sums = pass.sums();
            pass.add(&exposures, &mut sums, task)?;
            Ok(Some(pass.read_sums(&sums.joined(&stage.layout))))
        },
    )
}

/// What a pass has before it, but for the images.
pub(super) struct Stage {
    /// Where its windows lie.
    pub layout: Layout,
    /// How far it seeks a peak (columns, rows), px.
    pub reach: (usize, usize),
    /// What it adds its shifts to; `None` in the first pass.
    pub predictor: Option<Predictor>,
}

/// Goes through the passes of a plan for images of (width, height) px: `correlate` gives what the
/// windows of a stage say, or nothing where it goes no further, which ends the passes at this
/// stage. It is told whether the stage is the last.
pub(super) fn stages(
    plan: &Plan,
    (width, height): (usize, usize),
    label: &str,
    hidden: Option<&Array2<bool>>,
    mut correlate: impl FnMut(&Stage, bool) -> Result<Option<Array2<Finding>>, InterrogateError>,
) -> Result<Stage, InterrogateError> {
    let layouts = layouts(plan, width, height, label)?;
    let mut known: Option<(Shifts, Layout)> = None;
    for (pass, layout) in layouts.iter().enumerate() {
        let predictor = known
            .as_ref()
            .map(|(shifts, on)| Predictor::new(&shifts.smoothed(on), on, width, height));
        let stage = Stage {
            layout: *layout,
            reach: reach(layout.window, pass == 0),
            predictor,
        };
        match correlate(&stage, pass + 1 == layouts.len())? {
            Some(findings) => {
                let judged = judge(&findings, &stage, hidden, plan, false);
                known = Some((judged.shifts, *layout));
            }
            None => return Ok(stage),
        }
    }
    unreachable!("the passes end at the last stage at the latest")
}

/// The two exposures of a pair, what is hidden of them, and once they are needed the splines
/// through them.
pub(super) struct Images<'a> {
    plain: [Cow<'a, Array2<f32>>; 2],
    /// Hidden pixels of each.
    pub masks: Masks<'a>,
    splines: Option<[SplineImage; 2]>,
}

impl<'a> Images<'a> {
    /// # Errors
    /// [`InterrogateError`] when the exposures or the masks differ in size.
    pub fn new(
        images: [&'a Array2<f32>; 2],
        masks: Masks<'a>,
        plan: &Plan,
        label: &str,
    ) -> Result<Self, InterrogateError> {
        let size = |(h, w): (usize, usize)| format!("{w} x {h}");
        let [first, second] = images;
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
        let plain = [evened(first, masks[0]), evened(second, masks[1])];
        let plain = match plan.options().flatten_px {
            0 => plain,
            side => plain.map(|image| Cow::Owned(flattened(&image, side))),
        };
        Ok(Self {
            plain,
            masks,
            splines: None,
        })
    }

    /// Width and height, px.
    pub fn size(&self) -> (usize, usize) {
        (self.plain[0].ncols(), self.plain[0].nrows())
    }

    /// Makes the splines unless they are there.
    ///
    /// # Errors
    /// [`Cancelled`]: each takes a while on a large image.
    pub fn prepare(&mut self, task: &Task) -> Result<(), Cancelled> {
        if self.splines.is_none() {
            let first = SplineImage::new(&self.plain[0]);
            task.check()?;
            self.splines = Some([first, SplineImage::new(&self.plain[1])]);
            task.check()?;
        }
        Ok(())
    }

    /// The exposures moved by the predicted shift, or as they are; prepared if there is one.
    pub fn exposures<'b>(&'b self, predictor: Option<&'b Predictor>) -> Exposures<'b> {
        match (predictor, &self.splines) {
            (Some(predictor), Some([a, b])) => Exposures::moved([a, b], predictor, self.masks),
            _ => Exposures::plain([&self.plain[0], &self.plain[1]], self.masks),
        }
    }
}

/// The layouts of all passes.
pub(super) fn layouts(
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
