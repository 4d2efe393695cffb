//! Image pairs to displacement: windows, transforms, peaks, deformation, passes, validation.
//!
//! [`interrogate`] runs the passes of a [`Plan`] over one pair. Each pass deforms both exposures
//! by half of what the passes before found (`deform`, `predictor`), correlates every window
//! (`transform`), finds the residual shift from the peak (`peak`), and tests each vector against
//! its neighbours (`validate`). [`correlation_plane`] shows what one vector was read from. Inside
//! this room arrays follow the image: row 0 is the top row and a positive row shift points down;
//! only the finished field and plane have y pointing up.
//!
//! Reading files, eddies and statistics live elsewhere.

mod deform;
mod finish;
mod flatten;
mod hidden;
mod judge;
mod layout;
mod pass;
mod peak;
mod plan;
mod plane;
mod plane_sums;
mod predictor;
mod raw_plane;
mod response;
mod run;
mod significance;
mod smoothing;
mod spline;
mod statistics;
mod taper;
mod together;
mod validate;

pub use finish::blank_field;
pub use kolk_correlate as transform;
pub use plan::{Plan, PlanError, PlanOptions, WindowSize};
pub use plane::{CorrelationPlane, PlaneError, PlanePeak, correlation_plane};
pub use run::{ALGORITHM, InterrogateError, interrogate, interrogate_images};
pub use together::{TogetherError, correlate_together};
