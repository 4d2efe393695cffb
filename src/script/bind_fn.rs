//! Rust closures as built-ins: the arguments' types say what a script may give.

use rhai::Dynamic;

use super::answer::Answer;
use super::argument::{Argument, Shape};
use super::call::Call;
use super::fault::Fault;
use super::kind::Subject;
use std::any::TypeId;

/// The arguments as the engine hands them over, taken one by one.
pub struct Given<'a, 'b> {
    values: std::slice::IterMut<'a, &'b mut Dynamic>,
    names: &'a [&'static str],
    call: &'a Call,
}

impl<'a, 'b> Given<'a, 'b> {
    pub(super) fn new(
        values: &'a mut [&'b mut Dynamic],
        names: &'a [&'static str],
        call: &'a Call,
    ) -> Self {
        Self {
            values: values.iter_mut(),
            names,
            call,
        }
    }

    fn next<A: Argument>(&mut self) -> Result<A, Fault> {
        if A::shape().hidden {
            return A::take(None, self.call);
        }
        let (name, rest) = match self.names.split_first() {
            Some((name, rest)) => (*name, rest),
            None => ("argument", self.names),
        };
        self.names = rest;
        let given = self.values.next().map(|value| &mut **value);
        A::take(given, self.call).map_err(|fault| name_parameter(fault, name))
    }
}

/// `takes a number, not text` becomes `\`x\` takes a number, not text`; faults about an option
/// already say what they are about.
fn name_parameter(fault: Fault, name: &str) -> Fault {
    if fault.message().starts_with("takes ") {
        let message = format!("`{name}` {}", fault.message());
        match fault.hint_text() {
            Some(hint) => Fault::new(message).hint(hint),
            None => Fault::new(message),
        }
    } else {
        fault
    }
}

/// A closure without a subject.
pub trait BindFunction<Arguments>: 'static {
    /// What it takes, the call itself included.
    fn shapes() -> Vec<Shape>;
    /// What it gives.
    fn outcome() -> String;
    /// Runs it.
    ///
    /// # Errors
    /// Arguments of the wrong kind, or the closure's own fault.
    fn run(&self, given: Given<'_, '_>) -> Result<Dynamic, Fault>;
}

/// A closure whose first argument is its subject.
pub trait BindMethod<S, Arguments>: 'static {
    /// What it takes besides the subject.
    fn shapes() -> Vec<Shape>;
    /// The engine's types of each argument, for operators.
    fn types() -> Vec<Vec<TypeId>>;
    /// What it gives.
    fn outcome() -> String;
    /// Runs it on `subject`.
    ///
    /// # Errors
    /// Arguments of the wrong kind, or the closure's own fault.
    fn run(&self, subject: &Dynamic, given: Given<'_, '_>) -> Result<Dynamic, Fault>;
}

macro_rules! bind {
    ($($name:ident)*) => {
        impl<Closure, Gives, $($name,)*> BindFunction<($($name,)*)> for Closure
        where
            Closure: Fn($($name,)*) -> Gives + 'static,
            Gives: Answer,
            $($name: Argument,)*
        {
            fn shapes() -> Vec<Shape> {
                vec![$($name::shape(),)*]
            }

            fn outcome() -> String {
                Gives::kind()
            }

            #[allow(unused_mut, unused_variables, non_snake_case)]
            fn run(&self, mut given: Given<'_, '_>) -> Result<Dynamic, Fault> {
                $(let $name = given.next::<$name>()?;)*
                self($($name,)*).give()
            }
        }

        impl<Closure, Gives, Sub, $($name,)*> BindMethod<Sub, ($($name,)*)> for Closure
        where
            Closure: Fn(&Sub, $($name,)*) -> Gives + 'static,
            Gives: Answer,
            Sub: Subject,
            $($name: Argument,)*
        {
            fn shapes() -> Vec<Shape> {
                vec![$($name::shape(),)*]
            }

            fn types() -> Vec<Vec<TypeId>> {
                vec![$($name::types(),)*]
            }

            fn outcome() -> String {
                Gives::kind()
            }

            #[allow(unused_mut, unused_variables, non_snake_case)]
            fn run(&self, subject: &Dynamic, mut given: Given<'_, '_>) -> Result<Dynamic, Fault> {
                $(let $name = given.next::<$name>()?;)*
                Sub::lend(subject, |subject| self(subject, $($name,)*))
                    .ok_or_else(|| Fault::new(format!("this belongs to a {}", Sub::NAME)))?
                    .give()
            }
        }
    };
}

bind!();
bind!(A);
bind!(A B);
bind!(A B C);
bind!(A B C D);
bind!(A B C D E);
