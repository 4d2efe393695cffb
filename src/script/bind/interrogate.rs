//! Plans, and pairs to vector fields.

use std::sync::Arc;

use rhai::Dynamic;

use super::super::call::Call;
use super::super::draft::Room;
use super::super::fault::Fault;
use super::super::kind::Kind;
use super::super::options::Optional;
use super::vortex::FoundEddies;
use crate::field::{Status, VectorField};
use crate::frames::{Pair, Recording};
use crate::interrogate::{Plan, PlanOptions, correlate_together, interrogate};
use crate::series::{Series, default_name, interrogate_series};
use crate::vortex::{EddyOptions, find_eddies};

crate::option_keys! {
    PlanOptions {
        windows_px: "list of whole numbers or [width, height]", "px", "[64, 32, 32, 32]",
            "Interrogation window of each pass: one number for a square; 4 to 1024, a product of 2, 3 and 5.";
        overlap: "number", "fraction", "0.75",
            "Share of a window that its neighbour also covers, 0 to 0.95.";
        median_limit: "number", "plain number", "2.0",
            "Normalized median residual above which a vector is replaced (Westerweel & Scarano 2005).";
        median_floor_px: "number", "px", "0.1",
            "Displacement noise the median test tolerates.";
        least_lit: "number", "fraction", "0.5",
            "Share of a window that must lie inside the image and outside masks.";
        flatten_px: "whole number", "px", "25",
            "Side of the square over which the lighting is made even first: local mean and contrast are taken out; 0 for none, else 9 to 255.";
        join_neighbours: "true or false", "", "false",
            "In every pass but the last, average the correlation plane of a window with those half a window away: for thin seeding.";
    }
}

impl Kind for Plan {
    const NAME: &'static str = "plan";
    const ABOUT: &'static str = "How pairs are interrogated: the windows of each pass, in px, and the limits of validation.";

    fn show(&self) -> String {
        self.to_string()
    }
}

impl Kind for Series {
    const NAME: &'static str = "series of fields";
    const ABOUT: &'static str = "Vector fields one after another, one a pair of a recording, all on \
        one grid. They lie on disk and load when they are used; `for` goes through them, [i] picks \
        one.";

    fn show(&self) -> String {
        let first = match self.field(0) {
            Ok(first) => first.show(),
            Err(error) => error.to_string(),
        };
        format!("series of {} fields, the first: {first}", self.len())
    }

    fn count(&self) -> usize {
        self.len()
    }

    fn item(&self, index: usize) -> Result<Dynamic, Fault> {
        Ok(Dynamic::from(Arc::new(self.field(index)?)))
    }

    const HAS_ITEMS: bool = true;
}

/// A pair the examples look at.
macro_rules! with_a_recording {
    ($code:literal) => {
        concat!(
            "let p = uniform(#{ u_px_per_frame: 2, v_px_per_frame: 0 }).pair(#{ width_px: 128, height_px: 128 });\n",
            $code
        )
    };
}

/// Writes the records.
pub(super) fn records(room: &mut Room) {
    room.kind::<Plan>();
    room.kind::<Series>();
    room.function("plan")
        .about(
            "How pairs are to be interrogated: multi-pass cross-correlation with symmetric image \
             deformation between the passes.",
        )
        .words("interrogation windows passes overlap settings correlation")
        .errors("an option is out of its range")
        .source("Scarano 2002 (deformation); Westerweel & Scarano 2005 (validation)")
        .example(
            "plan(#{ windows_px: [64, 32, 32], overlap: 0.75 })",
            "plan: windows 64, 32, 32 px, overlap 0.75",
        )
        .does(|options: Optional<PlanOptions>| Plan::new(&options.0));
    room.method::<Pair>("interrogate")
        .about("The vector field of the pair: displacement of the particle pattern, window by window.")
        .words("correlate displacement velocity vectors measure")
        .input("plan", "", "how; the default plan when left out")
        .unit("px/frame, or mm/s for a calibrated recording")
        .errors("a frame cannot be read or is smaller than the window")
        .source("Scarano 2002; Wereley & Meinhart 2001; Westerweel & Scarano 2005")
        .example(
            with_a_recording!(
                "let flow = p.interrogate(plan(#{ windows_px: [32, 32], overlap: 0.5 }));\ndecimals(flow.u.mean().value, 1)"
            ),
            "\"2.0\"",
        )
        .does(|pair: &Pair, plan: Option<Arc<Plan>>, call: Call| {
            let field = interrogate(pair, &*given(plan)?, &call.task())?;
            // The pairs of a recording differ in the numbers of their names.
            let without_digits = |c: &char| !c.is_ascii_digit();
            let recording: String = pair.label().chars().filter(without_digits).collect();
            note_poor_yield(std::slice::from_ref(&field), &recording, &call);
            Ok::<_, Fault>(field)
        });
    room.method::<Recording>("interrogate")
        .about(
            "The vector fields of all pairs, over all cores, with progress; Ctrl-C stops it. They \
             are written as one Zarr group below the output folder, frame by frame: run again, \
             what is there from the same images, masks and plan is kept, and only the rest is computed.",
        )
        .words("correlate displacement velocity vectors measure series all zarr resume")
        .input("plan", "", "how; the default plan when left out")
        .input(
            "folder",
            "",
            "name of the Zarr group; left out, series/….zarr by the files, masks and plan",
        )
        .unit("px/frame, or mm/s for a calibrated recording")
        .errors(
            "a frame cannot be read or is smaller than the window, the pairs differ in size, or \
             the folder holds something else",
        )
        .source("Scarano 2002; Wereley & Meinhart 2001; Westerweel & Scarano 2005; Zarr 3.0")
        .example(
            with_a_recording!(
                "recording([p, p]).interrogate(plan(#{ windows_px: [32], overlap: 0 })).len()"
            ),
            "2",
        )
        .example(
            with_a_recording!(
                "let all = recording([p, p]).interrogate(plan(#{ windows_px: [32], overlap: 0 }), \"steady.zarr\");\nfor flow in all { print(decimals(flow.u.mean().value, 1)); }"
            ),
            "2.0\n2.0",
        )
        .does(
            |recording: &Recording, plan: Option<Arc<Plan>>, folder: Option<String>, call: Call| {
                let all = series(recording, &*given(plan)?, folder, &call)?;
                if !all.is_empty() {
                    // One pair says whether the order and the windows are right.
                    let files = recording.files().iter().map(|f| f.to_string_lossy());
                    let name = files.collect::<Vec<_>>().join(" ");
                    note_poor_yield(std::slice::from_ref(&all.field(0)?), &name, &call);
                }
                Ok::<_, Fault>(all)
            },
        );
    room.method::<Recording>("correlate_together")
        .about(
            "One vector field of a steady flow from all pairs: their correlation planes are summed \
             window by window before the peaks are read.",
        )
        .words("ensemble average mean steady sum correlation thin seeding sparse")
        .input("plan", "", "how to do it; left out, the default plan")
        .unit("px/frame, or mm/s for a calibrated recording")
        .errors("there is no pair, the pairs differ in size or calibration, or a frame cannot be read")
        .source("Meinhart, Wereley & Santiago 2000 (from memory)")
        .example(
            "let flow = uniform(#{ u_px_per_frame: 2, v_px_per_frame: 0 });\nlet thin = |seed| flow.pair(#{ width_px: 128, height_px: 128, seeding_per_px2: 0.002, seed: seed });\nlet all = recording([thin.call(1), thin.call(2), thin.call(3), thin.call(4), thin.call(5), thin.call(6)]);\nprint(decimals(all.correlate_together(plan(#{ windows_px: [32, 32], overlap: 0.5 })).u.mean().value, 1));",
            "2.0",
        )
        .does(|recording: &Recording, plan: Option<Arc<Plan>>, call: Call| {
            let label = format!("{} pairs together", recording.len());
            let field = correlate_together(recording.pairs(), &*given(plan)?, &label, &call.task());
            Ok::<_, Fault>(field?)
        });
    of_series(room);
    super::plane::records(room);
}

/// Below this share of measured vectors something is likely to be wrong with the settings. Common
/// practice, no source.
const POOR_YIELD: f64 = 0.7;

fn note_poor_yield(fields: &[VectorField], recording: &str, call: &Call) {
    let count = |status| fields.iter().map(|f| f.count(status)).sum::<usize>();
    let measured = count(Status::Measured);
    let nodes: usize = fields.iter().map(|f| f.status.len()).sum();
    let all = nodes - count(Status::Masked);
    if (measured as f64) < POOR_YIELD * all as f64 {
        let percent = 100 * measured / all;
        let note = format!(
            "{percent} % of the vectors are measured; is the order \"pairs\" or \"series\" right, \
             and the window large enough for the motion?"
        );
        call.session().note(recording, &note);
    }
}

pub(super) fn given(plan: Option<Arc<Plan>>) -> Result<Arc<Plan>, Fault> {
    match plan {
        Some(plan) => Ok(plan),
        None => Ok(Arc::new(Plan::new(&PlanOptions::default())?)),
    }
}

fn series(
    recording: &Recording,
    plan: &Plan,
    folder: Option<String>,
    call: &Call,
) -> Result<Series, Fault> {
    let folder = match folder {
        Some(folder) => folder,
        None => default_name(recording, plan)?,
    };
    call.write(&folder, |path| {
        interrogate_series(recording, plan, path, &call.task())
    })
}

fn of_series(room: &mut Room) {
    room.method::<Series>("len")
        .about("How many fields the series has.")
        .words("count size number")
        .unit("count")
        .example(
            with_a_recording!(
                "recording([p, p, p]).interrogate(plan(#{ windows_px: [32], overlap: 0 })).len()"
            ),
            "3",
        )
        .does(|series: &Series| series.len());
    room.property::<Series>("kept")
        .about("How many of its fields were there already, from an earlier run.")
        .words("resume reuse again count")
        .unit("count")
        .example(
            with_a_recording!("let how = plan(#{ windows_px: [32], overlap: 0 });\nrecording([p, p]).interrogate(how, \"a.zarr\");\nrecording([p, p, p]).interrogate(how, \"a.zarr\").kept"),
            "2",
        )
        .does(|series: &Series| series.kept());
    room.index::<Series>()
        .about("The field of this number.")
        .words("pick choose one")
        .input("index", "count", "which field, from 0; -1 is the last")
        .unit("px/frame, or mm/s")
        .errors("the series has no such field, or it was overwritten since")
        .example(
            with_a_recording!("let all = recording([p, p]).interrogate(plan(#{ windows_px: [64], overlap: 0 }));\nall[-1].status_count(\"measured\")"),
            "4",
        )
        .does(|series: &Series, index: i64| {
            let index = counted(series.len(), index, "series", "fields")?;
            series.field(index).map_err(Fault::from)
        });
    room.method::<Series>("eddies")
        .about("The eddies of every field, as a list with one entry a field; over all cores.")
        .words("vortex vortices find detect cores")
        .errors(
            "an option makes no sense, a field is smaller than 5 x 5 nodes or was overwritten since",
        )
        .source("Zhou, Adrian, Balachandar & Kendall 1999 (swirling strength)")
        .example(
            with_a_recording!("let all = recording([p, p]).interrogate(plan(#{ windows_px: [32], overlap: 0.5 }));\nall.eddies().len()"),
            "2",
        )
        .does(|series: &Series, options: Optional<EddyOptions>, call: Call| {
            all_eddies(series, &options.0, &call)
        });
}

fn all_eddies(
    series: &Series,
    options: &EddyOptions,
    call: &Call,
) -> Result<Vec<FoundEddies>, Fault> {
    use rayon::prelude::*;
    let task = call.task();
    (0..series.len())
        .into_par_iter()
        .map(|index| {
            let found = find_eddies(&series.field(index)?, options, &task)?;
            Ok(FoundEddies(Arc::new(found)))
        })
        .collect()
}

/// The place among `count` of an index that counts from the end below 0.
pub(super) fn counted(count: usize, index: i64, whole: &str, name: &str) -> Result<usize, Fault> {
    let length = i64::try_from(count).unwrap_or(i64::MAX);
    let place = if index < 0 { index + length } else { index };
    usize::try_from(place)
        .ok()
        .filter(|place| *place < count)
        .ok_or_else(|| {
            let fault = Fault::new(format!("index {index} is past the end of the {whole}"));
            match count {
                0 => fault.hint("there are none"),
                1 => fault.hint("there is one, number 0"),
                n => fault.hint(format!("there are {n} {name}, numbered 0 to {}", n - 1)),
            }
        })
}
