//! One grey image, and the calibration of a recording.

use ndarray::Array2;

use crate::quantity::Unit;

/// One exposure: grey levels as they stand in the file.
#[derive(Clone, Debug, PartialEq)]
pub struct Frame {
    /// Grey levels, shape (rows, columns), row 0 at the top.
    pub pixels: Array2<f32>,
    /// Bits a grey level uses, 8 to 16: levels run from 0 to 2^bits - 1. That of the file's
    /// pixels (8 or 16), or fewer where the file or the camera says so (12-bit cameras).
    pub bits: u8,
}

impl Frame {
    /// Rows of the image.
    pub fn height(&self) -> usize {
        self.pixels.nrows()
    }

    /// Columns of the image.
    pub fn width(&self) -> usize {
        self.pixels.ncols()
    }
}

/// What a pixel and a frame interval are worth. Both or neither are given for a calibrated field.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Scale {
    /// Time between the two exposures of a pair, s.
    pub dt_s: Option<f64>,
    /// Length of one pixel in the light sheet, mm.
    pub mm_per_px: Option<f64>,
}

impl Scale {
    /// Unit of lengths and the factor that brings px to it.
    pub fn length(&self) -> (Unit, f64) {
        match (self.dt_s, self.mm_per_px) {
            (Some(_), Some(mm)) => (Unit::MM, mm),
            _ => (Unit::PX, 1.0),
        }
    }

    /// Unit of times and the factor that brings frames to it.
    pub fn time(&self) -> (Unit, f64) {
        match (self.dt_s, self.mm_per_px) {
            (Some(s), Some(_)) => (Unit::S, s),
            _ => (Unit::FRAME, 1.0),
        }
    }
}
