//! Image pairs to displacement: windows, transforms, peaks, deformation, passes, validation.
//!
//! [`interrogate`] runs the passes of a [`Plan`] over one pair. Each pass deforms both exposures
//! by half of what the passes before found (`deform`, `predictor`), correlates every window
//! (`transform`), finds the residual shift from the peak (`peak`), and tests each vector against
//! its neighbours (`validate`). Inside this room arrays follow the image: row 0 is the top row
//! and a positive row shift points down; only the finished field has y pointing up.
//!
//! Reading files, eddies and statistics live elsewhere.

mod deform;
mod hidden;
mod layout;
mod pass;
mod peak;
mod plan;
mod predictor;
mod response;
mod run;
mod spline;
mod statistics;
mod taper;
mod validate;

pub use kolk_correlate as transform;
pub use plan::{Plan, PlanError, PlanOptions, WindowSize};
pub use run::{ALGORITHM, InterrogateError, blank_field, interrogate, interrogate_images};
