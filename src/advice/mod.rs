//! What the images of a recording say of themselves, and which plan fits them.
//!
//! [`pair_health`] and [`recording_health`] measure particle images (how wide, how many), light,
//! noise, loss of pairs and peak locking, and say in words what to do about what is amiss.
//! [`pair_plan`] and [`recording_plan`] choose windows and passes from a few quick looks at the recording and keep
//! their reasons with the plan. How pairs are interrogated lives in
//! [`interrogate`](crate::interrogate), which this room only calls.

mod advised;
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

pub use advised::{pair_plan, recording_plan};
pub use error::AdviceError;
pub use finding::{Finding, Verdict};
pub use health::{Health, PairHealth, pair_health, recording_health};
pub use locking::{Locking, Pull};
pub use rehearsal::Rehearsal;
