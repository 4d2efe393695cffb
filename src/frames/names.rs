//! Patterns and names to files, in the order frames were taken.

use std::cmp::Ordering;
use std::path::{Path, PathBuf};

use super::FrameError;

/// Nearest names an error offers.
const OFFERED: usize = 3;

/// The files that `patterns` stand for, relative to `base`.
///
/// A pattern is a file name or holds `*` (any text inside one name), `?` (one letter), `[..]`
/// (one of these) or `**` (any folders); a file that exists under the very text of a pattern is
/// that file. A pattern's files come in [`natural_order`]; the patterns keep their own order.
/// Only names are looked at, so a caller can refuse files before any is opened.
///
/// # Errors
/// [`FrameError`] where nothing is named, a pattern is malformed or matches nothing, a named file
/// does not exist, or a pattern brings a file a second time.
pub fn matching_files(patterns: &[String], base: &Path) -> Result<Vec<PathBuf>, FrameError> {
    if patterns.is_empty() {
        return Err(FrameError::NothingNamed);
    }
    let mut files: Vec<PathBuf> = Vec::new();
    let mut seen = std::collections::HashSet::new();
    for pattern in patterns {
        let literal = base.join(pattern);
        if literal.is_file() || !pattern.contains(['*', '?', '[']) {
            if !literal.exists() {
                return Err(missing_file(&literal));
            }
            seen.insert(literal.clone());
            files.push(literal);
            continue;
        }
        for file in expand(pattern, base)? {
            if !seen.insert(file.clone()) {
                return Err(FrameError::Repeated {
                    file: file.display().to_string(),
                    pattern: pattern.clone(),
                });
            }
            files.push(file);
        }
    }
    Ok(files)
}

fn expand(pattern: &str, base: &Path) -> Result<Vec<PathBuf>, FrameError> {
    // The base is a place, not a pattern, whatever letters it holds.
    let base_text = glob::Pattern::escape(&base.to_string_lossy());
    let full = Path::new(&base_text).join(pattern);
    let rules = glob::MatchOptions {
        case_sensitive: true,
        require_literal_separator: true,
        // Hidden files are not frames.
        require_literal_leading_dot: true,
    };
    let found =
        glob::glob_with(&full.to_string_lossy(), rules).map_err(|e| FrameError::BadPattern {
            pattern: pattern.to_owned(),
            why: e.msg.to_owned(),
        })?;
    let mut files = Vec::new();
    for file in found {
        let file =
            file.map_err(|e| FrameError::from_io(&e.path().display().to_string(), e.error()))?;
        if file.is_file() {
            files.push(file);
        }
    }
    if files.is_empty() {
        return Err(no_match(pattern, base));
    }
    files.sort_by(|a, b| natural_order(&a.to_string_lossy(), &b.to_string_lossy()));
    Ok(files)
}

/// Order of numbered names: runs of digits compare as numbers, so that `f9` comes before `f10`
/// and `f08` before `f9`; all else compares letter by letter.
pub fn natural_order(left: &str, right: &str) -> Ordering {
    let (mut a, mut b) = (left, right);
    while !a.is_empty() && !b.is_empty() {
        let (run_a, rest_a) = first_run(a);
        let (run_b, rest_b) = first_run(b);
        match compare_runs(run_a, run_b) {
            Ordering::Equal => (a, b) = (rest_a, rest_b),
            unequal => return unequal,
        }
    }
    // Names equal but for leading zeros (`f1`, `f01`) still need a fixed order.
    a.len().cmp(&b.len()).then_with(|| left.cmp(right))
}

/// The leading run of digits or of other letters, and what follows.
fn first_run(text: &str) -> (&str, &str) {
    let digits = text.starts_with(|c: char| c.is_ascii_digit());
    let end = text
        .find(|c: char| c.is_ascii_digit() != digits)
        .unwrap_or(text.len());
    text.split_at(end)
}

fn compare_runs(a: &str, b: &str) -> Ordering {
    let is_number = |s: &str| s.starts_with(|c: char| c.is_ascii_digit());
    if is_number(a) && is_number(b) {
        let (a, b) = (a.trim_start_matches('0'), b.trim_start_matches('0'));
        a.len().cmp(&b.len()).then_with(|| a.cmp(b))
    } else {
        a.cmp(b)
    }
}

/// The error for a file that is not there, with the names nearest to its own.
pub fn missing_file(file: &Path) -> FrameError {
    let name = file.file_name().unwrap_or_default().to_string_lossy();
    let folder = file.parent().unwrap_or(Path::new("."));
    FrameError::Missing {
        file: file.display().to_string(),
        nearest: nearest(&name, folder),
    }
}

fn no_match(pattern: &str, base: &Path) -> FrameError {
    let mut folder = base.to_path_buf();
    let mut wanted = pattern;
    while let Some((first, rest)) = wanted.split_once('/') {
        if first.contains(['*', '?', '[']) {
            break;
        }
        folder.push(if first.is_empty() { "/" } else { first });
        wanted = rest;
    }
    let wanted = wanted.split('/').next().unwrap_or_default();
    FrameError::NoMatch {
        pattern: pattern.to_owned(),
        folder: folder.display().to_string(),
        nearest: nearest(wanted, &folder),
    }
}

/// `"; the nearest names are a, b"`, or what is wrong with the folder, or nothing.
fn nearest(wanted: &str, folder: &Path) -> String {
    let names = match std::fs::read_dir(folder) {
        Ok(entries) => entries
            .filter_map(|e| e.ok()?.file_name().into_string().ok())
            .filter(|name| !name.starts_with('.')),
        Err(_) if !folder.exists() => return "; that folder does not exist".to_owned(),
        Err(e) => return format!("; that folder cannot be read: {e}"),
    };
    let allowed = (wanted.chars().count() / 4).max(1);
    let mut close: Vec<(usize, String)> = names
        .map(|name| (distance(wanted, &name), name))
        .filter(|(d, _)| *d <= allowed)
        .collect();
    close.sort_by(|(d, a), (e, b)| d.cmp(e).then_with(|| natural_order(a, b)));
    close.truncate(OFFERED);
    let names: Vec<_> = close.into_iter().map(|(_, name)| name).collect();
    match names.as_slice() {
        [] => String::new(),
        [one] => format!("; the nearest name there is {one}"),
        several => format!("; the nearest names there are {}", several.join(", ")),
    }
}

/// Letters to change, add or leave out to turn `pattern` into `name`, whatever their case; `*`
/// stands for any text and `?` for any letter at no cost (Levenshtein 1965, by rows).
fn distance(pattern: &str, name: &str) -> usize {
    let name: Vec<char> = name.to_lowercase().chars().collect();
    let mut row: Vec<usize> = (0..=name.len()).collect();
    for wanted in pattern.to_lowercase().chars() {
        let above = row.clone();
        let skip = usize::from(wanted != '*');
        row[0] = above[0] + skip;
        for (i, letter) in name.iter().enumerate() {
            let same = wanted == *letter || matches!(wanted, '*' | '?');
            row[i + 1] = (above[i] + usize::from(!same))
                .min(above[i + 1] + skip)
                .min(row[i] + skip);
        }
    }
    row[name.len()]
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn folder(names: &[&str]) -> tempfile::TempDir {
        let folder = tempfile::tempdir().unwrap();
        for name in names {
            let path = folder.path().join(name);
            std::fs::create_dir_all(path.parent().unwrap()).unwrap();
            std::fs::write(path, "").unwrap();
        }
        folder
    }

    fn matched(patterns: &[&str], base: &Path) -> Result<Vec<String>, FrameError> {
        let patterns: Vec<_> = patterns.iter().map(|p| (*p).to_owned()).collect();
        let files = matching_files(&patterns, base)?;
        let relative = |f: PathBuf| f.strip_prefix(base).unwrap().display().to_string();
        Ok(files.into_iter().map(relative).collect())
    }

    #[test]
    fn numbers_in_names_compare_as_numbers() {
        let mut names = [
            "f10b", "f9", "f010a", "f1", "f0999", "f01000", "f08", "e11", "f", "f10a",
        ];
        names.sort_by(|a, b| natural_order(a, b));
        let expected = [
            "e11", "f", "f1", "f08", "f9", "f010a", "f10a", "f10b", "f0999", "f01000",
        ];
        assert_eq!(names, expected);
        // Longer than any machine number.
        let long = "9".repeat(60);
        assert_eq!(natural_order(&long, &format!("1{long}")), Ordering::Less);
    }

    proptest! {
        #[test]
        fn natural_order_is_a_total_order(mut names in prop::collection::vec("[a0-2]{0,5}", 3)) {
            names.sort_by(|a, b| natural_order(a, b));
            for i in 0..3 {
                for j in 0..3 {
                    let found = natural_order(&names[i], &names[j]);
                    prop_assert_eq!(found.reverse(), natural_order(&names[j], &names[i]));
                    prop_assert_eq!(found == Ordering::Equal, names[i] == names[j]);
                    prop_assert!(i > j || found != Ordering::Greater);
                }
            }
        }
    }

    #[test]
    fn a_pattern_brings_files_in_number_order_and_a_list_keeps_its_own() {
        let folder = folder(&[
            "b_2.tif",
            "b_10.tif",
            "b_1.tif",
            ".b_0.tif",
            "b_3.txt",
            "in/b_4.tif",
        ]);
        let base = folder.path();
        assert_eq!(
            matched(&["b_*.tif"], base).unwrap(),
            ["b_1.tif", "b_2.tif", "b_10.tif"]
        );
        assert_eq!(
            matched(&["b_10.tif", "b_1.tif"], base).unwrap(),
            ["b_10.tif", "b_1.tif"]
        );
        assert_eq!(
            matched(&["in/*", "b_?.tif"], base).unwrap(),
            ["in/b_4.tif", "b_1.tif", "b_2.tif"]
        );
    }

    #[test]
    fn letters_that_mean_something_in_patterns_may_stand_in_names() {
        let folder = folder(&["run [1]/a[1].tif", "run [1]/a2.tif"]);
        let base = folder.path().join("run [1]");
        assert_eq!(matched(&["a[1].tif"], &base).unwrap(), ["a[1].tif"]);
        assert_eq!(matched(&["a*.tif"], &base).unwrap(), ["a2.tif", "a[1].tif"]);
    }

    #[test]
    fn names_that_match_nothing_are_reported_with_the_place_and_the_nearest_names() {
        let folder = folder(&[
            "basin/inlet_01.tiff",
            "basin/inlet_02.tiff",
            "basin/notes.txt",
        ]);
        let base = folder.path();
        let error = |pattern: &str| matched(&[pattern], base).unwrap_err().to_string();
        let text = error("basin/*.tif");
        assert!(
            text.contains("no file matches \"basin/*.tif\": looked in"),
            "{text}"
        );
        assert!(
            text.ends_with("the nearest names there are inlet_01.tiff, inlet_02.tiff"),
            "{text}"
        );
        assert!(error("basin/inlet_03.tif").contains("nearest names there are inlet_01.tiff"));
        assert!(error("basin/INLET_01.TIF").contains("inlet_01.tiff"));
        assert!(error("bassin/*.tif").ends_with("that folder does not exist"));
        assert!(error("bassin").ends_with("the nearest name there is basin"));
        assert!(error("basin/a***.tif").contains("is not a file pattern"));
        assert_eq!(matched(&[], base), Err(FrameError::NothingNamed));
    }

    #[test]
    fn a_file_that_two_patterns_bring_is_refused() {
        let folder = folder(&["a_1.tif", "a_2.tif"]);
        let text = matched(&["a_2.tif", "*.tif"], folder.path())
            .unwrap_err()
            .to_string();
        assert!(
            text.contains("a_2.tif is listed twice, the second time by \"*.tif\""),
            "{text}"
        );
        // Named twice on purpose: a frame against itself.
        assert!(matched(&["a_1.tif", "a_1.tif"], folder.path()).is_ok());
    }
}
