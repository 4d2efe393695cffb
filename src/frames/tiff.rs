//! Grey TIFF: headers and pixels of each page (TIFF 6.0, Adobe 1992, and its 64-bit extension).

use std::io::{Read, Seek};
use std::path::Path;

use ::tiff::decoder::{Decoder, DecodingResult, Limits};
use ::tiff::tags::Tag;
use ::tiff::{ColorType, TiffError};
use ndarray::{Array2, ArrayViewMut2, s};

use super::error::page_name;
use super::read::{MAX_PIXELS, Page, check_size};
use super::{Frame, FrameError};

/// Pages in one file; more are taken for damage.
const MAX_PAGES: usize = 1 << 20;

/// Largest tile side, px.
const MAX_TILE: u32 = 1 << 16;

/// Compression tag values read here: none, LZW, deflate (two numbers), PackBits.
const COMPRESSIONS: [u32; 5] = [1, 5, 8, 32946, 32773];

/// Headers of the pages, in file order, without reduced-resolution copies (thumbnails).
pub(super) fn pages<R: Read + Seek>(
    reader: R,
    length: u64,
    file: &Path,
) -> Result<Vec<Page>, FrameError> {
    let mut decoder = open(reader, file)?;
    let mut pages = Vec::new();
    for position in 0..MAX_PAGES {
        if position > 0 {
            decoder
                .next_image()
                .map_err(|e| translate(&page_name(file, position), e))?;
        }
        let image = page_name(file, position);
        if !is_thumbnail(&mut decoder, &image)? {
            pages.push(header(&mut decoder, length, &image, position)?);
        }
        if !decoder.more_images() {
            return if pages.is_empty() {
                Err(corrupt(&image, "it holds thumbnails only"))
            } else {
                Ok(pages)
            };
        }
    }
    Err(FrameError::Corrupt {
        image: page_name(file, 0),
        why: format!("it claims more than {MAX_PAGES} pages"),
    })
}

/// The pixels of the page at `position` in the file.
pub(super) fn frame<R: Read + Seek>(
    reader: R,
    length: u64,
    file: &Path,
    position: usize,
) -> Result<Frame, FrameError> {
    let image = page_name(file, position);
    let mut decoder = open(reader, file)?;
    if position > 0 {
        decoder
            .seek_to_image(position)
            .map_err(|e| translate(&image, e))?;
    }
    let page = header(&mut decoder, length, &image, position)?;
    let declared = declared_bits(&mut decoder, page.bits, &image)?;
    let pixels = pixels(&mut decoder, page, &image)?;
    // A declared depth that a pixel exceeds is a mistake of the writer: the file's own depth holds.
    let bits = declared
        .filter(|bits| pixels.iter().all(|g| *g < 2f32.powi(i32::from(*bits))))
        .unwrap_or(page.bits);
    Ok(Frame { pixels, bits })
}

/// Reads strip by strip or tile by tile, each in whole rows of the strip or tile: row by row into
/// an image, the LZW reader of `tiff` 0.11.3 calls some good tiles cut short.
fn pixels<R: Read + Seek>(
    decoder: &mut Decoder<R>,
    page: Page,
    image: &str,
) -> Result<Array2<f32>, FrameError> {
    let (width, height) = decoder.chunk_dimensions();
    let (width, height) = (width as usize, height as usize);
    let across = page.width.div_ceil(width);
    let row_bytes = width * usize::from(page.bits / 8);
    let mut pixels = Array2::zeros((page.height, page.width));
    let mut buffer = DecodingResult::U8(Vec::new());
    for index in 0..across * page.height.div_ceil(height) {
        let (top, left) = (index / across * height, index % across * width);
        let bottom = page.height.min(top.saturating_add(height));
        let right = page.width.min(left + width);
        let part = pixels.slice_mut(s![top..bottom, left..right]);
        u32::try_from(index)
            .map_err(TiffError::from)
            .and_then(|index| decoder.read_chunk_to_buffer(&mut buffer, index, row_bytes))
            .map_err(|e| translate(image, e))?;
        match &buffer {
            DecodingResult::U8(levels) => place(levels, width, part),
            DecodingResult::U16(levels) => place(levels, width, part),
            _ => return Err(corrupt(image, "its pixels are not of the kind it declares")),
        }
    }
    Ok(pixels)
}

/// Puts rows of `width` levels where they belong, without what pads a tile beyond the image.
fn place<T: Copy + Into<f32>>(levels: &[T], width: usize, mut part: ArrayViewMut2<'_, f32>) {
    for (row, levels) in part.rows_mut().into_iter().zip(levels.chunks(width)) {
        for (pixel, level) in row.into_iter().zip(levels) {
            *pixel = (*level).into();
        }
    }
}

fn open<R: Read + Seek>(reader: R, file: &Path) -> Result<Decoder<R>, FrameError> {
    let mut limits = Limits::default();
    limits.decoding_buffer_size = 2 * MAX_PIXELS;
    limits.intermediate_buffer_size = 4 * MAX_PIXELS;
    Ok(Decoder::new(reader)
        .map_err(|e| translate(&page_name(file, 0), e))?
        .with_limits(limits))
}

/// Checks everything a header can tell, so that decoding starts only on what can be decoded.
fn header<R: Read + Seek>(
    decoder: &mut Decoder<R>,
    length: u64,
    image: &str,
    position: usize,
) -> Result<Page, FrameError> {
    let (width, height) = decoder.dimensions().map_err(|e| translate(image, e))?;
    check_size(image, width, height)?;
    let bits = grey_bits(decoder, image)?;
    let compression = number(decoder, Tag::Compression, image)?.unwrap_or(1);
    if !COMPRESSIONS.contains(&compression) {
        return Err(FrameError::Unsupported {
            image: image.to_owned(),
            what: format!("compressed by method {compression} of the TIFF standard"),
            instead: "uncompressed, LZW, deflate and PackBits images",
        });
    }
    for side in [Tag::TileWidth, Tag::TileLength] {
        if number(decoder, side, image)?.is_some_and(|n| n > MAX_TILE) {
            return Err(corrupt(image, "its tiles are larger than any image"));
        }
    }
    check_extent(decoder, length, image)?;
    Ok(Page {
        position,
        width: width as usize,
        height: height as usize,
        bits,
    })
}

/// 8 or 16 for unsigned grey of that depth.
fn grey_bits<R: Read + Seek>(decoder: &mut Decoder<R>, image: &str) -> Result<u8, FrameError> {
    // 262: PhotometricInterpretation; 3 means colours looked up in a table.
    if number(decoder, Tag::PhotometricInterpretation, image)? == Some(3) {
        return Err(colour(image, "a colour table"));
    }
    let colours = decoder.colortype().map_err(|e| translate(image, e))?;
    // 339: SampleFormat; 1 is unsigned, 2 signed, 3 floating point; one number a sample.
    let format = decoder
        .find_tag_unsigned_vec::<u16>(Tag::SampleFormat)
        .map_err(|e| translate(image, e))?
        .and_then(|all| all.first().copied())
        .unwrap_or(1);
    let what = match (colours, format) {
        (ColorType::Gray(bits @ (8 | 16)), 1) => return Ok(bits),
        (ColorType::Gray(bits), 1) => format!("{bits}-bit grey"),
        (ColorType::Gray(bits), 2) => format!("{bits}-bit grey with a sign"),
        (ColorType::Gray(bits), _) => format!("{bits}-bit floating-point grey"),
        (ColorType::Multiband { num_samples, .. }, _) => format!("made of {num_samples} channels"),
        (other, _) => return Err(colour(image, colour_name(other))),
    };
    Err(FrameError::Unsupported {
        image: image.to_owned(),
        what,
        instead: "unsigned grey of 8 or 16 bits, one channel",
    })
}

fn colour_name(colours: ColorType) -> &'static str {
    match colours {
        ColorType::RGB(_) | ColorType::RGBA(_) => "red, green, blue",
        ColorType::CMYK(_) | ColorType::CMYKA(_) => "four printing inks",
        ColorType::YCbCr(_) => "luma and chroma",
        _ => "more than one channel",
    }
}

/// Every strip or tile must lie inside the file.
fn check_extent<R: Read + Seek>(
    decoder: &mut Decoder<R>,
    length: u64,
    image: &str,
) -> Result<(), FrameError> {
    let mut list = |tag| {
        decoder
            .find_tag_unsigned_vec::<u64>(tag)
            .map_err(|e| translate(image, e))
    };
    let (offsets, counts) = match (list(Tag::StripOffsets)?, list(Tag::StripByteCounts)?) {
        (Some(offsets), Some(counts)) => (offsets, counts),
        _ => (
            list(Tag::TileOffsets)?.unwrap_or_default(),
            list(Tag::TileByteCounts)?.unwrap_or_default(),
        ),
    };
    let end = offsets
        .iter()
        .zip(&counts)
        .map(|(offset, count)| offset.saturating_add(*count))
        .max()
        .unwrap_or(0);
    if end > length {
        return Err(FrameError::Truncated {
            image: image.to_owned(),
            why: format!("its pixels reach to byte {end}, the file ends at byte {length}"),
        });
    }
    Ok(())
}

/// True for a page that is a small copy of another (254: NewSubfileType, bit 0).
fn is_thumbnail<R: Read + Seek>(decoder: &mut Decoder<R>, image: &str) -> Result<bool, FrameError> {
    Ok(number(decoder, Tag::NewSubfileType, image)?.is_some_and(|kind| kind & 1 == 1))
}

/// Bits the grey levels really use, where the page says so by a largest level of 2^n - 1 (281:
/// MaxSampleValue), as a camera of 12 bits writing to 16 does.
fn declared_bits<R: Read + Seek>(
    decoder: &mut Decoder<R>,
    bits: u8,
    image: &str,
) -> Result<Option<u8>, FrameError> {
    let largest = number(decoder, Tag::MaxSampleValue, image)?;
    Ok((9..bits).find(|n| largest == Some((1 << n) - 1)))
}

fn number<R: Read + Seek>(
    decoder: &mut Decoder<R>,
    tag: Tag,
    image: &str,
) -> Result<Option<u32>, FrameError> {
    decoder
        .find_tag_unsigned(tag)
        .map_err(|e| translate(image, e))
}

fn corrupt(image: &str, why: &str) -> FrameError {
    FrameError::Corrupt {
        image: image.to_owned(),
        why: why.to_owned(),
    }
}

fn colour(image: &str, found: &str) -> FrameError {
    FrameError::Colour {
        image: image.to_owned(),
        found: found.to_owned(),
    }
}

fn translate(image: &str, error: TiffError) -> FrameError {
    match error {
        TiffError::IoError(e) if e.kind() == std::io::ErrorKind::InvalidData => {
            corrupt(image, &e.to_string())
        }
        TiffError::IoError(e) => FrameError::from_io(image, &e),
        TiffError::UnsupportedError(e) => FrameError::Unsupported {
            image: image.to_owned(),
            what: format!("a TIFF of a rare kind ({e})"),
            instead: "unsigned grey of 8 or 16 bits, one channel",
        },
        TiffError::LimitsExceeded | TiffError::IntSizeError => FrameError::TooLarge {
            image: image.to_owned(),
            why: "its header asks for more memory than an image may take".to_owned(),
        },
        other => corrupt(image, &other.to_string()),
    }
}
