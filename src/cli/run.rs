//! `kolk run FILE`: runs a script.

use std::path::Path;

use clap::CommandFactory;

use super::arguments::{Arguments, Run};
use super::terminal::interrupt_flag;
use super::{Outcome, Terminal, sandbox, say};
use crate::script::{DeclaredSetting, Language, Session, Settings, Trouble, read_script};

/// Runs the script, or prints help about it.
pub(super) fn run(run: &Run, terminal: &Terminal) -> Outcome {
    let Some(file) = &run.file else {
        return help_of_the_command();
    };
    let text = match read_script(file) {
        Ok(text) => text,
        Err(trouble) => {
            terminal.complain(&trouble.display(false));
            return Outcome::Misused;
        }
    };
    match session(run, file) {
        Err(message) => terminal.misused(&message),
        Ok(session) => {
            let language = Language::new(terminal.watching(session));
            run_text(run, file, &text, &language, terminal)
        }
    }
}

fn session(run: &Run, file: &Path) -> Result<Session, String> {
    let settings = Settings::parse(&run.set).map_err(|error| format!("--set: {error}"))?;
    let sandbox = sandbox(&run.places, Some(file)).map_err(|error| error.to_string())?;
    Ok(Session::new(sandbox, say)
        .with_settings(settings)
        .cancelled_by(interrupt_flag(true)))
}

fn run_text(
    run: &Run,
    file: &Path,
    text: &str,
    language: &Language,
    terminal: &Terminal,
) -> Outcome {
    let name = file.display().to_string();
    let declared = match language.settings_of(&name, text) {
        Ok(declared) => declared,
        Err(trouble) => return terminal.show(&trouble),
    };
    if run.help {
        say(&help_of_the_script(&name, text, &declared));
        return Outcome::Done;
    }
    if let Err(error) = language.session().settings().check(&declared) {
        return terminal.misused(&format!("--set: {error}"));
    }
    let result: Result<_, Trouble> = language.run(&name, text);
    terminal.clear_progress();
    for path in language.session().sandbox().written() {
        terminal.complain(&format!("wrote {}\n", short(&path)));
    }
    match result {
        Ok(_) => Outcome::Done,
        Err(trouble) => terminal.show(&trouble),
    }
}

/// The path from the current folder where it lies below it.
fn short(path: &Path) -> String {
    let here = std::env::current_dir().and_then(|here| here.canonicalize());
    let short = here.ok().and_then(|here| path.strip_prefix(here).ok());
    short.unwrap_or(path).display().to_string()
}

fn help_of_the_command() -> Outcome {
    let mut command = Arguments::command();
    command.build();
    if let Some(run) = command.find_subcommand_mut("run") {
        say(&run.render_help().to_string());
    }
    Outcome::Done
}

/// The comment a script begins with, and its settings.
fn help_of_the_script(name: &str, text: &str, declared: &[DeclaredSetting]) -> String {
    let mut help = format!("kolk run {name} [--set NAME=VALUE]... [--out DIR]\n");
    for line in text.lines().take_while(|line| line.starts_with("//")) {
        help += &format!("\n  {}", line.trim_start_matches('/').trim());
    }
    if declared.is_empty() {
        return help + "\n\nIt has no settings.";
    }
    help += "\n\nSettings:";
    let width = declared.iter().map(|d| d.name.len()).max().unwrap_or(0);
    for setting in declared {
        help += &format!(
            "\n  {:width$}  {} (default {})",
            setting.name, setting.meaning, setting.default
        );
    }
    help
}
