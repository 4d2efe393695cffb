//! One run of the language: where it prints, what it may touch, whether it was interrupted.

use std::cell::RefCell;
use std::collections::HashSet;
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};

use super::sandbox::Sandbox;
use super::settings::Settings;
use super::sources::Sources;
use crate::task::{Step, Task};

/// Where a script's `print` goes, one line at a time.
pub type Sink = Box<dyn Fn(&str)>;

type Progress = Arc<dyn Fn(Step) + Send + Sync>;

/// What a run shares with every built-in it calls.
pub struct Session {
    cancel: Arc<AtomicBool>,
    progress: Option<Progress>,
    sandbox: Sandbox,
    settings: Settings,
    sink: Sink,
    notes: Sink,
    noted: RefCell<HashSet<String>>,
    pub(super) sources: Sources,
}

impl Session {
    /// A run that touches what `sandbox` allows and prints into `sink`.
    pub fn new(sandbox: Sandbox, sink: impl Fn(&str) + 'static) -> Self {
        Self {
            cancel: Arc::default(),
            progress: None,
            sandbox,
            settings: Settings::default(),
            sink: Box::new(sink),
            notes: Box::new(|_| ()),
            noted: RefCell::default(),
            sources: Sources::default(),
        }
    }

    /// The same, interrupted by setting `cancel` to true.
    pub fn cancelled_by(mut self, cancel: Arc<AtomicBool>) -> Self {
        self.cancel = cancel;
        self
    }

    /// The same with the progress of long work sent to `report`.
    pub fn reporting(mut self, report: impl Fn(Step) + Send + Sync + 'static) -> Self {
        self.progress = Some(Arc::new(report));
        self
    }

    /// The same with notes sent to `note`, one line at a time.
    pub fn noting(mut self, note: impl Fn(&str) + 'static) -> Self {
        self.notes = Box::new(note);
        self
    }

    /// The same with values for the script's settings.
    pub fn with_settings(mut self, settings: Settings) -> Self {
        self.settings = settings;
        self
    }

    /// What the run may read and write.
    pub fn sandbox(&self) -> &Sandbox {
        &self.sandbox
    }

    /// Values given on the command line.
    pub fn settings(&self) -> &Settings {
        &self.settings
    }

    /// Prints one line.
    pub fn print(&self, line: &str) {
        (self.sink)(line);
    }

    /// Says something beside the results that is no error, once for each `subject` in a run.
    pub fn note(&self, subject: &str, line: &str) {
        if self.noted.borrow_mut().insert(subject.to_owned()) {
            (self.notes)(line);
        }
    }

    /// The flag an interrupt sets.
    pub fn cancel_flag(&self) -> Arc<AtomicBool> {
        Arc::clone(&self.cancel)
    }

    /// True once the run was interrupted.
    pub fn is_cancelled(&self) -> bool {
        self.cancel.load(Ordering::Relaxed)
    }

    /// Forgets an interrupt and what was noted, so that the next cell can run.
    pub fn go_on(&self) {
        self.noted.borrow_mut().clear();
        self.cancel.store(false, Ordering::Relaxed);
    }

    /// The handle for one kernel.
    pub fn task(&self) -> Task {
        let task = Task::cancelled_by(self.cancel_flag());
        match &self.progress {
            Some(progress) => {
                let progress = Arc::clone(progress);
                task.reporting(move |step| progress(step))
            }
            None => task,
        }
    }
}

impl std::fmt::Debug for Session {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.debug_struct("Session")
            .field("sandbox", &self.sandbox)
            .field("cancelled", &self.is_cancelled())
            .finish_non_exhaustive()
    }
}
