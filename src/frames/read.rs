//! Files to frames: telling the formats apart and bounding what a header may ask for.

use std::fs::File;
use std::io::{BufRead, BufReader, Read, Seek, SeekFrom};
use std::path::Path;

use super::error::page_name;
use super::{Frame, FrameError, png, tiff};

/// Longest side of an image, px: no header makes kolk reserve more.
pub(super) const MAX_SIDE: u32 = 32768;

/// Pixels of one image: 2^28, some twice the largest camera sensors; 1 GB once read.
pub(super) const MAX_PIXELS: usize = 1 << 28;

/// Pixels [`read_frames`] loads at once, 2 GB in memory.
const MAX_PIXELS_AT_ONCE: usize = 1 << 29;

/// What a header says of one page.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Page {
    /// Position in the file's chain of pages, thumbnails counted.
    pub position: usize,
    /// Columns.
    pub width: usize,
    /// Rows.
    pub height: usize,
    /// Bits a pixel: 8 or 16.
    pub bits: u8,
}

#[derive(Clone, Copy, PartialEq, Eq)]
enum Format {
    Tiff,
    Png,
}

/// All pages of an image file, in file order; a reduced-resolution copy (thumbnail) is no page.
///
/// Reads grey TIFF of 8 or 16 bits in strips or tiles, uncompressed or compressed by LZW, deflate
/// or PackBits, and grey PNG of 8 or 16 bits. Grey levels are exact; where the file counts white
/// as zero they are turned so that white is the largest.
///
/// # Errors
/// [`FrameError`] where the file is missing, unreadable, cut short, damaged, not grey, of another
/// depth, or larger than 2^28 px an image or 2^29 px together.
pub fn read_frames(path: &Path) -> Result<Vec<Frame>, FrameError> {
    let pages = headers(path)?;
    let pixels: usize = pages.iter().map(|p| p.width * p.height).sum();
    if pixels > MAX_PIXELS_AT_ONCE {
        return Err(FrameError::TooLarge {
            image: page_name(path, 0),
            why: format!(
                "its {} pages do not go into memory together; a recording loads them one by one",
                pages.len()
            ),
        });
    }
    pages
        .iter()
        .map(|p| read_position(path, p.position))
        .collect()
}

/// One page of an image file, counted from 0; see [`read_frames`].
///
/// # Errors
/// As [`read_frames`], and [`FrameError::NoPage`] where the file has no such page.
pub fn read_page(path: &Path, page: usize) -> Result<Frame, FrameError> {
    let pages = headers(path)?;
    let found = pages.get(page).ok_or_else(|| FrameError::NoPage {
        file: page_name(path, 0),
        page,
        pages: pages.len(),
    })?;
    read_position(path, found.position)
}

/// Headers of the pages of a file.
pub(super) fn headers(path: &Path) -> Result<Vec<Page>, FrameError> {
    let (reader, length) = open(path)?;
    headers_from(reader, length, path)
}

/// The page at `position` in a file's chain of pages.
pub(super) fn read_position(path: &Path, position: usize) -> Result<Frame, FrameError> {
    let (reader, length) = open(path)?;
    frame_from(reader, length, path, position)
}

/// [`headers`] of an open file of `length` bytes; `path` is only for messages.
pub(super) fn headers_from<R: BufRead + Seek>(
    mut reader: R,
    length: u64,
    path: &Path,
) -> Result<Vec<Page>, FrameError> {
    match format(&mut reader, length, path)? {
        Format::Tiff => tiff::pages(reader, length, path),
        Format::Png => png::page(reader, path).map(|page| vec![page]),
    }
}

/// [`read_position`] of an open file of `length` bytes; `path` is only for messages.
pub(super) fn frame_from<R: BufRead + Seek>(
    mut reader: R,
    length: u64,
    path: &Path,
    position: usize,
) -> Result<Frame, FrameError> {
    match format(&mut reader, length, path)? {
        Format::Tiff => tiff::frame(reader, length, path, position),
        Format::Png => png::frame(reader, path),
    }
}

fn open(path: &Path) -> Result<(BufReader<File>, u64), FrameError> {
    let name = page_name(path, 0);
    let file = File::open(path).map_err(|e| FrameError::from_io(&name, &e))?;
    let meta = file
        .metadata()
        .map_err(|e| FrameError::from_io(&name, &e))?;
    if meta.is_dir() {
        return Err(FrameError::Unreadable {
            image: name,
            why: "it is a folder; to take the images in it add /*.tif".to_owned(),
        });
    }
    Ok((BufReader::new(file), meta.len()))
}

/// Tells the format by the first bytes, as file names lie, and goes back to the start.
fn format<R: Read + Seek>(reader: &mut R, length: u64, path: &Path) -> Result<Format, FrameError> {
    let name = page_name(path, 0);
    let mut start = Vec::with_capacity(8);
    reader
        .by_ref()
        .take(8)
        .read_to_end(&mut start)
        .and_then(|_| reader.seek(SeekFrom::Start(0)))
        .map_err(|e| FrameError::from_io(&name, &e))?;
    match start.as_slice() {
        [b'I', b'I', 42 | 43, 0, ..] | [b'M', b'M', 0, 42 | 43, ..] => Ok(Format::Tiff),
        [0x89, b'P', b'N', b'G', 13, 10, 26, 10] => Ok(Format::Png),
        [] if length == 0 => Err(FrameError::Truncated {
            image: name,
            why: "it is empty".to_owned(),
        }),
        other => Err(FrameError::NotAnImage {
            image: name,
            found: guess(other).to_owned(),
        }),
    }
}

fn guess(start: &[u8]) -> &'static str {
    match start {
        [0xff, 0xd8, 0xff, ..] => "a JPEG, whose compression changes particle images",
        [b'G', b'I', b'F', b'8', ..] => "a GIF",
        [b'B', b'M', ..] => "a BMP",
        [b'%', b'P', b'D', b'F', ..] => "a PDF",
        text if text.iter().all(|b| matches!(b, 9 | 10 | 13 | 32..127)) => "text",
        _ => "of an unknown format",
    }
}

/// No header may ask for more than kolk gives.
pub(super) fn check_size(image: &str, width: u32, height: u32) -> Result<(), FrameError> {
    let pixels = u64::from(width) * u64::from(height);
    if width > MAX_SIDE || height > MAX_SIDE || pixels > MAX_PIXELS as u64 {
        return Err(FrameError::TooLarge {
            image: image.to_owned(),
            why: format!(
                "{width} x {height} px; an image may have {MAX_SIDE} px a side and {MAX_PIXELS} px in all"
            ),
        });
    }
    Ok(())
}
