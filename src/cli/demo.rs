//! `kolk demo`: a recording of a tidal-inlet basin, made, analysed and tabulated.

use super::arguments::Demo;
use super::{Outcome, Terminal};

/// Makes the recording and runs the analysis on it.
pub(super) fn demo(_demo: &Demo, terminal: &Terminal) -> Outcome {
    terminal.complain("error: this build has no demo yet\n");
    Outcome::Failed
}
