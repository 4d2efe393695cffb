//! Tests that walk over every record of the language.

use std::cell::RefCell;
use std::path::Path;
use std::rc::Rc;

use super::{Language, Registry, Sandbox, Session};

/// What running `code` in a folder of its own prints, with its last value.
fn output(code: &str) -> String {
    let folder = tempfile::tempdir().unwrap();
    let sandbox = Sandbox::new(folder.path(), &[], Path::new("out")).unwrap();
    let lines = Rc::new(RefCell::new(Vec::new()));
    let sink = Rc::clone(&lines);
    let session = Session::new(sandbox, move |line| sink.borrow_mut().push(line.to_owned()));
    match Language::new(session).run("example", code) {
        Ok(value) => lines.borrow_mut().extend(value),
        Err(trouble) => lines.borrow_mut().push(trouble.display(false)),
    }
    lines.borrow().join("\n")
}

#[test]
fn every_built_in_is_documented_in_full() {
    let registry = Registry::new();
    let gaps: Vec<String> = registry.records().iter().flat_map(|r| r.gaps()).collect();
    assert!(gaps.is_empty(), "{}", gaps.join("\n"));
}

#[test]
fn every_example_prints_what_its_record_says() {
    let registry = Registry::new();
    let mut wrong = Vec::new();
    for record in registry.records() {
        for example in &record.examples {
            let found = output(example.code);
            if found.trim() != example.output.trim() {
                wrong.push(format!(
                    "{}\n  {}\n  expected {}\n  found    {found}",
                    record.usage(),
                    example.code,
                    example.output
                ));
            }
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

#[test]
fn no_built_in_hides_another() {
    let clashes = Registry::new().clashes();
    assert!(clashes.is_empty(), "{}", clashes.join("\n"));
}

#[test]
fn every_kind_a_record_names_has_a_page() {
    let registry = Registry::new();
    for record in registry.records() {
        if let Some(kind) = record.subject {
            assert!(registry.kind(kind).is_some(), "no page for {kind}");
        }
    }
}

#[test]
fn documented_options_are_those_the_struct_reads() {
    let mut wrong = Vec::new();
    for record in Registry::new().records() {
        for input in &record.inputs {
            if let Some(differences) = input.shape.differences {
                let found = differences();
                wrong.extend(found.iter().map(|d| format!("{}: {d}", record.usage())));
            }
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}
