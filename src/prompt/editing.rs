//! What the line editor needs to know of the language: what is unfinished, and what may follow.

use std::cell::RefCell;
use std::rc::Rc;

use rustyline::completion::Completer;
use rustyline::highlight::Highlighter;
use rustyline::hint::Hinter;
use rustyline::validate::{ValidationContext, ValidationResult, Validator};
use rustyline::{Cmd, ConditionalEventHandler, Context, Event, EventContext, Helper, RepeatCount};

use crate::script::is_unfinished;

/// Names that may be completed.
#[derive(Clone, Debug, Default)]
pub(super) struct Names {
    /// Names that stand anywhere: built-ins and variables.
    pub free: Vec<String>,
    /// Names that stand after a dot.
    pub after_a_dot: Vec<String>,
}

/// The editor's view of the language.
pub(super) struct Editing {
    names: Rc<RefCell<Names>>,
}

impl Editing {
    pub(super) fn new(names: Rc<RefCell<Names>>) -> Self {
        Self { names }
    }
}

impl Completer for Editing {
    type Candidate = String;

    fn complete(
        &self,
        line: &str,
        position: usize,
        _: &Context<'_>,
    ) -> rustyline::Result<(usize, Vec<String>)> {
        Ok(completions(line, position, &self.names.borrow()))
    }
}

/// Where the word before `position` starts, and the names it may become.
fn completions(line: &str, position: usize, names: &Names) -> (usize, Vec<String>) {
    let before = line.get(..position).unwrap_or(line);
    let start = before
        .rfind(|c: char| !(c.is_alphanumeric() || c == '_'))
        .map_or(0, |i| {
            i + before[i..].chars().next().map_or(1, char::len_utf8)
        });
    let word = &before[start..];
    let pool = if before[..start].ends_with('.') {
        &names.after_a_dot
    } else if word.is_empty() {
        return (start, Vec::new());
    } else {
        &names.free
    };
    let mut found: Vec<String> = pool
        .iter()
        .filter(|name| name.starts_with(word))
        .cloned()
        .collect();
    found.sort_unstable();
    found.dedup();
    (start, found)
}

impl Validator for Editing {
    fn validate(&self, context: &mut ValidationContext<'_>) -> rustyline::Result<ValidationResult> {
        // An empty last line ends a cell whatever it says, so that nobody is caught in one.
        let input = context.input();
        let ended = input.contains('\n') && input.ends_with("\n\n");
        Ok(if !ended && is_unfinished(input) {
            ValidationResult::Incomplete
        } else {
            ValidationResult::Valid(None)
        })
    }
}

/// Ctrl-D at the end of a cell of several lines gives it up, as Ctrl-C does.
pub(super) struct CancelUnfinished;

impl ConditionalEventHandler for CancelUnfinished {
    fn handle(
        &self,
        _: &Event,
        _: RepeatCount,
        _: bool,
        context: &EventContext<'_>,
    ) -> Option<Cmd> {
        let line = context.line();
        (line.contains('\n') && context.pos() == line.len()).then_some(Cmd::Interrupt)
    }
}

impl Hinter for Editing {
    type Hint = String;
}

impl Highlighter for Editing {}

impl Helper for Editing {}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn names_after_a_dot_are_those_of_methods() {
        let names = Names {
            free: vec![
                "flow".to_owned(),
                "floor".to_owned(),
                "gradient_of".to_owned(),
            ],
            after_a_dot: vec!["gradient".to_owned(), "speed".to_owned()],
        };
        let at_end = |line: &str| completions(line, line.len(), &names);
        assert_eq!(at_end("let x = flo").1, ["floor", "flow"]);
        assert_eq!(at_end("flow.gr"), (5, vec!["gradient".to_owned()]));
        assert_eq!(at_end("flow.").1, ["gradient", "speed"]);
        assert!(at_end("1 + ").1.is_empty());
        assert_eq!(at_end("\"µ\".gr").1, ["gradient"]);
    }
}
