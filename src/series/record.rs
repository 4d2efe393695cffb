//! What a frame of a series was made from.

use std::path::Path;

use blake3::{Hash, Hasher};
use ndarray::Array2;
use serde_json::{Value, json};

use super::SeriesError;
use crate::frames::{Frame, Mask, Pair, Recording, Scale};
use crate::interrogate::{ALGORITHM, Plan};

/// Bytes of a record: three hashes of 32.
pub(super) const LENGTH: usize = 96;

/// Says of one frame what it was made from and what came out.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Record {
    /// Hash of the [`basis`].
    pub basis: Hash,
    /// [`hash_of_frames`].
    pub images: Hash,
    /// Hash of the frame's chunks.
    pub chunks: Hash,
}

impl Record {
    /// The bytes on disk.
    pub(super) fn to_bytes(self) -> Vec<u8> {
        [self.basis, self.images, self.chunks]
            .iter()
            .flat_map(|hash| *hash.as_bytes())
            .collect()
    }

    /// Reads what [`Record::to_bytes`] gives; `None` for anything of another length.
    pub(super) fn from_bytes(bytes: &[u8]) -> Option<Record> {
        let (hashes, rest) = bytes.as_chunks::<32>();
        match (hashes, rest) {
            (&[basis, images, chunks], []) => Some(Record {
                basis: basis.into(),
                images: images.into(),
                chunks: chunks.into(),
            }),
            _ => None,
        }
    }
}

/// Everything but the pixels that a field depends on: the plan, the calibration, and the program.
pub(super) fn basis(plan: &Plan, (width, height): (usize, usize), scale: &Scale) -> Value {
    json!({
        "program": "kolk",
        "version": env!("CARGO_PKG_VERSION"),
        "algorithm": ALGORITHM,
        "plan": plan.options(),
        "dt_s": scale.dt_s,
        "mm_per_px": scale.mm_per_px,
        "image_px": [width, height],
    })
}

/// Hash of a basis.
pub(super) fn hash_of_basis(basis: &Value) -> Hash {
    // Numbers are written with every digit they need, so that different plans differ as text.
    blake3::hash(basis.to_string().as_bytes())
}

/// Hash of the sizes and pixels of both exposures, whatever files they stand in, and of which
/// pixels are hidden, whatever hides them.
pub(super) fn hash_of_frames(
    first: &Frame,
    second: &Frame,
    hidden: &[Option<Array2<bool>>; 2],
) -> Hash {
    let mut hasher = Hasher::new();
    let mut bytes = Vec::new();
    for frame in [first, second] {
        hasher.update(&(frame.width() as u64).to_le_bytes());
        hasher.update(&(frame.height() as u64).to_le_bytes());
        for row in frame.pixels.rows() {
            bytes.clear();
            bytes.extend(row.iter().flat_map(|level| level.to_le_bytes()));
            hasher.update(&bytes);
        }
    }
    for (exposure, hidden) in [1u8, 2].iter().zip(hidden) {
        if let Some(hidden) = hidden {
            hasher.update(&[*exposure]);
            bytes.clear();
            bytes.extend(hidden.iter().map(|hidden| u8::from(*hidden)));
            hasher.update(&bytes);
        }
    }
    hasher.finalize()
}

/// The different masks of a recording, each as what hides pixels of the first and of the second
/// exposure, and for every pair which of them it has; `None` where no pair has any.
pub(super) fn masks(pairs: &[Pair]) -> Option<(Value, Value)> {
    let mut different: Vec<[&[Mask]; 2]> = Vec::new();
    let mut place = |pair| {
        let masks = Pair::masks(pair);
        if masks.concat().is_empty() {
            return None;
        }
        let known = different.iter().position(|other| *other == masks);
        Some(known.unwrap_or_else(|| {
            different.push(masks);
            different.len() - 1
        }))
    };
    let of_pairs: Vec<Option<usize>> = pairs.iter().map(&mut place).collect();
    if different.is_empty() {
        return None;
    }
    let all = |masks: &[Mask]| masks.iter().map(Mask::description).collect::<Vec<_>>();
    let described = different
        .iter()
        .map(|[first, second]| json!({ "first": all(first), "second": all(second) }));
    Some((described.collect(), json!(of_pairs)))
}

/// A name for the series of this recording by this plan, the same each time: so a script that is
/// run again finds what it wrote, and two plans or two recordings do not meet in one place.
///
/// It depends on the plan, on the masks, and on the names of the files or the pixels of pairs in
/// memory.
///
/// # Errors
/// [`SeriesError::NoPairs`], or a frame in memory that is refused.
pub fn default_name(recording: &Recording, plan: &Plan) -> Result<String, SeriesError> {
    let size = recording.size().ok_or(SeriesError::NoPairs)?;
    let mut hasher = Hasher::new();
    // Not the version: a new one computes again in the same place.
    hasher.update(
        basis(plan, size, &recording.scale())["plan"]
            .to_string()
            .as_bytes(),
    );
    for pair in recording.pairs() {
        let places = pair.places();
        hasher.update(&(places.len() as u64).to_le_bytes());
        for (file, page) in &places {
            let file: &Path = file;
            hasher.update(file.as_os_str().as_encoded_bytes());
            hasher.update(&(*page as u64).to_le_bytes());
        }
        if places.is_empty() {
            let (first, second) = pair.load()?;
            hasher.update(hash_of_frames(&first, &second, &[None, None]).as_bytes());
        }
        for (exposure, masks) in [1u8, 2].iter().zip(pair.masks()) {
            for mask in masks {
                hasher.update(&[*exposure]);
                hasher.update(mask.digest().as_bytes());
            }
        }
    }
    let hash = hasher.finalize().to_hex();
    Ok(format!("series/{}.zarr", &hash[..16]))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_record_is_read_back_and_half_of_one_is_none() {
        let hash = |text: &str| blake3::hash(text.as_bytes());
        let record = Record {
            basis: hash("plan"),
            images: hash("images"),
            chunks: hash("chunks"),
        };
        let bytes = record.to_bytes();
        assert_eq!(bytes.len(), LENGTH);
        assert_eq!(Record::from_bytes(&bytes), Some(record));
        for part in [&bytes[..0], &bytes[..64], &bytes[..95]] {
            assert_eq!(Record::from_bytes(part), None);
        }
    }

    #[test]
    fn the_hash_of_frames_tells_apart_pixels_and_shapes() {
        let frame = |rows, columns, level| Frame {
            pixels: ndarray::Array2::from_elem((rows, columns), level),
            bits: 8,
        };
        let all_lit = [None, None];
        let of = |first, second| hash_of_frames(&first, &second, &all_lit);
        let base = of(frame(4, 6, 1.0), frame(4, 6, 2.0));
        assert_eq!(base, of(frame(4, 6, 1.0), frame(4, 6, 2.0)));
        for (first, second) in [
            (frame(4, 6, 2.0), frame(4, 6, 1.0)),
            (frame(6, 4, 1.0), frame(6, 4, 2.0)),
            (frame(4, 6, 1.0), frame(4, 6, 2.000_000_2)),
        ] {
            assert_ne!(base, of(first, second));
        }
    }

    #[test]
    fn the_hash_of_frames_tells_apart_what_is_hidden_in_which() {
        let frame = Frame {
            pixels: Array2::zeros((4, 6)),
            bits: 8,
        };
        let hidden = |at| {
            let mut hidden = Array2::from_elem((4, 6), false);
            hidden[at] = true;
            Some(hidden)
        };
        let hashes = [
            [None, None],
            [hidden((1, 2)), None],
            [None, hidden((1, 2))],
            [hidden((1, 2)), hidden((1, 2))],
            [hidden((2, 1)), None],
        ]
        .map(|hidden| hash_of_frames(&frame, &frame, &hidden));
        for (k, hash) in hashes.iter().enumerate() {
            assert!(!hashes[..k].contains(hash), "{k}");
        }
    }
}
