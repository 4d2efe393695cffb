//! What a built-in says when it cannot do what was asked.

use std::sync::Arc;

use rhai::{Dynamic, EvalAltResult, Position};

use super::kind::Kind;

/// A message, and where one is known a hint and the option it is about.
///
/// Every error of a kernel turns into one by itself, so a binding may use `?`.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Fault {
    message: String,
    hint: Option<String>,
    key: Option<String>,
}

impl Fault {
    /// A fault with this message: one sentence without a full stop, in the reader's words.
    pub fn new(message: impl Into<String>) -> Self {
        Self {
            message: message.into(),
            hint: None,
            key: None,
        }
    }

    /// The same with a hint: what would be right.
    pub fn hint(mut self, hint: impl Into<String>) -> Self {
        self.hint = Some(hint.into());
        self
    }

    /// The same about the option `key`, so that the place shown is that key.
    pub fn at_key(mut self, key: &str) -> Self {
        self.key = Some(key.to_owned());
        self
    }

    /// The message.
    pub fn message(&self) -> &str {
        &self.message
    }

    /// The hint, if there is one.
    pub fn hint_text(&self) -> Option<&str> {
        self.hint.as_deref()
    }

    /// The option the fault is about, if it is about one.
    pub fn key(&self) -> Option<&str> {
        self.key.as_deref()
    }

    pub(super) fn into_error(self) -> Box<EvalAltResult> {
        EvalAltResult::ErrorRuntime(Dynamic::from(Arc::new(self)), Position::NONE).into()
    }
}

impl<E: std::error::Error> From<E> for Fault {
    /// The error's own message; what a unit mismatch advises becomes the hint.
    fn from(error: E) -> Self {
        let text = error.to_string();
        match text.split_once(" do not go together: ") {
            Some((units, advice)) => Fault::new(format!("{units} do not go together")).hint(advice),
            None => Fault::new(text),
        }
    }
}

impl Kind for Fault {
    const NAME: &'static str = "error";
    const ABOUT: &'static str =
        "What a built-in could not do, as `catch (e)` receives it; it prints as its message.";

    fn show(&self) -> String {
        self.message.clone()
    }
}
