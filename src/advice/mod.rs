//! What the images of a recording say of themselves, and which plan fits them.
//!
//! [`pair_health`] and [`recording_health`] measure particle images (how wide, how many), light,
//! noise, loss of pairs and peak locking, and say in words what to do about what is amiss.
//! [`advised_plan`] chooses windows and passes from a few quick looks at the recording and keeps
//! its reasons with the plan. How pairs are interrogated lives in
//! [`interrogate`](crate::interrogate), which this room only calls.

mod blob;
mod choice;
mod diameter;
mod error;
mod finding;
mod health;
mod images;
mod kept;
mod levels;
mod locking;
mod look;
mod motion;
mod pattern;
mod rehearsal;
mod report;
mod seeding;
mod trial;

pub use error::AdviceError;
pub use finding::{Finding, Verdict};
pub use health::{Health, PairHealth, pair_health, recording_health};
pub use locking::{Locking, Pull};
pub use rehearsal::Rehearsal;

#[allow(missing_docs)]
pub fn choose_for_test(pairs: &[crate::frames::Pair], of: usize, task: &crate::task::Task) -> Result<(Vec<usize>, Vec<String>), AdviceError> {
    choice::choose(pairs, of, task)
}
#[allow(missing_docs)]
pub fn stairs_for_test(a: usize, b: usize, c: usize) -> Vec<usize> {
    look::stairs(a, b, c)
}
