//! `kolk docs [NAME]`: the documentation of the language.

use super::arguments::Docs;
use super::{Outcome, say};
use crate::script::{Registry, help_for, overview};

/// Prints the page asked for.
pub(super) fn docs(docs: &Docs) -> Outcome {
    let registry = Registry::new();
    let asked = docs.about.join(" ");
    let page = if asked.trim().is_empty() {
        overview(&registry)
    } else {
        help_for(&registry, &asked)
    };
    say(&page.0);
    Outcome::Done
}
