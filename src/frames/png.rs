//! Grey PNG: header and pixels (ISO/IEC 15948).

use std::io::{BufRead, Read, Seek};
use std::path::Path;

use image::codecs::png::PngDecoder;
use image::error::ImageError;
use image::{ColorType, ImageDecoder, Limits};
use ndarray::Array2;

use super::error::page_name;
use super::read::{MAX_PIXELS, MAX_SIDE, Page, check_size};
use super::{Frame, FrameError};

/// Header of the one image.
pub(super) fn page<R: BufRead + Seek>(reader: R, file: &Path) -> Result<Page, FrameError> {
    open(reader, &page_name(file, 0)).map(|(_, page)| page)
}

/// Pixels of the one image.
pub(super) fn frame<R: BufRead + Seek>(reader: R, file: &Path) -> Result<Frame, FrameError> {
    let image = page_name(file, 0);
    let (decoder, page) = open(reader, &image)?;
    let bits = page.bits;
    let mut bytes = vec![0; page.width * page.height * usize::from(bits / 8)];
    decoder
        .read_image(&mut bytes)
        .map_err(|e| translate(&image, e))?;
    let levels = if bits == 8 {
        bytes.into_iter().map(f32::from).collect()
    } else {
        let level = |b: &[u8]| f32::from(u16::from_ne_bytes([b[0], b[1]]));
        bytes.chunks_exact(2).map(level).collect()
    };
    let pixels = Array2::from_shape_vec((page.height, page.width), levels)
        .map_err(|_| corrupt(&image, "it holds another number of pixels than it declares"))?;
    Ok(Frame { pixels, bits })
}

fn open<R: BufRead + Seek>(
    mut reader: R,
    image: &str,
) -> Result<(PngDecoder<R>, Page), FrameError> {
    let bits = declared_bits(&mut reader, image)?;
    let mut limits = Limits::default();
    limits.max_image_width = Some(MAX_SIDE);
    limits.max_image_height = Some(MAX_SIDE);
    limits.max_alloc = Some(4 * MAX_PIXELS as u64);
    let decoder = PngDecoder::with_limits(reader, limits).map_err(|e| translate(image, e))?;
    let (width, height) = decoder.dimensions();
    check_size(image, width, height)?;
    match (bits, decoder.color_type()) {
        (8, ColorType::L8) | (16, ColorType::L16) => {}
        // A grey level declared to be transparent (tRNS) adds a channel.
        _ => return Err(unsupported(image, "grey with transparency")),
    }
    let page = Page {
        position: 0,
        width: width as usize,
        height: height as usize,
        bits,
    };
    Ok((decoder, page))
}

/// 8 or 16 for grey of that depth, by the header chunk, which the decoder would widen.
fn declared_bits<R: Read + Seek>(reader: &mut R, image: &str) -> Result<u8, FrameError> {
    let mut start = [0; 26];
    reader
        .read_exact(&mut start)
        .and_then(|()| reader.rewind())
        .map_err(|e| FrameError::from_io(image, &e))?;
    let colour = |found: &str| FrameError::Colour {
        image: image.to_owned(),
        found: found.to_owned(),
    };
    // Bytes 24 and 25: bit depth and colour type (ISO/IEC 15948, 11.2.2).
    match (start[25], start[24]) {
        (0, bits @ (8 | 16)) => Ok(bits),
        (0, 1 | 2 | 4) => Err(unsupported(image, "grey of fewer than 8 bits")),
        (2 | 6, _) => Err(colour("red, green, blue")),
        (3, _) => Err(colour("a colour table")),
        (4, _) => Err(unsupported(image, "grey with transparency")),
        _ => Err(corrupt(image, "its header declares no known kind of pixel")),
    }
}

fn unsupported(image: &str, what: &str) -> FrameError {
    FrameError::Unsupported {
        image: image.to_owned(),
        what: what.to_owned(),
        instead: "grey of 8 or 16 bits, without transparency",
    }
}

fn corrupt(image: &str, why: &str) -> FrameError {
    FrameError::Corrupt {
        image: image.to_owned(),
        why: why.to_owned(),
    }
}

fn translate(image: &str, error: ImageError) -> FrameError {
    match error {
        ImageError::IoError(e) => FrameError::from_io(image, &e),
        ImageError::Limits(_) => FrameError::TooLarge {
            image: image.to_owned(),
            why: "its header asks for more memory than an image may take".to_owned(),
        },
        other => corrupt(image, &other.to_string()),
    }
}
