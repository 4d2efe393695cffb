//! What can be wrong with an image, a list of images, or a calibration.

use std::io;
use std::path::Path;

/// Why frames could not be found, read or paired. Each message names the file and what would be
/// right.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
#[non_exhaustive]
#[allow(missing_docs)] // The fields are what the messages say they are.
pub enum FrameError {
    /// No file name or pattern at all.
    #[error("no files are named: give a file name or a pattern such as \"run1/*.tif\"")]
    NothingNamed,
    /// A pattern that is not one.
    #[error("\"{pattern}\" is not a file pattern: {why}; * stands for any text, ? for one letter")]
    BadPattern { pattern: String, why: String },
    /// A pattern that no file matches.
    #[error("no file matches \"{pattern}\": looked in {folder}{nearest}")]
    NoMatch {
        pattern: String,
        folder: String,
        /// Empty, or a sentence part that lists the nearest names.
        nearest: String,
    },
    /// A named file that does not exist.
    #[error("there is no file {file}{nearest}")]
    Missing {
        file: String,
        /// Empty, or a sentence part that lists the nearest names.
        nearest: String,
    },
    /// A file brought twice, at least once by a pattern.
    #[error(
        "{file} is listed twice, the second time by \"{pattern}\": the same frame would count twice; narrow one of the patterns"
    )]
    Repeated { file: String, pattern: String },
    /// A file the system does not let us read.
    #[error("{image} cannot be read: {why}")]
    Unreadable { image: String, why: String },
    /// A file that ends too early.
    #[error("{image} is cut short: {why}; copy or record it again")]
    Truncated { image: String, why: String },
    /// A file whose content contradicts itself.
    #[error("{image} is damaged: {why}; copy or record it again")]
    Corrupt { image: String, why: String },
    /// A file that is neither TIFF nor PNG.
    #[error(
        "{image} is not an image kolk reads: it is {found}; give grey TIFF or PNG of 8 or 16 bits"
    )]
    NotAnImage { image: String, found: String },
    /// A colour image.
    #[error(
        "{image} is a colour image ({found}): convert it to 8- or 16-bit grey first; kolk does not guess how the colours should be weighed"
    )]
    Colour { image: String, found: String },
    /// A grey image of a kind that is not read.
    #[error("{image} is {what}; kolk reads {instead}")]
    Unsupported {
        image: String,
        what: String,
        instead: &'static str,
    },
    /// An image, or what its header promises, that would need too much memory.
    #[error("{image} is too large: {why}; cut the images or the file into parts")]
    TooLarge { image: String, why: String },
    /// A page that the file does not have.
    #[error("{file} has no page {page}: it has {pages}, counted from 0")]
    NoPage {
        file: String,
        page: usize,
        pages: usize,
    },
    /// Two frames of one recording that differ in size.
    #[error(
        "{second} is {sw} x {sh} px but {first} is {fw} x {fh} px: the frames of a recording must be of one size",
        fw = first_size.0, fh = first_size.1, sw = second_size.0, sh = second_size.1
    )]
    SizesDiffer {
        first: String,
        /// (width, height) in px.
        first_size: (usize, usize),
        second: String,
        /// (width, height) in px.
        second_size: (usize, usize),
    },
    /// An odd number of frames where every two make a pair.
    #[error(
        "order \"pairs\" needs an even number of frames, but there are {frames}, the last one {last}: add or leave out one, or use order \"series\" or \"stacked\""
    )]
    OddFrames { frames: usize, last: String },
    /// One frame where a series needs two.
    #[error(
        "order \"series\" needs at least two frames, but there is only {only}: add frames, or use order \"stacked\" if it holds both exposures"
    )]
    TooFewFrames { only: String },
    /// A stacked image that does not split in two.
    #[error(
        "{image} is {height} px high: order \"stacked\" needs an even height, the upper half being the first exposure"
    )]
    OddHeight { image: String, height: usize },
    /// A pair index past the end.
    #[error("there is no pair {index}: the recording has {pairs}, counted from 0")]
    NoPair { index: usize, pairs: usize },
    /// A mask that makes no sense.
    #[error("{0}")]
    Mask(String),
    /// A mask image that is no image of an exposure.
    #[error(
        "{mask} is {mw} x {mh} px but the exposures are {w} x {h} px: a mask image must be of their size",
        mw = mask_size.0, mh = mask_size.1, w = size.0, h = size.1
    )]
    MaskSize {
        mask: String,
        /// (width, height) in px.
        mask_size: (usize, usize),
        /// (width, height) of an exposure in px.
        size: (usize, usize),
    },
    /// A calibration that makes no sense.
    #[error("{0}")]
    Calibration(String),
}

impl FrameError {
    /// The error for what the system said about `image`.
    pub(super) fn from_io(image: &str, error: &io::Error) -> Self {
        let image = image.to_owned();
        match error.kind() {
            io::ErrorKind::NotFound => FrameError::Missing {
                file: image,
                nearest: String::new(),
            },
            io::ErrorKind::UnexpectedEof => FrameError::Truncated {
                image,
                why: "it ends before the image does".to_owned(),
            },
            _ => FrameError::Unreadable {
                image,
                why: error.to_string(),
            },
        }
    }
}

/// How a page of a file is named in messages; pages are counted from 1 as viewers do.
pub(super) fn page_name(file: &Path, page: usize) -> String {
    if page == 0 {
        file.display().to_string()
    } else {
        format!("{}, page {}", file.display(), page + 1)
    }
}
