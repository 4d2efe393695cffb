//! Grey PNG: header and pixels (ISO/IEC 15948).

use std::io::{BufRead, Seek};
use std::path::Path;

use image::codecs::png::PngDecoder;
use image::error::ImageError;
use image::{ColorType, ExtendedColorType, ImageDecoder, Limits};
use ndarray::Array2;

use super::error::page_name;
use super::read::{MAX_PIXELS, MAX_SIDE, Page, check_size};
use super::{Frame, FrameError};

/// Header of the one image.
pub(super) fn page<R: BufRead + Seek>(reader: R, file: &Path) -> Result<Page, FrameError> {
    header(&open(reader, file)?, &page_name(file, 0))
}

/// Pixels of the one image.
pub(super) fn frame<R: BufRead + Seek>(reader: R, file: &Path) -> Result<Frame, FrameError> {
    let image = page_name(file, 0);
    let decoder = open(reader, file)?;
    let page = header(&decoder, &image)?;
    let bytes_per_pixel = usize::from(page.bits / 8);
    let mut bytes = vec![0; page.width * page.height * bytes_per_pixel];
    decoder
        .read_image(&mut bytes)
        .map_err(|e| translate(&image, e))?;
    let levels = if page.bits == 8 {
        bytes.into_iter().map(f32::from).collect()
    } else {
        let level = |b: &[u8]| f32::from(u16::from_ne_bytes([b[0], b[1]]));
        bytes.chunks_exact(2).map(level).collect()
    };
    let pixels = Array2::from_shape_vec((page.height, page.width), levels).map_err(|_| {
        FrameError::Corrupt {
            image,
            why: "it holds another number of pixels than it declares".to_owned(),
        }
    })?;
    Ok(Frame {
        pixels,
        bits: page.bits,
    })
}

fn open<R: BufRead + Seek>(reader: R, file: &Path) -> Result<PngDecoder<R>, FrameError> {
    let mut limits = Limits::default();
    limits.max_image_width = Some(MAX_SIDE);
    limits.max_image_height = Some(MAX_SIDE);
    limits.max_alloc = Some(4 * MAX_PIXELS as u64);
    PngDecoder::with_limits(reader, limits).map_err(|e| translate(&page_name(file, 0), e))
}

fn header<R: BufRead + Seek>(decoder: &PngDecoder<R>, image: &str) -> Result<Page, FrameError> {
    let (width, height) = decoder.dimensions();
    check_size(image, width, height)?;
    let unsupported = |what: &str| FrameError::Unsupported {
        image: image.to_owned(),
        what: what.to_owned(),
        instead: "grey of 8 or 16 bits, without transparency",
    };
    let bits = match (decoder.color_type(), decoder.original_color_type()) {
        (ColorType::L8, ExtendedColorType::L8) => 8,
        (ColorType::L16, _) => 16,
        (ColorType::L8, _) => return Err(unsupported("grey of fewer than 8 bits")),
        (ColorType::La8 | ColorType::La16, _) => return Err(unsupported("grey with transparency")),
        _ => {
            return Err(FrameError::Colour {
                image: image.to_owned(),
                found: "red, green, blue".to_owned(),
            });
        }
    };
    Ok(Page {
        position: 0,
        width: width as usize,
        height: height as usize,
        bits,
    })
}

fn translate(image: &str, error: ImageError) -> FrameError {
    match error {
        ImageError::IoError(e) => FrameError::from_io(image, &e),
        ImageError::Limits(_) => FrameError::TooLarge {
            image: image.to_owned(),
            why: "its header asks for more memory than an image may take".to_owned(),
        },
        other => FrameError::Corrupt {
            image: image.to_owned(),
            why: other.to_string(),
        },
    }
}
