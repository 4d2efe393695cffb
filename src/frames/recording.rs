//! Frames in the order they were taken, cut into pairs.

use std::path::{Path, PathBuf};
use std::sync::Arc;

use rayon::prelude::*;
use serde::{Deserialize, Serialize};

use super::names::matching_files;
use super::pair::Source;
use super::read::headers;
use super::{FrameError, Mask, Pair, Scale};

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

    /// The same recording with the pixels of `mask` hidden in every exposure, beside what is
    /// hidden already.
    ///
    /// # Errors
    /// As [`Pair::hide`].
    pub fn hide(&self, mask: &Mask) -> Result<Recording, FrameError> {
        let pairs = self.pairs.iter().map(|pair| pair.hide(mask));
        Ok(Recording {
            pairs: pairs.collect::<Result<_, _>>()?,
            ..self.clone()
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

#[cfg(test)]
mod tests {
    use super::*;
    use crate::frames::Frame;
    use crate::store::write_tiff;
    use ndarray::Array2;

    /// A folder with frames of these sizes, all pixels of frame k being k, as `f_1.tif`, ….
    fn folder(sizes: &[(usize, usize)]) -> tempfile::TempDir {
        let folder = tempfile::tempdir().unwrap();
        for (k, &(width, height)) in sizes.iter().enumerate() {
            let pixels = Array2::from_elem((height, width), k as f32);
            let path = folder.path().join(format!("f_{}.tif", k + 1));
            write_tiff(&path, &Frame { pixels, bits: 8 }).unwrap();
        }
        folder
    }

    fn options(order: Order) -> RecordingOptions {
        RecordingOptions {
            order,
            ..Default::default()
        }
    }

    fn open(folder: &Path, order: Order) -> Result<Recording, FrameError> {
        Recording::open(&["*.tif".to_owned()], folder, &options(order))
    }

    fn error(sizes: &[(usize, usize)], order: Order) -> String {
        open(folder(sizes).path(), order).unwrap_err().to_string()
    }

    fn levels(recording: &Recording) -> Vec<(f32, f32)> {
        let both = |pair: &Pair| {
            let (first, second) = pair.load().unwrap();
            (first.pixels[(0, 0)], second.pixels[(0, 0)])
        };
        recording.pairs().iter().map(both).collect()
    }

    #[test]
    fn frames_make_pairs_in_each_order() {
        let folder = folder(&[(6, 4); 12]);
        let pairs = open(folder.path(), Order::Pairs).unwrap();
        let expected: Vec<_> = (0..6)
            .map(|k| (2.0 * k as f32, 2.0 * k as f32 + 1.0))
            .collect();
        assert_eq!(levels(&pairs), expected);
        assert_eq!((pairs.len(), pairs.files().len()), (6, 12));
        let last = pairs.pair(5).unwrap();
        assert_eq!((last.label(), last.index()), ("f_11.tif and f_12.tif", 5));
        let series = open(folder.path(), Order::Series).unwrap();
        let expected: Vec<_> = (0..11).map(|k| (k as f32, k as f32 + 1.0)).collect();
        assert_eq!(levels(&series), expected);
        let stacked = open(folder.path(), Order::Stacked).unwrap();
        assert_eq!((stacked.len(), stacked.size()), (12, Some((6, 2))));
        assert_eq!(stacked.pair(2).unwrap().label(), "f_3.tif");
    }

    #[test]
    fn frames_load_when_used_and_not_before() {
        let folder = folder(&[(6, 4); 2]);
        let recording = open(folder.path(), Order::Pairs).unwrap();
        std::fs::remove_file(folder.path().join("f_2.tif")).unwrap();
        let error = recording.pair(0).unwrap().load().unwrap_err();
        assert!(matches!(error, FrameError::Missing { .. }), "{error}");
    }

    #[test]
    fn a_file_that_changed_size_after_opening_is_noticed() {
        let folder = folder(&[(6, 4); 2]);
        let recording = open(folder.path(), Order::Pairs).unwrap();
        let pixels = Array2::zeros((5, 6));
        write_tiff(&folder.path().join("f_2.tif"), &Frame { pixels, bits: 8 }).unwrap();
        let error = recording.pair(0).unwrap().load().unwrap_err().to_string();
        assert!(error.contains("f_2.tif is 6 x 5 px but"), "{error}");
    }

    #[test]
    fn frames_that_do_not_pair_are_refused_with_the_reason() {
        let text = error(&[(6, 4); 3], Order::Pairs);
        assert!(
            text.contains("even number of frames, but there are 3, the last one"),
            "{text}"
        );
        assert!(text.contains("f_3.tif"), "{text}");
        let text = error(&[(6, 4)], Order::Series);
        assert!(
            text.contains("at least two frames, but there is only"),
            "{text}"
        );
        let text = error(&[(6, 4), (6, 4), (6, 5), (6, 4)], Order::Pairs);
        assert!(text.contains("f_3.tif is 6 x 5 px but") && text.contains("f_1.tif is 6 x 4 px"));
        let text = error(&[(6, 5)], Order::Stacked);
        assert!(
            text.contains("f_1.tif is 5 px high") && text.contains("even height"),
            "{text}"
        );
    }

    #[test]
    fn a_pair_past_the_end_says_how_many_there_are() {
        let folder = folder(&[(6, 4); 4]);
        let error = open(folder.path(), Order::Pairs)
            .unwrap()
            .pair(2)
            .unwrap_err();
        assert_eq!(
            error.to_string(),
            "there is no pair 2: the recording has 2, counted from 0"
        );
    }

    #[test]
    fn a_calibration_is_whole_and_positive_or_refused() {
        let scale = |dt_s, mm_per_px| {
            let order = Order::Pairs;
            RecordingOptions {
                order,
                dt_s,
                mm_per_px,
            }
            .scale()
            .map_err(|e| e.to_string())
        };
        assert_eq!(scale(None, None), Ok(Scale::default()));
        let both = Scale {
            dt_s: Some(0.004),
            mm_per_px: Some(0.05),
        };
        assert_eq!(scale(Some(0.004), Some(0.05)), Ok(both));
        assert!(
            scale(Some(0.004), None)
                .unwrap_err()
                .contains("dt_s is given without mm_per_px")
        );
        assert!(
            scale(None, Some(0.05))
                .unwrap_err()
                .contains("mm_per_px is given without dt_s")
        );
        for bad in [0.0, -1.0, f64::NAN, f64::INFINITY] {
            assert!(
                scale(Some(bad), Some(0.05))
                    .unwrap_err()
                    .starts_with("dt_s is ")
            );
            assert!(
                scale(Some(0.004), Some(bad))
                    .unwrap_err()
                    .starts_with("mm_per_px is ")
            );
        }
    }

    #[test]
    fn options_read_by_their_names_and_refuse_others() {
        let read = |text: &str| serde_json::from_str::<RecordingOptions>(text);
        let options = read(r#"{"order": "series", "dt_s": 0.01, "mm_per_px": 2}"#).unwrap();
        assert_eq!(
            (options.order, options.mm_per_px),
            (Order::Series, Some(2.0))
        );
        assert_eq!(read("{}").unwrap(), RecordingOptions::default());
        assert!(
            read(r#"{"dt_ms": 4}"#)
                .unwrap_err()
                .to_string()
                .contains("dt_ms")
        );
    }

    #[test]
    fn pairs_in_memory_are_renumbered_and_checked() {
        let frame = |width| Frame {
            pixels: Array2::zeros((4, width)),
            bits: 8,
        };
        let scale = Scale {
            dt_s: Some(0.004),
            mm_per_px: Some(0.05),
        };
        let pair = |second| Pair::from_frames(frame(6), frame(second), scale, "made");
        let recording = Recording::from_pairs(vec![pair(6), pair(7)]);
        assert_eq!((recording.len(), recording.scale()), (2, scale));
        assert_eq!(recording.pair(1).unwrap().index(), 1);
        assert!(recording.pair(0).unwrap().load().is_ok());
        let error = recording.pair(1).unwrap().load().unwrap_err().to_string();
        assert!(
            error.contains("the second frame of made is 7 x 4 px"),
            "{error}"
        );
        assert!(Recording::from_pairs(Vec::new()).is_empty());
    }
}
