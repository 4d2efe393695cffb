//! How a pair is interrogated: the windows of each pass and the limits of validation.

use std::sync::Arc;

use super::layout::Layout;
use super::response::{ErrorModel, Response};
use serde::{Deserialize, Deserializer, Serialize};

/// Width and height of an interrogation window, px.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, Serialize)]
pub struct WindowSize {
    /// Columns.
    pub width: usize,
    /// Rows.
    pub height: usize,
}

impl<'de> Deserialize<'de> for WindowSize {
    /// One number for a square window, `[width, height]` for any other.
    fn deserialize<D: Deserializer<'de>>(from: D) -> Result<Self, D::Error> {
        #[derive(Deserialize)]
        #[serde(
            untagged,
            expecting = "a window is one whole number of px, or [width, height]"
        )]
        enum Form {
            Square(usize),
            Sides([usize; 2]),
        }
        Ok(match Form::deserialize(from)? {
            Form::Square(side) => WindowSize {
                width: side,
                height: side,
            },
            Form::Sides([width, height]) => WindowSize { width, height },
        })
    }
}

/// The options of [`Plan::new`], as a script gives them.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(default, deny_unknown_fields)]
pub struct PlanOptions {
    /// Window of each pass, px: a number for a square, `[width, height]` otherwise.
    pub windows_px: Vec<WindowSize>,
    /// Share of a window that its neighbour also covers, 0 to 0.95.
    pub overlap: f64,
    /// Normalized median residual above which a vector is rejected (Westerweel & Scarano 2005).
    pub median_limit: f64,
    /// Displacement noise the median test tolerates, px: its small number in the denominator.
    pub median_floor_px: f64,
    /// Share of a window that must be inside the image and outside masks, 0.1 to 1.
    pub least_lit: f64,
    /// Side of the square, px, over which the lighting is made even before anything else: local
    /// mean and contrast are taken out. 0 leaves the images as they are; otherwise 9 to 255.
    pub flatten_px: usize,
    /// Whether in every pass but the last the correlation plane of a window is averaged with those
    /// of the windows about half a window away: for thin seeding.
    pub join_neighbours: bool,
}

impl Default for PlanOptions {
    fn default() -> Self {
        let square = |side| WindowSize {
            width: side,
            height: side,
        };
        Self {
            windows_px: vec![square(64), square(32), square(32), square(32)],
            overlap: 0.75,
            median_limit: 2.0,
            median_floor_px: 0.1,
            least_lit: 0.5,
            flatten_px: 25,
            join_neighbours: false,
        }
    }
}

/// What is wrong with the options of a plan.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum PlanError {
    /// No pass at all.
    #[error("windows_px is empty: give the window of each pass, such as [64, 32, 32]")]
    NoPass,
    /// A window outside what can be correlated.
    #[error(
        "windows_px has a window of {width} x {height} px: each side must be 4 to 1024 px and a product of 2, 3 and 5, such as 8, 16, 24, 32, 48, 64, 96 or 128"
    )]
    Window {
        /// Columns asked for.
        width: usize,
        /// Rows asked for.
        height: usize,
    },
    /// An option out of its range.
    #[error("{name} is {value}: it must be {range}")]
    Range {
        /// The option.
        name: &'static str,
        /// Its value.
        value: f64,
        /// The values allowed.
        range: &'static str,
    },
}

/// A checked plan, with what it makes of waves and of noise.
#[derive(Clone, Debug)]
pub struct Plan {
    options: PlanOptions,
    response: Arc<Response>,
    errors: ErrorModel,
}

impl Plan {
    /// Checks the options.
    ///
    /// # Errors
    /// [`PlanError`] naming the option that cannot be used.
    pub fn new(options: &PlanOptions) -> Result<Self, PlanError> {
        if options.windows_px.is_empty() {
            return Err(PlanError::NoPass);
        }
        for &WindowSize { width, height } in &options.windows_px {
            let usable = |side: usize| {
                let rest = [2, 3, 5].iter().fold(side, |rest, &prime| {
                    (0..10).fold(rest, |rest, _| {
                        if rest % prime == 0 {
                            rest / prime
                        } else {
                            rest
                        }
                    })
                });
                (4..=1024).contains(&side) && rest == 1
            };
            if !usable(width) || !usable(height) {
                return Err(PlanError::Window { width, height });
            }
        }
        let within = |name, value: f64, low, high, range| {
            if value >= low && value <= high {
                Ok(())
            } else {
                Err(PlanError::Range { name, value, range })
            }
        };
        within("overlap", options.overlap, 0.0, 0.95, "0 to 0.95")?;
        let limit = options.median_limit;
        within("median_limit", limit, 0.1, 1e6, "0.1 or more")?;
        let floor = options.median_floor_px;
        within("median_floor_px", floor, 0.001, 100.0, "0.001 to 100 px")?;
        within("least_lit", options.least_lit, 0.1, 1.0, "0.1 to 1")?;
        if options.flatten_px != 0 && !(9..=255).contains(&options.flatten_px) {
            return Err(PlanError::Range {
                name: "flatten_px",
                value: options.flatten_px as f64,
                range: "0, or 9 to 255 px",
            });
        }
        // The layouts' steps matter, the size of the image does not: any that holds a window does.
        let layouts: Vec<Layout> = options
            .windows_px
            .iter()
            .filter_map(|&window| Layout::new(window, options.overlap, 4096, 4096))
            .collect();
        let (Some(response), Some(last)) = (Response::new(&layouts), layouts.last()) else {
            return Err(PlanError::NoPass);
        };
        Ok(Self {
            options: options.clone(),
            errors: response.error_model(last),
            response: Arc::new(response),
        })
    }

    /// The options the plan was made from.
    pub fn options(&self) -> &PlanOptions {
        &self.options
    }

    /// Amplitude the plan gives a wave of displacement of this length, px, along x: 1 when the
    /// wave comes out whole, 0 when it is lost. From the model that also gives vectors their
    /// uncertainty; waves that last only a few windows come out lower.
    pub fn amplitude(&self, wavelength_px: f64) -> f64 {
        self.response.amplitude(wavelength_px)
    }

    /// What becomes of a single window's error in the finished field.
    pub(crate) fn error_model(&self) -> &ErrorModel {
        &self.errors
    }

    /// Windows of the passes, in order; never empty.
    pub fn windows(&self) -> &[WindowSize] {
        &self.options.windows_px
    }
}

impl std::fmt::Display for Plan {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        let windows: Vec<String> = self
            .windows()
            .iter()
            .map(|w| {
                if w.width == w.height {
                    w.width.to_string()
                } else {
                    format!("{}x{}", w.width, w.height)
                }
            })
            .collect();
        write!(
            f,
            "plan: windows {} px, overlap {}",
            windows.join(", "),
            self.options.overlap
        )
    }
}
