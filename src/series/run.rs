//! From a recording to a series.

use std::path::Path;
use std::sync::atomic::{AtomicUsize, Ordering};

use blake3::Hash;
use serde_json::Value;

use super::contents::{self, Chunks, FRAME_ARRAYS, RECORD};
use super::group::Group;
use super::in_flight::in_flight;
use super::record::{Record, basis, hash_of_basis, hash_of_frames, masks};
use super::{Series, SeriesError};
use crate::field::VectorField;
use crate::frames::{Pair, Recording, Scale};
use crate::interrogate::{Plan, blank_field, interrogate_images};
use crate::task::Task;

/// Interrogates every pair of a recording, over all cores, into the Zarr group `folder`.
///
/// Frames that are there already from the same images, masks and plan are kept; the others are
/// computed, and written one by one as they come. As many pairs are in memory as there are
/// threads. Reports progress in pairs, those kept included. The fields do not depend on the
/// number of threads, nor on how often a run was broken off.
///
/// # Errors
/// [`SeriesError`]: the recording has no pairs or pairs of several sizes, the folder holds
/// something else, a pair cannot be interrogated (the first that fails), a file cannot be
/// written, or `task` was cancelled. What was written by then is kept.
pub fn interrogate_series(
    recording: &Recording,
    plan: &Plan,
    folder: &Path,
    task: &Task,
) -> Result<Series, SeriesError> {
    let (size, scale) = shared(recording)?;
    let blank = blank_field(plan, size, &scale, "")?;
    let basis = basis(plan, size, &scale);
    let total = recording.len();
    let group = Group::take_over(folder, hash_of_basis(&basis), total)?;
    describe(&group, &blank, &basis, recording)?;
    let run = Run {
        group: &group,
        basis: hash_of_basis(&basis),
        plan,
        task,
        kept: AtomicUsize::new(0),
    };
    let done = AtomicUsize::new(0);
    task.report("pairs", 0, total);
    let chunks = in_flight(total, |index| {
        task.check()?;
        let hash = run.frame(index, &recording.pair(index)?)?;
        task.report("pairs", done.fetch_add(1, Ordering::Relaxed) + 1, total);
        Ok::<_, SeriesError>(hash)
    })?;
    let kept = run.kept.into_inner();
    Ok(Series {
        group,
        blank,
        labels: labels(recording),
        chunks,
        kept,
    })
}

/// The size and calibration all pairs share.
fn shared(recording: &Recording) -> Result<((usize, usize), Scale), SeriesError> {
    let of = |pair: &Pair| (pair.size(), pair.scale());
    let text = |pair: &Pair| {
        let ((width, height), scale) = of(pair);
        let (length, mm) = scale.length();
        let (time, dt) = scale.time();
        format!("{width} x {height} px at {mm} {length} a px and {dt} {time} a pair")
    };
    let first = recording.pairs().first().ok_or(SeriesError::NoPairs)?;
    match recording.pairs().iter().find(|pair| of(pair) != of(first)) {
        None => Ok(of(first)),
        Some(other) => Err(SeriesError::PairsDiffer {
            first: first.label().to_owned(),
            of_first: text(first),
            other: format!("pair {} ({})", other.index(), other.label()),
            of_other: text(other),
        }),
    }
}

fn labels(recording: &Recording) -> Vec<String> {
    let pairs = recording.pairs().iter();
    pairs.map(|pair| pair.label().to_owned()).collect()
}

/// Writes all metadata, the group's first: by it a later run knows the folder.
fn describe(
    group: &Group,
    blank: &VectorField,
    basis: &Value,
    recording: &Recording,
) -> Result<(), SeriesError> {
    let masks = masks(recording.pairs());
    let labels = labels(recording);
    group.describe("", &contents::group(blank, basis, &labels, masks))?;
    for (name, document, bytes) in contents::coordinates(blank, labels.len()) {
        group.describe(name, &document)?;
        let dimensions = document["shape"].as_array().map_or(1, Vec::len);
        group.write_whole(name, dimensions, &bytes)?;
    }
    for name in FRAME_ARRAYS.into_iter().chain([RECORD]) {
        group.describe(name, &contents::frame_array(name, blank, labels.len()))?;
    }
    Ok(())
}

/// What the frames of one run share.
struct Run<'a> {
    group: &'a Group,
    basis: Hash,
    plan: &'a Plan,
    task: &'a Task,
    kept: AtomicUsize,
}

impl Run<'_> {
    /// Keeps a frame that is there, or computes and writes it; gives the hash of its chunks.
    fn frame(&self, index: usize, pair: &Pair) -> Result<Hash, SeriesError> {
        let (first, second) = pair.load()?;
        let hidden = pair.hidden(&first, &second)?;
        let images = hash_of_frames(&first, &second, &hidden);
        if let Some(record) = self.group.record(index)
            && (record.basis, record.images) == (self.basis, images)
            && self.group.read(index, record.chunks).is_some()
        {
            self.kept.fetch_add(1, Ordering::Relaxed);
            return Ok(record.chunks);
        }
        let field = interrogate_images(
            &first.pixels,
            &second.pixels,
            [hidden[0].as_ref(), hidden[1].as_ref()],
            self.plan,
            &pair.scale(),
            pair.label(),
            self.task,
        )?;
        let chunks = Chunks::of(&field);
        let record = Record {
            basis: self.basis,
            images,
            chunks: chunks.hash(),
        };
        self.group.write(index, &chunks, record)?;
        Ok(record.chunks)
    }
}
