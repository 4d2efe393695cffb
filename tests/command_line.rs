//! The program as it is started: what it prints, writes and exits with.

#![allow(clippy::unwrap_used)] // Tests say what went wrong by failing.

use std::io::Write;
use std::path::Path;
use std::process::{Command, Output, Stdio};

fn kolk(folder: &Path, arguments: &[&str]) -> Output {
    Command::new(env!("CARGO_BIN_EXE_kolk"))
        .args(arguments)
        .current_dir(folder)
        .stdin(Stdio::null())
        .output()
        .unwrap()
}

fn text(bytes: &[u8]) -> String {
    String::from_utf8(bytes.to_vec()).unwrap()
}

/// A folder with `a.rhai` holding `script`.
fn folder_with(script: &str) -> tempfile::TempDir {
    let folder = tempfile::tempdir().unwrap();
    std::fs::write(folder.path().join("a.rhai"), script).unwrap();
    folder
}

#[test]
fn a_script_prints_to_standard_output_and_exits_with_0() {
    let folder = folder_with("print(1 / 2);");
    let output = kolk(folder.path(), &["run", "a.rhai"]);
    assert_eq!(output.status.code(), Some(0));
    assert_eq!(text(&output.stdout), "0.5\n");
    assert_eq!(text(&output.stderr), "");
}

#[test]
fn a_script_error_shows_file_line_and_hint_and_exits_with_1() {
    let folder = folder_with("let width = 3;\nprint(widht);\n");
    let output = kolk(folder.path(), &["run", "a.rhai"]);
    assert_eq!(output.status.code(), Some(1));
    let shown = text(&output.stderr);
    for part in [
        "there is no variable `widht`",
        "a.rhai:2:7",
        "print(widht);",
        "did you mean `width`?",
    ] {
        assert!(shown.contains(part), "{part} is missing in\n{shown}");
    }
    assert!(!shown.contains('\u{1b}'), "colour where no terminal is");
}

#[test]
fn an_error_in_a_module_shows_the_module_and_the_calls() {
    let folder = folder_with("import \"b\" as b;\nfn twice(x) { b::width(x) }\ntwice(3);\n");
    std::fs::write(folder.path().join("b.rhai"), "fn width(e) {\n  e.wide\n}\n").unwrap();
    let output = kolk(folder.path(), &["run", "a.rhai"]);
    let shown = text(&output.stderr);
    for part in [
        "a number has no property `wide`",
        "b.rhai:2:5",
        "in width, called at a.rhai:2:",
        "in twice, called at a.rhai:3:1",
    ] {
        assert!(shown.contains(part), "{part} is missing in\n{shown}");
    }
}

#[test]
fn modules_that_import_one_another_are_reported() {
    let folder = folder_with("import \"b\" as b;");
    std::fs::write(folder.path().join("b.rhai"), "import \"c\" as c;").unwrap();
    std::fs::write(folder.path().join("c.rhai"), "import \"b\" as b;").unwrap();
    let shown = text(&kolk(folder.path(), &["run", "a.rhai"]).stderr);
    assert!(shown.contains("b.rhai -> c.rhai -> b.rhai"), "{shown}");
}

#[test]
fn files_are_written_below_the_output_folder_and_named() {
    let folder = folder_with("table([[\"a\", [1]]]).save(\"t/a.csv\");");
    let output = kolk(folder.path(), &["run", "a.rhai", "--out", "results"]);
    assert_eq!(output.status.code(), Some(0), "{}", text(&output.stderr));
    assert_eq!(text(&output.stderr), "wrote results/t/a.csv\n");
    let written = std::fs::read_to_string(folder.path().join("results/t/a.csv")).unwrap();
    assert_eq!(written, "a\n1\n");
}

#[test]
fn settings_are_listed_taken_and_checked() {
    let script = "// Counts pairs.\nlet n = setting(\"pairs\", 12, \"how many pairs\");\nprint(n);";
    let folder = folder_with(script);
    let help = text(&kolk(folder.path(), &["run", "a.rhai", "--help"]).stdout);
    assert!(help.contains("Counts pairs."), "{help}");
    assert!(
        help.contains("pairs  how many pairs (default 12)"),
        "{help}"
    );
    let taken = kolk(folder.path(), &["run", "a.rhai", "--set", "pairs=3"]);
    assert_eq!(text(&taken.stdout), "3\n");
    let unknown = kolk(folder.path(), &["run", "a.rhai", "--set", "pair=3"]);
    assert_eq!(unknown.status.code(), Some(2));
    assert!(text(&unknown.stderr).contains("did you mean `pairs`?"));
    let wrong = kolk(folder.path(), &["run", "a.rhai", "--set", "pairs=many"]);
    assert_eq!(wrong.status.code(), Some(1));
    assert!(text(&wrong.stderr).contains("takes a whole number"));
}

#[test]
fn a_wrong_command_line_exits_with_2() {
    let folder = folder_with("");
    for arguments in [
        &["run"][..],
        &["run", "missing.rhai"],
        &["run", "a.rhai", "--set", "x"],
        &["run", "a.rhai", "--read", "nowhere"],
        &["fly"],
        &["run", "a.rhai", "--wrong"],
    ] {
        let output = kolk(folder.path(), arguments);
        assert_eq!(output.status.code(), Some(2), "{arguments:?}");
        assert!(!output.stderr.is_empty(), "{arguments:?}");
    }
}

#[test]
fn a_script_in_place_of_a_command_is_recognised() {
    let folder = folder_with("");
    let output = kolk(folder.path(), &["a.rhai"]);
    assert_eq!(output.status.code(), Some(2));
    assert_eq!(
        text(&output.stderr),
        "error: there is no command `a.rhai`; did you mean `kolk run a.rhai`?\n"
    );
}

#[test]
fn a_recording_with_few_measured_vectors_is_noted_once() {
    // 24 px a frame leave a window of 16 px: no pattern is found again.
    let script = |speed: u32| {
        format!(
            "let p = uniform(#{{ u_px_per_frame: {speed}, v_px_per_frame: 0 }})\n\
             .pair(#{{ width_px: 96, height_px: 96 }});\n\
             for pair in [p, p] {{ pair.interrogate(plan(#{{ windows_px: [16], overlap: 0 }})); }}\n"
        )
    };
    let folder = folder_with(&script(24));
    let output = kolk(folder.path(), &["run", "a.rhai"]);
    assert_eq!(output.status.code(), Some(0));
    let shown = text(&output.stderr);
    assert_eq!(shown.matches("note: ").count(), 1, "{shown}");
    assert!(shown.contains("% of the vectors are measured;"), "{shown}");
    let folder = folder_with(&script(2));
    let output = kolk(folder.path(), &["run", "a.rhai"]);
    assert_eq!(text(&output.stderr), "");
}

#[test]
fn a_file_that_is_no_text_is_refused() {
    let folder = tempfile::tempdir().unwrap();
    std::fs::write(folder.path().join("a.rhai"), [0xff, 0xfe, 0x00]).unwrap();
    let output = kolk(folder.path(), &["run", "a.rhai"]);
    assert_eq!(output.status.code(), Some(2));
    assert!(text(&output.stderr).contains("is not a script"));
}

#[test]
fn help_says_who_it_is_for_and_which_commands_there_are() {
    let folder = tempfile::tempdir().unwrap();
    let output = kolk(folder.path(), &["--help"]);
    assert_eq!(output.status.code(), Some(0));
    let help = text(&output.stdout);
    for part in [
        "people who measure flow",
        "run",
        "demo",
        "docs",
        "kolk run eddies.rhai",
    ] {
        assert!(help.contains(part), "{part} is missing in\n{help}");
    }
    let docs = text(&kolk(folder.path(), &["docs", "gradient"]).stdout);
    assert!(docs.contains("vector_field.gradient([options])"), "{docs}");
}

#[test]
fn standard_input_is_run_where_there_is_no_terminal() {
    let folder = tempfile::tempdir().unwrap();
    let mut child = Command::new(env!("CARGO_BIN_EXE_kolk"))
        .current_dir(folder.path())
        .stdin(Stdio::piped())
        .stdout(Stdio::piped())
        .spawn()
        .unwrap();
    child
        .stdin
        .take()
        .unwrap()
        .write_all(b"let a = 2;\na * 21")
        .unwrap();
    let output = child.wait_with_output().unwrap();
    assert_eq!(text(&output.stdout), "42\n");
}

#[cfg(unix)]
#[test]
fn a_reader_that_goes_away_does_not_end_the_work() {
    let folder =
        folder_with("for i in 0..20000 { print(i); }\ntable([[\"a\", [1]]]).save(\"a.csv\");");
    let mut child = Command::new(env!("CARGO_BIN_EXE_kolk"))
        .args(["run", "a.rhai"])
        .current_dir(folder.path())
        .stdin(Stdio::null())
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .unwrap();
    drop(child.stdout.take());
    let output = child.wait_with_output().unwrap();
    assert_eq!(output.status.code(), Some(0), "{}", text(&output.stderr));
    assert!(folder.path().join("out/a.csv").is_file());
}

#[cfg(unix)]
#[test]
fn an_interrupt_ends_a_script_with_130() {
    let folder = folder_with("print(\"started\"); wait(60);");
    let mut child = Command::new(env!("CARGO_BIN_EXE_kolk"))
        .args(["run", "a.rhai"])
        .current_dir(folder.path())
        .stdin(Stdio::null())
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .unwrap();
    let mut first = [0; 7];
    std::io::Read::read_exact(child.stdout.as_mut().unwrap(), &mut first).unwrap();
    let kill = Command::new("kill")
        .args(["-INT", &child.id().to_string()])
        .status()
        .unwrap();
    assert!(kill.success());
    let output = child.wait_with_output().unwrap();
    assert_eq!(output.status.code(), Some(130));
    assert_eq!(text(&output.stderr), "interrupted\n");
}
