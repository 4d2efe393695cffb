//! The folder of a series: made ready, written frame by frame, read back.

use std::fs;
use std::io;
use std::path::{Path, PathBuf};

use blake3::Hash;
use serde_json::Value;

use super::SeriesError;
use super::contents::{BASIS, Chunks, FRAME_ARRAYS, RECORD, dimensions};
use super::record::Record;
use crate::store::zarr::{METADATA, chunk_index, chunk_name, write_metadata};
use crate::store::{StoreError, TEMPORARY, write_atomically};

/// The folder that holds the group.
#[derive(Clone, Debug)]
pub(super) struct Group {
    folder: PathBuf,
}

impl Group {
    /// Takes over `folder`: it may be absent, empty, or a series, of which frames with another
    /// basis or past the last pair are removed, as is what a killed run left unfinished.
    ///
    /// # Errors
    /// [`SeriesError::NotASeries`] for a folder of anything else, [`SeriesError::Store`] where
    /// the system refuses.
    pub(super) fn take_over(folder: &Path, basis: Hash, pairs: usize) -> Result<Self, SeriesError> {
        let group = Self {
            folder: folder.to_owned(),
        };
        if !folder.exists() {
            return Ok(group);
        }
        let not_ours = || SeriesError::NotASeries {
            folder: folder.display().to_string(),
        };
        if !folder.is_dir() {
            return Err(not_ours());
        }
        let unfinished = |name: &str| name.starts_with(TEMPORARY);
        if !is_series(folder) && !names(folder)?.iter().all(|name| unfinished(name)) {
            return Err(not_ours());
        }
        remove(folder, unfinished)?;
        let stays: Vec<bool> = (0..pairs)
            .map(|index| {
                group
                    .record(index)
                    .is_some_and(|record| record.basis == basis)
            })
            .collect();
        for entry in names(folder)? {
            let array = folder.join(&entry);
            let framed = entry == RECORD || FRAME_ARRAYS.contains(&entry.as_str());
            if !array.is_dir() {
                continue;
            }
            remove(&array, |name| {
                let stale = |index: usize| !stays.get(index).copied().unwrap_or(false);
                unfinished(name)
                    || (framed && chunk_index(name, dimensions(&entry)).is_some_and(stale))
            })?;
        }
        Ok(group)
    }

    /// Where it is.
    pub(super) fn folder(&self) -> &Path {
        &self.folder
    }

    /// Writes the metadata of the group (`array` "") or of one array.
    ///
    /// # Errors
    /// [`StoreError`] where the system refuses.
    pub(super) fn describe(&self, array: &str, document: &Value) -> Result<(), StoreError> {
        write_metadata(&self.folder.join(array), document)
    }

    /// Writes the only chunk of an array, unless it stands there.
    ///
    /// # Errors
    /// [`StoreError`] where the system refuses.
    pub(super) fn write_whole(
        &self,
        array: &str,
        dimensions: usize,
        bytes: &[u8],
    ) -> Result<(), StoreError> {
        let path = self.folder.join(array).join(chunk_name(0, dimensions));
        if fs::read(&path).is_ok_and(|there| there == bytes) {
            return Ok(());
        }
        write_atomically(&path, |file| file.write_all(bytes))
    }

    fn chunk(&self, array: &str, index: usize) -> PathBuf {
        let name = chunk_name(index, dimensions(array));
        self.folder.join(array).join(name)
    }

    /// The record of a frame, where there is one.
    pub(super) fn record(&self, index: usize) -> Option<Record> {
        Record::from_bytes(&fs::read(self.chunk(RECORD, index)).ok()?)
    }

    /// Writes a frame, its record last.
    ///
    /// # Errors
    /// [`StoreError`] where the system refuses.
    pub(super) fn write(
        &self,
        index: usize,
        chunks: &Chunks,
        record: Record,
    ) -> Result<(), StoreError> {
        for (array, bytes) in FRAME_ARRAYS.iter().zip(&chunks.0) {
            write_atomically(&self.chunk(array, index), |file| file.write_all(bytes))?;
        }
        let bytes = record.to_bytes();
        write_atomically(&self.chunk(RECORD, index), |file| file.write_all(&bytes))
    }

    /// The chunks of a frame, if they are those of this hash.
    pub(super) fn read(&self, index: usize, hash: Hash) -> Option<Chunks> {
        let mut chunks = Chunks(Default::default());
        for (array, bytes) in FRAME_ARRAYS.iter().zip(&mut chunks.0) {
            *bytes = fs::read(self.chunk(array, index)).ok()?;
        }
        (chunks.hash() == hash).then_some(chunks)
    }
}

/// True for a group that a series was written to.
fn is_series(folder: &Path) -> bool {
    fs::read(folder.join(METADATA))
        .ok()
        .and_then(|bytes| serde_json::from_slice::<Value>(&bytes).ok())
        .is_some_and(|document| document["attributes"][BASIS]["program"] == "kolk")
}

fn refused(path: &Path) -> impl FnOnce(io::Error) -> StoreError {
    let file = path.display().to_string();
    |source| StoreError::Write { file, source }
}

fn names(folder: &Path) -> Result<Vec<String>, StoreError> {
    let entries = fs::read_dir(folder).map_err(refused(folder))?;
    entries
        .map(|entry| {
            let entry = entry.map_err(refused(folder))?;
            Ok(entry.file_name().to_string_lossy().into_owned())
        })
        .collect()
}

fn remove(folder: &Path, unwanted: impl Fn(&str) -> bool) -> Result<(), StoreError> {
    for name in names(folder)?.iter().filter(|name| unwanted(name)) {
        let path = folder.join(name);
        fs::remove_file(&path).map_err(refused(&path))?;
    }
    Ok(())
}
