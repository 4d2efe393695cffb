//! Help from the records: by name, by kind, by value, by word.

use std::fmt::Write;

use super::kind::{Kind, with_article};
use super::options::OptionKey;
use super::record::{Form, Record};
use super::registry::{KindRecord, Registry};

/// A page of help: a value that prints itself.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Help(pub String);

impl Kind for Help {
    const NAME: &'static str = "help page";
    const ABOUT: &'static str = "A page of help; it prints as its text.";

    fn show(&self) -> String {
        self.0.clone()
    }
}

/// The page for what was asked: a built-in's name, a kind of value, or words to search.
pub fn help_for(registry: &Registry, asked: &str) -> Help {
    let asked = asked.trim();
    let named = registry.named(asked);
    if !named.is_empty() {
        return Help(named.iter().map(|r| page(r)).collect::<Vec<_>>().join("\n"));
    }
    if let Some(kind) = registry.kind(asked) {
        return kind_page(registry, kind);
    }
    let found = registry.search(asked);
    if found.is_empty() {
        let hint = super::wording::nearest(asked, registry.names().into_iter())
            .map_or_else(String::new, |name| format!(" Did you mean `{name}`?"));
        return Help(format!(
            "Nothing about \"{asked}\".{hint} help() lists everything."
        ));
    }
    Help(format!("About \"{asked}\":\n{}", lines(&found)))
}

/// The page about a kind of value and everything that belongs to it.
pub(super) fn kind_page(registry: &Registry, kind: &KindRecord) -> Help {
    let mut text = format!("{}\n  {}\n", kind.name, kind.about);
    let own: Vec<_> = registry.belonging_to(kind.name);
    if !own.is_empty() {
        let _ = write!(text, "\n{}", lines(&own));
    }
    Help(text.trim_end().to_owned())
}

/// The first page: every room with its names.
pub fn overview(registry: &Registry) -> Help {
    let mut text =
        String::from("help(\"name\"), help(value) or help(\"words to search\") says more.\n");
    let mut rooms: Vec<&str> = Vec::new();
    for record in registry.records() {
        if !rooms.contains(&record.room) {
            rooms.push(record.room);
        }
    }
    for room in rooms {
        let mut names: Vec<&str> = registry
            .records()
            .iter()
            .filter(|r| r.room == room && !matches!(r.form, Form::Operator | Form::Index))
            .map(|r| r.name)
            .collect();
        names.sort_unstable();
        names.dedup();
        if !names.is_empty() {
            let _ = write!(text, "\n{room}\n{}", wrapped(&names.join(", "), 2));
        }
    }
    Help(text.trim_end().to_owned())
}

/// Everything known of one built-in.
fn page(record: &Record) -> String {
    let mut text = format!("{}\n{}", record.usage(), wrapped(record.about, 2));
    if let (Some(kind), true) = (record.subject, record.form == Form::Function) {
        let _ = writeln!(
            text,
            "  takes {}{}",
            with_article(kind),
            in_unit(record.subject_unit)
        );
    }
    for input in record.inputs.iter().filter(|i| i.shape.options.is_none()) {
        let left_out = if input.shape.optional {
            ", may be left out"
        } else {
            ""
        };
        let _ = writeln!(
            text,
            "  {}: {}{}{left_out}. {}",
            input.name,
            with_article(&input.shape.kind),
            in_unit(input.unit),
            sentence(input.meaning)
        );
    }
    let options = record.options();
    if !options.is_empty() {
        text += "  options:\n";
        text += &option_lines(&options);
    }
    if record.form != Form::Constant && record.outcome.kind != "nothing" {
        let _ = writeln!(
            text,
            "  gives {}{}",
            with_article(&record.outcome.kind),
            in_unit(record.outcome.unit)
        );
    }
    if !record.errors.is_empty() {
        let _ = writeln!(text, "  fails when {}", record.errors);
    }
    if !record.source.is_empty() {
        let _ = writeln!(text, "  after {}", record.source);
    }
    for example in &record.examples {
        text += "\n";
        for line in example.code.lines() {
            let _ = writeln!(text, "    {line}");
        }
        for line in example.output.lines() {
            let _ = writeln!(text, "      {line}");
        }
    }
    text
}

fn option_lines(options: &[OptionKey]) -> String {
    let mut text = String::new();
    let width = options.iter().map(|o| o.name.len()).max().unwrap_or(0);
    for option in options {
        let _ = writeln!(
            text,
            "    {:width$}  {}; default {}. {}",
            option.name,
            option.kind_text(),
            option.default_text(),
            option.about
        );
    }
    text
}

fn in_unit(unit: &str) -> String {
    match unit {
        "" | "plain" => String::new(),
        unit => format!(" ({unit})"),
    }
}

fn sentence(text: &str) -> String {
    let mut chars = text.chars();
    let mut text: String = match chars.next() {
        Some(first) => first.to_uppercase().chain(chars).collect(),
        None => String::new(),
    };
    if !text.ends_with('.') {
        text.push('.');
    }
    text
}

/// One line a record: how it is written, then what it does.
fn lines(records: &[&Record]) -> String {
    let usages: Vec<String> = records.iter().map(|r| r.usage()).collect();
    let width = usages
        .iter()
        .map(|u| u.chars().count())
        .max()
        .unwrap_or(0)
        .min(44);
    let mut text = String::new();
    for (record, usage) in records.iter().zip(usages) {
        let _ = writeln!(text, "  {usage:width$}  {}", first_sentence(record.about));
    }
    text
}

fn first_sentence(text: &str) -> &str {
    match text.find(". ") {
        Some(end) => &text[..=end],
        None => text,
    }
}

/// Words filled into lines of at most 78 characters, each indented.
fn wrapped(text: &str, indent: usize) -> String {
    let mut lines = String::new();
    let mut line = String::new();
    for word in text.split_whitespace() {
        if !line.is_empty() && indent + line.chars().count() + 1 + word.chars().count() > 78 {
            let _ = writeln!(lines, "{:indent$}{line}", "");
            line.clear();
        }
        if !line.is_empty() {
            line.push(' ');
        }
        line.push_str(word);
    }
    if !line.is_empty() {
        let _ = writeln!(lines, "{:indent$}{line}", "");
    }
    lines
}
