//! Recordings and pairs.

use std::sync::Arc;

use rhai::Dynamic;

use super::super::argument::{Argument, Shape};
use super::super::call::Call;
use super::super::draft::Room;
use super::super::fault::Fault;
use super::super::kind::Kind;
use super::super::number::number_text;
use super::super::options::Optional;
use crate::frames::{Pair, Recording, RecordingOptions, Scale, matching_files};
use crate::store::write_tiff;

crate::option_keys! {
    RecordingOptions {
        order: "one of \"pairs\", \"series\" or \"stacked\"", "", "\"pairs\"",
            "How frames make pairs: (0,1)(2,3)..., (0,1)(1,2)..., or one file with the first exposure above the second.";
        dt_s: "number", "s", "none",
            "Time between the two exposures of a pair; with mm_per_px it brings velocities to mm/s.";
        mm_per_px: "number", "mm", "none",
            "Length of one pixel in the light sheet; given together with dt_s or not at all.";
    }
}

impl Kind for Recording {
    const NAME: &'static str = "recording";
    const ABOUT: &'static str = "Pairs of exposures in the order they were taken, with their \
        calibration. Frames load when they are used.";

    fn show(&self) -> String {
        let size = self
            .size()
            .map_or_else(String::new, |(w, h)| format!(" of {w} x {h} px"));
        let pairs = if self.len() == 1 { "pair" } else { "pairs" };
        let masked = masked(self.pairs().iter().any(is_masked));
        format!(
            "recording, {} {pairs}{size}; {}{masked}",
            self.len(),
            calibration(self.scale())
        )
    }

    fn count(&self) -> usize {
        self.len()
    }

    fn item(&self, index: usize) -> Result<Dynamic, Fault> {
        Ok(Dynamic::from(Arc::new(self.pair(index)?)))
    }

    const HAS_ITEMS: bool = true;
}

impl Kind for Pair {
    const NAME: &'static str = "pair";
    const ABOUT: &'static str = "Two exposures of one flow, with their calibration.";

    fn show(&self) -> String {
        let (width, height) = self.size();
        format!(
            "pair {}: {}, {width} x {height} px; {}{}",
            self.index(),
            self.label(),
            calibration(self.scale()),
            masked(is_masked(self))
        )
    }
}

fn is_masked(pair: &Pair) -> bool {
    pair.masks().iter().any(|masks| !masks.is_empty())
}

fn masked(is: bool) -> &'static str {
    if is { "; masked" } else { "" }
}

fn calibration(scale: Scale) -> String {
    match (scale.dt_s, scale.mm_per_px) {
        (Some(dt), Some(mm)) => format!("{} s apart, {} mm a px", number_text(dt), number_text(mm)),
        _ => "in px and frames".to_owned(),
    }
}

/// What a recording is made of.
enum Frames {
    Patterns(Vec<String>),
    Pairs(Vec<Pair>),
}

impl Argument for Frames {
    fn shape() -> Shape {
        Shape::of("text, list of texts, or list of pairs")
    }

    fn take(given: Option<&mut Dynamic>, call: &Call) -> Result<Self, Fault> {
        let Some(given) = given else {
            return Err(Fault::new(
                "takes text, a list of texts, or a list of pairs",
            ));
        };
        if given.is_string() {
            return Ok(Frames::Patterns(vec![given.to_string()]));
        }
        if let Ok(pairs) = Vec::<Arc<Pair>>::take(Some(given), call)
            && !pairs.is_empty()
        {
            return Ok(Frames::Pairs(pairs.iter().map(|p| (**p).clone()).collect()));
        }
        Vec::take(Some(given), call)
            .map(Frames::Patterns)
            .map_err(|_| Fault::new("takes text, a list of texts, or a list of pairs"))
    }
}

/// Writes the records.
pub(super) fn records(room: &mut Room) {
    room.kind::<Recording>();
    room.kind::<Pair>();
    room.function("recording")
        .about(
            "The recording in these image files: grey TIFF or PNG, 8 or 16 bits. A name may hold \
             *, ?, [..] and **; files are taken in natural order (2 before 10). A list of pairs \
             makes a recording in memory.",
        )
        .words("open read images frames files camera load tiff png pattern")
        .input("files", "", "a file name or pattern, a list of them, or a list of pairs")
        .errors(
            "nothing matches, a file is no grey image or differs in size, an exposure has no \
             partner, or only half of the calibration is given",
        )
        .example(
            "let p = taylor_green(#{ wavelength_px: 40, peak_vorticity_per_frame: 0.2 }).pair(#{ width_px: 96, height_px: 64 });\n\
             p.save(\"a.tif\", \"b.tif\");\n\
             recording(\"out/*.tif\", #{ dt_s: 0.01, mm_per_px: 0.2 })",
            "recording, 1 pair of 96 x 64 px; 0.01 s apart, 0.2 mm a px",
        )
        .does(|files: Frames, options: Optional<RecordingOptions>, call: Call| {
            open(files, &options.0, &call)
        });
    of_recordings(room);
    of_pairs(room);
}

fn open(files: Frames, options: &RecordingOptions, call: &Call) -> Result<Recording, Fault> {
    match files {
        Frames::Pairs(pairs) => {
            alike(&pairs)?;
            Ok(Recording::from_pairs(pairs))
        }
        Frames::Patterns(patterns) => {
            let files = matching_files(&patterns, call.base())?;
            // Only names were looked at so far: refuse before anything is opened.
            let files = files
                .iter()
                .map(|file| call.readable(&file.to_string_lossy()))
                .collect::<Result<_, _>>()?;
            Ok(Recording::from_files(files, options)?)
        }
    }
}

/// Refuses pairs that no one grid and no one unit could hold.
fn alike(pairs: &[Pair]) -> Result<(), Fault> {
    let Some(first) = pairs.first() else {
        return Ok(());
    };
    for (k, pair) in pairs.iter().enumerate() {
        let ((w, h), (width, height)) = (pair.size(), first.size());
        if (w, h) != (width, height) {
            return Err(Fault::new(format!(
                "pair {k} is {w} x {h} px but pair 0 is {width} x {height} px: the pairs of a recording must be of one size"
            )));
        }
        if pair.scale() != first.scale() {
            return Err(Fault::new(format!(
                "pair {k} is {} but pair 0 is {}: the pairs of a recording must have one calibration",
                calibration(pair.scale()),
                calibration(first.scale())
            )));
        }
    }
    Ok(())
}

macro_rules! with_two_pairs {
    ($code:literal) => {
        concat!(
            "let p = uniform(#{ u_px_per_frame: 1, v_px_per_frame: 0 }).pair(#{ width_px: 64, height_px: 64 });\nlet rec = recording([p, p]);\n",
            $code
        )
    };
}

fn of_recordings(room: &mut Room) {
    room.method::<Recording>("len")
        .about("How many pairs the recording has.")
        .words("count size number pairs")
        .unit("count")
        .example(with_two_pairs!("rec.len()"), "2")
        .does(|recording: &Recording| recording.len());
    room.method::<Recording>("pair")
        .about("The pair of this number.")
        .words("frame exposure")
        .input("index", "count", "which pair, from 0; -1 is the last")
        .errors("the recording has no such pair")
        .example(with_two_pairs!("rec.pair(1).index"), "1")
        .does(|recording: &Recording, index: i64| pair(recording, index));
    room.index::<Recording>()
        .about("The pair of this number.")
        .words("frame exposure")
        .input("index", "count", "which pair, from 0; -1 is the last")
        .errors("the recording has no such pair")
        .example(with_two_pairs!("rec[-1].index"), "1")
        .does(|recording: &Recording, index: i64| pair(recording, index));
    room.property::<Recording>("files")
        .about("The files the frames are in, in the order they are used.")
        .words("names paths images")
        .example(with_two_pairs!("rec.files"), "[]")
        .does(|recording: &Recording| {
            let files = recording.files().iter();
            files
                .map(|file| file.display().to_string())
                .collect::<Vec<_>>()
        });
    room.property::<Recording>("order")
        .about("How the frames make pairs: \"pairs\", \"series\" or \"stacked\".")
        .words("sequence double frame")
        .example(with_two_pairs!("rec.order"), "\"pairs\"")
        .does(|recording: &Recording| recording.order().text());
    room.property::<Recording>("size_px")
        .about("Width and height of an exposure.")
        .words("width height pixels")
        .unit("px")
        .example(with_two_pairs!("rec.size_px"), "[64, 64]")
        .does(|recording: &Recording| {
            let (width, height) = recording.size().unwrap_or_default();
            vec![width, height]
        });
}

fn pair(recording: &Recording, index: i64) -> Result<Pair, Fault> {
    let count = i64::try_from(recording.len()).unwrap_or(i64::MAX);
    let counted = if index < 0 { index + count } else { index };
    match usize::try_from(counted) {
        Ok(counted) => Ok(recording.pair(counted)?),
        Err(_) => Err(Fault::new(format!(
            "there is no pair {index}: the recording has {count}, the first of them -{count} from the end"
        ))),
    }
}

fn of_pairs(room: &mut Room) {
    room.property::<Pair>("label")
        .about("Where the pair comes from: its files, or the flow it was made from.")
        .words("name file")
        .example(with_two_pairs!("p.label"), "\"synthetic pair\"")
        .does(|pair: &Pair| pair.label().to_owned());
    room.property::<Pair>("index")
        .about("Its number in the recording, from 0.")
        .words("number place")
        .unit("count")
        .example(with_two_pairs!("rec.pair(1).index"), "1")
        .does(|pair: &Pair| pair.index());
    room.property::<Pair>("size_px")
        .about("Width and height of each exposure.")
        .words("width height pixels")
        .unit("px")
        .example(with_two_pairs!("p.size_px"), "[64, 64]")
        .does(|pair: &Pair| {
            let (width, height) = pair.size();
            vec![width, height]
        });
    room.method::<Pair>("save")
        .about("Writes the two exposures as grey TIFF files.")
        .words("write file tiff export images")
        .input("first", "", "file name of the first exposure")
        .input("second", "", "file name of the second")
        .errors("a file cannot be written")
        .example(with_two_pairs!("p.save(\"a.tif\", \"b.tif\")"), "")
        .does(|pair: &Pair, first: String, second: String, call: Call| {
            let (a, b) = pair.load()?;
            call.write(&first, |path| write_tiff(path, &a))?;
            call.write(&second, |path| write_tiff(path, &b))
        });
}
