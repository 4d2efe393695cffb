//! What a built-in takes: values of the language turned into Rust values.

use std::any::TypeId;
use std::sync::Arc;

use rhai::{Array, Dynamic, FLOAT, INT, ImmutableString, Map};

use super::call::Call;
use super::fault::Fault;
use super::kind::{Kind, kind_name, number, with_article};
use super::options::{Needed, OptionKey, Optional, Options, read};

/// What may be given for one parameter.
#[derive(Clone, Debug)]
pub struct Shape {
    /// Kind of value, as people call it.
    pub kind: String,
    /// True when it may be left out.
    pub optional: bool,
    /// Keys of the option map, where it is one.
    pub options: Option<fn() -> &'static [OptionKey]>,
    /// True for what is no parameter of the script: the call itself.
    pub(super) hidden: bool,
    /// Where the documented options and the struct that reads them part ways.
    #[cfg(test)]
    pub(super) differences: Option<fn() -> Vec<String>>,
}

impl Shape {
    pub(super) fn of(kind: impl Into<String>) -> Self {
        Self {
            kind: kind.into(),
            optional: false,
            options: None,
            hidden: false,
            #[cfg(test)]
            differences: None,
        }
    }
}

/// A Rust value made from a value of the language.
///
/// Numbers are taken as integers or floats alike.
pub trait Argument: Sized + 'static {
    /// What may be given.
    fn shape() -> Shape;

    /// The engine's types that operators with this right-hand side are registered for.
    fn types() -> Vec<TypeId> {
        Vec::new()
    }

    /// The value made from what was given.
    ///
    /// # Errors
    /// What was expected, as a [`Fault`] that does not yet name the parameter.
    fn take(given: Option<&mut Dynamic>, call: &Call) -> Result<Self, Fault>;
}

/// The fault for a value that is not `wanted`.
fn unfit(wanted: &str, given: Option<&Dynamic>) -> Fault {
    let wanted = with_article(wanted);
    match given {
        Some(value) => Fault::new(format!(
            "takes {wanted}, not {}",
            with_article(kind_name(value))
        )),
        None => Fault::new(format!("takes {wanted}")),
    }
}

fn taken<T>(
    wanted: &str,
    given: Option<&mut Dynamic>,
    read: impl FnOnce(&Dynamic) -> Option<T>,
) -> Result<T, Fault> {
    let given = given.map(|value| &*value);
    given.and_then(read).ok_or_else(|| unfit(wanted, given))
}

impl Argument for f64 {
    fn shape() -> Shape {
        Shape::of("number")
    }

    fn types() -> Vec<TypeId> {
        vec![TypeId::of::<FLOAT>(), TypeId::of::<INT>()]
    }

    fn take(given: Option<&mut Dynamic>, _: &Call) -> Result<Self, Fault> {
        taken("number", given, number)
    }
}

/// A float that stands for a whole number, as that number.
fn whole(value: &Dynamic) -> Option<INT> {
    value.as_int().ok().or_else(|| {
        let x = value.as_float().ok()?;
        (x.fract() == 0.0 && x.abs() < 9e15).then_some(x as INT)
    })
}

impl Argument for i64 {
    fn shape() -> Shape {
        Shape::of("whole number")
    }

    fn types() -> Vec<TypeId> {
        f64::types()
    }

    fn take(given: Option<&mut Dynamic>, _: &Call) -> Result<Self, Fault> {
        taken("whole number", given, whole)
    }
}

impl Argument for usize {
    fn shape() -> Shape {
        Shape::of("whole number")
    }

    fn take(given: Option<&mut Dynamic>, _: &Call) -> Result<Self, Fault> {
        let n = taken("whole number", given, whole)?;
        usize::try_from(n)
            .map_err(|_| Fault::new(format!("takes a whole number from 0 up, not {n}")))
    }
}

impl Argument for bool {
    fn shape() -> Shape {
        Shape::of("true/false")
    }

    fn take(given: Option<&mut Dynamic>, _: &Call) -> Result<Self, Fault> {
        taken("true/false", given, |value| value.as_bool().ok())
    }
}

impl Argument for String {
    fn shape() -> Shape {
        Shape::of("text")
    }

    fn types() -> Vec<TypeId> {
        vec![TypeId::of::<ImmutableString>()]
    }

    fn take(given: Option<&mut Dynamic>, _: &Call) -> Result<Self, Fault> {
        taken("text", given, |value| {
            value
                .as_immutable_string_ref()
                .ok()
                .map(|text| text.to_string())
        })
    }
}

/// Any value at all.
impl Argument for Dynamic {
    fn shape() -> Shape {
        Shape::of("anything")
    }

    fn take(given: Option<&mut Dynamic>, _: &Call) -> Result<Self, Fault> {
        taken("anything", given, |value| Some(value.clone()))
    }
}

impl Argument for Map {
    fn shape() -> Shape {
        Shape::of("map")
    }

    fn take(given: Option<&mut Dynamic>, _: &Call) -> Result<Self, Fault> {
        taken("map", given, |value| {
            value.as_map_ref().ok().map(|map| map.clone())
        })
    }
}

impl<T: Kind> Argument for Arc<T> {
    fn shape() -> Shape {
        Shape::of(T::NAME)
    }

    fn types() -> Vec<TypeId> {
        vec![TypeId::of::<Arc<T>>()]
    }

    fn take(given: Option<&mut Dynamic>, _: &Call) -> Result<Self, Fault> {
        taken(T::NAME, given, |value| {
            value.read_lock::<Arc<T>>().map(|held| Arc::clone(&held))
        })
    }
}

impl<T: Argument> Argument for Vec<T> {
    fn shape() -> Shape {
        Shape::of(list_of(&T::shape().kind))
    }

    fn take(given: Option<&mut Dynamic>, call: &Call) -> Result<Self, Fault> {
        let wanted = Self::shape().kind;
        let mut items: Array = taken(&wanted, given, |value| {
            value.as_array_ref().ok().map(|list| list.clone())
        })?;
        items
            .iter_mut()
            .enumerate()
            .map(|(i, item)| {
                T::take(Some(item), call).map_err(|fault| {
                    let inner = fault.message().trim_start_matches("takes ");
                    Fault::new(format!(
                        "takes {}; item {i} should be {inner}",
                        with_article(&wanted)
                    ))
                })
            })
            .collect()
    }
}

/// `list of numbers`, `list of vector fields`, `list of eddies`.
pub(super) fn list_of(kind: &str) -> String {
    match kind {
        "anything" => "list".to_owned(),
        "text" => "list of texts".to_owned(),
        "eddies" | "true/false" => format!("list of {kind}"),
        kind if kind.starts_with("series") => format!("list of {kind}"),
        kind if kind.ends_with("ddy") => format!("list of {}ies", &kind[..kind.len() - 1]),
        kind if kind.starts_with("point ") => format!("list of points{}", &kind[5..]),
        kind if kind.starts_with("list") => format!("list of lists{}", &kind[4..]),
        kind => format!("list of {kind}s"),
    }
}

/// Two numbers written as a list: a point `[x, y]`.
impl Argument for (f64, f64) {
    fn shape() -> Shape {
        Shape::of("point [x, y] of numbers")
    }

    fn take(given: Option<&mut Dynamic>, _: &Call) -> Result<Self, Fault> {
        taken("point [x, y] of numbers", given, |value| {
            match value.as_array_ref().ok()?.as_slice() {
                [x, y] => Some((number(x)?, number(y)?)),
                _ => None,
            }
        })
    }
}

impl<T: Argument> Argument for Option<T> {
    fn shape() -> Shape {
        Shape {
            optional: true,
            ..T::shape()
        }
    }

    fn take(given: Option<&mut Dynamic>, call: &Call) -> Result<Self, Fault> {
        given.map(|value| T::take(Some(value), call)).transpose()
    }
}

fn options_shape<T: Options>(optional: bool) -> Shape {
    Shape {
        optional,
        options: Some(T::keys),
        #[cfg(test)]
        differences: Some(super::options::differences::<T>),
        ..Shape::of("map of options")
    }
}

fn read_options<T: Options>(given: Option<&mut Dynamic>) -> Result<T, Fault> {
    let wanted = "map of options, such as #{ key: value }";
    let map = taken(wanted, given, |value| {
        value.as_map_ref().ok().map(|map| map.clone())
    })?;
    read(&map)
}

impl<T: Options + Default + 'static> Argument for Optional<T> {
    fn shape() -> Shape {
        options_shape::<T>(true)
    }

    fn take(given: Option<&mut Dynamic>, _: &Call) -> Result<Self, Fault> {
        match given {
            None => Ok(Optional(T::default())),
            given => read_options(given).map(Optional),
        }
    }
}

impl<T: Options + 'static> Argument for Needed<T> {
    fn shape() -> Shape {
        options_shape::<T>(false)
    }

    fn take(given: Option<&mut Dynamic>, _: &Call) -> Result<Self, Fault> {
        read_options(given).map(Needed)
    }
}

impl Argument for Call {
    fn shape() -> Shape {
        Shape {
            hidden: true,
            ..Shape::of("")
        }
    }

    fn take(_: Option<&mut Dynamic>, call: &Call) -> Result<Self, Fault> {
        Ok(call.clone())
    }
}

/// A plain number or a value of the kind `T`, for operators and functions that take either.
#[derive(Clone, Debug)]
pub enum NumberOr<T> {
    /// A plain number.
    Number(f64),
    /// The other kind.
    Other(Arc<T>),
}

impl<T: Kind> Argument for NumberOr<T> {
    fn shape() -> Shape {
        Shape::of(format!("number or {}", T::NAME))
    }

    fn types() -> Vec<TypeId> {
        let mut types = f64::types();
        types.push(TypeId::of::<Arc<T>>());
        types
    }

    fn take(given: Option<&mut Dynamic>, _: &Call) -> Result<Self, Fault> {
        taken(&Self::shape().kind, given, |value| {
            number(value).map(NumberOr::Number).or_else(|| {
                value
                    .read_lock::<Arc<T>>()
                    .map(|held| NumberOr::Other(Arc::clone(&held)))
            })
        })
    }
}
