//! The vector fields of a recording, on disk.
//!
//! [`interrogate_series`] writes one Zarr group: arrays `u`, `v`, `u_unc`, `v_unc` and `status`
//! over (pair, y, x) with one chunk a pair, their coordinates, and `record`, which says what each
//! frame was made from. A [`Series`] reads its fields back when they are asked for, so that
//! memory holds the pairs being worked on and not the recording.
//!
//! # What is kept and what is computed again
//!
//! A frame counts as there once its record is: the record is written last, and carries the BLAKE3
//! hashes of the plan, of the pixels with which of them are hidden, and of the frame's own chunks.
//! A run into a group that is there already keeps each frame whose three hashes fit and computes
//! the others. So a run killed at any moment goes on where it was, a changed image costs the
//! frames it is in, a changed mask those in which it hides other pixels, a changed plan all, and a
//! chunk changed by anyone is noticed.
//!
//! Two runs that write one group at once disturb each other: each then says so rather than give
//! a wrong field.

mod contents;
mod error;
mod fields;
mod group;
mod in_flight;
mod record;
mod run;

pub use error::SeriesError;
pub use fields::Series;
pub use record::default_name;
pub use run::interrogate_series;
