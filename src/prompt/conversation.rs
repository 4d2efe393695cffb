//! The conversation: read a cell, run it, show what it gives.

use std::cell::RefCell;
use std::io::{IsTerminal, Read};
use std::path::PathBuf;
use std::rc::Rc;

use rustyline::error::ReadlineError;
use rustyline::history::DefaultHistory;
use rustyline::{CompletionType, Config, Editor, EventHandler, KeyEvent};

use super::editing::{CancelUnfinished, Editing, Names};
use crate::cli::{Outcome, Terminal, interrupt_flag, say};
use crate::script::{Cells, Language, Sandbox, Session};

const PROMPT: &str = "kolk: ";

/// Talks until the person leaves. Where standard input is no terminal it is run as one script.
pub(crate) fn converse(sandbox: Sandbox, terminal: &Terminal) -> Outcome {
    let session = Session::new(sandbox, say).cancelled_by(interrupt_flag(false));
    let cells = Cells::new(Language::new(terminal.watching(session)));
    if std::io::stdin().is_terminal() {
        talk(cells, terminal)
    } else {
        run_input(cells, terminal)
    }
}

fn run_input(mut cells: Cells, terminal: &Terminal) -> Outcome {
    let mut text = String::new();
    if let Err(error) = std::io::stdin().read_to_string(&mut text) {
        return terminal.misused(&format!("cannot read standard input: {error}"));
    }
    match cells.evaluate(&text) {
        Ok(value) => {
            value.as_deref().inspect(|value| say(value));
            Outcome::Done
        }
        Err(trouble) => terminal.show(&trouble),
    }
}

fn talk(mut cells: Cells, terminal: &Terminal) -> Outcome {
    let names = Rc::new(RefCell::new(Names::default()));
    let mut editor = match editor(Rc::clone(&names)) {
        Ok(editor) => editor,
        Err(error) => return terminal.misused(&format!("this terminal cannot be used: {error}")),
    };
    let history = history_file();
    // A history that cannot be read or written is no reason to trouble anyone.
    if let Some(file) = &history {
        let _ = editor.load_history(file);
    }
    say(&format!(
        "kolk {}. help() lists what there is, Ctrl-C stops what runs, Ctrl-D leaves.",
        env!("CARGO_PKG_VERSION")
    ));
    loop {
        *names.borrow_mut() = known_names(&cells);
        match editor.readline(PROMPT) {
            Ok(text) => {
                if text.trim().is_empty() {
                    continue;
                }
                let _ = editor.add_history_entry(text.trim_end());
                if let Some(file) = &history {
                    let _ = editor.append_history(file);
                }
                if matches!(text.trim(), "exit" | "exit()" | "quit" | "quit()") {
                    return Outcome::Done;
                }
                answer(&mut cells, &text, terminal);
            }
            Err(ReadlineError::Interrupted) => {}
            Err(ReadlineError::Eof) => return Outcome::Done,
            Err(error) => {
                return terminal.misused(&format!("this terminal cannot be used: {error}"));
            }
        }
    }
}

fn answer(cells: &mut Cells, text: &str, terminal: &Terminal) {
    let result = cells.evaluate(&with_brackets(text));
    terminal.clear_progress();
    match result {
        Ok(Some(value)) => say(&value),
        Ok(None) => {}
        Err(trouble) => {
            terminal.show(&trouble);
        }
    }
}

/// `help swirl` is taken for `help("swirl")`, and `help` alone for `help()`.
fn with_brackets(text: &str) -> String {
    let trimmed = text.trim();
    match trimmed.strip_prefix("help") {
        Some("") => "help()".to_owned(),
        Some(rest) if rest.starts_with(' ') && !rest.contains(['(', '"', '=', '\n', ';', '`']) => {
            format!("help(\"{}\")", rest.trim())
        }
        _ => text.to_owned(),
    }
}

fn editor(names: Rc<RefCell<Names>>) -> rustyline::Result<Editor<Editing, DefaultHistory>> {
    let config = Config::builder()
        .completion_type(CompletionType::List)
        .history_ignore_dups(true)?
        .max_history_size(10_000)?
        .build();
    let mut editor = Editor::with_config(config)?;
    editor.set_helper(Some(Editing::new(names)));
    let cancel = EventHandler::Conditional(Box::new(CancelUnfinished));
    editor.bind_sequence(KeyEvent::ctrl('D'), cancel);
    Ok(editor)
}

fn known_names(cells: &Cells) -> Names {
    let registry = cells.language().registry();
    let owned = |names: Vec<&str>| names.into_iter().map(str::to_owned).collect::<Vec<_>>();
    let mut free = owned(registry.names());
    free.extend(cells.variables().into_iter().map(|(name, _)| name));
    free.extend(
        [
            "let", "const", "for", "while", "if", "else", "return", "import", "true", "false",
        ]
        .map(str::to_owned),
    );
    Names {
        free,
        after_a_dot: owned(registry.names_after_a_dot()),
    }
}

/// `kolk/history` in the user's data folder, which is made when it is not there.
fn history_file() -> Option<PathBuf> {
    let folder = |name: &str| {
        std::env::var_os(name)
            .filter(|v| !v.is_empty())
            .map(PathBuf::from)
    };
    let data = folder("XDG_DATA_HOME")
        .or_else(|| folder("APPDATA"))
        .or_else(|| folder("HOME").map(|home| home.join(".local/share")))?;
    let own = data.join("kolk");
    std::fs::create_dir_all(&own).ok()?;
    Some(own.join("history"))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn help_may_be_asked_without_brackets() {
        assert_eq!(with_brackets("help"), "help()");
        assert_eq!(
            with_brackets("help vector field "),
            "help(\"vector field\")"
        );
        assert_eq!(with_brackets("help(\"x\")"), "help(\"x\")");
        assert_eq!(with_brackets("helper + 1"), "helper + 1");
        assert_eq!(with_brackets("help = 3"), "help = 3");
    }
}
