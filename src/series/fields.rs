//! A series as a list of fields.

use std::path::Path;

use blake3::Hash;

use super::SeriesError;
use super::group::Group;
use crate::field::VectorField;

/// The vector fields of a recording, on disk, one a pair in order, all on one grid.
#[derive(Clone, Debug)]
pub struct Series {
    pub(super) group: Group,
    /// A field without values: grid, units and what else all fields share.
    pub(super) blank: VectorField,
    pub(super) labels: Vec<String>,
    pub(super) chunks: Vec<Hash>,
    pub(super) kept: usize,
}

impl Series {
    /// Number of fields.
    pub fn len(&self) -> usize {
        self.chunks.len()
    }

    /// True without any field; [`interrogate_series`](super::interrogate_series) gives no such
    /// series.
    pub fn is_empty(&self) -> bool {
        self.chunks.is_empty()
    }

    /// The Zarr group it is written to.
    pub fn folder(&self) -> &Path {
        self.group.folder()
    }

    /// How many of its fields were there already from an earlier run.
    pub fn kept(&self) -> usize {
        self.kept
    }

    /// Reads field `index`, counted from 0: bit for bit the field that was interrogated.
    ///
    /// # Errors
    /// [`SeriesError::NoField`] past the end, [`SeriesError::Changed`] where the files are gone
    /// or no longer hold what was written.
    pub fn field(&self, index: usize) -> Result<VectorField, SeriesError> {
        let (Some(hash), Some(label)) = (self.chunks.get(index), self.labels.get(index)) else {
            return Err(SeriesError::NoField {
                index,
                fields: self.len(),
            });
        };
        self.group
            .read(index, *hash)
            .and_then(|chunks| chunks.field(&self.blank, label))
            .ok_or_else(|| SeriesError::Changed {
                index,
                folder: self.folder().display().to_string(),
            })
    }

    /// All fields, each read when its turn comes.
    pub fn fields(&self) -> impl Iterator<Item = Result<VectorField, SeriesError>> + '_ {
        (0..self.len()).map(|index| self.field(index))
    }
}
