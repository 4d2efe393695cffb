//! Option maps as documented structs: the keys, defaults and units live on the struct that
//! parses them.

use rhai::{Dynamic, Map};
use serde::de::DeserializeOwned;
use serde_json::Value;

use super::fault::Fault;
use super::kind::{kind_name, number, with_article};
use super::number::number_text;
use super::wording::nearest;

/// One key of an option map.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct OptionKey {
    /// The key; a unit it has stands at its end (`dt_s`).
    pub name: &'static str,
    /// What may be given: "number", "text", "list of whole numbers".
    pub kind: &'static str,
    /// What is taken when the key is left out, as it would be written in a script.
    pub default: &'static str,
    /// Unit of a number, or "fraction", "count", "plain number".
    pub unit: &'static str,
    /// What it means, in one sentence.
    pub about: &'static str,
}

/// A struct that an option map is read into: written whole with [`options!`](crate::options), or
/// a kernel's own struct documented with [`option_keys!`](crate::option_keys).
pub trait Options: DeserializeOwned + std::fmt::Debug {
    /// The keys of the map, in the order they are documented.
    fn keys() -> &'static [OptionKey];
}

/// An option map that may be left out of a call.
#[derive(Clone, Debug, Default)]
pub struct Optional<T>(pub T);

/// An option map that a call must have, because one of its keys has no default.
#[derive(Clone, Debug)]
pub struct Needed<T>(pub T);

/// Documents the options a kernel's own struct reads: kind, unit, default as a script would write
/// it (`none` where there is none, `needed` where the key must be given), meaning. A test holds
/// the keys and defaults against the struct.
#[macro_export]
macro_rules! option_keys {
    ($type:ty {
        $( $key:ident : $kind:literal, $unit:literal, $default:literal, $about:literal ; )*
    }) => {
        impl $crate::script::Options for $type {
            fn keys() -> &'static [$crate::script::OptionKey] {
                &[ $( $crate::script::OptionKey {
                    name: stringify!($key),
                    kind: $kind,
                    default: $default,
                    unit: $unit,
                    about: $about,
                }, )* ]
            }
        }
    };
}

/// Declares a struct of options: fields, defaults, units and meanings in one place.
///
/// ```
/// kolk::options! {
///     /// How a line is sampled.
///     pub struct LineOptions {
///         points: usize = 100, "whole number", "count", "How many samples along the line.";
///         width_mm: f64 = 0.5, "number", "mm", "Width the samples are averaged over.";
///     }
/// }
/// assert_eq!(LineOptions::default().points, 100);
/// ```
#[macro_export]
macro_rules! options {
    (
        $(#[$meta:meta])*
        $vis:vis struct $name:ident {
            $( $key:ident : $type:ty = $default:expr, $kind:literal, $unit:literal, $about:literal ; )*
        }
    ) => {
        $(#[$meta])*
        #[derive(Clone, Debug, serde::Deserialize)]
        #[serde(default, deny_unknown_fields)]
        $vis struct $name {
            $( #[doc = $about] pub $key: $type, )*
        }

        impl Default for $name {
            fn default() -> Self {
                Self { $( $key: $default, )* }
            }
        }

        impl $crate::script::Options for $name {
            fn keys() -> &'static [$crate::script::OptionKey] {
                &[ $( $crate::script::OptionKey {
                    name: stringify!($key),
                    kind: $kind,
                    default: stringify!($default),
                    unit: $unit,
                    about: $about,
                }, )* ]
            }
        }
    };
}

impl OptionKey {
    /// The default as a script would write it: `[64, 32, 32]`, not `Some(vec![64, 32, 32])`.
    pub fn default_text(&self) -> String {
        let mut text = self.default.trim();
        match text {
            "None" => return "none".to_owned(),
            "String::new()" => return "\"\"".to_owned(),
            "Vec::new()" => return "[]".to_owned(),
            _ => {}
        }
        for (open, close) in [("Some(", ")"), ("vec!", "")] {
            if let Some(inner) = text.strip_prefix(open).and_then(|t| t.strip_suffix(close)) {
                text = inner;
            }
        }
        text.trim_end_matches(".to_owned()")
            .trim_end_matches(".into()")
            .to_owned()
    }

    /// `a number (mm)` or just `text`.
    pub fn kind_text(&self) -> String {
        match self.unit {
            "" | "plain number" => with_article(self.kind),
            unit => format!("{} ({unit})", with_article(self.kind)),
        }
    }
}

/// Reads an option map.
///
/// # Errors
/// An unknown key (naming the nearest and listing them all), or a value of the wrong kind (naming
/// the key, what it takes and in which unit).
pub(super) fn read<T: Options>(map: &Map) -> Result<T, Fault> {
    let keys = T::keys();
    for key in map.keys() {
        if !keys.iter().any(|k| k.name == key.as_str()) {
            return Err(unknown(key, keys));
        }
    }
    let mut object = serde_json::Map::new();
    for (key, value) in map {
        // `()` means "as if the key were left out".
        if !value.is_unit() {
            let value = plain(value).ok_or_else(|| wrong_kind(key, keys, &shown(value)))?;
            object.insert(key.to_string(), value);
        }
    }
    let given = Value::Object(object);
    serde_path_to_error::deserialize(&given).map_err(|error| {
        let path = error.path().to_string();
        let key = path.split(['.', '[']).next().unwrap_or_default().to_owned();
        refused(
            &key,
            map.get(key.as_str()),
            keys,
            &error.into_inner().to_string(),
        )
    })
}

/// The fault behind what the reading said of `key`.
fn refused(key: &str, value: Option<&Dynamic>, keys: &[OptionKey], said: &str) -> Fault {
    if let Some(missing) = said.strip_prefix("missing field `") {
        let missing = missing.split('`').next().unwrap_or_default();
        let wanted = wanted(missing, keys);
        return Fault::new(format!("option `{missing}` is missing"))
            .hint(format!("it takes {wanted}"));
    }
    let Some(value) = value else {
        return Fault::new(said);
    };
    let about_the_kind = [
        "invalid type",
        "invalid value",
        "invalid length",
        "unknown variant",
    ];
    if !about_the_kind.iter().any(|start| said.starts_with(start))
        && !said.contains("did not match")
    {
        return Fault::new(format!("option `{key}`: {said}")).at_key(key);
    }
    let fault = wrong_kind(key, keys, &shown(value));
    let takes_a_list = keys
        .iter()
        .any(|k| k.name == key && k.kind.starts_with("list of"));
    if takes_a_list && number(value).is_some() {
        return fault.hint(format!("write it as a list: [{}]", shown(value)));
    }
    let words = wanted(key, keys);
    let words = words.split('"').skip(1).step_by(2);
    match value
        .as_immutable_string_ref()
        .ok()
        .and_then(|given| nearest(&given, words))
    {
        Some(word) => fault.hint(format!("did you mean \"{word}\"?")),
        None => fault,
    }
}

fn unknown(key: &str, keys: &[OptionKey]) -> Fault {
    let names = keys.iter().map(|k| k.name);
    let list = names.clone().collect::<Vec<_>>().join(", ");
    let fault = Fault::new(format!("there is no option `{key}`")).at_key(key);
    // The unit at the end of a key is what is forgotten first.
    let longer = |name: &&str| name.strip_prefix(key).is_some_and(|r| r.starts_with('_'));
    match names.clone().find(longer).or_else(|| nearest(key, names)) {
        Some(name) => fault.hint(format!("did you mean `{name}`? The options are: {list}")),
        None => fault.hint(format!("the options are: {list}")),
    }
}

fn wanted(key: &str, keys: &[OptionKey]) -> String {
    keys.iter()
        .find(|k| k.name == key)
        .map_or_else(|| "something else".to_owned(), OptionKey::kind_text)
}

fn wrong_kind(key: &str, keys: &[OptionKey], given: &str) -> Fault {
    let wanted = wanted(key, keys);
    Fault::new(format!("option `{key}` takes {wanted}, not {given}")).at_key(key)
}

/// A value for messages: the number or text itself where it is short, its kind otherwise.
fn shown(value: &Dynamic) -> String {
    if let Ok(text) = value.as_immutable_string_ref() {
        return format!("\"{}\"", &*text);
    }
    if let Ok(x) = value.as_float() {
        // `1e9` is refused where a whole number is needed: show that it is none.
        let text = number_text(x);
        let looks_whole = text.bytes().all(|b| b.is_ascii_digit() || b == b'-');
        return if looks_whole { text + ".0" } else { text };
    }
    if let Ok(n) = value.as_int() {
        return n.to_string();
    }
    if let Ok(b) = value.as_bool() {
        return b.to_string();
    }
    if let Ok(list) = value.as_array_ref() {
        return format!(
            "[{}]",
            list.iter().map(shown).collect::<Vec<_>>().join(", ")
        );
    }
    with_article(kind_name(value))
}

/// The value as plain data; `None` where it holds something that is not data.
fn plain(value: &Dynamic) -> Option<Value> {
    if let Ok(text) = value.as_immutable_string_ref() {
        return Some(Value::String(text.to_string()));
    }
    if let Ok(x) = value.as_float() {
        return serde_json::Number::from_f64(x).map(Value::Number);
    }
    if let Ok(n) = value.as_int() {
        return Some(Value::from(n));
    }
    if let Ok(b) = value.as_bool() {
        return Some(Value::Bool(b));
    }
    if value.is_unit() {
        return Some(Value::Null);
    }
    if let Ok(list) = value.as_array_ref() {
        return list
            .iter()
            .map(plain)
            .collect::<Option<Vec<_>>>()
            .map(Value::Array);
    }
    if let Ok(map) = value.as_map_ref() {
        let entries = map.iter().map(|(k, v)| Some((k.to_string(), plain(v)?)));
        return entries
            .collect::<Option<serde_json::Map<_, _>>>()
            .map(Value::Object);
    }
    None
}

/// Compares what is documented with the struct: the same keys, and for each the default the
/// struct takes. Gives what differs.
#[cfg(test)]
pub(super) fn differences<T: Options>() -> Vec<String> {
    let mut wrong = Vec::new();
    let mut fields = Vec::new();
    let _ = T::deserialize(FieldNames(&mut fields));
    let names: Vec<&str> = T::keys().iter().map(|k| k.name).collect();
    let (mut sorted_fields, mut sorted_names) = (fields.clone(), names.clone());
    sorted_fields.sort_unstable();
    sorted_names.sort_unstable();
    if sorted_fields != sorted_names {
        wrong.push(format!("documented {names:?}, read {fields:?}"));
    }
    let mut engine = rhai::Engine::new();
    engine.register_fn("/", |a: f64, b: f64| a / b);
    let mut needed = Map::new();
    for key in T::keys().iter().filter(|k| k.default == "needed") {
        needed.insert(key.name.into(), Dynamic::from(1.5_f64));
    }
    let Ok(default) = read::<T>(&needed) else {
        wrong.push(format!("{names:?}: the defaults are refused"));
        return wrong;
    };
    let default = format!("{default:?}");
    for key in T::keys() {
        let text = key.default_text();
        if text == "none" || text == "needed" {
            continue;
        }
        let mut map = needed.clone();
        match engine.eval::<Dynamic>(&text) {
            Ok(value) => map.insert(key.name.into(), value),
            Err(error) => {
                wrong.push(format!("{}: default {text} is no value: {error}", key.name));
                continue;
            }
        };
        match read::<T>(&map) {
            Ok(read) if format!("{read:?}") == default => {}
            other => wrong.push(format!("{}: default {text} reads {other:?}", key.name)),
        }
    }
    wrong
}

/// Asks a struct for the names of its fields.
#[cfg(test)]
struct FieldNames<'a>(&'a mut Vec<&'static str>);

#[cfg(test)]
impl<'de> serde::Deserializer<'de> for FieldNames<'_> {
    type Error = serde::de::value::Error;

    fn deserialize_struct<V: serde::de::Visitor<'de>>(
        self,
        _: &'static str,
        fields: &'static [&'static str],
        _: V,
    ) -> Result<V::Value, Self::Error> {
        self.0.extend(fields);
        Err(serde::de::Error::custom("only the names"))
    }

    fn deserialize_any<V: serde::de::Visitor<'de>>(self, _: V) -> Result<V::Value, Self::Error> {
        Err(serde::de::Error::custom("not a struct"))
    }

    serde::forward_to_deserialize_any! {
        bool i8 i16 i32 i64 u8 u16 u32 u64 f32 f64 char str string bytes byte_buf option unit
        unit_struct newtype_struct seq tuple tuple_struct map enum identifier ignored_any
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn what_is_documented_is_what_is_read() {
        assert!(differences::<TestOptions>().is_empty());
    }

    crate::options! {
        /// Options of the tests.
        pub struct TestOptions {
            windows_px: Vec<usize> = vec![64, 32], "list of whole numbers", "px", "Window sides.";
            overlap: f64 = 0.5, "number", "fraction", "Shared part of neighbours.";
            scheme: Option<String> = None, "text", "", "Difference scheme.";
        }
    }

    fn read_text(text: &str) -> Result<TestOptions, Fault> {
        let map: Map = rhai::Engine::new().eval(text).unwrap();
        read(&map)
    }

    #[test]
    fn what_is_left_out_takes_its_default() {
        let options = read_text("#{}").unwrap();
        assert_eq!(options.windows_px, [64, 32]);
        assert_eq!(options.overlap, 0.5);
        assert_eq!(options.scheme, None);
        assert_eq!(TestOptions::keys()[0].default_text(), "[64, 32]");
        assert_eq!(TestOptions::keys()[2].default_text(), "none");
    }

    #[test]
    fn an_integer_serves_where_a_float_is_wanted() {
        assert_eq!(read_text("#{overlap: 1}").unwrap().overlap, 1.0);
        assert_eq!(read_text("#{overlap: 1.0}").unwrap().overlap, 1.0);
    }

    #[test]
    fn an_unknown_key_names_the_nearest_and_lists_all() {
        let fault = read_text("#{overlapp: 0.5}").unwrap_err();
        assert_eq!(fault.message(), "there is no option `overlapp`");
        assert_eq!(
            fault.hint_text(),
            Some("did you mean `overlap`? The options are: windows_px, overlap, scheme")
        );
    }

    #[test]
    fn a_key_without_its_unit_and_a_list_of_one_are_recognised() {
        let hint = |text| read_text(text).unwrap_err().hint_text().map(str::to_owned);
        let nearest = hint("#{windows: [64]}").unwrap();
        assert!(
            nearest.starts_with("did you mean `windows_px`?"),
            "{nearest}"
        );
        assert_eq!(
            hint("#{windows_px: 48}").as_deref(),
            Some("write it as a list: [48]")
        );
    }

    #[test]
    fn a_wrong_kind_names_the_key_and_the_unit() {
        let message = |text| read_text(text).unwrap_err().message().to_owned();
        assert_eq!(
            message("#{windows_px: 32.5}"),
            "option `windows_px` takes a list of whole numbers (px), not 32.5"
        );
        assert_eq!(
            message("#{windows_px: [64, \"a\"]}"),
            "option `windows_px` takes a list of whole numbers (px), not [64, \"a\"]"
        );
        assert_eq!(
            message("#{overlap: \"half\"}"),
            "option `overlap` takes a number (fraction), not \"half\""
        );
        assert_eq!(message("#{scheme: 3}"), "option `scheme` takes text, not 3");
    }
}
