//! Kinds of value the language knows, by the names people see.

use std::any::TypeId;
use std::cell::RefCell;
use std::collections::HashMap;
use std::sync::Arc;

use rhai::{Array, Dynamic, FLOAT, FnPtr, INT, ImmutableString, Map};

use super::fault::Fault;
use super::number::number_text;

/// A Rust type that scripts hold as a whole value. It is kept behind an [`Arc`]: copying it in a
/// script costs nothing.
pub trait Kind: Sized + 'static {
    /// What people call it: "vector field".
    const NAME: &'static str;
    /// What it holds, in which units, in a sentence or two.
    const ABOUT: &'static str;
    /// The short summary a prompt shows and `print` prints.
    fn show(&self) -> String;

    /// How many items `for` goes through; 0 for a kind it cannot go through.
    fn count(&self) -> usize {
        0
    }

    /// The item `for` comes to at `index`, below [`Kind::count`].
    ///
    /// # Errors
    /// An item that cannot be had, such as one on a disk that is gone.
    fn item(&self, index: usize) -> Result<Dynamic, Fault> {
        Err(Fault::new(format!("a {} has no item {index}", Self::NAME)))
    }

    /// True for a kind that `for` can go through.
    const HAS_ITEMS: bool = false;
}

/// What a method, property or operator can belong to: any [`Kind`], or a plain value.
pub trait Subject: Sized + 'static {
    /// Name of the kind.
    const NAME: &'static str;
    /// The engine's types it covers.
    fn types() -> Vec<TypeId>;
    /// Lends the value to `f`; `None` when the value is of another kind.
    fn lend<R>(value: &Dynamic, f: impl FnOnce(&Self) -> R) -> Option<R>;
}

impl<T: Kind> Subject for T {
    const NAME: &'static str = T::NAME;

    fn types() -> Vec<TypeId> {
        vec![TypeId::of::<Arc<T>>()]
    }

    fn lend<R>(value: &Dynamic, f: impl FnOnce(&Self) -> R) -> Option<R> {
        let held = value.read_lock::<Arc<T>>()?.clone();
        Some(f(&held))
    }
}

impl Subject for f64 {
    const NAME: &'static str = "number";

    fn types() -> Vec<TypeId> {
        vec![TypeId::of::<FLOAT>(), TypeId::of::<INT>()]
    }

    fn lend<R>(value: &Dynamic, f: impl FnOnce(&Self) -> R) -> Option<R> {
        number(value).map(|x| f(&x))
    }
}

impl Subject for String {
    const NAME: &'static str = "text";

    fn types() -> Vec<TypeId> {
        vec![TypeId::of::<ImmutableString>()]
    }

    fn lend<R>(value: &Dynamic, f: impl FnOnce(&Self) -> R) -> Option<R> {
        let text = value.as_immutable_string_ref().ok()?.to_string();
        Some(f(&text))
    }
}

impl Subject for Array {
    const NAME: &'static str = "list";

    fn types() -> Vec<TypeId> {
        vec![TypeId::of::<Array>()]
    }

    fn lend<R>(value: &Dynamic, f: impl FnOnce(&Self) -> R) -> Option<R> {
        value.as_array_ref().ok().map(|list| f(&list))
    }
}

impl Subject for Map {
    const NAME: &'static str = "map";

    fn types() -> Vec<TypeId> {
        vec![TypeId::of::<Map>()]
    }

    fn lend<R>(value: &Dynamic, f: impl FnOnce(&Self) -> R) -> Option<R> {
        value.as_map_ref().ok().map(|map| f(&map))
    }
}

/// The number in a value, whether it was written `2` or `2.0`.
pub(super) fn number(value: &Dynamic) -> Option<f64> {
    value
        .as_float()
        .ok()
        .or_else(|| value.as_int().ok().map(|n| n as f64))
}

/// Names of the engine's own types, as people see them.
pub(super) const PLAIN_KINDS: [(&str, &str); 9] = [
    ("i64", "number"),
    ("f64", "number"),
    ("bool", "true/false"),
    ("char", "character"),
    ("string", "text"),
    ("array", "list"),
    ("map", "map"),
    ("Fn", "function"),
    ("()", "nothing"),
];

type Show = fn(&Dynamic) -> Option<String>;

thread_local! {
    /// Name and summary of every kind an engine of this thread knows, by the type it holds.
    static KNOWN: RefCell<HashMap<TypeId, (&'static str, Show)>> = RefCell::default();
}

/// Makes `T` known, so that [`kind_name`] and [`show`] can tell it from the others.
pub(super) fn learn<T: Kind>() {
    KNOWN.with_borrow_mut(|known| {
        known.insert(
            TypeId::of::<Arc<T>>(),
            (T::NAME, |value| T::lend(value, |held| held.show())),
        );
    });
}

/// What people call the kind of this value.
pub(super) fn kind_name(value: &Dynamic) -> &'static str {
    let known = KNOWN.with_borrow(|known| known.get(&value.type_id()).map(|(name, _)| *name));
    if let Some(name) = known {
        return name;
    }
    match value.type_id() {
        id if id == TypeId::of::<FLOAT>() || id == TypeId::of::<INT>() => "number",
        id if id == TypeId::of::<ImmutableString>() => "text",
        id if id == TypeId::of::<bool>() => "true/false",
        id if id == TypeId::of::<char>() => "character",
        id if id == TypeId::of::<Array>() => "list",
        id if id == TypeId::of::<Map>() => "map",
        id if id == TypeId::of::<FnPtr>() => "function",
        id if id == TypeId::of::<()>() => "nothing",
        _ => "value",
    }
}

/// The value as the prompt shows it: text in quotes, a field as its summary.
pub(super) fn show(value: &Dynamic) -> String {
    let known = KNOWN.with_borrow(|known| known.get(&value.type_id()).map(|(_, show)| *show));
    if let Some(text) = known.and_then(|show| show(value)) {
        return text;
    }
    if let Ok(x) = value.as_float() {
        return number_text(x);
    }
    if let Ok(text) = value.as_immutable_string_ref() {
        return format!("\"{}\"", &*text);
    }
    if let Ok(list) = value.as_array_ref() {
        return show_list(&list);
    }
    if let Ok(map) = value.as_map_ref() {
        return show_map(&map);
    }
    if value.is_unit() {
        return "()".to_owned();
    }
    if value.is_fnptr() {
        return "a function".to_owned();
    }
    value.to_string()
}

/// A map as it would be written.
pub(super) fn show_map(map: &Map) -> String {
    let entries = map.iter().map(|(key, value)| {
        let is_word = key.chars().all(|c| c.is_alphanumeric() || c == '_');
        let key = if is_word {
            key.to_string()
        } else {
            format!("\"{key}\"")
        };
        format!("{key}: {}", show(value))
    });
    format!("#{{{}}}", entries.collect::<Vec<_>>().join(", "))
}

/// A list on one line while it is short and of plain values, one item a line otherwise.
pub(super) fn show_list(list: &Array) -> String {
    let items: Vec<String> = list.iter().map(show).collect();
    let one_line = format!("[{}]", items.join(", "));
    let plain = |value: &Dynamic| KNOWN.with_borrow(|known| !known.contains_key(&value.type_id()));
    if one_line.chars().count() <= 76 || list.iter().all(plain) {
        one_line
    } else {
        let lines = items
            .iter()
            .enumerate()
            .map(|(i, item)| format!("  {i}: {}", item.replace('\n', "\n     ")));
        format!(
            "{} items:\n{}",
            items.len(),
            lines.collect::<Vec<_>>().join("\n")
        )
    }
}

/// `a number`, `an eddy`, `text`.
pub(super) fn with_article(kind: &str) -> String {
    let bare = [
        "text",
        "true",
        "nothing",
        "eddies",
        "numbers",
        "one of",
        "anything",
        "something",
        "a ",
        "an ",
    ];
    if bare.iter().any(|word| kind.starts_with(word)) {
        kind.to_owned()
    } else if kind.starts_with(['a', 'e', 'i', 'o', 'u']) {
        format!("an {kind}")
    } else {
        format!("a {kind}")
    }
}
