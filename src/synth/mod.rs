//! Known flows and the particle images they would give.
//!
//! A [`Flow`] is a sum of elements with exact velocity and vorticity; [`particle_images`] moves
//! particles with it and draws what a camera would see. The truth in these flows is what the
//! other rooms are tested against. Flows are steady, two-dimensional and free of divergence.
//!
//! Lengths and times of a flow are the caller's; images take them as px and frame. As everywhere,
//! x points right, y points up, and vorticity is positive counter-clockwise.

pub mod basin;
mod camera;
mod dipole;
mod exposure;
mod flow;
mod images;
mod options;
mod particles;
mod plane;
mod round;
mod taylor_green;

pub use dipole::LambChaplygin;
pub use flow::{Element, Flow};
pub use images::particle_images;
pub use options::{ImageOptions, Sheet, SynthError};
pub use plane::{Shear, SineWave, SolidRotation, Uniform};
pub use round::{LambOseen, Rankine, ShieldedGaussian};
pub use taylor_green::TaylorGreen;
