//! Files in open formats, written whole or not at all.
//!
//! Every file is first written beside its place and then renamed, so that a reader finds the old
//! file or the new one and never a part. Nothing here decides which folders may be written.

mod atomic;
mod cells;
mod lattice;
mod tiff;
mod vector_columns;
mod vectors;
pub(crate) mod zarr;

pub(crate) use atomic::TEMPORARY;
pub use atomic::{StoreError, write_atomically};
pub use tiff::{write_tiff, write_tiff_pages};
pub use vectors::{read_vectors, save_vectors};
