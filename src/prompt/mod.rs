//! The interactive prompt: lines in, short summaries out.
//!
//! What a cell means is the language's affair ([`crate::script::Cells`]); here live only
//! editing, history, completion and the conversation itself.

mod conversation;
mod editing;

pub(crate) use conversation::converse;
