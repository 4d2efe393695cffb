//! `kolk demo`: a recording of a tidal-inlet basin, made, analysed and tabulated.

use std::path::Path;

use super::arguments::{Demo, Run};
use super::{Outcome, Terminal, run, say};
use crate::quantity::{Symbol, Unit};
use crate::store::write_tiff;
use crate::synth::basin;
use crate::table::{Column, Table};

/// The analysis, as it stands in `scripts/`.
const SCRIPT: &str = include_str!("../../scripts/inlet_basin.rhai");

/// Makes the recording and runs the analysis on it.
pub(super) fn demo(demo: &Demo, terminal: &Terminal) -> Outcome {
    let out = &demo.places.out;
    let recording = out.join("recording");
    if let Err(message) = write_recording(&recording) {
        terminal.complain(&format!("error: {message}\n"));
        return Outcome::Failed;
    }
    let script = out.join("inlet_basin.rhai");
    let written = crate::store::write_atomically(&script, |file| file.write_all(SCRIPT.as_bytes()));
    if let Err(error) = written {
        terminal.complain(&format!("error: {error}\n"));
        return Outcome::Failed;
    }
    say(&format!(
        "wrote {} pairs of images to {}",
        basin::PAIRS,
        recording.display()
    ));
    let inside = |name: &str| recording.join(name).display().to_string();
    let set = vec![
        format!("frames={}", inside("frame_*.tif")),
        format!("truth={}", inside("true_eddies.csv")),
    ];
    say(&format!(
        "running {} --set {} --set {}",
        script.display(),
        set[0],
        set[1]
    ));
    run::run(
        &Run {
            file: Some(script),
            set,
            help: false,
            places: demo.places.clone(),
        },
        terminal,
    )
}

/// Writes the image files and the table of exact eddies.
fn write_recording(folder: &Path) -> Result<(), String> {
    std::fs::create_dir_all(folder).map_err(|error| format!("{}: {error}", folder.display()))?;
    for pair in 0..basin::PAIRS {
        let (first, second) = basin::exposures(pair).map_err(|error| error.to_string())?;
        for (k, frame) in [first, second].iter().enumerate() {
            let file = folder.join(format!("frame_{:02}.tif", 2 * pair + k));
            write_tiff(&file, frame).map_err(|error| error.to_string())?;
        }
    }
    true_eddies()
        .and_then(|table| table.save(&folder.join("true_eddies.csv")))
        .map_err(|error| error.to_string())
}

fn true_eddies() -> Result<Table, crate::table::TableError> {
    let all: Vec<(usize, basin::TrueEddy)> = (0..basin::PAIRS)
        .flat_map(|pair| basin::true_eddies(pair).into_iter().map(move |e| (pair, e)))
        .collect();
    let numbers = |name: &str, unit, value: fn(&basin::TrueEddy) -> f64| {
        Column::new(name, unit, all.iter().map(|(_, eddy)| value(eddy)))
    };
    let circulation = Unit::MM.power(2).per(Unit::of(Symbol::S));
    Table::of(vec![
        Column::new("pair", Unit::ONE, all.iter().map(|(pair, _)| *pair as f64)),
        Column::new("name", Unit::ONE, all.iter().map(|(_, eddy)| eddy.name)),
        numbers("x", Unit::MM, |eddy| eddy.x_mm),
        numbers("y", Unit::MM, |eddy| eddy.y_mm),
        numbers("circulation", circulation, |eddy| {
            eddy.circulation_mm2_per_s
        }),
        numbers("diameter", Unit::MM, |eddy| eddy.diameter_mm),
    ])
}
