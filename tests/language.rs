//! Scripts that say themselves what they print and where they fail.
//!
//! A file in `tests/language` holds cases that begin with `// case: NAME`. In a case,
//! `// prints: TEXT` stands above nothing in particular and is printed in that order;
//! `// error: TEXT` stands directly above the line that fails, `// hint: TEXT` below it where the
//! hint is part of the claim.

#![allow(clippy::unwrap_used)] // Tests say what went wrong by failing.

use std::cell::RefCell;
use std::path::Path;
use std::rc::Rc;

use kolk::script::{Language, Sandbox, Session, Trouble, on_a_big_stack};

struct Case {
    name: String,
    text: String,
    prints: Vec<String>,
    error: Option<(usize, String)>,
    hint: Option<String>,
}

fn cases(file: &Path) -> Vec<Case> {
    let text = std::fs::read_to_string(file).unwrap();
    let short = file.file_stem().unwrap().to_string_lossy().into_owned();
    text.split("// case: ")
        .skip(1)
        .map(|part| {
            let (name, text) = part.split_once('\n').unwrap();
            let all = |mark: &str| -> Vec<String> {
                let lines = text
                    .lines()
                    .filter_map(|line| line.trim().strip_prefix(mark));
                lines.map(|line| line.trim().to_owned()).collect()
            };
            let mut lines = text.lines().enumerate();
            let error = lines.find_map(|(i, line)| {
                let message = line.trim().strip_prefix("// error:")?;
                // The line that fails is the first after this one that is no comment; lines
                // count from 1.
                let below = text
                    .lines()
                    .skip(i)
                    .take_while(|l| l.trim().starts_with("//"));
                Some((i + below.count() + 1, message.trim().to_owned()))
            });
            Case {
                name: format!("{short}: {}", name.trim()),
                text: text.to_owned(),
                prints: all("// prints:"),
                error,
                hint: all("// hint:").first().cloned(),
            }
        })
        .collect()
}

fn run(case: &Case, folder: &Path) -> (Vec<String>, Result<(), Trouble>) {
    let sandbox = Sandbox::new(folder, &[], Path::new("out")).unwrap();
    let lines = Rc::new(RefCell::new(Vec::new()));
    let sink = Rc::clone(&lines);
    let session = Session::new(sandbox, move |line| sink.borrow_mut().push(line.to_owned()));
    let result = Language::new(session).run("case", &case.text).map(|_| ());
    let printed = lines
        .borrow()
        .iter()
        .flat_map(|l| l.lines().map(str::to_owned))
        .collect();
    (printed, result)
}

/// What differs from what the case says of itself.
fn check(case: &Case, folder: &Path) -> Vec<String> {
    let (printed, result) = run(case, folder);
    let mut wrong = Vec::new();
    if printed != case.prints {
        wrong.push(format!("prints {printed:?}, not {:?}", case.prints));
    }
    match (&case.error, result) {
        (None, Ok(())) => {}
        (None, Err(trouble)) => wrong.push(format!("fails:\n{}", trouble.display(false))),
        (Some((_, message)), Ok(())) => wrong.push(format!("does not fail with {message:?}")),
        (Some((line, message)), Err(trouble)) => {
            if trouble.message != *message {
                wrong.push(format!("fails with {:?}, not {message:?}", trouble.message));
            }
            let place = trouble.place.as_ref().map(|place| place.line);
            if place != Some(*line) {
                wrong.push(format!("fails at line {place:?}, not {line}"));
            }
            if case.hint.is_some() && trouble.hint != case.hint {
                wrong.push(format!("hints {:?}, not {:?}", trouble.hint, case.hint));
            }
            let shown = trouble.display(false);
            for word in [
                "Dynamic",
                "i64",
                "f64",
                "ImmutableString",
                "alloc::",
                "rhai::",
                "\u{1b}",
            ] {
                if shown.contains(word) {
                    wrong.push(format!("shows the word {word:?}:\n{shown}"));
                }
            }
        }
    }
    wrong
        .iter()
        .map(|w| format!("{}: {w}", case.name))
        .collect()
}

#[test]
fn every_case_prints_and_fails_as_it_says() {
    let wrong = on_a_big_stack(|| {
        let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/language");
        let mut files: Vec<_> = std::fs::read_dir(&folder)
            .unwrap()
            .map(|entry| entry.unwrap().path())
            .filter(|path| path.extension().is_some_and(|e| e == "rhai"))
            .collect();
        files.sort();
        let scratch = tempfile::tempdir().unwrap();
        let modules = folder.join("modules");
        for entry in std::fs::read_dir(modules).unwrap() {
            let path = entry.unwrap().path();
            std::fs::copy(&path, scratch.path().join(path.file_name().unwrap())).unwrap();
        }
        let cases: Vec<Case> = files.iter().flat_map(|file| cases(file)).collect();
        assert!(cases.len() >= 60, "only {} cases", cases.len());
        cases
            .iter()
            .flat_map(|case| check(case, scratch.path()))
            .collect::<Vec<_>>()
    })
    .unwrap();
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}
