//! The part of Zarr that a series needs: groups, and arrays in chunks of plain bytes.
//!
//! Source: the Zarr core specification, version 3.0 (zarr-specs.readthedocs.io): `zarr.json`
//! beside the chunks, the regular chunk grid, the default chunk keys, the `bytes` codec. Arrays
//! are little-endian in row-major order. Keys have "." between indices, so that all chunks of an
//! array lie in one folder, one file each. Nothing is compressed: the digits of measured
//! velocities are noise to a compressor. tests/outside/read_series.py has other readers open it.

use std::fs;
use std::path::Path;

use serde_json::{Map, Value, json};

use super::{StoreError, write_atomically};

/// File that describes a group or an array.
pub(crate) const METADATA: &str = "zarr.json";

/// Types of elements.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum Element {
    /// 64-bit floating point; NaN where a chunk is absent.
    Float64,
    /// Bytes; 255 where a chunk is absent.
    Byte,
    /// 64-bit integers; -1 where a chunk is absent.
    Int64,
}

/// What `zarr.json` says of an array.
#[derive(Clone, Debug)]
pub(crate) struct ArrayMetadata {
    /// Type of its elements.
    pub element: Element,
    /// Length along each dimension.
    pub shape: Vec<usize>,
    /// Length of a chunk along each dimension.
    pub chunk: Vec<usize>,
    /// Names of the dimensions, by which labelled-array readers join arrays.
    pub dimensions: Vec<&'static str>,
    /// Units, meanings and the like.
    pub attributes: Map<String, Value>,
}

impl ArrayMetadata {
    /// The metadata document.
    pub(crate) fn document(&self) -> Value {
        let little = json!([{ "name": "bytes", "configuration": { "endian": "little" } }]);
        let (data_type, fill, codecs) = match self.element {
            Element::Float64 => ("float64", json!("NaN"), little),
            Element::Int64 => ("int64", json!(-1), little),
            Element::Byte => ("uint8", json!(255), json!([{ "name": "bytes" }])),
        };
        json!({
            "zarr_format": 3,
            "node_type": "array",
            "shape": self.shape,
            "data_type": data_type,
            "chunk_grid": { "name": "regular", "configuration": { "chunk_shape": self.chunk } },
            "chunk_key_encoding": { "name": "default", "configuration": { "separator": "." } },
            "fill_value": fill,
            "codecs": codecs,
            "dimension_names": self.dimensions,
            "attributes": self.attributes,
        })
    }
}

/// The metadata document of a group.
pub(crate) fn group_document(attributes: Map<String, Value>) -> Value {
    json!({ "zarr_format": 3, "node_type": "group", "attributes": attributes })
}

/// Writes a metadata document into `folder`, which is made if need be; one that says the same is
/// left alone.
///
/// # Errors
/// [`StoreError`] when the folder cannot be made or the file cannot be written.
pub(crate) fn write_metadata(folder: &Path, document: &Value) -> Result<(), StoreError> {
    fs::create_dir_all(folder).map_err(|source| StoreError::Write {
        file: folder.display().to_string(),
        source,
    })?;
    let path = folder.join(METADATA);
    let text = format!("{document:#}\n");
    if fs::read(&path).is_ok_and(|there| there == text.as_bytes()) {
        return Ok(());
    }
    write_atomically(&path, |file| file.write_all(text.as_bytes()))
}

/// File name of the chunk that holds index `first` along the first of `dimensions` dimensions
/// and all of the others.
pub(crate) fn chunk_name(first: usize, dimensions: usize) -> String {
    format!("c.{first}{}", ".0".repeat(dimensions.saturating_sub(1)))
}

/// Reads what [`chunk_name`] writes; `None` for any other name.
pub(crate) fn chunk_index(name: &str, dimensions: usize) -> Option<usize> {
    let first = name.split('.').nth(1)?.parse().ok()?;
    (chunk_name(first, dimensions) == name).then_some(first)
}

/// The bytes of a chunk of numbers.
pub(crate) fn encode<'a>(values: impl IntoIterator<Item = &'a f64>) -> Vec<u8> {
    values.into_iter().flat_map(|x| x.to_le_bytes()).collect()
}

/// The numbers of a chunk; bytes past the last whole number are left out.
pub(crate) fn decode(bytes: &[u8]) -> Vec<f64> {
    let (numbers, _) = bytes.as_chunks::<8>();
    numbers.iter().map(|b| f64::from_le_bytes(*b)).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_metadata_has_every_member_the_specification_asks_for() {
        // Zarr core specification 3.0, "Array metadata", mandatory members (from memory).
        let array = ArrayMetadata {
            element: Element::Float64,
            shape: vec![7, 3, 2],
            chunk: vec![1, 3, 2],
            dimensions: vec!["pair", "y", "x"],
            attributes: Map::new(),
        };
        let document = array.document();
        for member in [
            "zarr_format",
            "node_type",
            "shape",
            "data_type",
            "chunk_grid",
            "chunk_key_encoding",
            "fill_value",
            "codecs",
        ] {
            assert!(document.get(member).is_some(), "{member}");
        }
        assert_eq!(document["shape"], json!([7, 3, 2]));
    }

    #[test]
    fn chunk_names_are_those_of_the_default_encoding_and_read_back() {
        // Zarr core specification 3.0, "Chunk key encoding": c, then the indices (from memory).
        assert_eq!(chunk_name(12, 3), "c.12.0.0");
        assert_eq!(chunk_index("c.12.0.0", 3), Some(12));
        for other in [
            "c.12.0",
            "c.012.0.0",
            "c.1.1.0",
            "zarr.json",
            "c",
            ".kolk-a",
        ] {
            assert_eq!(chunk_index(other, 3), None, "{other}");
        }
    }

    #[test]
    fn numbers_keep_every_bit() {
        let values = [0.1, -0.0, f64::NAN, 5e-324, f64::MAX];
        let back = decode(&encode(&values));
        let bits = |x: &[f64]| x.iter().map(|x| x.to_bits()).collect::<Vec<_>>();
        assert_eq!(bits(&back), bits(&values));
    }
}
