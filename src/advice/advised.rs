//! The plan that fits a recording.

use super::AdviceError;
use super::choice::choose;
use super::health::spread;
use super::look::squares;
use crate::frames::{Pair, Recording};
use crate::interrogate::Plan;
use crate::task::Task;

/// The plan that fits one pair, with its reasons: [`recording_plan`] for a recording of one.
///
/// # Errors
/// As [`recording_plan`].
pub fn pair_plan(pair: &Pair, task: &Task) -> Result<Plan, AdviceError> {
    advised(std::slice::from_ref(pair), 1, task)
}

/// The plan that fits a recording by a look at up to `most` of its pairs, evenly spread over it,
/// with its reasons ([`Plan::reasons`]).
///
/// The first window follows from the largest displacement a quick look finds, and from how many
/// particle images stay and move alike in it. Last windows from the smallest that holds 8 particle
/// images (Keane & Adrian 1992) upwards are tried on the pairs, each but the first against the one
/// before: the larger is taken while what it changes is less than what it saves in noise. So are
/// passes. Windows are square, 8 to 128 px (the last up to 64) and no larger than half (the last a
/// quarter) of the image; the overlap is 0.75.
///
/// # Errors
/// [`AdviceError`] where a pair cannot be read, is smaller than 64 px, shows no particle images, or
/// its exposures have no motion in common; and as
/// [`recording_health`](super::recording_health) for no pairs.
pub fn recording_plan(
    recording: &Recording,
    most: usize,
    task: &Task,
) -> Result<Plan, AdviceError> {
    advised(&spread(recording, most)?, recording.len(), task)
}

fn advised(pairs: &[Pair], of: usize, task: &Task) -> Result<Plan, AdviceError> {
    let (sides, reasons) = choose(pairs, of, task)?;
    Ok(squares(&sides)?.with_reasons(reasons))
}
