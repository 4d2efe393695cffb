//! What can go wrong with a series.

use crate::frames::FrameError;
use crate::interrogate::InterrogateError;
use crate::store::StoreError;
use crate::task::Cancelled;

/// Why a series could not be made or read.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
#[allow(missing_docs)] // The fields are what the messages say they are.
pub enum SeriesError {
    /// Nothing to interrogate.
    #[error("the recording has no pairs")]
    NoPairs,
    /// Pairs that cannot share one grid.
    #[error(
        "the pairs of a series share one size and one calibration, but {first} has {of_first} and {other} has {of_other}; interrogate them one by one"
    )]
    PairsDiffer {
        first: String,
        of_first: String,
        other: String,
        of_other: String,
    },
    /// A place where something else is.
    #[error(
        "{folder} is there already and is no series of vector fields; give the series another name"
    )]
    NotASeries { folder: String },
    /// A field past the end.
    #[error("there is no field {index}: the series has {fields}, counted from 0")]
    NoField { index: usize, fields: usize },
    /// A frame that was overwritten or damaged after this series was made.
    #[error(
        "field {index} of {folder} is no longer what was written: another run or program changed it; interrogate again, perhaps under another name"
    )]
    Changed { index: usize, folder: String },
    /// A pair that could not be interrogated.
    #[error(transparent)]
    Interrogate(#[from] InterrogateError),
    /// A frame that could not be read.
    #[error(transparent)]
    Frame(#[from] FrameError),
    /// A file that could not be written or read.
    #[error(transparent)]
    Store(#[from] StoreError),
    /// The person who started it stopped it.
    #[error(transparent)]
    Cancelled(#[from] Cancelled),
}
