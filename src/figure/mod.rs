//! What is drawn: maps of fields with arrows and outlines, curves, points, bars, panels of them.
//!
//! A [`Figure`] is put together from layers, laid out on paper in millimetres as a scene of paths,
//! and written as SVG or PNG from that one scene, so both show the same. Everything a figure needs
//! is inside the crate: the typeface (Fira Sans, see `assets/fonts`), the colour scales
//! ([`ColourScale`], designed here), the rasteriser. Nothing here finds or computes anything:
//! outlines, traces and fields come finished.
//!
//! The manner of the figures: the name of the upright axis stands level over its end, marks
//! straddle the axis line, what explains the plot (colour bar, reference arrow, key) stands beside
//! it and never on it, curves differ in dash as well as in colour.

mod arrows;
mod axis;
mod caption;
mod colour;
mod curve;
mod eddies;
mod error;
#[allow(clippy::module_inception)]
mod figure;
mod font;
mod key;
mod labels;
mod layer;
mod layout;
mod marks;
mod outlines;
mod panels;
mod placement;
mod plane;
mod raster;
mod scale;
mod scene;
mod settle;
mod shade;
mod sheet;
mod svg;
mod ticks;
mod transect;

pub use arrows::ArrowOptions;
pub use colour::Colour;
pub use curve::{Bars, Curve};
pub use eddies::eddy_transect;
pub use error::{FigureError, UnitName};
pub use figure::{DOTS_PER_INCH, Figure};
pub use marks::{Bounds, Mark, MarkSet};
pub use outlines::{Outline, OutlineSet};
pub use plane::plane_figure;
pub use scale::ColourScale;
pub use shade::ShadeOptions;
pub use transect::{Transect, transect};

#[cfg(test)]
mod tests;
