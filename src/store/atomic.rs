//! A file appears complete or not at all.

use std::io::{self, BufWriter, Write};
use std::path::Path;

/// How the names of unfinished files begin; a program killed while writing leaves them behind.
pub(crate) const TEMPORARY: &str = ".kolk-";

/// Why a file could not be written or read.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum StoreError {
    /// The folder the file should go to does not exist.
    #[error("{file} cannot be written: there is no folder {folder}; create it first")]
    NoFolder {
        /// The file.
        file: String,
        /// The folder that is missing.
        folder: String,
    },
    /// The system refused; an earlier file of the name is as it was.
    #[error("{file} cannot be written: {source}")]
    Write {
        /// The file.
        file: String,
        /// What the system said.
        source: io::Error,
    },
    /// What was to be written does not go into the format.
    #[error("{file} cannot be written: {why}")]
    DoesNotFit {
        /// The file.
        file: String,
        /// What does not fit and what would.
        why: String,
    },
    /// A file that is missing or may not be read.
    #[error("{file} cannot be read: {source}")]
    Read {
        /// The file.
        file: String,
        /// What the system said.
        source: io::Error,
    },
    /// What stands in a file is not what was expected.
    #[error("{file}{}: {what}", line.map_or(String::new(), |line| format!(", line {line}")))]
    Content {
        /// The file.
        file: String,
        /// The line, counted from 1, where there is one to blame.
        line: Option<usize>,
        /// What is wrong and what would be right.
        what: String,
    },
}

/// Writes the file at `path` by `write`, into a temporary file in the same folder that takes the
/// name only once complete and on disk. An earlier file of that name is replaced at that moment
/// and stays untouched if anything fails.
///
/// # Errors
/// [`StoreError`] where the folder does not exist, the system refuses, or `write` fails.
pub fn write_atomically(
    path: &Path,
    write: impl FnOnce(&mut dyn Write) -> io::Result<()>,
) -> Result<(), StoreError> {
    let folder = match path.parent() {
        Some(folder) if !folder.as_os_str().is_empty() => folder,
        _ => Path::new("."),
    };
    if !folder.is_dir() {
        return Err(StoreError::NoFolder {
            file: path.display().to_string(),
            folder: folder.display().to_string(),
        });
    }
    write_beside(path, folder, write).map_err(|source| StoreError::Write {
        file: path.display().to_string(),
        source,
    })
}

fn write_beside(
    path: &Path,
    folder: &Path,
    write: impl FnOnce(&mut dyn Write) -> io::Result<()>,
) -> io::Result<()> {
    if path.is_dir() {
        return Err(io::Error::other("a folder has that name"));
    }
    let mut builder = tempfile::Builder::new();
    builder.prefix(TEMPORARY);
    // A temporary file is private by default; results get the rights any new file gets.
    #[cfg(unix)]
    builder.permissions(std::os::unix::fs::PermissionsExt::from_mode(0o666));
    let file = builder.tempfile_in(folder)?;
    let mut buffer = BufWriter::new(file);
    write(&mut buffer)?;
    let file = buffer.into_inner().map_err(|e| e.into_error())?;
    file.as_file().sync_all()?;
    file.persist(path).map_err(|e| e.error)?;
    Ok(())
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::fs;

    fn names(folder: &Path) -> Vec<String> {
        let name = |e: io::Result<fs::DirEntry>| e.unwrap().file_name().into_string().unwrap();
        fs::read_dir(folder).unwrap().map(name).collect()
    }

    #[test]
    fn a_failed_write_leaves_the_earlier_file_and_nothing_else() {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("eddies.csv");
        write_atomically(&path, |w| w.write_all(b"old")).unwrap();
        let error = write_atomically(&path, |w| {
            w.write_all(b"half of the new")?;
            Err(io::Error::other("the disk is full"))
        })
        .unwrap_err();
        assert!(
            error
                .to_string()
                .ends_with("eddies.csv cannot be written: the disk is full")
        );
        assert_eq!(fs::read(&path).unwrap(), b"old");
        assert_eq!(names(folder.path()), ["eddies.csv"]);
    }

    #[test]
    fn a_complete_write_replaces_the_earlier_file() {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("eddies.csv");
        write_atomically(&path, |w| w.write_all(b"old")).unwrap();
        write_atomically(&path, |w| w.write_all(b"new")).unwrap();
        assert_eq!(fs::read(&path).unwrap(), b"new");
        assert_eq!(names(folder.path()), ["eddies.csv"]);
    }

    #[test]
    #[cfg(unix)]
    fn a_result_has_the_rights_of_any_new_file() {
        use std::os::unix::fs::PermissionsExt;
        let folder = tempfile::tempdir().unwrap();
        let (ours, plain) = (folder.path().join("ours"), folder.path().join("plain"));
        write_atomically(&ours, |w| w.write_all(b"x")).unwrap();
        fs::write(&plain, b"x").unwrap();
        let rights = |p| fs::metadata(p).unwrap().permissions().mode();
        assert_eq!(rights(ours), rights(plain));
    }

    #[test]
    fn a_missing_folder_is_named() {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("tables/eddies.csv");
        let error = write_atomically(&path, |_| Ok(())).unwrap_err().to_string();
        assert!(error.contains("there is no folder") && error.ends_with("create it first"));
    }

    #[test]
    fn a_folder_is_not_replaced_by_a_file() {
        let folder = tempfile::tempdir().unwrap();
        let error = write_atomically(folder.path(), |_| Ok(()))
            .unwrap_err()
            .to_string();
        assert!(error.ends_with("a folder has that name"));
    }
}
