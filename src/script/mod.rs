//! The language: engine, built-ins, help, errors, and what a script may touch.
//!
//! A built-in is one [`Record`]: its documentation and the Rust closure behind it stand together
//! in one file a room under `bind/`. The [`Registry`] of all records feeds the engine, `help`,
//! completion and the reference. No kernel lives here, and nothing outside this room knows which
//! engine runs the language.
//!
//! # Where to look
//!
//! | file | what it holds |
//! | --- | --- |
//! | `record`, `registry`, `draft` | built-ins as records, how they are written and found |
//! | `kind`, `argument`, `answer`, `bind_fn` | values of the language as Rust sees them |
//! | `options` | option maps as documented structs |
//! | `arithmetic`, `signs`, `number` | what `/`, `==`, `**`, `-x ** 2` mean, and how a number prints |
//! | `fault`, `wording`, `trouble` | errors: ours, the engine's in our words, and their display |
//! | `session`, `sandbox`, `settings` | what a run may read, write and be told |
//! | `language`, `cells`, `modules` | running files, cells of a prompt, and imports |
//! | `help`, `unfinished` | what a person at the prompt sees |

mod answer;
mod argument;
mod arithmetic;
mod bind;
mod bind_fn;
mod call;
mod cells;
mod draft;
mod fault;
mod help;
mod kind;
mod language;
mod modules;
mod number;
mod options;
mod record;
mod registry;
mod sandbox;
mod session;
mod settings;
mod signs;
mod sources;
mod trouble;
mod unfinished;
#[cfg(test)]
mod walk;
mod wording;

pub use answer::Answer;
pub use argument::{Argument, Shape};
pub use bind_fn::{BindFunction, BindMethod};
pub use call::Call;
pub use cells::Cells;
pub use draft::Room;
pub use fault::Fault;
pub use help::{Help, help_for, overview};
pub use kind::{Kind, Subject};
pub(crate) use language::read_script;
pub use language::{Language, on_a_big_stack};
pub use number::number_text;
pub use options::{Needed, OptionKey, Optional, Options};
pub use record::{Example, Form, Input, Outcome, Record};
pub use registry::Registry;
pub use sandbox::{Sandbox, SandboxError};
pub use session::{Session, Sink};
pub use settings::{DeclaredSetting, SettingError, Settings};
pub use trouble::{Place, Trouble};
pub use unfinished::is_unfinished;
