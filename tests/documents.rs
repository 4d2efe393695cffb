//! The documents tell the truth: their scripts run and print what they say, their links lead
//! somewhere, and the tests they name exist.
//!
//! A block that begins ```` ```rhai run ```` is run as a script beside the demo's recording; a
//! ```` ```text ```` block that follows it directly is all it prints. ```` ```rhai fails ```` is a
//! script that must end with an error, shown whole in the block that follows.

#![allow(clippy::unwrap_used)] // Tests say what went wrong by failing.

use std::path::{Path, PathBuf};
use std::process::{Command, Output, Stdio};

fn root() -> &'static Path {
    Path::new(env!("CARGO_MANIFEST_DIR"))
}

/// Every document with its text.
fn documents() -> Vec<(PathBuf, String)> {
    let mut files = vec![root().join("README.md"), root().join("DEVELOPERS.md")];
    for entry in std::fs::read_dir(root().join("docs")).unwrap() {
        let path = entry.unwrap().path();
        if path.extension().is_some_and(|e| e == "md") {
            files.push(path);
        }
    }
    files.sort();
    let read = |path: PathBuf| {
        let text = std::fs::read_to_string(&path).unwrap();
        (path, text)
    };
    files.into_iter().map(read).collect()
}

struct Block {
    /// The line of its fence, from 1.
    line: usize,
    /// What stands after the fence.
    kind: String,
    text: String,
    /// Text of the next block, where no heading or table lies between and it is ```` ```text ````.
    followed_by: Option<String>,
}

fn blocks(text: &str) -> Vec<Block> {
    let mut blocks: Vec<Block> = Vec::new();
    let mut inside = false;
    let mut adjacent = false;
    for (number, line) in text.lines().enumerate() {
        match line.strip_prefix("```") {
            Some(kind) if !inside => {
                blocks.push(Block {
                    line: number + 1,
                    kind: kind.trim().to_owned(),
                    text: String::new(),
                    followed_by: None,
                });
                inside = true;
            }
            Some(_) => {
                inside = false;
                let last = blocks.len() - 1;
                if adjacent && last > 0 && blocks[last].kind == "text" {
                    blocks[last - 1].followed_by = Some(blocks[last].text.clone());
                }
                adjacent = true;
            }
            None if inside => {
                let block = blocks.last_mut().unwrap();
                block.text.push_str(line);
                block.text.push('\n');
            }
            // Words that introduce the output may stand between.
            None if line.starts_with('#') || line.starts_with('|') => adjacent = false,
            None => {}
        }
    }
    blocks
}

fn kolk(folder: &Path, arguments: &[&str]) -> Output {
    Command::new(env!("CARGO_BIN_EXE_kolk"))
        .args(arguments)
        .current_dir(folder)
        .stdin(Stdio::null())
        .output()
        .unwrap()
}

fn lines(text: &str) -> Vec<&str> {
    text.lines().map(str::trim_end).collect()
}

/// What differs from what the document says of a block.
fn check(folder: &Path, block: &Block) -> Option<String> {
    let fails = block.kind == "rhai fails";
    std::fs::write(folder.join("example.rhai"), &block.text).unwrap();
    let output = kolk(folder, &["run", "example.rhai"]);
    let stdout = String::from_utf8(output.stdout).unwrap();
    let stderr = String::from_utf8(output.stderr).unwrap();
    if output.status.code() != Some(i32::from(fails)) {
        return Some(format!("exit code {:?}\n{stderr}", output.status.code()));
    }
    let shown = if fails { stderr } else { stdout };
    let said = match &block.followed_by {
        Some(said) => said,
        None if shown.trim().is_empty() => return None,
        None => return Some(format!("prints what the document does not show:\n{shown}")),
    };
    (lines(said.trim_end()) != lines(shown.trim_end()))
        .then(|| format!("the document says\n{said}\nbut it prints\n{shown}"))
}

#[test]
fn every_runnable_block_runs_and_prints_what_the_document_says() {
    let folder = tempfile::tempdir().unwrap();
    let demo = kolk(folder.path(), &["demo"]);
    assert!(
        demo.status.success(),
        "{}",
        String::from_utf8_lossy(&demo.stderr)
    );
    let (mut wrong, mut count) = (Vec::new(), 0);
    for (path, text) in documents() {
        for block in blocks(&text) {
            if block.kind == "rhai run" || block.kind == "rhai fails" {
                count += 1;
                if let Some(what) = check(folder.path(), &block) {
                    wrong.push(format!("{}:{}: {what}", path.display(), block.line));
                }
            }
        }
    }
    assert!(count >= 10, "only {count} blocks were found");
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

#[test]
fn every_script_block_is_run_or_says_that_it_is_a_sketch() {
    for (path, text) in documents() {
        for block in blocks(&text) {
            let known = ["rhai run", "rhai fails", "rhai sketch"];
            assert!(
                !block.kind.starts_with("rhai") || known.contains(&block.kind.as_str()),
                "{}:{}: ```{}",
                path.display(),
                block.line,
                block.kind
            );
        }
    }
}

#[test]
fn every_link_and_picture_leads_to_a_file() {
    let mut count = 0;
    for (path, text) in documents() {
        for part in text.split("](").skip(1) {
            let Some((target, _)) = part.split_once(')') else {
                continue;
            };
            let file = target.split('#').next().unwrap_or_default();
            if target.contains("://") || file.is_empty() {
                continue;
            }
            count += 1;
            let full = path.parent().unwrap().join(file);
            assert!(full.exists(), "{}: {target}", path.display());
        }
    }
    assert!(count >= 15, "only {count} links were found");
}

#[test]
fn pictures_are_small() {
    for entry in std::fs::read_dir(root().join("docs/images")).unwrap() {
        let entry = entry.unwrap();
        assert!(entry.metadata().unwrap().len() < 150_000, "{entry:?}");
    }
}

/// Tests are named `file.rs::test_name` there.
#[test]
fn every_test_the_list_of_checks_names_exists() {
    let text = std::fs::read_to_string(root().join("docs/checks.md")).unwrap();
    let mut count = 0;
    for quoted in text.split('`').skip(1).step_by(2) {
        let Some((file, test)) = quoted.split_once("::") else {
            continue;
        };
        if !file.ends_with(".rs") {
            continue;
        }
        count += 1;
        let source = std::fs::read_to_string(root().join(file))
            .unwrap_or_else(|error| panic!("{file}: {error}"));
        assert!(
            source.contains(&format!("fn {test}(")),
            "{file} has no {test}"
        );
    }
    assert!(count >= 60, "only {count} tests were found");
}
