//! The built-ins, one file a room of the crate.
//!
//! Each file has one function that writes the room's records, documentation and closure
//! together. Nothing is computed here: a closure calls a kernel and hands its answer on.

mod core;
mod field;
mod field_arithmetic;
mod figure;
mod frames;
mod interrogate;
mod lists;
mod mask;
mod mathematics;
mod place;
mod plane;
mod quantity;
mod synth;
mod table;
mod values;
mod vortex;

use super::draft::Room;

type Write = fn(&mut Room);

/// Every room with the function that writes its records, in the order help lists them.
pub(super) const ROOMS: [(&str, Write); 12] = [
    ("recordings", frames::records),
    ("masks", mask::records),
    ("interrogation", interrogate::records),
    ("fields", field::records),
    ("eddies", vortex::records),
    ("tables", table::records),
    ("figures", figure::records),
    ("measured values", quantity::records),
    ("known flows", synth::records),
    ("numbers", mathematics::records),
    ("lists and text", lists::records),
    ("script", core::records),
];
