//! A mask in a few words, and as plain data for the record of a series.

use std::fmt;

use serde_json::{Value, json};

use super::mask::{Mask, MaskUnit, Part};
use super::shape::Shape;

impl Mask {
    /// All of it as plain data, an image as the hash of its pixels.
    pub fn description(&self) -> Value {
        self.part.description()
    }
}

impl Part {
    pub(super) fn description(&self) -> Value {
        match self {
            Part::Shape(shape, unit) => {
                let unit = match unit {
                    MaskUnit::Recording => "that of the recording",
                    unit => unit.text(),
                };
                match shape {
                    Shape::Polygon(corners) => json!({"polygon": corners, "unit": unit}),
                    Shape::Circle(centre, radius) => {
                        json!({"circle": {"centre": centre, "radius": radius}, "unit": unit})
                    }
                    Shape::Rectangle(low, high) => {
                        json!({"rectangle": [low, high], "unit": unit})
                    }
                }
            }
            Part::Image(_, pixels) => {
                let bytes: Vec<u8> = pixels.iter().map(|hidden| u8::from(*hidden)).collect();
                json!({"image": {
                    "size_px": [pixels.ncols(), pixels.nrows()],
                    "blake3": blake3::hash(&bytes).to_hex().as_str(),
                }})
            }
            Part::Bright(options) => json!({"bright": options}),
            Part::Union(a, b) => json!({"union": [a.description(), b.description()]}),
            Part::Inverse(of) => json!({"all_but": of.description()}),
        }
    }
}

/// In a few words: `circle about (20, 30) of radius 8 px`.
impl fmt::Display for Mask {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match &*self.part {
            Part::Shape(shape, unit) => {
                let unit = unit.text();
                let gap = if unit.is_empty() { "" } else { " " };
                match shape {
                    Shape::Polygon(corners) => {
                        let (low, high) = shape.bounds();
                        write!(
                            f,
                            "polygon of {} corners, x {} to {}, y {} to {}{gap}{unit}",
                            corners.len(),
                            low[0],
                            high[0],
                            low[1],
                            high[1]
                        )
                    }
                    Shape::Circle([x, y], radius) => {
                        write!(f, "circle about ({x}, {y}) of radius {radius}{gap}{unit}")
                    }
                    Shape::Rectangle(low, high) => write!(
                        f,
                        "rectangle, x {} to {}, y {} to {}{gap}{unit}",
                        low[0], high[0], low[1], high[1]
                    ),
                }
            }
            Part::Image(_, pixels) => {
                write!(f, "image of {} x {} px", pixels.ncols(), pixels.nrows())
            }
            Part::Bright(o) => write!(
                f,
                "brighter than {}, patches below {} px² left out, grown by {} px",
                o.above, o.least_area_px2, o.grow_px
            ),
            Part::Union(a, b) if self.parts <= 3 => write!(f, "{a}; and {b}"),
            Part::Union(..) => write!(f, "{} masks together", self.parts),
            Part::Inverse(of) => write!(f, "all but ({of})"),
        }
    }
}
