//! The engine's errors in our own words.

use std::sync::Arc;

use rhai::{EvalAltResult, LexError, ParseErrorType, Position};

use super::fault::Fault;
use super::kind::{PLAIN_KINDS, show, with_article};
use super::record::{Form, Record};
use super::registry::Registry;

/// An error in words.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub(super) struct Wording {
    pub message: String,
    pub hint: Option<String>,
    /// The option it is about.
    pub key: Option<String>,
}

impl Wording {
    fn new(message: impl Into<String>) -> Self {
        Self {
            message: message.into(),
            ..Self::default()
        }
    }

    fn hint(mut self, hint: impl Into<String>) -> Self {
        self.hint = Some(hint.into());
        self
    }

    fn maybe(mut self, hint: Option<String>) -> Self {
        self.hint = hint;
        self
    }
}

/// The known name nearest to `name`, if one is near enough to have been meant.
pub(super) fn nearest<'a>(name: &str, known: impl Iterator<Item = &'a str>) -> Option<&'a str> {
    known
        .filter(|k| *k != name)
        .map(|k| (strsim::damerau_levenshtein(name, k), k))
        .filter(|(distance, k)| {
            // Up to a third of the letters may differ, or one is the beginning of the other.
            let longest = name.chars().count().max(k.chars().count());
            *distance <= longest / 3
                || (name.len() >= 3 && (k.starts_with(name) || name.starts_with(k)) && k.len() >= 3)
        })
        .min_by_key(|(distance, _)| *distance)
        .map(|(_, k)| k)
}

fn did_you_mean(name: &str) -> String {
    format!("did you mean `{name}`?")
}

/// Says what an innermost error in the script `text` means.
pub(super) fn say(
    error: &EvalAltResult,
    registry: &Registry,
    names: &[String],
    text: &str,
) -> Wording {
    use EvalAltResult as E;
    match error {
        E::ErrorRuntime(thrown, _) => match thrown.read_lock::<Arc<Fault>>() {
            Some(fault) => Wording {
                message: fault.message().to_owned(),
                hint: fault.hint_text().map(str::to_owned),
                key: fault.key().map(str::to_owned),
            },
            None if thrown.is_string() => Wording::new(thrown.to_string()),
            None => Wording::new(format!("the script threw {}", show(thrown))),
        },
        E::ErrorParsing(kind, position) => parsing(kind, text, *position),
        E::ErrorVariableNotFound(name, position) => {
            let set_to = set_to(name, text, *position);
            variable(name, registry, names, set_to)
        }
        E::ErrorFunctionNotFound(signature, _) => function(signature, registry, names),
        E::ErrorDotExpr(text, _) => property(text, registry),
        E::ErrorIndexingType(text, _) => indexing(text),
        E::ErrorPropertyNotFound(name, _) => missing_key(name, text),
        E::ErrorIndexNotFound(index, _) => {
            Wording::new(format!("there is nothing at {}", show(index)))
        }
        E::ErrorArrayBounds(count, index, _) => past_the_end("list", "item", *count, *index),
        E::ErrorStringBounds(count, index, _) => past_the_end("text", "character", *count, *index),
        E::ErrorMismatchDataType(wanted, given, _)
        | E::ErrorMismatchOutputType(wanted, given, _) => mismatch(wanted, given),
        E::ErrorAssignmentToConstant(name, _) => {
            Wording::new(format!("`{name}` is a constant and keeps its value"))
        }
        E::ErrorNonPureMethodCallOnConstant(name, _) => {
            let name = name.rsplit('$').next().unwrap_or(name);
            Wording::new(format!("`{name}` would change a constant"))
        }
        E::ErrorModuleNotFound(name, _) => Wording::new(format!("there is no module `{name}`")),
        E::ErrorFor(_) => Wording::new("`for` cannot go through this value")
            .hint("it goes through a list, a range such as 0..10, or a text's characters"),
        E::ErrorArithmetic(text, _) => arithmetic(text),
        E::ErrorStackOverflow(_) => Wording::new("functions call one another too deeply")
            .hint("a function that calls itself needs a case in which it stops"),
        E::ErrorDataTooLarge(what, _) => too_large(what),
        E::ErrorTerminated(..) => Wording::new("interrupted"),
        E::ErrorUnboundThis(_) => Wording::new("`this` stands for nothing here")
            .hint("it is the value before the dot of a call"),
        E::ErrorVariableExists(name, _) => Wording::new(format!("`{name}` exists already")),
        E::ErrorForbiddenVariable(name, _) => {
            Wording::new(format!("`{name}` cannot be the name of a variable"))
        }
        E::ErrorDataRace(name, _) => Wording::new(format!(
            "{} is in use by the very call it is given to",
            if name.is_empty() { "a value" } else { name }
        )),
        E::ErrorTooManyOperations(_) => Wording::new("the script ran too long"),
        E::ErrorTooManyVariables(_) => Wording::new("the script has too many variables"),
        E::ErrorTooManyModules(_) => Wording::new("the script imports too many modules"),
        E::ErrorSystem(text, inner) => Wording::new(if text.is_empty() {
            inner.to_string()
        } else {
            format!("{text}: {inner}")
        }),
        E::LoopBreak(is_break, ..) => {
            let word = if *is_break { "break" } else { "continue" };
            Wording::new(format!("`{word}` stands outside a loop"))
        }
        other => Wording::new(lower_first(&other.to_string())),
    }
}

/// What stands before and from this position on.
fn split_at(text: &str, position: Position) -> Option<(&str, &str)> {
    let line = position.line()?;
    let column = position.position().unwrap_or(1);
    let start: usize = text
        .split_inclusive('\n')
        .take(line - 1)
        .map(str::len)
        .sum();
    let inside = text
        .get(start..)?
        .char_indices()
        .nth(column.checked_sub(1)?)?
        .0;
    text.split_at_checked(start + inside)
}

/// What the variable is set to, where the position is that of `name = value`.
fn set_to<'a>(name: &str, text: &'a str, position: Position) -> Option<&'a str> {
    let (_, rest) = split_at(text, position)?;
    let value = rest.strip_prefix(name)?.trim_start().strip_prefix('=')?;
    let value = value.split([';', '\n']).next().unwrap_or_default();
    (!value.starts_with('=')).then_some(value.trim())
}

fn variable(name: &str, registry: &Registry, names: &[String], set_to: Option<&str>) -> Wording {
    let wording = Wording::new(format!("there is no variable `{name}`"));
    if names.iter().any(|n| n == name) {
        return wording.hint(format!(
            "`{name}` exists outside this function, and a function sees only its parameters: pass it in"
        ));
    }
    if let Some(value) = set_to {
        let meant = nearest(name, names.iter().map(String::as_str));
        let meant = meant.map_or(String::new(), |near| format!(", or did you mean `{near}`?"));
        let value = if (1..=30).contains(&value.len()) {
            value
        } else {
            "..."
        };
        return wording.hint(format!("write `let {name} = {value}`{meant}"));
    }
    let belongs = registry
        .named(name)
        .first()
        .map(|r| format!("`{name}` is a built-in: {}", r.usage()));
    let known = names.iter().map(String::as_str).chain(registry.names());
    wording.maybe(belongs.or_else(|| nearest(name, known).map(did_you_mean)))
}

/// Kinds as people see them, from the engine's list of argument types.
fn kinds(list: &str) -> Vec<String> {
    list.replace("&str | ImmutableString | String", "text")
        .split(", ")
        .filter(|t| !t.trim().is_empty())
        .map(|t| people_say(t.trim()))
        .collect()
}

/// One of the engine's type names in people's words.
fn people_say(name: &str) -> String {
    let plain = PLAIN_KINDS.iter().find(|(engine, _)| *engine == name);
    plain.map_or_else(|| name.to_owned(), |(_, people)| (*people).to_owned())
}

fn function(signature: &str, registry: &Registry, names: &[String]) -> Wording {
    let (name, list) = match signature.split_once(" (") {
        Some((name, rest)) => (name.trim(), rest.trim_end_matches(')')),
        None => (signature.trim(), ""),
    };
    let given = kinds(list);
    if !name.starts_with(|c: char| c.is_alphabetic() || c == '_') {
        return operator(name, &given);
    }
    let short = name.rsplit("::").next().unwrap_or(name);
    if short == "range" {
        return Wording::new("there is no function `range`").hint("`for i in 0..3 { ... }`");
    }
    let records = registry.named(short);
    let phrase = given
        .iter()
        .map(|k| with_article(k))
        .collect::<Vec<_>>()
        .join(", ");
    if records.is_empty() {
        let wording = Wording::new(if phrase.is_empty() {
            format!("there is no function `{name}`")
        } else {
            format!("there is no function `{name}` for {phrase}")
        });
        let known = registry
            .names()
            .into_iter()
            .chain(names.iter().map(String::as_str));
        return wording.maybe(nearest(short, known).map(did_you_mean));
    }
    let own: Vec<_> = records
        .iter()
        .filter(|r| r.subject.is_some() && r.subject == given.first().map(String::as_str))
        .collect();
    match own.first() {
        Some(record) => arity(record, given.len()),
        None if records.iter().all(|r| r.subject.is_none()) => arity(records[0], given.len()),
        None => {
            let usages = records.iter().map(|r| r.usage()).collect::<Vec<_>>();
            let phrase = if phrase.is_empty() {
                "nothing".to_owned()
            } else {
                phrase
            };
            let wording = Wording::new(format!("`{short}` does not take {phrase}"));
            // What cannot be saved itself may have a table that can.
            let kind = given.first().map(String::as_str).unwrap_or_default();
            let has_table = registry
                .belonging_to(kind)
                .iter()
                .any(|r| r.name == "table");
            if short == "save" && has_table {
                return wording.hint("`.table().save(...)` saves the numbers");
            }
            wording.hint(format!("it is: {}", usages.join(", ")))
        }
    }
}

/// `given` counts the subject too, where the record has one.
fn arity(record: &Record, given: usize) -> Wording {
    let own = usize::from(record.subject.is_some() && record.form == Form::Function);
    let given = given - usize::from(record.subject.is_some() && record.form != Form::Function);
    let most = record.inputs.len() + own;
    let least = record.inputs.iter().filter(|i| !i.shape.optional).count() + own;
    let wanted = match (least, most) {
        (0, 0) => "no values".to_owned(),
        (1, 1) => "1 value".to_owned(),
        (a, b) if a == b => format!("{a} values"),
        (a, b) => format!("{a} to {b} values"),
    };
    if record.form == Form::Property {
        return Wording::new(format!("`{}` is not called", record.name))
            .hint(format!("write it without brackets: {}", record.usage()));
    }
    if record.name == "print" {
        return Wording::new(format!("`print` takes {wanted}, not {given}"))
            .hint("one text in backticks holds several: print(`${a} and ${b}`)");
    }
    Wording::new(format!("`{}` takes {wanted}, not {given}", record.name))
        .hint(format!("it is: {}", record.usage()))
}

fn operator(name: &str, given: &[String]) -> Wording {
    let phrase = given.iter().map(|k| with_article(k)).collect::<Vec<_>>();
    let wording = Wording::new(match phrase.as_slice() {
        [one] => format!("`{name}` does not go with {one}"),
        [left, right] => format!("`{name}` does not go between {left} and {right}"),
        _ => format!("there is no operator `{name}`"),
    });
    let kinds: Vec<&str> = given.iter().map(String::as_str).collect();
    match kinds.as_slice() {
        ["list", "number"] => wording.hint(format!("`.map(|v| v {name} 2)` goes item by item")),
        ["number", "list"] => wording.hint(format!("`.map(|v| 2 {name} v)` goes item by item")),
        _ => wording,
    }
}

/// `Unknown property 'x' - a getter is not registered for type 'y'`.
fn property(text: &str, registry: &Registry) -> Wording {
    let mut quoted = text.split('\'').skip(1).step_by(2);
    let (Some(name), Some(kind)) = (quoted.next(), quoted.next()) else {
        return Wording::new(lower_first(text));
    };
    let kind = people_say(kind);
    if text.starts_with("No writable") {
        return Wording::new(format!("`{name}` of {} cannot be set", with_article(&kind)));
    }
    let wording = Wording::new(format!("{} has no property `{name}`", with_article(&kind)));
    let own = registry.belonging_to(&kind);
    if let Some(method) = own
        .iter()
        .find(|r| r.name == name && r.form != Form::Property)
    {
        return wording.hint(format!("`{name}` is called: {}", method.usage()));
    }
    wording.maybe(nearest(name, own.iter().map(|r| r.name)).map(did_you_mean))
}

/// `list [text]`: what was indexed, and with what.
fn indexing(text: &str) -> Wording {
    match text.split_once(" [") {
        Some((what, index)) if !text.contains("] = ") => {
            let what = people_say(what);
            let index = kinds(index.trim_end_matches(']')).join(", ");
            Wording::new(format!(
                "{} cannot be indexed with {}",
                with_article(&what),
                with_article(&index)
            ))
        }
        Some((what, _)) => Wording::new(format!(
            "the items of {} cannot be set",
            with_article(&people_say(what))
        )),
        None => Wording::new(lower_first(text)),
    }
}

/// The map itself is out of reach here, but the keys of maps stand in the script's text.
fn missing_key(name: &str, text: &str) -> Wording {
    let is_word = |c: char| c.is_alphanumeric() || c == '_';
    let keys = text.split(':').filter_map(|before| {
        let before = before.trim_end().trim_end_matches('"');
        let start = before.rfind(|c| !is_word(c)).map_or(0, |i| i + 1);
        before.get(start..).filter(|key| !key.is_empty())
    });
    Wording::new(format!("the map has no key `{name}`"))
        .maybe(nearest(name, keys).map(did_you_mean))
}

fn past_the_end(what: &str, item: &str, count: usize, index: i64) -> Wording {
    let wording = Wording::new(format!("index {index} is past the end of the {what}"));
    wording.hint(match count {
        0 => format!("the {what} is empty"),
        1 => format!("it has 1 {item}, number 0"),
        n => format!(
            "it has {n} {item}s, numbered 0 to {} (or -1 to -{n} from the end)",
            n - 1
        ),
    })
}

fn mismatch(wanted: &str, given: &str) -> Wording {
    let wanted = match wanted {
        w if w.contains("iterable") => {
            "something to go through, such as a list or 0..10,".to_owned()
        }
        w if w.contains("boolean") => "true or false".to_owned(),
        w => people_say(w),
    };
    let given = people_say(given.trim_start_matches("a "));
    match (wanted.as_str(), given.as_str()) {
        ("", given) => Wording::new(format!("{} does not fit here", with_article(given))),
        ("number", "number") => {
            Wording::new("a whole number is needed here, not one with decimals")
                .hint("round(x) gives the nearest whole number")
        }
        (wanted, "") => Wording::new(format!("{} is needed here", with_article(wanted))),
        (wanted, given) => Wording::new(format!(
            "{} is needed here, not {}",
            with_article(wanted),
            with_article(given)
        )),
    }
}

fn arithmetic(text: &str) -> Wording {
    if text.to_lowercase().contains("division by zero") {
        let sum = text.rsplit(": ").next().unwrap_or(text);
        return Wording::new(format!("division by zero: {sum}"));
    }
    let wording = Wording::new(lower_first(text));
    if text.to_lowercase().contains("overflow") {
        wording.hint("whole numbers end at 9223372036854775807; write one of them with a point (2.0) to go on in floats")
    } else {
        wording
    }
}

fn too_large(what: &str) -> Wording {
    let what = match what {
        w if w.contains("string") => "text",
        w if w.contains("array") => "list",
        _ => "map",
    };
    Wording::new(format!("the {what} grew past what a script may hold"))
}

/// True where the position is that of the colon in `({ key: value`.
fn is_bare_map(text: &str, position: Position) -> bool {
    let Some((before, rest)) = split_at(text, position) else {
        return false;
    };
    let mut open = 0;
    let brace = before.char_indices().rev().find(|(_, c)| {
        open += i32::from(*c == '}') - i32::from(*c == '{');
        open < 0
    });
    let outside = brace.map(|(i, _)| before[..i].trim_end());
    rest.starts_with(':') && outside.is_some_and(|o| o.ends_with(['(', ',', '=', ':', '[']))
}

fn parsing(kind: &ParseErrorType, text: &str, position: Position) -> Wording {
    use ParseErrorType as P;
    match kind {
        P::MissingToken(..) if is_bare_map(text, position) => {
            Wording::new("`{` begins a block here, not a map")
                .hint("options begin with `#{`: #{ key: value }")
        }
        P::BadInput(LexError::MalformedChar(_)) => Wording::new("single quotes hold one character")
            .hint("text stands in double quotes: \"so\""),
        P::UnexpectedEOF => {
            Wording::new("the script ends too early").hint("something opened was not closed")
        }
        P::BadInput(LexError::UnterminatedString) => {
            Wording::new("this text is not closed").hint("end it with the quote it began with")
        }
        P::BadInput(LexError::UnexpectedInput(s)) => {
            Wording::new(format!("`{s}` has no meaning here"))
        }
        P::BadInput(LexError::MalformedNumber(s)) => Wording::new(format!("`{s}` is not a number")),
        P::BadInput(LexError::MalformedEscapeSequence(s)) => {
            Wording::new(format!("`{s}` is not an escape")).hint("write a backslash as \\\\")
        }
        P::BadInput(LexError::ImproperSymbol(s, text)) if text.is_empty() => {
            Wording::new(format!("`{s}` has no meaning here"))
        }
        P::BadInput(LexError::ImproperSymbol(s, text)) => {
            Wording::new(format!("`{s}` has no meaning here")).hint(lower_first(text))
        }
        P::MissingToken(token, why) if token == "," => {
            Wording::new("`,` or the closing bracket is missing")
                .hint(format!("`,` is needed {why}"))
        }
        P::MissingToken(token, why) => {
            Wording::new(format!("`{token}` is missing")).hint(format!("it is needed {why}"))
        }
        P::ExprExpected(what) => Wording::new(format!(
            "{} is missing here",
            with_article(&expression(what))
        )),
        P::VariableExpected => Wording::new("the name of a variable is missing here"),
        P::PropertyExpected => Wording::new("the name of a property or key is missing here"),
        P::Reserved(word) => {
            Wording::new(format!("`{word}` is a word of the language, not a name"))
        }
        P::UnknownOperator(op) => Wording::new(format!("there is no operator `{op}`")),
        P::AssignmentToConstant(name) => {
            Wording::new(format!("`{name}` is a constant and keeps its value"))
        }
        P::AssignmentToInvalidLHS(_) => Wording::new("nothing can be assigned to this")
            .hint("`=` sets a variable; `==` compares"),
        P::DuplicatedProperty(name) => {
            Wording::new(format!("the key `{name}` stands twice in this map"))
        }
        P::MismatchedType(wanted, given) => mismatch(wanted, given),
        P::FnDuplicatedDefinition(name, n) => Wording::new(format!(
            "there are two functions `{name}` with {n} parameter{}",
            if *n == 1 { "" } else { "s" }
        )),
        P::WrongFnDefinition => Wording::new("a function is defined inside another block")
            .hint("`fn` stands at the outermost level; inside, write |x| ..."),
        P::FnMissingBody(_) => {
            Wording::new("the body of the function is missing").hint("write it in { }")
        }
        P::FnMissingParams(_) => Wording::new("the parameters of the function are missing")
            .hint("write () when it has none"),
        P::FnMissingName => Wording::new("the name of the function is missing"),
        P::LoopBreak => Wording::new("this stands outside a loop"),
        P::ExprTooDeep => Wording::new("this expression is nested too deeply")
            .hint("give its parts names with `let`"),
        P::LiteralTooLarge(..) => Wording::new("this is larger than a script may hold"),
        other => Wording::new(lower_first(&other.to_string())),
    }
}

/// What kind of expression the engine missed.
fn expression(what: &str) -> String {
    match what.trim() {
        "" => "value".to_owned(),
        w if w.contains("boolean") => "condition".to_owned(),
        w => format!("{w} expression"),
    }
}

fn lower_first(text: &str) -> String {
    let mut chars = text.chars();
    match chars.next() {
        Some(first) => first.to_lowercase().chain(chars).collect(),
        None => String::new(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_name_is_near_when_few_letters_differ() {
        let known = ["gradient", "vorticity", "windows_px", "swirl"];
        let near = |name| nearest(name, known.into_iter());
        assert_eq!(near("gradeint"), Some("gradient"));
        assert_eq!(near("window_px"), Some("windows_px"));
        assert_eq!(near("grad"), Some("gradient"));
        assert_eq!(near("x"), None);
        assert_eq!(near("temperature"), None);
    }
}
