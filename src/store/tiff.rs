//! Frames to grey TIFF (TIFF 6.0, Adobe 1992).

use std::io::{Cursor, Seek, Write};
use std::path::Path;

use ::tiff::TiffResult;
use ::tiff::encoder::colortype::{ColorType, Gray8, Gray16};
use ::tiff::encoder::{TiffEncoder, TiffValue};
use ::tiff::tags::Tag;

use super::{StoreError, write_atomically};
use crate::frames::Frame;

/// Writes one frame as uncompressed grey TIFF, 8-bit where `bits` is 8, else 16-bit.
///
/// Grey levels are rounded to whole numbers; whole ones are read back exactly, and so is a depth
/// between 8 and 16 bits (MaxSampleValue).
///
/// # Errors
/// [`StoreError`] where a grey level does not go into the depth or the file cannot be written.
pub fn write_tiff(path: &Path, frame: &Frame) -> Result<(), StoreError> {
    write_tiff_pages(path, std::slice::from_ref(frame))
}

/// Writes frames as the pages of one file; see [`write_tiff`].
///
/// # Errors
/// As [`write_tiff`], and where there is no frame, a frame has no pixel, or the file would pass
/// the 4 GB the format can address.
pub fn write_tiff_pages(path: &Path, frames: &[Frame]) -> Result<(), StoreError> {
    let misfit = |why: String| StoreError::DoesNotFit {
        file: path.display().to_string(),
        why,
    };
    if frames.is_empty() {
        return Err(misfit("there is no frame to write".to_owned()));
    }
    for frame in frames {
        check_levels(frame).map_err(misfit)?;
    }
    let bytes = encode(frames).map_err(|e| misfit(e.to_string()))?;
    write_atomically(path, |w| w.write_all(&bytes))
}

fn check_levels(frame: &Frame) -> Result<(), String> {
    let (bits, largest) = (frame.bits, full_scale(frame));
    if !(8..=16).contains(&bits) {
        return Err(format!(
            "a frame of {bits} bits is neither 8- nor 16-bit grey"
        ));
    }
    let bad = |level: &f32| !(level.round() >= 0.0 && level.round() <= largest);
    match frame.pixels.indexed_iter().find(|(_, level)| bad(level)) {
        None => Ok(()),
        Some(((row, column), level)) => Err(format!(
            "the grey level {level} in row {row}, column {column} is not between 0 and {largest}"
        )),
    }
}

fn full_scale(frame: &Frame) -> f32 {
    2f32.powi(i32::from(frame.bits)) - 1.0
}

fn encode(frames: &[Frame]) -> TiffResult<Vec<u8>> {
    let mut file = Cursor::new(Vec::new());
    let mut encoder = TiffEncoder::new(&mut file)?;
    for frame in frames {
        // The casts are exact: the levels were checked.
        if frame.bits == 8 {
            let levels: Vec<u8> = frame.pixels.iter().map(|g| g.round() as u8).collect();
            encode_page::<_, Gray8>(&mut encoder, frame, &levels)?;
        } else {
            let levels: Vec<u16> = frame.pixels.iter().map(|g| g.round() as u16).collect();
            encode_page::<_, Gray16>(&mut encoder, frame, &levels)?;
        }
    }
    Ok(file.into_inner())
}

fn encode_page<W: Write + Seek, C: ColorType>(
    encoder: &mut TiffEncoder<W>,
    frame: &Frame,
    levels: &[C::Inner],
) -> TiffResult<()>
where
    [C::Inner]: TiffValue,
{
    let (width, height) = (
        u32::try_from(frame.width())?,
        u32::try_from(frame.height())?,
    );
    let mut page = encoder.new_image::<C>(width, height)?;
    page.encoder()
        .write_tag(Tag::MaxSampleValue, full_scale(frame) as u16)?;
    page.write_data(levels)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::frames::read_frames;
    use ndarray::Array2;

    fn frame(bits: u8, width: usize, height: usize) -> Frame {
        let largest = (1usize << bits) - 1;
        let level = |(r, c): (usize, usize)| ((r * 7919 + c * 104_729) % (largest + 1)) as f32;
        let mut pixels = Array2::from_shape_fn((height, width), level);
        pixels[(0, 0)] = largest as f32;
        pixels[(height - 1, width - 1)] = 0.0;
        Frame { pixels, bits }
    }

    fn error_of(frame: &Frame) -> String {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("a.tif");
        let error = write_tiff(&path, frame).unwrap_err().to_string();
        assert!(!path.exists());
        error
    }

    #[test]
    fn frames_are_read_back_as_written_at_every_depth() {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("frame.tif");
        for bits in 8..=16 {
            // The last size takes several strips.
            for (width, height) in [(1, 1), (17, 5), (900, 700)] {
                let frame = frame(bits, width, height);
                write_tiff(&path, &frame).unwrap();
                assert_eq!(read_frames(&path).unwrap(), [frame]);
            }
        }
    }

    #[test]
    fn pages_are_read_back_in_order() {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("run.tif");
        let frames = [frame(8, 5, 4), frame(12, 5, 4), frame(16, 5, 4)];
        write_tiff_pages(&path, &frames).unwrap();
        assert_eq!(read_frames(&path).unwrap(), frames);
    }

    #[test]
    fn levels_that_do_not_fit_are_named() {
        let mut bad = frame(12, 3, 2);
        bad.pixels[(1, 2)] = 4096.0;
        let text = error_of(&bad);
        assert!(text.ends_with("the grey level 4096 in row 1, column 2 is not between 0 and 4095"));
        for level in [-0.6, f32::NAN, f32::INFINITY] {
            bad.pixels[(1, 2)] = level;
            assert!(error_of(&bad).contains("row 1, column 2"));
        }
        bad.bits = 32;
        assert!(error_of(&bad).contains("32 bits"));
    }

    #[test]
    fn an_empty_list_or_frame_is_refused() {
        assert!(write_tiff_pages(Path::new("never.tif"), &[]).is_err());
        let empty = Frame {
            pixels: Array2::zeros((0, 4)),
            bits: 8,
        };
        assert!(error_of(&empty).contains("0"));
    }
}
