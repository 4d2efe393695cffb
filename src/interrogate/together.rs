//! One field from all pairs of a steady flow.

use super::finish::finish;
use super::judge::judge;
use super::pass::{Finding, Pass};
use super::plan::Plan;
use super::run::{Images, InterrogateError, Stage, layouts, stages};
use crate::field::VectorField;
use crate::frames::{Pair, Scale};
use crate::task::Task;
use ndarray::Array2;

/// Why pairs could not be correlated together.
#[derive(Debug, thiserror::Error)]
pub enum TogetherError {
    /// No pair at all.
    #[error("the recording has no pairs: there is nothing to correlate together")]
    NoPairs,
    /// Pairs of different sizes or calibrations.
    #[error(
        "the pairs are not alike: {first} and {other} differ in size or calibration; correlate like pairs together"
    )]
    #[allow(missing_docs)]
    Differ { first: String, other: String },
    /// A pair cannot be interrogated.
    #[error(transparent)]
    Interrogate(#[from] InterrogateError),
}

/// The displacement that all pairs have in common: in every pass the correlation planes of each
/// window are summed over the pairs, each as coefficients, before its peak is read.
///
/// For a flow that is steady, or whose mean is asked for where single pairs hold too few particles
/// to say anything. Where the flow is unsteady the peak widens and the field is the most frequent
/// displacement rather than its mean. Units, grid and uncertainty are those of
/// [`interrogate`](super::interrogate); the uncertainty falls with the root of the number of
/// pairs, and holds for the common displacement, not for its fluctuation. Images are read anew in
/// every pass: one pair is in memory at a time, and the planes.
///
/// # Errors
/// [`TogetherError`]: no pairs, pairs that are not alike, or one that cannot be interrogated.
pub fn correlate_together(
    pairs: &[Pair],
    plan: &Plan,
    label: &str,
    task: &Task,
) -> Result<VectorField, TogetherError> {
    let Some(first) = pairs.first() else {
        return Err(TogetherError::NoPairs);
    };
    let alike = |pair: &&Pair| (pair.size(), pair.scale()) != (first.size(), first.scale());
    if let Some(other) = pairs.iter().find(alike) {
        return Err(TogetherError::Differ {
            first: first.label().to_owned(),
            other: other.label().to_owned(),
        });
    }
    let size = first.size();
    let total = pairs.len() * layouts(plan, size.0, size.1, label)?.len();
    let mut done = 0;
    let mut correlate = |stage: &Stage, last: bool| -> Result<Array2<Finding>, InterrogateError> {
        let pass = Pass::new(&stage.layout, stage.reach, last)?;
        let mut sums = pass.sums();
        for pair in pairs {
            task.report("pairs and passes", done, total);
            let (a, b) = pair.load()?;
            let hidden = pair.hidden(&a, &b)?;
            let masks = [hidden[0].as_ref(), hidden[1].as_ref()];
            let mut images = Images::new([&a.pixels, &b.pixels], masks, plan, pair.label())?;
            if stage.predictor.is_some() {
                images.prepare(task)?;
            }
            pass.add(&images.exposures(stage.predictor.as_ref()), &mut sums, task)?;
            done += 1;
        }
        Ok(pass.read_sums(&sums))
    };
    let mut at_last = None;
    // What is hidden differs from pair to pair: what is not lit counts as outside.
    let stage = stages(plan, size, label, None, |stage, last| {
        let findings = correlate(stage, last)?;
        if last {
            at_last = Some(findings);
            return Ok(None);
        }
        Ok(Some(findings))
    })?;
    let Some(findings) = at_last else {
        unreachable!("the passes end with the last stage")
    };
    let scale: Scale = first.scale();
    let judged = judge(&findings, &stage, None, plan, true);
    Ok(finish(
        (judged, findings),
        plan.error_model(),
        &stage.layout,
        size.1,
        &scale,
        label,
    ))
}
