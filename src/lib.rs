//! kolk turns recordings of seeded, sheet-lit flow into vectors, each with its standard
//! uncertainty, and into eddy sizes, circulations and flow statistics.
//!
//! # The map of the crate
//!
//! | room | what lives there |
//! | --- | --- |
//! | [`quantity`] | units and measured values: what every number carries |
//! | [`task`] | the handle through which long work reports progress and is cancelled |
//! | [`frames`] | images in: reading, pairing, calibration, masks |
//! | [`interrogate`] | image pairs to displacement: windows, transforms, peaks, deformation, validation |
//! | [`series`] | the fields of a recording on disk: written, resumed, read back |
//! | [`field`] | grid, vector and scalar fields, gradients, sampling |
//! | [`vortex`] | finding eddies, their boundaries and sizes |
//! | [`synth`] | known flows and the particle images they would give |
//! | [`figure`] | what is drawn |
//! | [`table`] | what is tabulated |
//! | [`store`] | files in open formats, written whole or not at all |
//! | [`script`] | the language: engine, bindings, help, error display |
//! | [`prompt`] | the interactive prompt |
//! | [`cli`] | one file a command |
//!
//! Doors open one way: `cli` and `prompt` know `script`, `script` knows the kernels (`frames` to
//! `synth`), kernels know plain Rust types, and only `script` knows the language's engine.
//! Kernels never print.
//!
//! # Conventions
//!
//! x points right, y points **up**; vorticity and circulation are positive counter-clockwise.
//! Row 0 of an image is its top row, row 0 of a field is its lowest row. Pixel centres have
//! integer coordinates; an uncalibrated field is in px and frames with its origin at the centre
//! of the bottom-left pixel.

pub mod cli;
pub mod field;
pub mod figure;
pub mod frames;
pub mod interrogate;
pub mod prompt;
pub mod quantity;
pub mod script;
pub mod series;
pub mod store;
pub mod synth;
pub mod table;
pub mod task;
pub mod vortex;
