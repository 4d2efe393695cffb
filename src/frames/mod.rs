//! Images in: reading files, putting them in pairs, and what a pixel and a frame are worth.
//!
//! Frames load when they are used. Nothing here looks at what is in an image.

mod frame;

pub use frame::{Frame, Scale};
