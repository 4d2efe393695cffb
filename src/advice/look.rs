//! A quick first look at how the pattern moves, from which a plan is chosen.

use super::AdviceError;
use super::images::{Images, Particles};
use super::kept::kept;
use super::motion::Motion;
use crate::field::VectorField;
use crate::interrogate::{Plan, PlanOptions, WindowSize};
use crate::task::Task;

/// Sides of windows that are fast to transform, px.
pub(super) const SIDES: [usize; 8] = [8, 16, 24, 32, 48, 64, 96, 128];

/// Share of measured vectors at which a look has seen enough.
const ENOUGH: f64 = 0.97;

/// Particle images that the last window of a look holds.
const HELD: f64 = 10.0;

/// What a look has seen.
#[derive(Clone, Copy, Debug)]
pub(super) struct Look {
    pub motion: Motion,
    /// Share of the particle pattern that both exposures have, 0 to 1.
    pub kept: f64,
}

/// Square windows of these sides, one a pass.
pub(super) fn squares(sides: &[usize]) -> Result<Plan, AdviceError> {
    let square = |&side: &usize| WindowSize {
        width: side,
        height: side,
    };
    let options = PlanOptions {
        windows_px: sides.iter().map(square).collect(),
        ..PlanOptions::default()
    };
    Ok(Plan::new(&options)?)
}

/// Sides of the passes from a first window down to `passes` times a last one, each at least half
/// the one before.
pub(super) fn stairs(first: usize, last: usize, passes: usize) -> Vec<usize> {
    let mut sides = vec![first.max(last)];
    while let Some(&side) = sides.last()
        && side > 2 * last
        && let Some(half) = SIDES.into_iter().rev().find(|half| 2 * half <= side)
    {
        sides.push(half);
    }
    if sides.last() == Some(&last) {
        sides.pop();
    }
    sides.extend(std::iter::repeat_n(last, passes));
    sides
}

/// The least of the sides at which a window holds that many particle images, of those up to
/// `most`; the largest of them where none does.
pub(super) fn side_holding(images: f64, per_px2: f64, most: usize) -> usize {
    let holds = |side: &usize| (side * side) as f64 * per_px2 >= images;
    let mut sides = SIDES.into_iter().filter(|side| *side <= most.max(SIDES[0]));
    sides.clone().find(holds).or(sides.next_back()).unwrap_or(SIDES[0])
}

/// Looks at one pair with first windows from the largest down, until nearly all vectors are
/// measured, and keeps the best of the looks.
///
/// # Errors
/// [`AdviceError::NothingInCommon`] where no look measures a third of the vectors.
pub(super) fn look(
    images: &Images,
    particles: &Particles,
    task: &Task,
) -> Result<Look, AdviceError> {
    let (width, height) = images.size();
    let most = width.min(height) / 2;
    let last = side_holding(HELD, particles.seeding.per_px2, (most / 2).min(64)).max(16);
    let mut best: Option<(Motion, VectorField)> = None;
    let firsts = [128, 64, 32].into_iter().filter(|first| *first <= most && *first >= last);
    for first in firsts {
        let field = images.interrogate(&squares(&stairs(first, last, 2))?, task)?;
        let motion = Motion::of(&field)?;
        if best.as_ref().is_none_or(|(known, _)| motion.measured > known.measured) {
            best = Some((motion, field));
        }
        if motion.measured >= ENOUGH {
            break;
        }
    }
    match best {
        Some((motion, field)) if motion.measured > 1.0 / 3.0 => Ok(Look {
            motion,
            kept: kept(images, particles, &field).map_or(1.0, |(share, _)| share.clamp(0.05, 1.0)),
        }),
        best => Err(AdviceError::NothingInCommon {
            label: images.label.clone(),
            window: most.min(128),
            percent: best.map_or(0, |(motion, _)| (100.0 * motion.measured) as u32),
        }),
    }
}
