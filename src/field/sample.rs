//! Under construction.
/// Values along a line.
#[derive(Clone, Debug)]
pub struct Trace;
