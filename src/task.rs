//! The one handle through which long work reports progress and is cancelled.
//!
//! Kernels take a [`Task`], call [`Task::check`] once a row, chunk or pair, and return
//! [`Cancelled`] at once when it says so. They never print; whoever started the work decides
//! what a [`Step`] looks like.

use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};

/// One report of progress: `done` of `total` parts of the work called `what`.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Step {
    /// What the parts are, in the plural ("pairs", "frames").
    pub what: &'static str,
    /// Parts finished so far.
    pub done: usize,
    /// Parts in all.
    pub total: usize,
}

/// The work was cancelled by the person who started it.
#[derive(Clone, Copy, Debug, PartialEq, Eq, thiserror::Error)]
#[error("interrupted")]
pub struct Cancelled;

type Report = Arc<dyn Fn(Step) + Send + Sync>;

/// Progress and cancellation for one piece of work; cheap to clone and to share among threads.
#[derive(Clone, Default)]
pub struct Task {
    cancel: Arc<AtomicBool>,
    report: Option<Report>,
}

impl Task {
    /// A task nobody watches and nobody cancels.
    pub fn quiet() -> Self {
        Self::default()
    }

    /// A task cancelled by setting `cancel` to true.
    pub fn cancelled_by(cancel: Arc<AtomicBool>) -> Self {
        Self {
            cancel,
            report: None,
        }
    }

    /// The same task with its progress sent to `report`, which may be called from any thread.
    pub fn reporting(mut self, report: impl Fn(Step) + Send + Sync + 'static) -> Self {
        self.report = Some(Arc::new(report));
        self
    }

    /// Tells the watcher, if there is one, how far the work is.
    pub fn report(&self, what: &'static str, done: usize, total: usize) {
        if let Some(report) = &self.report {
            report(Step { what, done, total });
        }
    }

    /// True once the work was cancelled.
    pub fn is_cancelled(&self) -> bool {
        self.cancel.load(Ordering::Relaxed)
    }

    /// Goes on, or ends the work.
    ///
    /// # Errors
    /// [`Cancelled`] once the work was cancelled.
    pub fn check(&self) -> Result<(), Cancelled> {
        if self.is_cancelled() {
            Err(Cancelled)
        } else {
            Ok(())
        }
    }
}

impl std::fmt::Debug for Task {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.debug_struct("Task")
            .field("cancelled", &self.is_cancelled())
            .field("watched", &self.report.is_some())
            .finish()
    }
}
