//! Under construction.

pub mod transform;
