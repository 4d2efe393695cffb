//! Images in: reading files, putting them in pairs, and what a pixel and a frame are worth.
//!
//! Grey TIFF and PNG of 8 or 16 bits become a [`Frame`] with the grey levels as they stand in the
//! file. A [`Recording`] is an ordered set of frames cut into [`Pair`]s; opening one looks only
//! at names and headers, and frames load when they are used. A [`Mask`] says which pixels of an
//! exposure are hidden; only its rule for bright patches looks at what is in an image. Nothing here
//! decides which folders may be read.

mod bright;
mod error;
mod frame;
mod mask;
mod mask_text;
mod names;
mod pair;
mod png;
mod read;
mod recording;
mod shape;
mod tiff;

pub use bright::BrightOptions;
pub use error::FrameError;
pub use frame::{Frame, Scale};
pub use mask::{Mask, MaskUnit};
pub use names::{matching_files, missing_file, natural_order};
pub use pair::Pair;
pub use read::{read_frames, read_page};
pub use recording::{Order, Recording, RecordingOptions};
