//! The texts of everything that was run, for showing the place of an error.

use std::cell::RefCell;
use std::collections::HashMap;

/// Script texts by the name errors call them.
#[derive(Debug, Default)]
pub(super) struct Sources(RefCell<HashMap<String, String>>);

impl Sources {
    pub(super) fn keep(&self, name: &str, text: &str) {
        self.0.borrow_mut().insert(name.to_owned(), text.to_owned());
    }

    pub(super) fn text(&self, name: &str) -> Option<String> {
        self.0.borrow().get(name).cloned()
    }
}
