//! Frames in the order they were taken, cut into pairs.

use std::path::{Path, PathBuf};
use std::sync::Arc;

use rayon::prelude::*;
use serde::{Deserialize, Serialize};

use super::names::matching_files;
use super::pair::Source;
use super::read::headers;
use super::{FrameError, Pair, Scale};

/// How successive frames make pairs. Each page of a file of several pages is a frame.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Order {
    /// Frames (0, 1), (2, 3), …: one pair for every two frames.
    #[default]
    Pairs,
    /// Frames (0, 1), (1, 2), …: each frame with the next.
    Series,
    /// Each frame holds both exposures; the upper half is the first.
    Stacked,
}

impl Order {
    /// The word used in options: "pairs", "series", "stacked".
    pub fn text(self) -> &'static str {
        match self {
            Order::Pairs => "pairs",
            Order::Series => "series",
            Order::Stacked => "stacked",
        }
    }

    /// Reads what [`Order::text`] writes.
    pub fn parse(text: &str) -> Option<Order> {
        [Order::Pairs, Order::Series, Order::Stacked]
            .into_iter()
            .find(|order| order.text() == text)
    }
}

/// How a recording is put together and calibrated.
#[derive(Clone, Debug, Default, PartialEq, Serialize, Deserialize)]
#[serde(default, deny_unknown_fields)]
pub struct RecordingOptions {
    /// How successive frames make pairs; "pairs" by default.
    pub order: Order,
    /// Time between the two exposures of a pair, s; above zero, and only with `mm_per_px`.
    pub dt_s: Option<f64>,
    /// Length of one pixel in the light sheet, mm; above zero, and only with `dt_s`.
    pub mm_per_px: Option<f64>,
}

impl RecordingOptions {
    /// The calibration, checked.
    ///
    /// # Errors
    /// [`FrameError::Calibration`] where only one of the two is given or one is not a positive,
    /// finite number.
    pub fn scale(&self) -> Result<Scale, FrameError> {
        let complain = |text: String| Err(FrameError::Calibration(text));
        for (name, value) in [("dt_s", self.dt_s), ("mm_per_px", self.mm_per_px)] {
            if let Some(value) = value
                && !(value.is_finite() && value > 0.0)
            {
                return complain(format!(
                    "{name} is {value}: it must be a finite number above zero"
                ));
            }
        }
        let (given, absent) = match (self.dt_s, self.mm_per_px) {
            (Some(_), None) => ("dt_s", "mm_per_px"),
            (None, Some(_)) => ("mm_per_px", "dt_s"),
            _ => {
                return Ok(Scale {
                    dt_s: self.dt_s,
                    mm_per_px: self.mm_per_px,
                });
            }
        };
        complain(format!(
            "{given} is given without {absent}: a velocity in mm/s needs both; give both, or neither to work in px and frames"
        ))
    }
}

/// An ordered set of pairs of exposures; cheap to clone. Frames load when a pair is loaded.
#[derive(Clone, Debug)]
pub struct Recording {
    pairs: Arc<[Pair]>,
    files: Arc<[PathBuf]>,
    scale: Scale,
    order: Order,
}

impl Recording {
    /// Opens the files that `patterns` stand for, relative to `base`; see
    /// [`matching_files`] for their order.
    ///
    /// # Errors
    /// As [`matching_files`] and [`Recording::from_files`].
    pub fn open(
        patterns: &[String],
        base: &Path,
        options: &RecordingOptions,
    ) -> Result<Recording, FrameError> {
        Self::from_files(matching_files(patterns, base)?, options)
    }

    /// Opens these files in this order. Only headers are read.
    ///
    /// # Errors
    /// [`FrameError`] where the calibration makes no sense, a header shows that a file cannot be
    /// read, the sizes differ, or the frames do not make pairs in the order asked for.
    pub fn from_files(
        files: Vec<PathBuf>,
        options: &RecordingOptions,
    ) -> Result<Recording, FrameError> {
        let scale = options.scale()?;
        // The first bad file in order is reported, however the threads ran.
        let pages: Vec<_> = files.par_iter().map(|file| headers(file)).collect();
        let mut sources: Vec<Source> = Vec::new();
        for (file, pages) in files.iter().zip(pages) {
            let file: Arc<Path> = file.as_path().into();
            sources.extend(pages?.into_iter().map(|page| Source {
                file: file.clone(),
                page,
            }));
        }
        check_sizes(&sources)?;
        Ok(Recording {
            pairs: make_pairs(&sources, options.order, scale)?.into(),
            files: files.into(),
            scale,
            order: options.order,
        })
    }

    /// A recording of pairs in memory, renumbered from 0; its scale is that of the first.
    pub fn from_pairs(mut pairs: Vec<Pair>) -> Recording {
        let scale = pairs.first().map(Pair::scale).unwrap_or_default();
        for (index, pair) in pairs.iter_mut().enumerate() {
            pair.index = index;
        }
        Recording {
            pairs: pairs.into(),
            files: Arc::default(),
            scale,
            order: Order::Pairs,
        }
    }

    /// Number of pairs.
    pub fn len(&self) -> usize {
        self.pairs.len()
    }

    /// True without any pair.
    pub fn is_empty(&self) -> bool {
        self.pairs.is_empty()
    }

    /// What a pixel and a frame are worth.
    pub fn scale(&self) -> Scale {
        self.scale
    }

    /// The files in the order of their frames; empty for pairs in memory.
    pub fn files(&self) -> &[PathBuf] {
        &self.files
    }

    /// How frames make pairs.
    pub fn order(&self) -> Order {
        self.order
    }

    /// Width and height of each exposure, px; `None` without any pair.
    pub fn size(&self) -> Option<(usize, usize)> {
        self.pairs.first().map(Pair::size)
    }

    /// Pair `index`, counted from 0.
    ///
    /// # Errors
    /// [`FrameError::NoPair`] past the end.
    pub fn pair(&self, index: usize) -> Result<Pair, FrameError> {
        self.pairs.get(index).cloned().ok_or(FrameError::NoPair {
            index,
            pairs: self.len(),
        })
    }

    /// All pairs in order.
    pub fn pairs(&self) -> &[Pair] {
        &self.pairs
    }
}

fn check_sizes(sources: &[Source]) -> Result<(), FrameError> {
    let Some(first) = sources.first() else {
        return Ok(());
    };
    match sources.iter().find(|s| s.size() != first.size()) {
        None => Ok(()),
        Some(other) => Err(FrameError::SizesDiffer {
            first: first.name(),
            first_size: first.size(),
            second: other.name(),
            second_size: other.size(),
        }),
    }
}

fn make_pairs(sources: &[Source], order: Order, scale: Scale) -> Result<Vec<Pair>, FrameError> {
    let two = |(index, both): (usize, &[Source])| Pair::in_files(&both[0], &both[1], scale, index);
    match (order, sources) {
        (Order::Pairs, [.., last]) if sources.len() % 2 == 1 => Err(FrameError::OddFrames {
            frames: sources.len(),
            last: last.name(),
        }),
        (Order::Pairs, _) => Ok(sources.chunks_exact(2).enumerate().map(two).collect()),
        (Order::Series, [only]) => Err(FrameError::TooFewFrames { only: only.name() }),
        (Order::Series, _) => Ok(sources.windows(2).enumerate().map(two).collect()),
        (Order::Stacked, _) => stacked_pairs(sources, scale),
    }
}

fn stacked_pairs(sources: &[Source], scale: Scale) -> Result<Vec<Pair>, FrameError> {
    if let Some(odd) = sources.iter().find(|s| s.page.height % 2 == 1) {
        return Err(FrameError::OddHeight {
            image: odd.name(),
            height: odd.page.height,
        });
    }
    let pair = |(index, source)| Pair::stacked(source, scale, index);
    Ok(sources.iter().enumerate().map(pair).collect())
}
