//! What is tabulated: columns of numbers, words and gaps under headings that carry the unit.
//!
//! A heading is the column's name and its unit in one word (`diameter_mm`, `peak_vorticity_per_s`),
//! so a table read back knows its units. A measured value takes two columns, itself and its
//! standard uncertainty (`diameter_mm`, `diameter_unc_mm`), the latter empty where nothing is
//! known. Nothing here knows what the rows are about.

mod cell;
mod column;
mod csv;
mod eddies;
mod peaks;
mod show;
#[allow(clippy::module_inception)]
mod table;

pub use cell::Cell;
pub use column::Column;
pub use eddies::{eddies, eddies_of_each};
pub use peaks::plane_peaks;
pub use table::{Table, TableError};
