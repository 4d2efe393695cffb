//! What can go wrong between layers and a drawing.

use std::path::PathBuf;

use crate::quantity::Unit;
use crate::store::StoreError;

/// Why a figure could not be drawn or saved.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum FigureError {
    /// No layer at all.
    #[error("the figure is empty: give it something to draw, such as shade(field) or line(x, y)")]
    Empty,
    /// Layers, but not one finite value to draw or to take an axis from.
    #[error("there is nothing to draw: {0} holds no finite value")]
    NothingFinite(String),
    /// Two layers whose axes have different units.
    #[error("the layers do not share the {axis} axis: {first} is in {left}, {second} in {right}")]
    #[allow(missing_docs)]
    UnitsDiffer {
        axis: &'static str,
        first: String,
        left: UnitName,
        second: String,
        right: UnitName,
    },
    /// A second shaded field.
    #[error(
        "a figure shades one field, and {first:?} is already there; give {second:?} a panel of its own"
    )]
    #[allow(missing_docs)]
    TwoShades { first: String, second: String },
    /// Lists that should be equally long.
    #[error("{name}: {what} needs one number for each of the {expected} points, not {found}")]
    #[allow(missing_docs)]
    LengthsDiffer {
        name: String,
        what: &'static str,
        expected: usize,
        found: usize,
    },
    /// An axis or shading range that is no range.
    #[error(
        "{what} {lo} to {hi} is no range: give two numbers, the smaller first, both above zero on an axis of decades, none beyond 1e150"
    )]
    #[allow(missing_docs)]
    Range { what: String, lo: f64, hi: f64 },
    /// A logarithmic axis with nothing above zero on it.
    #[error("the {0} axis is logarithmic, and no value along it is above zero")]
    NothingAboveZero(&'static str),
    /// Values beyond what an axis can carry.
    #[error(
        "the {axis} axis would reach {value:e}; numbers beyond 1e150, or within 1e-150 of zero on an axis of decades, cannot be drawn"
    )]
    #[allow(missing_docs)]
    OffScale { axis: &'static str, value: f64 },
    /// An option that makes no sense.
    #[error("{option} is {value}; it should be {right}")]
    #[allow(missing_docs)]
    Option {
        option: &'static str,
        value: String,
        right: &'static str,
    },
    /// A size on paper that leaves no room for the plot, or too many dots.
    #[error("{0}")]
    Size(String),
    /// A file name whose extension is not one of those written.
    #[error("cannot tell the format of {}: end the name in .svg or .png", .0.display())]
    Extension(PathBuf),
    /// The file could not be written.
    #[error(transparent)]
    Store(#[from] StoreError),
    /// The dots could not be packed into a PNG.
    #[error("cannot make the PNG: {0}")]
    Encode(String),
}

/// A unit as a message names it.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct UnitName(pub Unit);

impl std::fmt::Display for UnitName {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        if self.0.is_one() {
            f.write_str("plain numbers")
        } else {
            self.0.fmt(f)
        }
    }
}
