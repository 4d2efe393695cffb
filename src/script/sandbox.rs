//! The folders a script may read from and write to.

use std::cell::RefCell;
use std::path::{Component, Path, PathBuf};

/// What a script may touch: it reads below its read folders and writes below one output folder.
///
/// Paths are resolved with every symbolic link followed before they are compared, so neither
/// `..` nor a link leads out.
#[derive(Debug)]
pub struct Sandbox {
    start: PathBuf,
    read: Vec<PathBuf>,
    out: PathBuf,
    written: RefCell<Vec<PathBuf>>,
}

/// Why a path may not be used.
#[derive(Debug, thiserror::Error)]
pub enum SandboxError {
    /// Reading outside the read folders.
    #[error(
        "a script may not read {0}: it reads only below the folder it was started in and those given with `--read FOLDER`"
    )]
    Read(String),
    /// Writing outside the output folder.
    #[error(
        "a script may not write {0}: it writes only below its output folder (choose another with `--out FOLDER`)"
    )]
    Write(String),
    /// A folder that cannot be made or looked into.
    #[error("cannot use the folder {path}: {reason}")]
    Folder {
        /// The folder.
        path: String,
        /// The system's reason.
        reason: std::io::Error,
    },
}

impl Sandbox {
    /// A sandbox that reads below `start` and each of `read`, and writes below `out` (taken from
    /// `start` when relative; it need not exist yet).
    ///
    /// # Errors
    /// A read folder that is not there.
    pub fn new(start: &Path, read: &[PathBuf], out: &Path) -> Result<Self, SandboxError> {
        let resolve = |path: &Path| {
            path.canonicalize().map_err(|reason| SandboxError::Folder {
                path: path.display().to_string(),
                reason,
            })
        };
        let start = resolve(start)?;
        let mut folders = vec![start.clone()];
        for folder in read {
            let folder = resolve(&start.join(folder))?;
            if !folders.contains(&folder) {
                folders.push(folder);
            }
        }
        let out = settled(&start.join(out));
        Ok(Self {
            start,
            read: folders,
            out,
            written: RefCell::default(),
        })
    }

    /// The folder relative paths are read from.
    pub fn start(&self) -> &Path {
        &self.start
    }

    /// The folder everything is written below.
    pub fn out(&self) -> &Path {
        &self.out
    }

    /// The files written so far, in order, each once.
    pub fn written(&self) -> Vec<PathBuf> {
        self.written.borrow().clone()
    }

    /// Where to read `path` from; what was written below the output folder may be read back.
    ///
    /// # Errors
    /// A path outside the read folders. A file that is not there is no error here when its
    /// folder may be read: whoever opens it says so.
    pub fn readable(&self, path: &Path) -> Result<PathBuf, SandboxError> {
        let full = settled(&self.start.join(path));
        let allowed = self.read.iter().chain([&self.out]);
        if allowed.clone().any(|folder| full.starts_with(folder)) {
            return Ok(full);
        }
        Err(SandboxError::Read(path.display().to_string()))
    }

    /// Where to write `path`, taken from the output folder when relative; makes the folders it
    /// needs.
    ///
    /// # Errors
    /// A path outside the output folder; a folder that cannot be made.
    pub fn writable(&self, path: &Path) -> Result<PathBuf, SandboxError> {
        let refused = || SandboxError::Write(path.display().to_string());
        let full = settled(&self.out.join(path));
        if !full.starts_with(&self.out) || full == self.out {
            return Err(refused());
        }
        let folder = full.parent().unwrap_or(&self.out);
        std::fs::create_dir_all(folder).map_err(|reason| SandboxError::Folder {
            path: folder.display().to_string(),
            reason,
        })?;
        Ok(full)
    }

    /// Notes a file as written.
    pub(super) fn note(&self, file: PathBuf) {
        let mut written = self.written.borrow_mut();
        if !written.contains(&file) {
            written.push(file);
        }
    }
}

/// The path with its existing part resolved (links followed) and the rest cleared of `.` and
/// `..` by name.
fn settled(path: &Path) -> PathBuf {
    let mut settled = PathBuf::new();
    for part in path.components() {
        match part {
            Component::CurDir => {}
            Component::ParentDir => {
                settled.pop();
            }
            part => settled.push(part),
        }
        // Links are followed as soon as they are met, so that `link/..` means what the system
        // takes it to mean.
        if let Ok(real) = settled.canonicalize() {
            settled = real;
        }
    }
    settled
}

#[cfg(test)]
mod tests {
    use super::*;

    fn sandbox() -> (tempfile::TempDir, Sandbox) {
        let folder = tempfile::tempdir().unwrap();
        std::fs::create_dir(folder.path().join("start")).unwrap();
        std::fs::write(folder.path().join("secret.txt"), "x").unwrap();
        let sandbox = Sandbox::new(&folder.path().join("start"), &[], Path::new("out")).unwrap();
        (folder, sandbox)
    }

    #[test]
    fn a_script_reads_below_its_start_folder_only() {
        let (folder, sandbox) = sandbox();
        let start = sandbox.start().to_owned();
        assert_eq!(
            sandbox.readable(Path::new("a/b.tif")).unwrap(),
            start.join("a/b.tif")
        );
        assert!(sandbox.readable(Path::new("a/../b.tif")).is_ok());
        for path in ["../secret.txt", "a/../../secret.txt", "/etc/passwd", ".."] {
            assert!(sandbox.readable(Path::new(path)).is_err(), "{path}");
        }
        let absolute = folder.path().canonicalize().unwrap().join("secret.txt");
        assert!(sandbox.readable(&absolute).is_err());
    }

    #[test]
    fn a_read_folder_opens_what_is_below_it() {
        let (folder, _) = sandbox();
        let start = folder.path().join("start");
        let read = vec![folder.path().to_owned()];
        let sandbox = Sandbox::new(&start, &read, Path::new("out")).unwrap();
        assert!(sandbox.readable(Path::new("../secret.txt")).is_ok());
        let missing = vec![folder.path().join("nowhere")];
        let error = Sandbox::new(&start, &missing, Path::new("out")).unwrap_err();
        assert!(error.to_string().contains("nowhere"), "{error}");
    }

    #[test]
    fn a_script_writes_below_its_output_folder_only() {
        let (_folder, sandbox) = sandbox();
        let path = sandbox.writable(Path::new("tables/eddies.csv")).unwrap();
        assert_eq!(path, sandbox.start().join("out/tables/eddies.csv"));
        assert!(path.parent().unwrap().is_dir());
        sandbox.note(path.clone());
        sandbox.note(path.clone());
        assert_eq!(sandbox.written(), [path]);
        for path in ["../a.csv", "/tmp/a.csv", ".", "", "tables/../../a.csv"] {
            assert!(sandbox.writable(Path::new(path)).is_err(), "{path}");
        }
    }

    #[cfg(unix)]
    #[test]
    fn a_symbolic_link_does_not_lead_out() {
        let (folder, sandbox) = sandbox();
        std::fs::create_dir_all(sandbox.out()).unwrap();
        for place in [sandbox.start(), sandbox.out()] {
            std::os::unix::fs::symlink(folder.path(), place.join("link")).unwrap();
        }
        assert!(sandbox.readable(Path::new("link/secret.txt")).is_err());
        assert!(sandbox.writable(Path::new("link/new.txt")).is_err());
    }
}
