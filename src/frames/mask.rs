//! Which pixels of an exposure are hidden.

use std::path::Path;
use std::sync::Arc;

use blake3::Hash;
use ndarray::Array2;
use serde_json::json;

use super::error::page_name;
use super::read::{headers, read_position};
use super::shape::Shape;
use super::{BrightOptions, Frame, FrameError, Scale};

/// Shapes, images and rules in one mask; it bounds the depth of masks made of masks.
const MOST_PARTS: usize = 1000;

/// What the coordinates of a shape are in: x right, y up, (0, 0) the centre of the bottom-left
/// pixel.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum MaskUnit {
    /// The unit of the recording it hides pixels of: mm with a calibration, px without.
    #[default]
    Recording,
    /// px, whatever the calibration.
    Px,
    /// mm; the recording must have a calibration.
    Mm,
}

impl MaskUnit {
    /// The unit written "px" or "mm".
    pub fn parse(text: &str) -> Option<MaskUnit> {
        match text {
            "px" => Some(MaskUnit::Px),
            "mm" => Some(MaskUnit::Mm),
            _ => None,
        }
    }

    /// "px", "mm" or "" for the recording's.
    pub fn text(self) -> &'static str {
        match self {
            MaskUnit::Recording => "",
            MaskUnit::Px => "px",
            MaskUnit::Mm => "mm",
        }
    }

    /// The factor that brings it to px.
    fn to_px(self, scale: &Scale) -> Result<f64, FrameError> {
        let calibrated = scale.length().0 == crate::quantity::Unit::MM;
        match self {
            MaskUnit::Px => Ok(1.0),
            MaskUnit::Mm if !calibrated => Err(FrameError::Mask(
                "a mask in mm needs a recording with dt_s and mm_per_px: give the mask in px"
                    .to_owned(),
            )),
            MaskUnit::Recording | MaskUnit::Mm => Ok(1.0 / scale.length().1),
        }
    }
}

/// Which pixels of an exposure are hidden: a shape, an image, a rule about brightness, several of
/// these together, or all but these. Cheap to clone.
#[derive(Clone, Debug)]
pub struct Mask {
    pub(super) part: Arc<Part>,
    /// How many shapes, images and rules it is made of.
    pub(super) parts: usize,
    digest: Hash,
}

/// What a mask is made of.
#[derive(Debug)]
pub(super) enum Part {
    Shape(Shape, MaskUnit),
    /// What messages call it, and the pixels.
    Image(String, Array2<bool>),
    Bright(BrightOptions),
    Union(Mask, Mask),
    Inverse(Mask),
}

/// Equal masks are made of the same parts in the same way; what an image file is called does not
/// matter.
impl PartialEq for Mask {
    fn eq(&self, other: &Self) -> bool {
        self.digest == other.digest
    }
}

impl Mask {
    fn new(part: Part) -> Self {
        let (parts, basis) = match &part {
            Part::Union(a, b) => (a.parts + b.parts, json!({"union": [a.hex(), b.hex()]})),
            Part::Inverse(of) => (of.parts, json!({"all_but": of.hex()})),
            plain => (1, plain.description()),
        };
        Mask {
            part: Arc::new(part),
            parts,
            digest: blake3::hash(basis.to_string().as_bytes()),
        }
    }

    /// The inside of a polygon, by its corners in order, and its sides.
    ///
    /// # Errors
    /// [`FrameError::Mask`]: fewer than 3 corners or more than 10 000, a corner that is not finite,
    /// sides that cross, no area.
    pub fn polygon(corners: Vec<[f64; 2]>, unit: MaskUnit) -> Result<Mask, FrameError> {
        Ok(Self::new(Part::Shape(Shape::polygon(corners)?, unit)))
    }

    /// The inside of a circle, and the circle.
    ///
    /// # Errors
    /// [`FrameError::Mask`]: a centre that is not finite, a radius that is not above 0.
    pub fn circle(centre: [f64; 2], radius: f64, unit: MaskUnit) -> Result<Mask, FrameError> {
        Ok(Self::new(Part::Shape(Shape::circle(centre, radius)?, unit)))
    }

    /// The inside of a rectangle with sides along x and y, by two opposite corners, and its sides.
    ///
    /// # Errors
    /// [`FrameError::Mask`]: a corner that is not finite, no area.
    pub fn rectangle(a: [f64; 2], b: [f64; 2], unit: MaskUnit) -> Result<Mask, FrameError> {
        Ok(Self::new(Part::Shape(Shape::rectangle(a, b)?, unit)))
    }

    /// The pixels of an image file that are not black. It is read here and now, and hides pixels
    /// of exposures of its own size.
    ///
    /// # Errors
    /// [`FrameError`] as [`read_frames`](super::read_frames); a file of several images.
    pub fn image(file: &Path) -> Result<Mask, FrameError> {
        let name = page_name(file, 0);
        let pages = headers(file)?;
        let [page] = pages.as_slice() else {
            return Err(FrameError::Unsupported {
                image: name,
                what: format!("a file of {} images", pages.len()),
                instead: "a mask from a file of one image",
            });
        };
        let frame = read_position(file, page.position)?;
        let hidden = Array2::from_shape_fn(frame.pixels.dim(), |at| frame.pixels[at] > 0.0);
        Ok(Self::new(Part::Image(name, hidden)))
    }

    /// The pixels that are true; shape (rows, columns), row 0 at the top.
    pub fn from_pixels(hidden: Array2<bool>) -> Mask {
        Self::new(Part::Image("the mask image".to_owned(), hidden))
    }

    /// The bright patches of each exposure by itself, see [`BrightOptions`].
    ///
    /// # Errors
    /// [`FrameError::Mask`]: an option out of its range.
    pub fn bright(options: BrightOptions) -> Result<Mask, FrameError> {
        options.check()?;
        Ok(Self::new(Part::Bright(options)))
    }

    /// The pixels that this mask or the other hides.
    ///
    /// # Errors
    /// [`FrameError::Mask`]: more than 1000 shapes, images and rules in all.
    pub fn union(&self, other: &Mask) -> Result<Mask, FrameError> {
        let parts = self.parts + other.parts;
        if parts > MOST_PARTS {
            return Err(FrameError::Mask(format!(
                "the masks have {parts} parts together; one mask has at most {MOST_PARTS}: draw them as one mask image"
            )));
        }
        Ok(Self::new(Part::Union(self.clone(), other.clone())))
    }

    /// All pixels but those that this mask hides.
    pub fn inverse(&self) -> Mask {
        match &*self.part {
            Part::Inverse(of) => of.clone(),
            _ => Self::new(Part::Inverse(self.clone())),
        }
    }

    /// Which pixels of `frame` are hidden: shape (rows, columns), row 0 at the top, true = hidden.
    ///
    /// # Errors
    /// [`FrameError`] where a mask image is not of the frame's size, or the mask is in mm and
    /// `scale` is no calibration.
    pub fn hidden(&self, frame: &Frame, scale: &Scale) -> Result<Array2<bool>, FrameError> {
        let mut hidden = Array2::from_elem(frame.pixels.dim(), false);
        self.cover(frame, scale, &mut hidden)?;
        Ok(hidden)
    }

    /// Hides the pixels of `frame` beside those hidden already.
    pub(super) fn cover(
        &self,
        frame: &Frame,
        scale: &Scale,
        hidden: &mut Array2<bool>,
    ) -> Result<(), FrameError> {
        match &*self.part {
            Part::Shape(shape, unit) => shape.times(unit.to_px(scale)?).cover(hidden),
            Part::Image(name, pixels) => {
                check_size(name, pixels, (frame.width(), frame.height()))?;
                hidden.zip_mut_with(pixels, |hidden, here| *hidden |= here);
            }
            Part::Bright(options) => options.cover(frame, hidden),
            Part::Union(a, b) => {
                a.cover(frame, scale, hidden)?;
                b.cover(frame, scale, hidden)?;
            }
            Part::Inverse(of) => {
                let shown = of.hidden(frame, scale)?;
                hidden.zip_mut_with(&shown, |hidden, shown| *hidden |= !shown);
            }
        }
        Ok(())
    }

    /// Whether it can be laid on exposures of `size` (width, height) px.
    pub(super) fn check(&self, size: (usize, usize), scale: &Scale) -> Result<(), FrameError> {
        match &*self.part {
            Part::Shape(_, unit) => unit.to_px(scale).map(|_| ()),
            Part::Image(name, pixels) => check_size(name, pixels, size),
            Part::Bright(_) => Ok(()),
            Part::Union(a, b) => a.check(size, scale).and_then(|()| b.check(size, scale)),
            Part::Inverse(of) => of.check(size, scale),
        }
    }

    /// True where it consists of shapes that all lie beside exposures of `size` (width, height)
    /// px, as happens with coordinates in another unit.
    pub fn misses(&self, (width, height): (usize, usize), scale: &Scale) -> bool {
        match &*self.part {
            Part::Shape(shape, unit) => unit.to_px(scale).is_ok_and(|factor| {
                let (low, high) = shape.times(factor).bounds();
                let past =
                    |axis: usize, side: usize| high[axis] < -0.5 || low[axis] > side as f64 - 0.5;
                past(0, width) || past(1, height)
            }),
            Part::Union(a, b) => {
                a.misses((width, height), scale) && b.misses((width, height), scale)
            }
            Part::Image(..) | Part::Bright(_) | Part::Inverse(_) => false,
        }
    }

    /// Hash of what it is made of; of an image it is the pixels that count, not the name.
    pub fn digest(&self) -> Hash {
        self.digest
    }

    fn hex(&self) -> String {
        self.digest.to_hex().to_string()
    }
}

fn check_size(name: &str, pixels: &Array2<bool>, size: (usize, usize)) -> Result<(), FrameError> {
    let mask_size = (pixels.ncols(), pixels.nrows());
    if mask_size == size {
        return Ok(());
    }
    Err(FrameError::MaskSize {
        mask: name.to_owned(),
        mask_size,
        size,
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn frame(width: usize, height: usize) -> Frame {
        Frame {
            pixels: Array2::from_shape_fn((height, width), |(r, c)| (r * width + c) as f32),
            bits: 16,
        }
    }

    fn calibrated() -> Scale {
        Scale {
            dt_s: Some(0.01),
            mm_per_px: Some(0.25),
        }
    }

    #[test]
    fn coordinates_are_those_of_the_recording_unless_a_unit_is_named() {
        let circle = |factor: f64, unit| {
            Mask::circle([8.0 * factor, 4.0 * factor], 3.0 * factor, unit).unwrap()
        };
        let hidden = |mask: Mask, scale: Scale| mask.hidden(&frame(20, 10), &scale).unwrap();
        let expected = hidden(circle(1.0, MaskUnit::Px), Scale::default());
        // y is up: the middle is 4 rows above the lowest.
        assert!(expected[(5, 8)] && !expected[(9, 8)]);
        for (factor, unit, scale) in [
            (1.0, MaskUnit::Recording, Scale::default()),
            (0.25, MaskUnit::Recording, calibrated()),
            (0.25, MaskUnit::Mm, calibrated()),
            (1.0, MaskUnit::Px, calibrated()),
        ] {
            assert_eq!(hidden(circle(factor, unit), scale), expected);
        }
        let error = circle(1.0, MaskUnit::Mm)
            .hidden(&frame(20, 10), &Scale::default())
            .unwrap_err();
        assert!(
            error.to_string().contains("needs a recording with dt_s"),
            "{error}"
        );
    }

    #[test]
    fn a_mask_in_the_wrong_unit_is_noticed() {
        let corners = vec![[60.0, 10.0], [90.0, 10.0], [75.0, 30.0]];
        let mask = Mask::polygon(corners, MaskUnit::Recording).unwrap();
        assert!(!mask.misses((100, 100), &Scale::default()));
        assert!(mask.misses((100, 100), &calibrated()));
        assert!(!mask.inverse().misses((100, 100), &calibrated()));
        let inside = Mask::circle([5.0, 5.0], 1.0, MaskUnit::Recording).unwrap();
        assert!(
            !mask
                .union(&inside)
                .unwrap()
                .misses((100, 100), &calibrated())
        );
    }

    #[test]
    fn what_masks_are_made_of_tells_them_apart() {
        let circle = |r| Mask::circle([8.0, 4.0], r, MaskUnit::Px).unwrap();
        let pixels = |at| {
            let mut pixels = Array2::from_elem((4, 6), false);
            pixels[at] = true;
            Mask::from_pixels(pixels)
        };
        assert_eq!(circle(3.0), circle(3.0));
        assert_ne!(circle(3.0), circle(4.0));
        assert_ne!(circle(3.0), circle(3.0).inverse());
        assert_eq!(circle(3.0), circle(3.0).inverse().inverse());
        assert_eq!(pixels((1, 2)), pixels((1, 2)));
        assert_ne!(pixels((1, 2)), pixels((2, 1)));
        assert_ne!(
            circle(3.0).union(&circle(4.0)).unwrap(),
            circle(4.0).union(&circle(3.0)).unwrap()
        );
    }

    #[test]
    fn a_mask_is_not_made_of_more_than_a_thousand() {
        let circle = Mask::circle([8.0, 4.0], 3.0, MaskUnit::Px).unwrap();
        let mut mask = circle.clone();
        for _ in 1..1000 {
            mask = mask.union(&circle).unwrap().inverse();
        }
        assert!(mask.hidden(&frame(20, 10), &Scale::default()).is_ok());
        let error = mask.union(&circle).unwrap_err().to_string();
        assert!(
            error.contains("have 1001 parts together; one mask has at most 1000"),
            "{error}"
        );
    }
}
