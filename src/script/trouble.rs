//! An error as a person sees it: what happened, where, how it came to be called, and a hint.

use ariadne::{Color, Config, Label, Report, ReportKind, Source};
use rhai::{EvalAltResult, Position};

use super::Registry;
use super::session::Session;
use super::wording::{Wording, say};

/// A place in a script.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Place {
    /// Name of the script or cell.
    pub source: String,
    /// Its whole text; empty when it is not at hand.
    pub text: String,
    /// Line, from 1.
    pub line: usize,
    /// Column in characters, from 1.
    pub column: usize,
    /// Characters from the start of the text to the start and the end of what is meant.
    pub span: std::ops::Range<usize>,
}

/// An error of a script, ready to be shown.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Trouble {
    /// What happened, in one sentence.
    pub message: String,
    /// What would be right.
    pub hint: Option<String>,
    /// Where it happened: the innermost place.
    pub place: Option<Box<Place>>,
    /// The calls that led there, innermost first, as `name, called at file:line:column`.
    pub calls: Vec<String>,
    /// True when the script did not fail but was interrupted.
    pub interrupted: bool,
}

impl Trouble {
    /// Trouble without a place.
    pub fn plain(message: impl Into<String>) -> Self {
        Self {
            message: message.into(),
            hint: None,
            place: None,
            calls: Vec::new(),
            interrupted: false,
        }
    }

    /// What the engine reported about the script `source`; `names` are the variables in scope.
    pub(super) fn of(
        error: &EvalAltResult,
        source: &str,
        session: &Session,
        registry: &Registry,
        names: &[String],
    ) -> Self {
        let mut source = source.to_owned();
        let mut calls = Vec::new();
        let mut error = error;
        loop {
            let (what, inner, next, position) = match error {
                EvalAltResult::ErrorInFunctionCall(name, from, inner, position) => {
                    (called(name), inner, from, position)
                }
                EvalAltResult::ErrorInModule(name, inner, position) => (
                    format!("the module {name}, imported"),
                    inner,
                    name,
                    position,
                ),
                _ => break,
            };
            let call = format!("{what} at {}", at(&source, *position));
            // The built-in that calls a function stands at the same place as the function.
            let place = at(&source, *position);
            if !calls
                .last()
                .is_some_and(|last: &String| last.ends_with(&format!(" {place}")))
            {
                calls.push(call);
            }
            if !next.is_empty() {
                source.clone_from(next);
            }
            error = inner;
        }
        calls.reverse();
        let text = session.sources.text(&source).unwrap_or_default();
        let Wording { message, hint, key } = say(error, registry, names, &text);
        Self {
            message,
            hint,
            place: place(&source, &text, error.position(), key.as_deref()),
            calls,
            interrupted: matches!(error, EvalAltResult::ErrorTerminated(..)),
        }
    }

    /// The whole message for a terminal, in colour where `colour` says so.
    pub fn display(&self, colour: bool) -> String {
        let calls = self.calls.iter().map(|call| format!("in {call}"));
        let calls = calls.collect::<Vec<_>>().join("\n");
        let Some(place) = self.place.as_ref().filter(|p| !p.text.is_empty()) else {
            return self.without_place(&calls);
        };
        let name = place.source.as_str();
        let mut report = Report::build(
            ReportKind::Custom("error", Color::Red),
            (name, place.span.clone()),
        )
        .with_config(Config::default().with_color(colour))
        .with_message(&self.message)
        .with_label(
            Label::new((name, place.span.clone()))
                .with_message("here")
                .with_color(Color::Red),
        );
        if let Some(hint) = &self.hint {
            report.set_help(hint);
        }
        if !calls.is_empty() {
            report.set_note(calls);
        }
        let mut shown = Vec::new();
        let source = (name, Source::from(place.text.as_str()));
        match report.finish().write(source, &mut shown) {
            Ok(()) => tidy(&String::from_utf8_lossy(&shown), colour),
            Err(_) => self.without_place(""),
        }
    }

    fn without_place(&self, calls: &str) -> String {
        let mut text = format!("error: {}\n", self.message);
        if let Some(place) = &self.place {
            text += &format!("  at {}:{}:{}\n", place.source, place.line, place.column);
        }
        for line in self
            .hint
            .iter()
            .flat_map(|hint| hint.lines())
            .chain(calls.lines())
        {
            text += &format!("  {line}\n");
        }
        text
    }
}

/// Ends every line at its last visible character. The word "error" arrives in colour whatever the
/// settings say.
fn tidy(text: &str, colour: bool) -> String {
    let plain;
    let text = if colour {
        text
    } else {
        plain = text.replace("\u{1b}[31m", "").replace("\u{1b}[0m", "");
        &plain
    };
    let mut tidy: String = text
        .lines()
        .map(|line| line.trim_end().to_owned() + "\n")
        .collect();
    while tidy.ends_with("\n\n") {
        tidy.pop();
    }
    tidy
}

fn called(name: &str) -> String {
    if name.starts_with("anon$") {
        "a function without a name, called".to_owned()
    } else {
        format!("{name}, called")
    }
}

fn at(source: &str, position: Position) -> String {
    match (position.line(), position.position()) {
        (Some(line), Some(column)) => format!("{source}:{line}:{column}"),
        (Some(line), None) => format!("{source}:{line}"),
        _ => source.to_owned(),
    }
}

/// The place of an error, narrowed to the option `key` where that stands close behind.
fn place(source: &str, text: &str, position: Position, key: Option<&str>) -> Option<Box<Place>> {
    let line = position.line()?;
    let column = position.position().unwrap_or(1);
    let before: usize = text
        .split('\n')
        .take(line - 1)
        .map(|line| line.chars().count() + 1)
        .sum();
    // A script that ends too early fails behind its last character: show that character.
    let last = text.trim_end().chars().count().saturating_sub(1);
    let start = (before + column - 1).min(last);
    let rest: String = text.chars().skip(start).collect();
    let span = key
        .and_then(|key| key_span(&rest, key))
        .unwrap_or_else(|| 0..token_length(&rest));
    let span = span.start + start..span.end + start;
    let (line, column) = if span.start == before + column - 1 {
        (line, column)
    } else {
        line_and_column(text, span.start)
    };
    Some(Box::new(Place {
        source: source.to_owned(),
        text: text.to_owned(),
        line,
        column,
        span,
    }))
}

fn line_and_column(text: &str, offset: usize) -> (usize, usize) {
    let before: String = text.chars().take(offset).collect();
    let line = before.matches('\n').count() + 1;
    let column = before
        .rsplit('\n')
        .next()
        .unwrap_or_default()
        .chars()
        .count()
        + 1;
    (line, column)
}

/// Where `key:` stands in the rest of the statement.
fn key_span(rest: &str, key: &str) -> Option<std::ops::Range<usize>> {
    let statement = rest.split(';').next().unwrap_or(rest);
    let chars: Vec<char> = statement.chars().collect();
    let wanted: Vec<char> = key.chars().collect();
    let is_word = |c: Option<&char>| c.is_some_and(|c| c.is_alphanumeric() || *c == '_');
    (0..chars.len().checked_sub(wanted.len())? + 1).find_map(|i| {
        let end = i + wanted.len();
        let before = i.checked_sub(1).and_then(|i| chars.get(i));
        let alone = !is_word(before) && !is_word(chars.get(end));
        let colon = chars
            .get(end..)?
            .iter()
            .find(|c| !c.is_whitespace() && **c != '"')
            == Some(&':');
        (alone && colon && chars.get(i..end)? == wanted.as_slice()).then_some(i..end)
    })
}

/// Characters of the word, text or symbol a place begins with.
fn token_length(rest: &str) -> usize {
    let mut chars = rest.chars();
    let Some(first) = chars.next() else {
        return 1;
    };
    if first.is_alphanumeric() || first == '_' {
        return 1 + chars
            .take_while(|c| c.is_alphanumeric() || *c == '_')
            .count();
    }
    if first == '"' || first == '`' {
        let inside = chars.take_while(|c| *c != first && *c != '\n').count();
        return (inside + 2).min(rest.lines().next().unwrap_or_default().chars().count());
    }
    if "+-*/%=<>!&|".contains(first) {
        return 1 + chars.take_while(|c| "*=&|".contains(*c)).count();
    }
    1
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_place_is_narrowed_to_the_option() {
        let text = "let how =\n  plan(#{ a: 1, windows_px: 3 });";
        let place = place("x", text, Position::new(2, 3), Some("windows_px")).unwrap();
        assert_eq!((place.line, place.column), (2, 17));
        assert_eq!(&text[place.span], "windows_px");
    }

    #[test]
    fn the_place_is_a_whole_word_or_text() {
        assert_eq!(token_length("gradient()"), 8);
        assert_eq!(token_length("\"a b\", 3"), 5);
        assert_eq!(token_length("** 2"), 2);
        assert_eq!(token_length("("), 1);
    }
}
