//! What a built-in gives: Rust values turned into values of the language.

use std::sync::Arc;

use rhai::{Array, Dynamic, Map};

use super::argument::{NumberOr, list_of};
use super::fault::Fault;
use super::kind::Kind;

/// A Rust value the language can hold.
pub trait Answer {
    /// What people call it.
    fn kind() -> String;

    /// The value as the language holds it.
    ///
    /// # Errors
    /// Where the value stands for a failure.
    fn give(self) -> Result<Dynamic, Fault>;
}

macro_rules! plain_answers {
    ($($type:ty => $kind:literal, $convert:expr;)*) => {
        $(impl Answer for $type {
            fn kind() -> String {
                $kind.to_owned()
            }

            fn give(self) -> Result<Dynamic, Fault> {
                Ok($convert(self))
            }
        })*
    };
}

plain_answers! {
    f64 => "number", Dynamic::from_float;
    i64 => "whole number", Dynamic::from_int;
    usize => "whole number", |n| Dynamic::from_int(i64::try_from(n).unwrap_or(i64::MAX));
    bool => "true/false", Dynamic::from_bool;
    String => "text", Dynamic::from;
    &'static str => "text", Dynamic::from;
    () => "nothing", |()| Dynamic::UNIT;
    Dynamic => "anything", |value| value;
    Map => "map", Dynamic::from_map;
}

impl<T: Kind> Answer for T {
    fn kind() -> String {
        T::NAME.to_owned()
    }

    fn give(self) -> Result<Dynamic, Fault> {
        Ok(Dynamic::from(Arc::new(self)))
    }
}

impl<T: Kind> Answer for Arc<T> {
    fn kind() -> String {
        T::NAME.to_owned()
    }

    fn give(self) -> Result<Dynamic, Fault> {
        Ok(Dynamic::from(self))
    }
}

impl<T: Kind> Answer for NumberOr<T> {
    fn kind() -> String {
        format!("number or {}", T::NAME)
    }

    fn give(self) -> Result<Dynamic, Fault> {
        match self {
            NumberOr::Number(x) => x.give(),
            NumberOr::Other(held) => held.give(),
        }
    }
}

impl<T: Answer> Answer for Vec<T> {
    fn kind() -> String {
        list_of(&T::kind())
    }

    fn give(self) -> Result<Dynamic, Fault> {
        let items = self
            .into_iter()
            .map(Answer::give)
            .collect::<Result<Array, _>>()?;
        Ok(Dynamic::from_array(items))
    }
}

impl<T: Answer, E: Into<Fault>> Answer for Result<T, E> {
    fn kind() -> String {
        T::kind()
    }

    fn give(self) -> Result<Dynamic, Fault> {
        self.map_err(Into::into)?.give()
    }
}
