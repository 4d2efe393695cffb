//! A series on disk: what is kept, what is computed again, and what a killed run leaves behind.
#![allow(missing_docs, clippy::unwrap_used)]

use std::collections::BTreeMap;
use std::fs;
use std::path::{Path, PathBuf};
use std::process::{Command, Stdio};
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};
use std::time::{Duration, Instant};

use kolk::frames::{Frame, Pair, Recording, RecordingOptions, Scale};
use kolk::interrogate::{InterrogateError, Plan, PlanOptions, interrogate};
use kolk::series::{Series, SeriesError, default_name, interrogate_series};
use kolk::store::write_tiff;
use kolk::synth::{Flow, ImageOptions, LambOseen, particle_images};
use kolk::task::Task;

fn plan(median_limit: f64) -> Plan {
    let options = serde_json::json!({
        "windows_px": [32, 16], "overlap": 0.5, "median_limit": median_limit,
    });
    Plan::new(&serde_json::from_value::<PlanOptions>(options).unwrap()).unwrap()
}

/// Exposures of a vortex, other particles for every seed.
fn exposures(seed: u64, side: usize) -> (Frame, Frame) {
    let middle = side as f64 / 2.0;
    let flow = Flow::from(LambOseen {
        x: middle,
        y: middle,
        core_radius: 12.0,
        circulation: 200.0,
    });
    let options = ImageOptions {
        width_px: side,
        height_px: side,
        seed,
        ..ImageOptions::default()
    };
    particle_images(&flow, &options).unwrap()
}

/// A folder with the frames of so many pairs as `frames/000_a.tif`, `frames/000_b.tif`, ….
fn folder_of_frames(pairs: u64, side: usize) -> tempfile::TempDir {
    let folder = tempfile::tempdir().unwrap();
    fs::create_dir(folder.path().join("frames")).unwrap();
    for pair in 0..pairs {
        write_pair(folder.path(), pair, pair, side);
    }
    folder
}

fn write_pair(folder: &Path, pair: u64, seed: u64, side: usize) {
    let (first, second) = exposures(seed, side);
    for (letter, frame) in [("a", first), ("b", second)] {
        let path = folder.join(format!("frames/{pair:03}_{letter}.tif"));
        write_tiff(&path, &frame).unwrap();
    }
}

fn open(folder: &Path) -> Recording {
    let patterns = ["frames/*.tif".to_owned()];
    Recording::open(&patterns, folder, &RecordingOptions::default()).unwrap()
}

fn run(recording: &Recording, plan: &Plan, folder: &Path) -> Series {
    interrogate_series(recording, plan, folder, &Task::quiet()).unwrap()
}

/// Every file below `folder` by its path from there.
fn files(folder: &Path) -> BTreeMap<PathBuf, Vec<u8>> {
    let mut found = BTreeMap::new();
    let mut folders = vec![folder.to_owned()];
    while let Some(next) = folders.pop() {
        let Ok(entries) = fs::read_dir(&next) else {
            continue;
        };
        for entry in entries {
            let path = entry.unwrap().path();
            if path.is_dir() {
                folders.push(path);
            } else {
                let name = path.strip_prefix(folder).unwrap().to_owned();
                found.insert(name, fs::read(&path).unwrap());
            }
        }
    }
    found
}

fn bits(values: &ndarray::Array2<f64>) -> Vec<u64> {
    values.iter().map(|x| x.to_bits()).collect()
}

#[test]
fn a_field_read_back_is_the_one_that_was_interrogated_bit_for_bit() {
    let folder = tempfile::tempdir().unwrap();
    let scale = Scale {
        dt_s: Some(0.004),
        mm_per_px: Some(0.07),
    };
    let pairs: Vec<Pair> = (0..3)
        .map(|k| {
            let (first, second) = exposures(k, 96);
            Pair::from_frames(first, second, scale, &format!("made {k}"))
        })
        .collect();
    let recording = Recording::from_pairs(pairs);
    let series = run(&recording, &plan(2.0), &folder.path().join("a.zarr"));
    assert_eq!((series.len(), series.kept()), (3, 0));
    for (pair, field) in recording.pairs().iter().zip(series.fields()) {
        let (field, direct) = (
            field.unwrap(),
            interrogate(pair, &plan(2.0), &Task::quiet()).unwrap(),
        );
        assert_eq!(field.label, direct.label);
        assert_eq!((field.grid, field.time), (direct.grid, direct.time));
        assert_eq!(
            (field.window, &field.status),
            (direct.window, &direct.status)
        );
        assert_eq!(field.error_correlation, direct.error_correlation);
        let ((u, v), (direct_u, direct_v)) = (field.unc.unwrap(), direct.unc.unwrap());
        for (read, made) in [
            (&field.u, &direct.u),
            (&field.v, &direct.v),
            (&u, &direct_u),
            (&v, &direct_v),
        ] {
            assert_eq!(bits(read), bits(made));
        }
    }
}

/// Which frames a run wrote: a file that takes its name by renaming has a new number. The files
/// are held open, so that the system cannot give a number out again while it is remembered.
#[cfg(unix)]
fn numbers(folder: &Path, pairs: usize) -> Vec<(u64, fs::File)> {
    use std::os::unix::fs::MetadataExt;
    let number = |k| {
        let file = fs::File::open(folder.join(format!("u/c.{k}.0.0"))).unwrap();
        (file.metadata().unwrap().ino(), file)
    };
    (0..pairs).map(number).collect()
}

#[cfg(unix)]
#[test]
fn only_what_changed_is_computed_again() {
    let folder = folder_of_frames(6, 64);
    let group = folder.path().join("s.zarr");
    let changed = |before: &[(u64, fs::File)]| -> Vec<usize> {
        let after = numbers(&group, 6);
        (0..6).filter(|&k| before[k].0 != after[k].0).collect()
    };
    run(&open(folder.path()), &plan(2.0), &group);
    let before = numbers(&group, 6);
    let again = run(&open(folder.path()), &plan(2.0), &group);
    assert_eq!((again.kept(), changed(&before)), (6, vec![]));

    write_pair(folder.path(), 3, 99, 64);
    let again = run(&open(folder.path()), &plan(2.0), &group);
    assert_eq!((again.kept(), changed(&before)), (5, vec![3]));

    // A file touched by hand.
    let before = numbers(&group, 6);
    let chunk = group.join("v/c.4.0.0");
    let mut bytes = fs::read(&chunk).unwrap();
    bytes[17] ^= 1;
    fs::write(&chunk, bytes).unwrap();
    assert!(matches!(
        again.field(4),
        Err(SeriesError::Changed { index: 4, .. })
    ));
    let again = run(&open(folder.path()), &plan(2.0), &group);
    assert_eq!((again.kept(), changed(&before)), (5, vec![4]));
    assert!(again.field(4).is_ok());

    let before = numbers(&group, 6);
    let other = run(&open(folder.path()), &plan(3.0), &group);
    assert_eq!((other.kept(), changed(&before)), (0, (0..6).collect()));
    assert!(other.field(0).is_ok());
}

#[test]
fn a_shorter_recording_leaves_no_frames_past_its_end() {
    let folder = folder_of_frames(4, 64);
    let group = folder.path().join("s.zarr");
    run(&open(folder.path()), &plan(2.0), &group);
    for letter in ["a", "b"] {
        fs::remove_file(folder.path().join(format!("frames/003_{letter}.tif"))).unwrap();
    }
    let shorter = run(&open(folder.path()), &plan(2.0), &group);
    assert_eq!((shorter.len(), shorter.kept()), (3, 3));
    let fresh = folder.path().join("fresh.zarr");
    run(&open(folder.path()), &plan(2.0), &fresh);
    assert_eq!(files(&group), files(&fresh));
}

#[test]
fn a_cancelled_run_goes_on_where_it_stopped() {
    let folder = folder_of_frames(40, 64);
    let group = folder.path().join("s.zarr");
    let stop = Arc::new(AtomicBool::new(false));
    let seen = Arc::clone(&stop);
    let task = Task::cancelled_by(stop).reporting(move |step| {
        if step.done >= 2 {
            seen.store(true, Ordering::Relaxed);
        }
    });
    let error = interrogate_series(&open(folder.path()), &plan(2.0), &group, &task).unwrap_err();
    assert!(
        matches!(
            error,
            SeriesError::Cancelled(_) | SeriesError::Interrogate(InterrogateError::Cancelled(_))
        ),
        "{error}"
    );
    let series = run(&open(folder.path()), &plan(2.0), &group);
    assert!((2..40).contains(&series.kept()), "{}", series.kept());
}

#[test]
fn what_cannot_be_a_series_is_refused_with_the_reason() {
    let folder = tempfile::tempdir().unwrap();
    let pair = |side, mm_per_px| {
        let (first, second) = exposures(1, side);
        let scale = Scale {
            dt_s: mm_per_px,
            mm_per_px,
        };
        Pair::from_frames(first, second, scale, "made")
    };
    let refused = |pairs: Vec<Pair>, place: &Path| {
        let recording = Recording::from_pairs(pairs);
        interrogate_series(&recording, &plan(2.0), place, &Task::quiet())
            .unwrap_err()
            .to_string()
    };
    let place = folder.path().join("s.zarr");
    assert_eq!(refused(vec![], &place), "the recording has no pairs");
    for other in [pair(96, None), pair(64, Some(0.1))] {
        let text = refused(vec![pair(64, None), other], &place);
        assert!(
            text.contains("share one size and one calibration"),
            "{text}"
        );
    }
    assert!(!place.exists());
    fs::write(folder.path().join("note.txt"), "mine").unwrap();
    for taken in [folder.path().to_owned(), folder.path().join("note.txt")] {
        let text = refused(vec![pair(64, None)], &taken);
        assert!(text.contains("is no series of vector fields"), "{text}");
    }
    assert_eq!(fs::read(folder.path().join("note.txt")).unwrap(), b"mine");
}

#[test]
fn a_second_series_in_the_same_place_is_not_taken_for_the_first() {
    let folder = folder_of_frames(2, 64);
    let group = folder.path().join("s.zarr");
    let first = run(&open(folder.path()), &plan(2.0), &group);
    assert!(first.field(1).is_ok());
    let wider = serde_json::from_str::<PlanOptions>(r#"{"windows_px": [32]}"#).unwrap();
    let second = run(&open(folder.path()), &Plan::new(&wider).unwrap(), &group);
    assert!(second.field(1).is_ok());
    let error = first.field(1).unwrap_err().to_string();
    assert!(error.contains("no longer what was written"), "{error}");
    assert!(
        first
            .field(2)
            .unwrap_err()
            .to_string()
            .contains("no field 2")
    );
}

#[test]
fn the_name_goes_by_the_files_the_plan_and_pixels_in_memory() {
    let folder = folder_of_frames(2, 64);
    let name = |recording: &Recording, limit| default_name(recording, &plan(limit)).unwrap();
    let files = open(folder.path());
    assert_eq!(name(&files, 2.0), name(&open(folder.path()), 2.0));
    assert_ne!(name(&files, 2.0), name(&files, 3.0));
    let made = |seed| {
        let (first, second) = exposures(seed, 64);
        let pair = Pair::from_frames(first, second, Scale::default(), "made");
        Recording::from_pairs(vec![pair])
    };
    assert_eq!(name(&made(1), 2.0), name(&made(1), 2.0));
    assert_ne!(name(&made(1), 2.0), name(&made(2), 2.0));
    assert!(name(&files, 2.0).starts_with("series/") && name(&files, 2.0).ends_with(".zarr"));
}

const SCRIPT: &str = r#"
let how = plan(#{ windows_px: [32, 16], overlap: 0.75 });
let all = recording("frames/*.tif").interrogate(how, "s.zarr");
print(all.kept);
for flow in all { flow.speed().max(); }
"#;

/// The program at work on the script, quiet.
fn start(folder: &Path) -> std::process::Child {
    Command::new(env!("CARGO_BIN_EXE_kolk"))
        .args(["run", "a.rhai"])
        .current_dir(folder)
        .stdin(Stdio::null())
        .stdout(Stdio::piped())
        .stderr(Stdio::null())
        .spawn()
        .unwrap()
}

#[test]
fn a_run_killed_at_random_moments_leaves_whole_frames_and_ends_the_same() {
    let whole = folder_of_frames(24, 96);
    fs::write(whole.path().join("a.rhai"), SCRIPT).unwrap();
    let began = Instant::now();
    assert!(start(whole.path()).wait().unwrap().success());
    let takes = began.elapsed();
    let expected = files(&whole.path().join("out/s.zarr"));

    let killed = folder_of_frames(24, 96);
    fs::write(killed.path().join("a.rhai"), SCRIPT).unwrap();
    let group = killed.path().join("out/s.zarr");
    let name = |path: &Path| path.file_name().unwrap().to_string_lossy().into_owned();
    // Moments by the golden ratio: spread evenly, in no order. Now and then everything is thrown
    // away, so that early moments are met too.
    for round in 0..16 {
        if round % 4 == 0 {
            let _ = fs::remove_dir_all(&group);
        }
        let part = (0.618_034 * f64::from(round)).fract();
        let mut child = start(killed.path());
        std::thread::sleep(takes.mul_f64(part).max(Duration::from_millis(2)));
        child.kill().unwrap();
        child.wait().unwrap();
        // What has its name is complete, bit for bit; a record has all its chunks.
        let left = files(&group);
        for (path, bytes) in &left {
            if !name(path).starts_with(".kolk-") {
                assert!(
                    bytes == &expected[path],
                    "{} after round {round}",
                    path.display()
                );
            }
        }
        for path in left.keys().filter(|path| path.starts_with("record")) {
            if let Some(k) = name(path)
                .strip_prefix("c.")
                .and_then(|k| k.strip_suffix(".0"))
            {
                for array in ["u", "v", "u_unc", "v_unc", "status"] {
                    let chunk = Path::new(array).join(format!("c.{k}.0.0"));
                    assert!(left.contains_key(&chunk), "{}", chunk.display());
                }
            }
        }
    }
    assert!(start(killed.path()).wait().unwrap().success());
    assert!(files(&group) == expected, "the resumed series differs");
    let output = start(killed.path()).wait_with_output().unwrap();
    assert_eq!(String::from_utf8(output.stdout).unwrap(), "24\n");
}
