//! How a binding is written: a record from its name to the closure behind it.

use std::any::TypeId;
use std::marker::PhantomData;
use std::rc::Rc;
use std::sync::Arc;

use rhai::{Dynamic, Engine, Module};

use super::argument::Shape;
use super::bind_fn::{BindFunction, BindMethod};
use super::fault::Fault;
use super::kind::{Kind, Subject, learn};
use super::record::{Example, Form, Input, Outcome, Record};
use super::registry::{KindRecord, Registration};

/// The built-ins of one room, written one after another.
#[derive(Debug)]
pub struct Room {
    name: &'static str,
    pub(super) records: Vec<Record>,
    pub(super) kinds: Vec<KindRecord>,
}

/// The subject of a built-in that has none.
#[derive(Debug)]
pub struct Free;

impl Room {
    pub(super) fn new(name: &'static str) -> Self {
        Self {
            name,
            records: Vec::new(),
            kinds: Vec::new(),
        }
    }

    /// Makes a kind of value known.
    pub fn kind<T: Kind>(&mut self) {
        self.kinds.push(KindRecord {
            name: T::NAME,
            about: T::ABOUT,
            register: register_kind::<T>,
        });
    }

    /// A page about a kind the engine brings along.
    pub fn plain_kind<T: Subject>(&mut self, about: &'static str) {
        self.kinds.push(KindRecord {
            name: T::NAME,
            about,
            register: |_| (),
        });
    }

    /// `name(…)`.
    pub fn function(&mut self, name: &'static str) -> Draft<'_, Free> {
        Draft::new(self, Form::Function, name)
    }

    /// `name(subject, …)`, for one kind of first value; other kinds may have their own.
    pub fn function_of<S: Subject>(&mut self, name: &'static str) -> Draft<'_, S> {
        Draft::new(self, Form::Function, name).belongs_to(S::NAME)
    }

    /// `subject.name(…)`.
    pub fn method<S: Subject>(&mut self, name: &'static str) -> Draft<'_, S> {
        Draft::new(self, Form::Method, name).belongs_to(S::NAME)
    }

    /// `subject.name`.
    pub fn property<S: Subject>(&mut self, name: &'static str) -> Draft<'_, S> {
        Draft::new(self, Form::Property, name).belongs_to(S::NAME)
    }

    /// `subject name other`, or `name subject` for a closure that takes only the subject.
    pub fn operator<S: Subject>(&mut self, name: &'static str) -> Draft<'_, S> {
        Draft::new(self, Form::Operator, name).belongs_to(S::NAME)
    }

    /// `subject[i]`.
    pub fn index<S: Subject>(&mut self) -> Draft<'_, S> {
        Draft::new(self, Form::Index, "[ ]").belongs_to(S::NAME)
    }

    /// A number with a name.
    pub fn constant(&mut self, name: &'static str) -> Draft<'_, Free> {
        Draft::new(self, Form::Constant, name)
    }
}

/// A record being written. `does` (or `is`, or `of_the_engine`) finishes it.
#[must_use = "a draft becomes a built-in only with `does`"]
#[derive(Debug)]
pub struct Draft<'a, S> {
    room: &'a mut Room,
    record: Record,
    inputs: Vec<(&'static str, &'static str, &'static str)>,
    subject: PhantomData<S>,
}

impl<'a, S> Draft<'a, S> {
    fn new(room: &'a mut Room, form: Form, name: &'static str) -> Self {
        let record = Record {
            name,
            form,
            subject: None,
            subject_unit: "",
            about: "",
            words: "",
            inputs: Vec::new(),
            outcome: Outcome {
                kind: String::new(),
                unit: "",
            },
            errors: "",
            source: "",
            examples: Vec::new(),
            room: room.name,
            registration: Registration::Engine,
        };
        Self {
            room,
            record,
            inputs: Vec::new(),
            subject: PhantomData,
        }
    }

    fn belongs_to(mut self, kind: &'static str) -> Self {
        self.record.subject = Some(kind);
        self
    }

    /// What it does, in one or two sentences.
    pub fn about(mut self, about: &'static str) -> Self {
        self.record.about = about;
        self
    }

    /// Further words to find it by.
    pub fn words(mut self, words: &'static str) -> Self {
        self.record.words = words;
        self
    }

    /// The next parameter: its name, the unit of a number ("" for anything else), its meaning.
    pub fn input(mut self, name: &'static str, unit: &'static str, meaning: &'static str) -> Self {
        self.inputs.push((name, unit, meaning));
        self
    }

    /// Unit of the subject itself, where that is a number.
    pub fn takes(mut self, unit: &'static str) -> Self {
        self.record.subject_unit = unit;
        self
    }

    /// Unit of the result.
    pub fn unit(mut self, unit: &'static str) -> Self {
        self.record.outcome.unit = unit;
        self
    }

    /// When it fails.
    pub fn errors(mut self, errors: &'static str) -> Self {
        self.record.errors = errors;
        self
    }

    /// Where the method comes from.
    pub fn source(mut self, source: &'static str) -> Self {
        self.record.source = source;
        self
    }

    /// A few lines of script, and everything they print with their last value as the prompt shows
    /// it.
    pub fn example(mut self, code: &'static str, output: &'static str) -> Self {
        self.record.examples.push(Example { code, output });
        self
    }

    /// Finishes a record of something the engine brings along; the parameters' kinds are given
    /// where their units would stand.
    pub fn of_the_engine(mut self, gives: &str) {
        self.record.outcome.kind = gives.to_owned();
        for (name, kind, meaning) in std::mem::take(&mut self.inputs) {
            self.record.inputs.push(Input {
                name,
                shape: Shape::of(kind),
                unit: "plain",
                meaning,
            });
        }
        self.room.records.push(self.record);
    }

    /// Pairs the documented parameters with the closure's, and remembers what it gives.
    fn settle(&mut self, shapes: Vec<Shape>, outcome: String) -> Vec<&'static str> {
        self.record.outcome.kind = outcome;
        let mut documented = std::mem::take(&mut self.inputs).into_iter();
        for shape in shapes.into_iter().filter(|s| !s.hidden) {
            let (name, unit, meaning) = if shape.options.is_some() {
                ("options", "", "")
            } else {
                documented.next().unwrap_or(("?", "", ""))
            };
            self.record.inputs.push(Input {
                name,
                shape,
                unit,
                meaning,
            });
        }
        for (name, unit, meaning) in documented {
            // One documented parameter too many shows up in the walk over the registry.
            let shape = Shape::of("number that the closure does not take");
            self.record.inputs.push(Input {
                name,
                shape,
                unit: "",
                meaning: if unit.is_empty() { meaning } else { "" },
            });
        }
        self.record.inputs.iter().map(|i| i.name).collect()
    }

    /// How many arguments may be given: from the first that may be left out to all.
    fn counts(&self) -> std::ops::RangeInclusive<usize> {
        let least = self
            .record
            .inputs
            .iter()
            .position(|i| i.shape.optional)
            .unwrap_or(self.record.inputs.len());
        least..=self.record.inputs.len()
    }
}

impl Draft<'_, Free> {
    /// The value of a constant.
    pub fn is(mut self, value: f64) {
        self.record.outcome.kind = "number".to_owned();
        self.record.registration = Registration::Constant(value);
        self.room.records.push(self.record);
    }

    /// The closure behind a function.
    pub fn does<Arguments, F: BindFunction<Arguments>>(mut self, closure: F) {
        let names = self.settle(F::shapes(), F::outcome());
        let signatures = self
            .counts()
            .map(|n| {
                (
                    self.record.name.to_owned(),
                    vec![TypeId::of::<Dynamic>(); n],
                )
            })
            .collect();
        let run =
            move |_: Option<&Dynamic>, given: super::bind_fn::Given<'_, '_>| closure.run(given);
        self.record.registration = Registration::closure(signatures, names, run, false);
        self.room.records.push(self.record);
    }
}

impl<S: Subject> Draft<'_, S> {
    /// The closure behind a method, property, operator or index; its first argument is the
    /// subject.
    pub fn does<Arguments, F: BindMethod<S, Arguments>>(mut self, closure: F) {
        let names = self.settle(F::shapes(), F::outcome());
        let signatures = match self.record.form {
            Form::Operator => operator_signatures(self.record.name, &S::types(), &F::types()),
            form => {
                let name = match form {
                    Form::Property => format!("get${}", self.record.name),
                    Form::Index => "index$get$".to_owned(),
                    _ => self.record.name.to_owned(),
                };
                method_signatures(&name, &S::types(), self.counts())
            }
        };
        let run = move |subject: Option<&Dynamic>, given: super::bind_fn::Given<'_, '_>| {
            closure.run(subject.unwrap_or(&Dynamic::UNIT), given)
        };
        self.record.registration = Registration::closure(signatures, names, run, true);
        self.room.records.push(self.record);
    }
}

fn method_signatures(
    name: &str,
    subjects: &[TypeId],
    counts: std::ops::RangeInclusive<usize>,
) -> Vec<(String, Vec<TypeId>)> {
    let mut signatures = Vec::new();
    for subject in subjects {
        for n in counts.clone() {
            let mut types = vec![*subject];
            types.extend(std::iter::repeat_n(TypeId::of::<Dynamic>(), n));
            signatures.push((name.to_owned(), types));
        }
    }
    signatures
}

/// Operators are registered for the exact types on both sides, so that one kind's `*` never
/// takes another kind's operand.
fn operator_signatures(
    name: &str,
    subjects: &[TypeId],
    others: &[Vec<TypeId>],
) -> Vec<(String, Vec<TypeId>)> {
    let mut signatures: Vec<Vec<TypeId>> = subjects.iter().map(|s| vec![*s]).collect();
    for other in others {
        signatures = signatures
            .iter()
            .flat_map(|types| {
                other.iter().map(|t| {
                    let mut types = types.clone();
                    types.push(*t);
                    types
                })
            })
            .collect();
    }
    signatures
        .into_iter()
        .map(|types| (name.to_owned(), types))
        .collect()
}

fn register_kind<T: Kind>(engine: &mut Engine) {
    learn::<T>();
    engine.register_type_with_name::<Arc<T>>(T::NAME);
    for name in ["to_string", "to_debug"] {
        engine.register_fn(name, |held: &mut Arc<T>| held.show());
    }
    if T::HAS_ITEMS {
        let mut module = Module::new();
        module.set_iter_result(TypeId::of::<Arc<T>>(), |held| {
            match held.try_cast::<Arc<T>>() {
                Some(held) => Box::new(
                    (0..held.count()).map(move |i| held.item(i).map_err(Fault::into_error)),
                ),
                None => Box::new(std::iter::empty()),
            }
        });
        engine.register_global_module(Rc::new(module));
    }
}
