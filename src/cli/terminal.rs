//! What the commands share of the terminal: colour, errors, progress, interrupts.

use std::io::{IsTerminal, Write};
use std::sync::atomic::{AtomicBool, Ordering};
use std::sync::{Arc, Mutex, PoisonError};

use indicatif::{ProgressBar, ProgressDrawTarget, ProgressStyle};

use super::Outcome;
use crate::script::{Session, Trouble};
use crate::task::Step;

/// The terminal a command runs in.
#[derive(Clone, Debug)]
pub(crate) struct Terminal {
    colour: bool,
    shows_progress: bool,
    bar: Arc<Mutex<Option<Bar>>>,
}

/// Prints one line to standard output. Where nobody reads it any more the line is dropped: the
/// work goes on and its files become whole.
pub(crate) fn say(line: &str) {
    let mut out = std::io::stdout().lock();
    let _ = writeln!(out, "{line}").and_then(|()| out.flush());
}

impl Terminal {
    /// Looks at where standard error goes and at NO_COLOR (https://no-color.org).
    pub(crate) fn new() -> Self {
        let is_terminal = std::io::stderr().is_terminal();
        let no_colour = std::env::var_os("NO_COLOR").is_some_and(|v| !v.is_empty());
        Self {
            colour: is_terminal && !no_colour,
            shows_progress: is_terminal,
            bar: Arc::default(),
        }
    }

    /// Prints to standard error.
    pub(crate) fn complain(&self, text: &str) {
        let _ = std::io::stderr().lock().write_all(text.as_bytes());
    }

    /// Shows what went wrong in a script.
    pub(crate) fn show(&self, trouble: &Trouble) -> Outcome {
        if trouble.interrupted {
            self.complain("interrupted\n");
            return Outcome::Interrupted;
        }
        self.complain(&trouble.display(self.colour));
        Outcome::Failed
    }

    /// Says what is wrong with the command line.
    pub(crate) fn misused(&self, message: &str) -> Outcome {
        self.complain(&format!("error: {message}\n"));
        Outcome::Misused
    }

    /// The session, with its notes and, where someone can see it, a bar for long work.
    pub(crate) fn watching(&self, session: Session) -> Session {
        let terminal = self.clone();
        let session = session.noting(move |line| terminal.complain(&format!("note: {line}\n")));
        if !self.shows_progress {
            return session;
        }
        let bar = Arc::clone(&self.bar);
        session.reporting(move |step| {
            let mut bar = bar.lock().unwrap_or_else(PoisonError::into_inner);
            show_step(&mut bar, &step);
        })
    }

    /// Takes away a bar whose work ended before it was done.
    pub(crate) fn clear_progress(&self) {
        let mut bar = self.bar.lock().unwrap_or_else(PoisonError::into_inner);
        if let Some(bar) = bar.take() {
            bar.drawn.finish_and_clear();
        }
    }
}

#[derive(Debug)]
struct Bar {
    what: &'static str,
    total: usize,
    /// Nothing is known of the time left before the first part is done.
    counts_down: bool,
    drawn: ProgressBar,
}

fn show_step(current: &mut Option<Bar>, step: &Step) {
    let same = current
        .as_ref()
        .is_some_and(|bar| bar.what == step.what && bar.total == step.total);
    if !same {
        if let Some(old) = current.take() {
            old.drawn.finish_and_clear();
        }
        let drawn =
            ProgressBar::with_draw_target(Some(step.total as u64), ProgressDrawTarget::stderr());
        give_style(&drawn, "");
        drawn.set_message(step.what);
        *current = Some(Bar {
            what: step.what,
            total: step.total,
            counts_down: false,
            drawn,
        });
    }
    if let Some(bar) = current {
        if step.done >= step.total {
            bar.drawn.finish_and_clear();
            *current = None;
        } else {
            if step.done > 0 && !bar.counts_down {
                bar.counts_down = true;
                give_style(&bar.drawn, " left {eta}");
            }
            bar.drawn.set_position(step.done as u64);
        }
    }
}

fn give_style(bar: &ProgressBar, end: &str) {
    let template = format!("{{wide_bar:.cyan}} {{pos}}/{{len}} {{msg}} {{elapsed}}{end}");
    // The template is ours and right; a bar without it would do too.
    if let Ok(style) = ProgressStyle::with_template(&template) {
        bar.set_style(style.progress_chars("=- "));
    }
}

/// A flag that Ctrl-C sets. Where `twice_ends` says so a second Ctrl-C ends the process at once.
pub(crate) fn interrupt_flag(twice_ends: bool) -> Arc<AtomicBool> {
    let flag = Arc::new(AtomicBool::new(false));
    let set = Arc::clone(&flag);
    // Fails only where a handler stands already; then Ctrl-C ends the process as it always does.
    let _ = ctrlc::set_handler(move || {
        if set.swap(true, Ordering::Relaxed) && twice_ends {
            std::process::exit(130);
        }
    });
    flag
}
