//! The command line: one file a command, and what they share of the terminal.
//!
//! Exit codes: 0 when all went well, 1 when a script failed, 2 when the command line was wrong,
//! 130 when the run was interrupted.

mod arguments;
mod demo;
mod docs;
mod run;
mod terminal;

use std::path::Path;
use std::process::ExitCode;

use clap::Parser;
use clap::error::{ContextKind, ContextValue};

use crate::script::{Sandbox, SandboxError, on_a_big_stack};
use arguments::{Arguments, Command, Places};

pub(crate) use terminal::{Terminal, interrupt_flag, say};

/// How a command ended.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum Outcome {
    /// All went well.
    Done,
    /// A script failed, or a file did.
    Failed,
    /// The command line was wrong.
    Misused,
    /// The person stopped it.
    Interrupted,
}

impl From<Outcome> for ExitCode {
    fn from(outcome: Outcome) -> Self {
        ExitCode::from(match outcome {
            Outcome::Done => 0,
            Outcome::Failed => 1,
            Outcome::Misused => 2,
            // 128 + SIGINT, as shells report it.
            Outcome::Interrupted => 130,
        })
    }
}

/// Reads the command line and does what it says.
pub fn main() -> ExitCode {
    let arguments = match Arguments::try_parse() {
        Ok(arguments) => arguments,
        Err(error) => {
            if let Some(ContextValue::String(word)) = error.get(ContextKind::InvalidSubcommand)
                && word.ends_with(".rhai")
            {
                let message =
                    format!("there is no command `{word}`; did you mean `kolk run {word}`?");
                return Terminal::new().misused(&message).into();
            }
            // Help and version arrive here too; they print to standard output. A closed pipe is
            // no reason to fail.
            let _ = error.print();
            return ExitCode::from(u8::try_from(error.exit_code()).unwrap_or(2));
        }
    };
    // A panic is reported once, as an error of the script that met it.
    std::panic::set_hook(Box::new(|_| ()));
    match on_a_big_stack(move || dispatch(arguments)) {
        Ok(outcome) => outcome.into(),
        Err(reason) => {
            Terminal::new().complain(&format!("error: kolk itself failed: {reason}\n"));
            ExitCode::FAILURE
        }
    }
}

fn dispatch(arguments: Arguments) -> Outcome {
    let terminal = Terminal::new();
    if let Some(threads) = arguments.places.threads {
        // Fails only where the threads already run, which they do not yet.
        let _ = rayon::ThreadPoolBuilder::new()
            .num_threads(threads)
            .build_global();
    }
    match arguments.command {
        None => prompt(&arguments.places, &terminal),
        Some(Command::Run(run)) => run::run(&run, &terminal),
        Some(Command::Demo(demo)) => demo::demo(&demo, &terminal),
        Some(Command::Docs(docs)) => docs::docs(&docs),
    }
}

fn prompt(places: &Places, terminal: &Terminal) -> Outcome {
    match sandbox(places, None) {
        Ok(sandbox) => crate::prompt::converse(sandbox, terminal),
        Err(error) => terminal.misused(&error.to_string()),
    }
}

/// What a run may touch: the folder it was started in, the script's own folder and every `--read`
/// folder to read from, `--out` to write below.
fn sandbox(places: &Places, script: Option<&Path>) -> Result<Sandbox, SandboxError> {
    let mut read = places.read.clone();
    if let Some(folder) = script.and_then(Path::parent)
        && !folder.as_os_str().is_empty()
    {
        read.push(folder.to_owned());
    }
    Sandbox::new(Path::new("."), &read, &places.out)
}
