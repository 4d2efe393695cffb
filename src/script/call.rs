//! One call of a built-in: what it may use of the run it belongs to.

use std::path::{Path, PathBuf};
use std::rc::Rc;

use super::fault::Fault;
use super::registry::Registry;
use super::session::Session;
use crate::frames::missing_file;
use crate::task::Task;

/// Given to a built-in that asks for it: progress, cancellation, files, and what may be printed.
#[derive(Clone)]
pub struct Call {
    session: Rc<Session>,
    registry: Rc<Registry>,
}

impl Call {
    pub(super) fn new(session: Rc<Session>, registry: Rc<Registry>) -> Self {
        Self { session, registry }
    }

    /// The handle a kernel reports through and is cancelled by.
    pub fn task(&self) -> Task {
        self.session.task()
    }

    /// The run this call belongs to.
    pub fn session(&self) -> &Session {
        &self.session
    }

    /// Every built-in there is.
    pub fn registry(&self) -> &Registry {
        &self.registry
    }

    /// The folder relative paths are read from.
    pub fn base(&self) -> &Path {
        self.session.sandbox().start()
    }

    /// The path to read `path` from.
    ///
    /// # Errors
    /// A path outside the folders a script may read.
    pub fn readable(&self, path: &str) -> Result<PathBuf, Fault> {
        Ok(self.session.sandbox().readable(Path::new(path))?)
    }

    /// The path to read the file `path` from, which is there.
    ///
    /// # Errors
    /// As [`Call::readable`]; a file that does not exist, with the names nearest to it.
    pub fn existing(&self, path: &str) -> Result<PathBuf, Fault> {
        let full = self.readable(path)?;
        if full.exists() {
            Ok(full)
        } else {
            Err(missing_file(&full).into())
        }
    }

    /// Lets `write` write the file (or folder) `path`, with the folder it goes to made; once it
    /// has, the file counts as written. Gives what `write` gives.
    ///
    /// # Errors
    /// A path outside the output folder, a folder that cannot be made, what `write` says.
    pub fn write<T, E: Into<Fault>>(
        &self,
        path: &str,
        write: impl FnOnce(&Path) -> Result<T, E>,
    ) -> Result<T, Fault> {
        if path.trim().is_empty() {
            return Err(Fault::new("the file name is empty"));
        }
        let sandbox = self.session.sandbox();
        let full = sandbox.writable(Path::new(path))?;
        let result = write(&full).map_err(Into::into)?;
        sandbox.note(full);
        Ok(result)
    }
}
