//! Why nothing can be said of a recording.

use crate::field::FieldError;
use crate::frames::FrameError;
use crate::interrogate::{InterrogateError, PlanError};
use crate::synth::SynthError;
use crate::task::Cancelled;

/// Why there is no report or no advice.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
#[allow(missing_docs)] // The fields are what the messages say they are.
pub enum AdviceError {
    /// Nothing to look at.
    #[error("the recording has no pair: there is nothing to look at")]
    NoPairs,
    /// A number of pairs that is none.
    #[error("0 pairs are to be looked at: give 1 or more")]
    NoneAskedFor,
    /// Too small for means over windows.
    #[error("{label}: the exposures are {width} x {height} px: at least 64 x 64 px are needed")]
    TooSmall {
        label: String,
        width: usize,
        height: usize,
    },
    /// Nothing that looks like particle images.
    #[error(
        "{label}: no particle images are seen: nothing in the exposures is alike over 1 or 2 px; look at the images, their focus and light, and at what is hidden"
    )]
    NoParticles { label: String },
    /// Exposures that have nothing in common.
    #[error(
        "{label}: the exposures have no motion in common that a window of {window} px finds ({percent} % of the vectors are measured): is the order \"pairs\" or \"series\" right, and the time between the exposures short enough?"
    )]
    NothingInCommon {
        label: String,
        window: usize,
        percent: u32,
    },
    /// A frame could not be read.
    #[error(transparent)]
    Frame(#[from] FrameError),
    /// A pair could not be interrogated.
    #[error(transparent)]
    Interrogate(#[from] InterrogateError),
    /// A plan that makes no sense; those made here do.
    #[error(transparent)]
    Plan(#[from] PlanError),
    /// A field without a gradient.
    #[error(transparent)]
    Field(#[from] FieldError),
    /// Images that cannot be made for comparison.
    #[error(transparent)]
    Synth(#[from] SynthError),
    /// The person who started it stopped it.
    #[error(transparent)]
    Cancelled(#[from] Cancelled),
}
