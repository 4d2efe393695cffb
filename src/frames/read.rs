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

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;
    use std::io::Cursor;
    use std::path::PathBuf;

    /// Every image file the outside checks read, good and bad.
    fn files() -> Vec<(PathBuf, Vec<u8>)> {
        let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/data/images");
        let mut files: Vec<_> = std::fs::read_dir(folder)
            .unwrap()
            .map(|entry| entry.unwrap().path())
            .map(|path| (path.clone(), std::fs::read(path).unwrap()))
            .collect();
        files.sort();
        files
    }

    /// Reads headers and every page; errors are an answer, panics are not.
    fn read_all(bytes: &[u8], path: &Path) -> Result<usize, FrameError> {
        let length = bytes.len() as u64;
        let pages = headers_from(Cursor::new(bytes), length, path)?;
        for page in &pages {
            let frame = frame_from(Cursor::new(bytes), length, path, page.position)?;
            assert_eq!((frame.width(), frame.height()), (page.width, page.height));
        }
        Ok(pages.len())
    }

    proptest! {
        #![proptest_config(ProptestConfig::with_cases(3000))]
        #[test]
        fn no_damage_to_a_file_makes_reading_panic(
            which in any::<prop::sample::Index>(),
            changes in prop::collection::vec((any::<prop::sample::Index>(), any::<u8>(), 0u8..4), 0..6),
            kept in prop::option::of(any::<prop::sample::Index>()),
        ) {
            let files = files();
            let (path, bytes) = which.get(&files);
            let mut bytes = bytes.clone();
            if bytes.is_empty() {
                return Ok(());
            }
            for (place, value, kind) in changes {
                // Half of the changes go to the first 300 bytes, where most headers are.
                let reach = if kind % 2 == 0 { bytes.len() } else { bytes.len().min(300) };
                let place = place.index(reach);
                bytes[place] = if kind < 2 { value } else { [0, 1, 255, 128][usize::from(value % 4)] };
            }
            if let Some(kept) = kept {
                bytes.truncate(kept.index(bytes.len()));
            }
            // Whatever it says, it names the file.
            if let Err(error) = read_all(&bytes, path) {
                prop_assert!(error.to_string().contains(&*path.to_string_lossy()));
            }
        }
    }

    #[test]
    fn every_good_file_cut_anywhere_in_its_last_part_is_an_error() {
        for (path, bytes) in files() {
            let name = path.file_name().unwrap().to_string_lossy().into_owned();
            // PNG ends in 12 bytes that hold nothing; the pixels of the others end the file.
            let tail = if name.ends_with(".png") { 13 } else { 1 };
            if name.starts_with("bad") || bytes.len() < 200 {
                continue;
            }
            for end in [
                bytes.len() - tail,
                bytes.len() * 3 / 4,
                bytes.len() / 2,
                30,
                9,
            ] {
                assert!(
                    read_all(&bytes[..end], &path).is_err(),
                    "{name} cut at {end}"
                );
            }
        }
    }

    /// A little-endian TIFF with one strip of `data` and the header entries given.
    fn tiff(width: u32, height: u32, bits: u32, compression: u32, data: &[u8]) -> Vec<u8> {
        let entries: [(u16, u32); 8] = [
            (256, width),
            (257, height),
            (258, bits),
            (259, compression),
            (262, 1),
            (273, 8 + 2 + 8 * 12 + 4),
            (278, height),
            (279, data.len() as u32),
        ];
        let mut file = b"II*\0\x08\0\0\0\x08\0".to_vec();
        for (tag, value) in entries {
            file.extend(tag.to_le_bytes());
            file.extend([4, 0, 1, 0, 0, 0]);
            file.extend(value.to_le_bytes());
        }
        file.extend([0; 4]);
        file.extend(data);
        file
    }

    #[test]
    fn a_small_file_that_claims_to_be_huge_is_refused_before_memory_is_taken() {
        let path = Path::new("claims.tif");
        for (width, height) in [(u32::MAX, u32::MAX), (32769, 1), (1, 40000), (32768, 32768)] {
            let error = read_all(&tiff(width, height, 16, 1, &[0; 64]), path).unwrap_err();
            assert!(matches!(error, FrameError::TooLarge { .. }), "{error}");
            assert!(error.to_string().contains("px"));
        }
        // As large as allowed, but not there.
        let error = read_all(&tiff(16384, 16384, 16, 1, &[0; 64]), path).unwrap_err();
        assert!(matches!(error, FrameError::Truncated { .. }), "{error}");
        assert_eq!(read_all(&tiff(8, 4, 16, 1, &[0; 64]), path), Ok(1));
    }

    #[test]
    fn a_folder_and_a_missing_file_are_said_to_be_so() {
        let folder = tempfile::tempdir().unwrap();
        let error = read_frames(folder.path()).unwrap_err().to_string();
        assert!(error.contains("it is a folder"), "{error}");
        let error = read_frames(&folder.path().join("a.tif"))
            .unwrap_err()
            .to_string();
        assert!(
            error.starts_with("there is no file") && error.ends_with("a.tif"),
            "{error}"
        );
    }
}
