//! Eddies: finding them, and saying how big and how strong they are.
//!
//! `find` picks cores out of the swirling strength, `peak` reads centre and peak vorticity,
//! `contour` draws a boundary between the nodes, and each measure of size has a file of its own
//! (`fraction`, `circulation`) that states what it measures and its exact answers. `eddy` holds
//! the result. Nothing here follows eddies in time or draws them.

mod circulation;
mod contour;
mod eddies;
mod eddy;
mod find;
mod fraction;
mod options;
mod peak;

pub use circulation::CirculationCurve;
pub use eddies::{Eddies, VortexError, find_eddies};
pub use eddy::{Eddy, Flag, Method, NoAnswer, Sense};
pub use options::EddyOptions;

#[cfg(test)]
mod exact_tests;
#[cfg(test)]
mod flows;
#[cfg(test)]
mod noise_tests;
