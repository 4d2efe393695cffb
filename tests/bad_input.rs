//! Bad input of every kind through the program as it is started: each gives one clear error that
//! says what is wrong, with the exit code the manual states, and never a panic.
//!
//! The small images are those of `tests/data/images`; tables are written by the test.

#![allow(clippy::unwrap_used)] // Tests say what went wrong by failing.

use std::path::Path;
use std::process::{Command, Stdio};

/// A script (or only its last lines, see [`START`]), arguments after `kolk run a.rhai`, the exit
/// code, and a part of the first line of the error.
type Case = (&'static str, &'static [&'static str], i32, &'static str);

/// What stands before every script: an exact field of one eddy and a pair of images.
const START: &str = "\
let eddy = lamb_oseen(#{ x_px: 40, y_px: 40, core_radius_px: 10, circulation_px2_per_frame: 300 });
let flow = eddy.field(#{ nx: 21, ny: 21, spacing_px: 4 });
let still = uniform(#{ u_px_per_frame: 0, v_px_per_frame: 0 });
let pair = still.pair(#{ width_px: 64, height_px: 64 });
";

/// Files beside the script.
const TABLES: [(&str, &str); 8] = [
    ("mph.csv", "x_mm,y_mm,u_mph,v_mph\n0,0,1,2\n"),
    ("empty.csv", ""),
    ("words.csv", "x,y,u,v\n0,0,1,2\n1,0,fast,4\n0,1,1,1\n"),
    (
        "uneven.csv",
        "x,y,u,v\n0,0,1,2\n1,0,1,2\n2,0,1,2\n3,0,1,2\n4,0,1,2\n5.4,0,1,2\n0,1,1,2\n",
    ),
    ("no_v.csv", "x,y,u\n0,0,1\n"),
    (
        "mixed.csv",
        "x_mm,y_mm,u_px_per_frame,v_px_per_frame\n0,0,1,2\n",
    ),
    ("ragged.csv", "a,b\n1,2\n3\n"),
    ("line.csv", "x,y,u,v\n0,0,1,2\n1,0,1,2\n"),
];

const OPTIONS: &[Case] = &[
    (
        "uniform(#{ u_px_per_frame: 1, v_px_per_frame: 0 }).field(#{ nx: 9, ny: 9, spacing_px: 1 }).u.along([0, 0], [8, 8], #{ points: 1000000000000 });",
        &[],
        1,
        "a line takes 2 to 1000000 points, not 1000000000000",
    ),
    (
        "plan(#{ overlp: 0.5 });",
        &[],
        1,
        "there is no option `overlp`",
    ),
    (
        "plan(#{ overlap: \"half\" });",
        &[],
        1,
        "option `overlap` takes a number (fraction), not \"half\"",
    ),
    (
        "plan(#{ overlap: 1 });",
        &[],
        1,
        "overlap is 1: it must be 0 to 0.95",
    ),
    (
        "plan(#{ overlap: -0.1 });",
        &[],
        1,
        "overlap is -0.1: it must be 0 to 0.95",
    ),
    (
        "plan(#{ windows_px: [] });",
        &[],
        1,
        "windows_px is empty: give the window of each pass",
    ),
    (
        "plan(#{ windows_px: [34] });",
        &[],
        1,
        "windows_px has a window of 34 x 34 px: each side must be 4 to 1024 px and a product of 2, 3 and 5",
    ),
    (
        "plan(#{ windows_px: [2048] });",
        &[],
        1,
        "windows_px has a window of 2048 x 2048 px",
    ),
    (
        "plan(#{ windows_px: [32.5] });",
        &[],
        1,
        "option `windows_px`: a window is one whole number of px, or [width, height]",
    ),
    (
        "plan(#{ windows_px: 32 });",
        &[],
        1,
        "option `windows_px` takes a list of whole numbers or [width, height] (px), not 32",
    ),
    (
        "plan([64, 32]);",
        &[],
        1,
        "`options` takes a map of options",
    ),
    (
        "flow.gradient(#{ scheme: \"centred\" });",
        &[],
        1,
        "option `scheme` takes one of \"forward\", \"central\"",
    ),
    (
        "flow.eddies(#{ fraction: 1.5 });",
        &[],
        1,
        "fraction must lie between 0 and 1; it is 1.5",
    ),
    (
        "flow.eddies(#{ least_nodes: -1 });",
        &[],
        1,
        "option `least_nodes` takes a whole number (count), not -1",
    ),
    (
        "uniform(#{ u_px_per_frame: 1 });",
        &[],
        1,
        "option `v_px_per_frame` is missing",
    ),
    (
        "still.pair(#{ width_px: 1e9 });",
        &[],
        1,
        "option `width_px` takes a whole number (px), not 1000000000.0",
    ),
    (
        "still.pair(#{ bits: 7 });",
        &[],
        1,
        "bits is 7: it must be from 8 to 16",
    ),
    (
        "still.pair(#{ width_px: 32768, height_px: 32768 });",
        &[],
        1,
        "make the images smaller or seeding_per_px2 less",
    ),
    (
        "still.field(#{ nx: 1 });",
        &[],
        1,
        "`nx` is 1: it must be 2 to 10000",
    ),
];

const IMAGES: &[Case] = &[
    ("recording(\"missing.tif\");", &[], 1, "there is no file "),
    (
        "recording(\"img/nothing_*.tif\");",
        &[],
        1,
        "no file matches \"img/nothing_*.tif\": looked in ",
    ),
    (
        "recording(\"nowhere/*.tif\");",
        &[],
        1,
        "that folder does not exist",
    ),
    (
        "recording(\"img\");",
        &[],
        1,
        "it is a folder; to take the images in it add /*.tif",
    ),
    ("recording([]);", &[], 1, "no files are named"),
    (
        "recording(3);",
        &[],
        1,
        "`files` takes text, a list of texts, or a list of pairs",
    ),
    (
        "recording([\"img/strips_8.tif\", \"img/tiles_8.tif\", \"img/lzw_8.tif\"]);",
        &[],
        1,
        "order \"pairs\" needs an even number of frames, but there are 3",
    ),
    (
        "recording([\"img/strips_8.tif\", \"img/lzw_8_large.tif\"]);",
        &[],
        1,
        "the frames of a recording must be of one size",
    ),
    (
        "recording([\"img/strips_8.tif\", \"img/bad_colour.tif\"]);",
        &[],
        1,
        "is a colour image (red, green, blue): convert it to 8- or 16-bit grey first",
    ),
    (
        "recording([\"img/strips_8.tif\", \"img/bad_cut_short.tif\"]);",
        &[],
        1,
        "is cut short: its pixels reach to byte 2160, the file ends at byte 1296",
    ),
    (
        "recording([\"img/strips_8.tif\", \"img/bad_empty.tif\"]);",
        &[],
        1,
        "is cut short: it is empty",
    ),
    (
        "recording([\"img/strips_8.tif\", \"img/bad_text.tif\"]);",
        &[],
        1,
        "is not an image kolk reads: it is text",
    ),
    (
        "recording([\"img/bad_float.tif\", \"img/bad_float.tif\"]);",
        &[],
        1,
        "is 32-bit floating-point grey; kolk reads unsigned grey of 8 or 16 bits",
    ),
    (
        "recording(\"img/strips_8.tif\", #{ order: \"stakced\" });",
        &[],
        1,
        "option `order` takes one of \"pairs\", \"series\" or \"stacked\", not \"stakced\"",
    ),
    (
        "recording([\"img/strips_8.tif\", \"img/tiles_8.tif\"], #{ dt_s: 0.01 });",
        &[],
        1,
        "dt_s is given without mm_per_px: a velocity in mm/s needs both",
    ),
    (
        "recording([\"img/strips_8.tif\", \"img/tiles_8.tif\"], #{ dt_s: -1, mm_per_px: 0.1 });",
        &[],
        1,
        "dt_s is -1: it must be a finite number above zero",
    ),
    (
        "recording([\"img/strips_8.tif\", \"img/tiles_8.tif\"]).pair(1);",
        &[],
        1,
        "there is no pair 1: the recording has 1, counted from 0",
    ),
    (
        "recording([\"img/strips_8.tif\", \"img/tiles_8.tif\"])[-2];",
        &[],
        1,
        "there is no pair -2: the recording has 1",
    ),
    (
        "recording([\"img/strips_8.tif\", \"img/tiles_8.tif\"]).pair(0).interrogate();",
        &[],
        1,
        "the image is 40 x 24 px, smaller than the window of 64 x 64 px; choose a smaller window",
    ),
    (
        "pair.interrogate(#{ windows_px: [32] });",
        &[],
        1,
        "`plan` takes a plan, not a map",
    ),
    (
        "recording([pair, still.pair(#{ width_px: 32, height_px: 64 })]);",
        &[],
        1,
        "pair 1 is 32 x 64 px but pair 0 is 64 x 64 px",
    ),
    (
        "uniform(#{ u_px_per_frame: 99, v_px_per_frame: 0 }).pair(#{ width_px: 64, height_px: 64 });",
        &[],
        1,
        "it must stay finite and below 64 px/frame",
    ),
];

const MASKS: &[Case] = &[
    (
        "mask_polygon([[0, 0], [9, 9]]);",
        &[],
        1,
        "a polygon has 3 to 10000 corners, not 2",
    ),
    (
        "mask_polygon([[0, 0], [9, 9], [18, 18]]);",
        &[],
        1,
        "the polygon has no area: its corners lie on one line",
    ),
    (
        "mask_polygon([[0, 0], [9, 9], [9, 0], [0, 9]]);",
        &[],
        1,
        "the sides of the polygon from corner 0 to 1 and from corner 2 to 3 cross: give the corners in their order round it",
    ),
    (
        "mask_polygon([[0, 0], [9], [9, 0]]);",
        &[],
        1,
        "`corners` takes a list of points [x, y] of numbers; item 1 should be a point [x, y] of numbers",
    ),
    (
        "mask_polygon([[0, 0], [1e300, 9], [9, 0]]);",
        &[],
        1,
        "its coordinates must be finite numbers, at most 1000000000",
    ),
    (
        "mask_circle(20, 20, 0);",
        &[],
        1,
        "the radius of the circle is 0: it must be above 0",
    ),
    (
        "mask_circle(20, 20, 5, \"cm\");",
        &[],
        1,
        "the unit of a mask is \"px\" or \"mm\", not \"cm\"",
    ),
    (
        "mask_rectangle([5, 5], [5, 9]);",
        &[],
        1,
        "the rectangle from (5, 5) to (5, 9) has no area: give two opposite corners",
    ),
    (
        "mask_bright(#{ grow_px: 2 });",
        &[],
        1,
        "option `above` is missing",
    ),
    (
        "mask_bright(#{ above: -1 });",
        &[],
        1,
        "above is -1: it must be 0 to 65535",
    ),
    (
        "mask_bright(#{ above: 3000, grow_px: 101 });",
        &[],
        1,
        "grow_px is 101: it must be 0 to 100",
    ),
    (
        "mask_bright(#{ above: 3000, least_area_px2: -4 });",
        &[],
        1,
        "least_area_px2 is -4: it must be 0 to 1000000000",
    ),
    (
        "mask_bright(#{ above: 3000, grow: 4 });",
        &[],
        1,
        "there is no option `grow`",
    ),
    ("mask_image(\"missing.png\");", &[], 1, "there is no file "),
    (
        "mask_image(\"../secret.csv\");",
        &[],
        1,
        "a script may not read ../secret.csv",
    ),
    (
        "mask_image(\"img/pages_16.tif\");",
        &[],
        1,
        "kolk reads a mask from a file of one image",
    ),
    (
        "pair.hide(mask_image(\"img/strips_8.tif\"));",
        &[],
        1,
        "strips_8.tif is 40 x 24 px but the exposures are 64 x 64 px: a mask image must be of their size",
    ),
    (
        "recording([pair]).hide(mask_circle(3, 3, 1, \"mm\"));",
        &[],
        1,
        "a mask in mm needs a recording with dt_s and mm_per_px: give the mask in px",
    ),
    (
        "pair.hide(\"mask.png\");",
        &[],
        1,
        "`mask` takes a mask, not text",
    ),
    (
        "let m = mask_circle(3, 3, 1); for k in 0..10 { m = m + m; }",
        &[],
        1,
        "the masks have 1024 parts together; one mask has at most 1000",
    ),
];

const FOLDERS_AND_TABLES: &[Case] = &[
    (
        "recording(\"/etc/passwd\");",
        &[],
        1,
        "a script may not read /etc/passwd",
    ),
    (
        "read_vectors(\"../secret.csv\");",
        &[],
        1,
        "a script may not read ../secret.csv",
    ),
    (
        "flow.save(\"../flow.csv\");",
        &[],
        1,
        "a script may not write ../flow.csv: it writes only below its output folder",
    ),
    (
        "flow.save(\"/tmp/flow.csv\");",
        &[],
        1,
        "a script may not write /tmp/flow.csv",
    ),
    ("flow.save(\"\");", &[], 1, "the file name is empty"),
    (
        "import \"../../lost\" as l;",
        &[],
        1,
        "a script may not read ../../lost.rhai",
    ),
    ("read_vectors(\"absent.csv\");", &[], 1, "run/absent.csv"),
    (
        "read_vectors(\"empty.csv\");",
        &[],
        1,
        "empty.csv: holds no rows of numbers",
    ),
    ("read_vectors(\"word.csv\");", &[], 1, "there is no file "),
    (
        "read_table(\"word.csv\");",
        &[],
        1,
        "word.csv; the nearest name there is words.csv",
    ),
    (
        "read_vectors(\"mph.csv\");",
        &[],
        1,
        "mph.csv: column u_mph is in \"mph\", which is not made of px, um, mm",
    ),
    (
        "read_vectors(\"words.csv\");",
        &[],
        1,
        "words.csv, line 3: \"fast\" in column 3 is not a number",
    ),
    (
        "read_vectors(\"uneven.csv\");",
        &[],
        1,
        "uneven.csv, line 7: x = 5.4 is off the regular spacing of 1",
    ),
    (
        "read_vectors(\"line.csv\");",
        &[],
        1,
        "at least two different y",
    ),
    (
        "read_vectors(\"no_v.csv\");",
        &[],
        1,
        "no_v.csv: has no column v; its columns are x, y, u",
    ),
    (
        "read_vectors(\"mixed.csv\");",
        &[],
        1,
        "states mm for positions and px/frame for velocities",
    ),
    (
        "read_vectors(\"img/strips_8.tif\");",
        &[],
        1,
        "strips_8.tif: is no text",
    ),
    (
        "read_table(\"ragged.csv\");",
        &[],
        1,
        "ragged.csv, line 3: 1 fields where the headings are 2",
    ),
    (
        "read_table(\"empty.csv\");",
        &[],
        1,
        "the file is empty; a table starts with a line of headings",
    ),
    (
        "table([[\"a\", [1, 2]], [\"b\", [1]]]);",
        &[],
        1,
        "column \"b\" has 1 rows; the table has 2",
    ),
    (
        "table([[\"a\", [1, 2]], [\"a\", [1, 2]]]);",
        &[],
        1,
        "there is a column \"a\" already",
    ),
    (
        "table([[\"width_mm\", [exact(3, \"px\")]]]);",
        &[],
        1,
        "column \"width\", row 1: px and mm do not go together",
    ),
];

const VALUES: &[Case] = &[
    (
        "pair.plane(400, 10);",
        &[],
        1,
        "synthetic pair: the point (400, 10) px is outside the image, which covers x -0.5 to 63.5 and y -0.5 to 63.5 px",
    ),
    (
        "pair.plane(exact(3, \"mm\"), 10);",
        &[],
        1,
        "mm and px do not go together",
    ),
    (
        "measured(1, 0.1, \"mm\") + exact(1, \"px\");",
        &[],
        1,
        "mm and px do not go together",
    ),
    ("exact(1, \"parsec\");", &[], 1, "there is no unit `parsec`"),
    (
        "flow.u.at(500, 0);",
        &[],
        1,
        "the point (500, 0) px is outside the field, which covers x 0 to 80 and y 0 to 80 px",
    ),
    (
        "flow.u.at(exact(3, \"mm\"), 0);",
        &[],
        1,
        "mm and px do not go together",
    ),
    (
        "flow.u + flow.gradient().vorticity();",
        &[],
        1,
        "px/frame and 1/frame do not go together",
    ),
    (
        "flow.eddies()[3];",
        &[],
        1,
        "index 3 is past the end of the eddies",
    ),
    (
        "flow.eddies()[0].diameter_by(\"largest_circulation\");",
        &[],
        1,
        "the circulation has no maximum up to a radius of",
    ),
    (
        "flow.eddies()[0].diameter_by(\"largest\");",
        &[],
        1,
        "there is no method \"largest\"",
    ),
    (
        "still.field(#{ nx: 4, ny: 4 }).eddies();",
        &[],
        1,
        "finding eddies needs a grid of at least 5 x 5 nodes; this one has 4 x 4",
    ),
    (
        "flow.status_count(\"good\");",
        &[],
        1,
        "there is no status \"good\"",
    ),
    ("figure().save(\"a.svg\");", &[], 1, "the figure is empty"),
    (
        "figure().shade(flow).save(\"a.svg\");",
        &[],
        1,
        "`field` takes a scalar field, not a vector field",
    ),
    (
        "figure().shade(flow.u).save(\"a.bmp\");",
        &[],
        1,
        "cannot tell the format of a.bmp: end the name in .svg or .png",
    ),
    (
        "figure().shade(flow.u, #{ range: [1, 0] }).save(\"a.svg\");",
        &[],
        1,
        "range 1 to 0 is no range",
    ),
    (
        "figure().line([1, 2], [1]).save(\"a.svg\");",
        &[],
        1,
        "the curve: y needs one number for each of the 2 points, not 1",
    ),
    (
        "figure().size_mm(5, 5).shade(flow.u).save(\"a.svg\");",
        &[],
        1,
        "5 x 5 mm leaves no room for the plot",
    ),
];

const SCRIPTS: &[Case] = &[
    (
        "let list = [1, 2];\nprint(list[2]);",
        &[],
        1,
        "index 2 is past the end of the list",
    ),
    ("sqrt(1, 2);", &[], 1, "`sqrt` takes 1 value, not 2"),
    (
        "measured(1);",
        &[],
        1,
        "`measured` takes 2 to 3 values, not 1",
    ),
    ("print(overlpa);", &[], 1, "there is no variable `overlpa`"),
    (
        "squareroot(2);",
        &[],
        1,
        "there is no function `squareroot` for a number",
    ),
    (
        "flow.gradeint();",
        &[],
        1,
        "there is no function `gradeint` for a vector field",
    ),
    (
        "print(flow.w);",
        &[],
        1,
        "a vector field has no property `w`",
    ),
    ("if true {\n  print(1);", &[], 1, "`}` is missing"),
    ("let a = \"open;", &[], 1, "this text is not closed"),
    ("import \"lost\" as l;", &[], 1, "there is no module `lost`"),
    ("1 / 0;", &[], 1, "division by zero: 1 / 0"),
    (
        "fn f(n) { f(n + 1) }\nf(0);",
        &[],
        1,
        "functions call one another too deeply",
    ),
    ("throw \"too dark\";", &[], 1, "too dark"),
];

const COMMAND_LINE: &[Case] = &[
    (
        "setting(\"pairs\", 3);",
        &["--set", "pair=4"],
        2,
        "--set: the script has no setting `pair`; did you mean `pairs`?",
    ),
    (
        "setting(\"pairs\", 3);",
        &["--set", "pairs=four"],
        1,
        "the setting `pairs` takes a whole number (its default is 3), not `four`",
    ),
    (
        "setting(\"pairs\", 3);",
        &["--set", "pairs"],
        2,
        "--set: `pairs` is not of the form name=value",
    ),
    ("", &["--read", "nowhere"], 2, "cannot use the folder "),
    (
        "flow.save(\"flow.csv\");",
        &["--out", "a.rhai"],
        1,
        "cannot use the folder ",
    ),
    (
        "",
        &["--threads", "0"],
        2,
        "invalid value '0' for '--threads <N>': 0 is not in 1..=1024",
    ),
    (
        "",
        &["--threads", "-1"],
        2,
        "invalid value '-1' for '--threads <N>'",
    ),
    ("", &["--quick"], 2, "unexpected argument '--quick' found"),
];

fn folder() -> tempfile::TempDir {
    let folder = tempfile::tempdir().unwrap();
    let images = folder.path().join("run/img");
    std::fs::create_dir_all(&images).unwrap();
    let from = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/data/images");
    for entry in std::fs::read_dir(from).unwrap() {
        let path = entry.unwrap().path();
        std::fs::copy(&path, images.join(path.file_name().unwrap())).unwrap();
    }
    std::fs::write(folder.path().join("secret.csv"), "x").unwrap();
    for (name, text) in TABLES {
        std::fs::write(folder.path().join("run").join(name), text).unwrap();
    }
    folder
}

/// What differs from what the table says.
fn check(folder: &Path, (script, arguments, code, part): &Case) -> Option<String> {
    let text = format!("{START}{script}\n");
    std::fs::write(folder.join("a.rhai"), text).unwrap();
    let output = Command::new(env!("CARGO_BIN_EXE_kolk"))
        .args(["run", "a.rhai"])
        .args(*arguments)
        .current_dir(folder)
        .stdin(Stdio::null())
        .output()
        .unwrap();
    let shown = String::from_utf8(output.stderr).unwrap();
    let first = shown.lines().next().unwrap_or("");
    let internal = [
        "panicked",
        "kolk itself failed",
        "Dynamic",
        "rhai::",
        "i64",
        "f64",
    ];
    let fits = output.status.code() == Some(*code)
        && first.starts_with("error: ")
        && first.contains(part)
        && !internal.iter().any(|word| shown.contains(word));
    (!fits).then(|| {
        format!(
            "{script} {arguments:?}: exit code {:?}, not {code}; {part:?} expected in\n{shown}",
            output.status.code()
        )
    })
}

fn check_all(cases: &[Case]) {
    let folder = folder();
    let run = folder.path().join("run");
    let wrong: Vec<String> = cases.iter().filter_map(|case| check(&run, case)).collect();
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

#[test]
fn options_that_make_no_sense_are_named() {
    check_all(OPTIONS);
}

#[test]
fn images_that_cannot_be_used_are_named_with_the_reason() {
    check_all(IMAGES);
}

#[test]
fn masks_that_make_no_sense_are_refused_with_the_reason() {
    check_all(MASKS);
}

#[test]
fn folders_and_tables_that_cannot_be_used_are_named_with_the_reason() {
    check_all(FOLDERS_AND_TABLES);
}

#[test]
fn values_that_do_not_go_together_are_refused() {
    check_all(VALUES);
}

#[test]
fn scripts_that_are_wrong_are_shown_where() {
    check_all(SCRIPTS);
}

#[test]
fn command_lines_that_are_wrong_are_refused() {
    check_all(COMMAND_LINE);
}

#[test]
fn a_failed_run_leaves_earlier_results_whole() {
    let folder = folder();
    let run = folder.path().join("run");
    let kolk = |script: &str| {
        std::fs::write(run.join("a.rhai"), format!("{START}{script}\n")).unwrap();
        Command::new(env!("CARGO_BIN_EXE_kolk"))
            .args(["run", "a.rhai"])
            .current_dir(&run)
            .stdin(Stdio::null())
            .output()
            .unwrap()
            .status
            .code()
    };
    assert_eq!(kolk("flow.save(\"flow.csv\");"), Some(0));
    let before = std::fs::read(run.join("out/flow.csv")).unwrap();
    assert_eq!(kolk("figure().save(\"flow.csv\");"), Some(1));
    assert_eq!(kolk("flow.save(\"flow.csv\"); throw \"no\";"), Some(1));
    assert_eq!(std::fs::read(run.join("out/flow.csv")).unwrap(), before);
}
