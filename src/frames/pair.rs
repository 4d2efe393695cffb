//! Two exposures a short time apart.

use std::path::Path;
use std::sync::Arc;

use ndarray::{Array2, s};

use super::error::page_name;
use super::read::{Page, read_position};
use super::{Frame, FrameError, Mask, Scale};

/// Two exposures of one flow; cheap to clone. Exposures from files load at each [`Pair::load`].
#[derive(Clone, Debug)]
pub struct Pair {
    exposures: Exposures,
    scale: Scale,
    label: Arc<str>,
    pub(super) index: usize,
    /// What hides pixels of the first and of the second exposure, together.
    masks: [Vec<Mask>; 2],
}

#[derive(Clone, Debug)]
enum Exposures {
    InMemory(Arc<Frame>, Arc<Frame>),
    InFiles(Source, Source),
    /// The upper half is the first exposure.
    Stacked(Source),
}

/// One page of one file.
#[derive(Clone, Debug)]
pub(super) struct Source {
    pub file: Arc<Path>,
    pub page: Page,
}

impl Source {
    /// How messages name it.
    pub(super) fn name(&self) -> String {
        page_name(&self.file, self.page.position)
    }

    /// How labels name it, without folders.
    fn short_name(&self) -> String {
        page_name(short(&self.file), self.page.position)
    }

    /// (width, height) in px.
    pub(super) fn size(&self) -> (usize, usize) {
        (self.page.width, self.page.height)
    }

    fn load(&self) -> Result<Frame, FrameError> {
        read_position(&self.file, self.page.position)
    }
}

fn short(file: &Path) -> &Path {
    file.file_name().map_or(file, Path::new)
}

impl Pair {
    /// A pair of frames in memory; `label` says what it is, the index is 0.
    ///
    /// Frames of different sizes are refused when the pair is loaded.
    pub fn from_frames(first: Frame, second: Frame, scale: Scale, label: &str) -> Pair {
        Pair {
            exposures: Exposures::InMemory(Arc::new(first), Arc::new(second)),
            scale,
            label: label.into(),
            index: 0,
            masks: Default::default(),
        }
    }

    pub(super) fn in_files(first: &Source, second: &Source, scale: Scale, index: usize) -> Pair {
        let label = if first.file == second.file {
            let name = page_name(short(&first.file), 0);
            let (one, two) = (first.page.position + 1, second.page.position + 1);
            format!("{name}, pages {one} and {two}")
        } else {
            format!("{} and {}", first.short_name(), second.short_name())
        };
        Pair {
            exposures: Exposures::InFiles(first.clone(), second.clone()),
            scale,
            label: label.into(),
            index,
            masks: Default::default(),
        }
    }

    pub(super) fn stacked(source: &Source, scale: Scale, index: usize) -> Pair {
        Pair {
            exposures: Exposures::Stacked(source.clone()),
            scale,
            label: source.short_name().into(),
            index,
            masks: Default::default(),
        }
    }

    /// The first and the second exposure, of one size.
    ///
    /// # Errors
    /// [`FrameError`] where a file is no longer what it was when the recording was opened, its
    /// pixels cannot be read, or the exposures differ in size.
    pub fn load(&self) -> Result<(Arc<Frame>, Arc<Frame>), FrameError> {
        let (first, second) = match &self.exposures {
            Exposures::InMemory(first, second) => (first.clone(), second.clone()),
            Exposures::InFiles(first, second) => (first.load()?.into(), second.load()?.into()),
            Exposures::Stacked(source) => {
                let (upper, lower) = halves(source.load()?, &source.name())?;
                (upper.into(), lower.into())
            }
        };
        let size = |frame: &Frame| (frame.width(), frame.height());
        if size(&first) != size(&second) {
            let (first_name, second_name) = self.names();
            return Err(FrameError::SizesDiffer {
                first: first_name,
                first_size: size(&first),
                second: second_name,
                second_size: size(&second),
            });
        }
        Ok((first, second))
    }

    /// The same pair with its exposures in memory.
    ///
    /// # Errors
    /// As [`Pair::load`].
    pub fn in_memory(&self) -> Result<Pair, FrameError> {
        let (first, second) = self.load()?;
        Ok(Pair {
            exposures: Exposures::InMemory(first, second),
            ..self.clone()
        })
    }

    /// The same pair with the pixels of `mask` hidden in both exposures, beside what is hidden
    /// already.
    ///
    /// # Errors
    /// [`FrameError`] where a mask image is not of the exposures' size, or the mask is in mm and
    /// the pair has no calibration.
    pub fn hide(&self, mask: &Mask) -> Result<Pair, FrameError> {
        self.hide_each(mask, mask)
    }

    /// The same pair with the pixels of `in_first` hidden in the first exposure and those of
    /// `in_second` in the second, as a body needs that moves in between.
    ///
    /// # Errors
    /// As [`Pair::hide`].
    pub fn hide_each(&self, in_first: &Mask, in_second: &Mask) -> Result<Pair, FrameError> {
        let mut pair = self.clone();
        for (masks, mask) in pair.masks.iter_mut().zip([in_first, in_second]) {
            mask.check(self.size(), &self.scale)?;
            masks.push(mask.clone());
        }
        Ok(pair)
    }

    /// What hides pixels of the first and of the second exposure; several masks add up.
    pub fn masks(&self) -> [&[Mask]; 2] {
        [&self.masks[0], &self.masks[1]]
    }

    /// Which pixels of its two exposures, as [`Pair::load`] gives them, are hidden: shape (rows,
    /// columns), row 0 at the top, true = hidden; `None` for an exposure of which no pixel is.
    ///
    /// # Errors
    /// As [`Pair::hide`].
    pub fn hidden(
        &self,
        first: &Frame,
        second: &Frame,
    ) -> Result<[Option<Array2<bool>>; 2], FrameError> {
        let of = |masks: &[Mask], frame: &Frame| {
            let mut hidden = Array2::from_elem(frame.pixels.dim(), false);
            for mask in masks {
                mask.cover(frame, &self.scale, &mut hidden)?;
            }
            Ok(hidden.iter().any(|hidden| *hidden).then_some(hidden))
        };
        Ok([of(&self.masks[0], first)?, of(&self.masks[1], second)?])
    }

    /// The share of the pixels, 0 to 1, that are hidden in one exposure or the other. Loads them.
    ///
    /// # Errors
    /// As [`Pair::load`] and [`Pair::hide`].
    pub fn hidden_share(&self) -> Result<f64, FrameError> {
        let (first, second) = self.load()?;
        let hidden = match self.hidden(&first, &second)? {
            [Some(first), Some(second)] => first | second,
            [None, None] => return Ok(0.0),
            [Some(one), None] | [None, Some(one)] => one,
        };
        let count = hidden.iter().filter(|hidden| **hidden).count();
        Ok(count as f64 / hidden.len() as f64)
    }

    /// Files and positions of the pages its exposures stand in; none for a pair in memory.
    pub fn places(&self) -> Vec<(Arc<Path>, usize)> {
        let place = |source: &Source| (source.file.clone(), source.page.position);
        match &self.exposures {
            Exposures::InMemory(..) => Vec::new(),
            Exposures::InFiles(first, second) => vec![place(first), place(second)],
            Exposures::Stacked(source) => vec![place(source)],
        }
    }

    fn names(&self) -> (String, String) {
        match &self.exposures {
            Exposures::InFiles(first, second) => (first.name(), second.name()),
            _ => (
                format!("the first frame of {}", self.label),
                format!("the second frame of {}", self.label),
            ),
        }
    }

    /// Width and height of each exposure, px, without loading it.
    pub fn size(&self) -> (usize, usize) {
        match &self.exposures {
            Exposures::InMemory(first, _) => (first.width(), first.height()),
            Exposures::InFiles(first, _) => first.size(),
            Exposures::Stacked(source) => (source.page.width, source.page.height / 2),
        }
    }

    /// What a pixel and a frame are worth.
    pub fn scale(&self) -> Scale {
        self.scale
    }

    /// The files, or what the pair was called.
    pub fn label(&self) -> &str {
        &self.label
    }

    /// Place in its recording, from 0.
    pub fn index(&self) -> usize {
        self.index
    }
}

fn halves(frame: Frame, name: &str) -> Result<(Frame, Frame), FrameError> {
    let height = frame.height();
    if height % 2 == 1 {
        return Err(FrameError::OddHeight {
            image: name.to_owned(),
            height,
        });
    }
    let part = |pixels: ndarray::ArrayView2<'_, f32>| Frame {
        pixels: pixels.to_owned(),
        bits: frame.bits,
    };
    Ok((
        part(frame.pixels.slice(s![..height / 2, ..])),
        part(frame.pixels.slice(s![height / 2.., ..])),
    ))
}
