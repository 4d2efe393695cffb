//! How eddies are looked for and measured.

use crate::field::{FieldError, Scheme};

/// Options of [`super::find_eddies`]; all are plain numbers.
#[derive(Clone, Copy, Debug, PartialEq, serde::Deserialize)]
#[serde(default, deny_unknown_fields)]
pub struct EddyOptions {
    /// Difference scheme of the gradient. None picks [`EddyOptions::DEFAULT_SCHEME`], whose
    /// truncation leaves the peak of a core of three spacings within 1 % of true.
    pub scheme: Option<Scheme>,
    /// Vorticity at the boundary as a part of the peak; above 0 and below 1. Default 0.25.
    pub fraction: f64,
    /// Least swirling strength of a core as a part of the strongest in the field; above 0 and
    /// below 1. Default 0.2.
    pub threshold: f64,
    /// Two peaks of swirling strength are two eddies where the saddle between them is lower
    /// than this part of the lower peak; above 0, at most 1. Default 0.8.
    pub saddle: f64,
    /// Cores of fewer nodes than this are noise; at least 1. Default 6.
    pub least_nodes: usize,
}

impl Default for EddyOptions {
    fn default() -> Self {
        Self {
            scheme: None,
            fraction: 0.25,
            threshold: 0.2,
            saddle: 0.8,
            least_nodes: 6,
        }
    }
}

impl EddyOptions {
    /// The scheme used when none is asked for.
    pub const DEFAULT_SCHEME: Scheme = Scheme::CubicFit;

    /// Refuses what makes no sense, naming the option.
    pub(super) fn check(&self) -> Result<(), FieldError> {
        let refuse = |name: &str, value: f64| {
            Err(FieldError::Option(format!(
                "{name} must lie between 0 and 1; it is {value}"
            )))
        };
        let is_part = |value: f64| value > 0.0 && value < 1.0;
        if !is_part(self.fraction) {
            return refuse("fraction", self.fraction);
        }
        if !is_part(self.threshold) {
            return refuse("threshold", self.threshold);
        }
        if !is_part(self.saddle) && self.saddle != 1.0 {
            return refuse("saddle", self.saddle);
        }
        if self.least_nodes == 0 {
            let what = "least_nodes must be at least 1; it is 0".to_owned();
            return Err(FieldError::Option(what));
        }
        Ok(())
    }
}
