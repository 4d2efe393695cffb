//! All built-ins, and their registration with the engine.

use std::any::TypeId;
use std::collections::BTreeSet;
use std::rc::Rc;

use rhai::{Dynamic, Engine, EvalAltResult, Position};

use super::bind;
use super::bind_fn::Given;
use super::call::Call;
use super::draft::Room;
use super::fault::Fault;
use super::record::{Form, Record};
use super::session::Session;

type Run = Rc<dyn Fn(&mut [&mut Dynamic], &Call) -> Result<Dynamic, Fault>>;

/// How the engine comes to know a built-in.
#[derive(Clone)]
pub(super) enum Registration {
    /// Under these engine names and types, run by this closure.
    Closure {
        signatures: Vec<(String, Vec<TypeId>)>,
        run: Run,
    },
    /// A value under the record's name.
    Constant(f64),
    /// The engine brings it along; the record only documents it.
    Engine,
}

impl Registration {
    pub(super) fn closure(
        signatures: Vec<(String, Vec<TypeId>)>,
        names: Vec<&'static str>,
        run: impl Fn(Option<&Dynamic>, Given<'_, '_>) -> Result<Dynamic, Fault> + 'static,
        with_subject: bool,
    ) -> Self {
        let run = move |values: &mut [&mut Dynamic], call: &Call| {
            if with_subject && let Some((subject, rest)) = values.split_first_mut() {
                let subject: &Dynamic = subject;
                return run(Some(subject), Given::new(rest, &names, call));
            }
            run(None, Given::new(values, &names, call))
        };
        Registration::Closure {
            signatures,
            run: Rc::new(run),
        }
    }
}

/// A kind of value, for its page in the help.
#[derive(Clone, Copy, Debug)]
pub struct KindRecord {
    /// What people call it.
    pub name: &'static str,
    /// What it holds, in which units.
    pub about: &'static str,
    pub(super) register: fn(&mut Engine),
}

/// Every built-in and every kind of value of the language.
#[derive(Debug, Default)]
pub struct Registry {
    records: Vec<Record>,
    kinds: Vec<KindRecord>,
}

impl Registry {
    /// The whole language.
    pub fn new() -> Self {
        let mut registry = Self::default();
        for (name, write) in bind::ROOMS {
            let mut room = Room::new(name);
            write(&mut room);
            registry.records.extend(room.records);
            registry.kinds.extend(room.kinds);
        }
        registry
    }

    /// All records, room by room.
    pub fn records(&self) -> &[Record] {
        &self.records
    }

    /// All kinds of value.
    pub fn kinds(&self) -> &[KindRecord] {
        &self.kinds
    }

    /// Records of this name; several where several kinds of value have it.
    pub fn named(&self, name: &str) -> Vec<&Record> {
        self.records.iter().filter(|r| r.name == name).collect()
    }

    /// Records that belong to values of this kind.
    pub fn belonging_to(&self, kind: &str) -> Vec<&Record> {
        self.records
            .iter()
            .filter(|r| r.subject == Some(kind))
            .collect()
    }

    /// The kind of this name; underscores may stand for spaces.
    pub fn kind(&self, name: &str) -> Option<&KindRecord> {
        let name = name.trim().replace('_', " ");
        self.kinds.iter().find(|kind| kind.name == name)
    }

    /// Records with every one of these words in their name, summary or further words.
    pub fn search(&self, words: &str) -> Vec<&Record> {
        let words: Vec<String> = words.split_whitespace().map(str::to_lowercase).collect();
        let holds = |record: &Record| {
            let text = format!(
                "{} {} {} {}",
                record.name,
                record.words,
                record.about,
                record.subject.unwrap_or_default()
            )
            .to_lowercase();
            words.iter().all(|word| text.contains(word.as_str()))
        };
        self.records.iter().filter(|r| holds(r)).collect()
    }

    /// Every name a script can write, once each, in alphabetical order.
    pub fn names(&self) -> Vec<&'static str> {
        let names: BTreeSet<_> = self
            .records
            .iter()
            .filter(|r| !matches!(r.form, Form::Operator | Form::Index))
            .map(|r| r.name)
            .collect();
        names.into_iter().collect()
    }

    /// Names that stand after a dot.
    pub fn names_after_a_dot(&self) -> Vec<&'static str> {
        let names: BTreeSet<_> = self
            .records
            .iter()
            .filter(|r| matches!(r.form, Form::Method | Form::Property))
            .map(|r| r.name)
            .collect();
        names.into_iter().collect()
    }

    /// Two built-ins that would hide one another; empty in a sound language.
    pub fn clashes(&self) -> Vec<String> {
        let mut seen = std::collections::HashMap::new();
        let mut clashes = Vec::new();
        for record in &self.records {
            if let Registration::Closure { signatures, .. } = &record.registration {
                for signature in signatures {
                    if let Some(other) = seen.insert(signature, record.usage()) {
                        clashes.push(format!("{} and {other}", record.usage()));
                    }
                }
            }
        }
        clashes
    }

    /// Makes the engine know every kind and every built-in.
    pub(super) fn register(registry: &Rc<Self>, engine: &mut Engine, session: &Rc<Session>) {
        for kind in &registry.kinds {
            (kind.register)(engine);
        }
        let call = Call::new(Rc::clone(session), Rc::clone(registry));
        for record in &registry.records {
            if let Registration::Closure { signatures, run } = &record.registration {
                for (name, types) in signatures {
                    let (run, call) = (Rc::clone(run), call.clone());
                    engine.register_raw_fn(name.as_str(), types, move |_, values| {
                        run(values, &call).map_err(|fault| raise(fault, &call))
                    });
                }
            }
        }
    }

    /// Constants by name, for the scope of a run.
    pub(super) fn constants(&self) -> impl Iterator<Item = (&'static str, f64)> {
        self.records.iter().filter_map(|r| match r.registration {
            Registration::Constant(value) => Some((r.name, value)),
            _ => None,
        })
    }
}

/// A fault as the engine's error; one that came from an interrupt ends the script.
fn raise(fault: Fault, call: &Call) -> Box<EvalAltResult> {
    if call.session().is_cancelled() {
        EvalAltResult::ErrorTerminated(Dynamic::UNIT, Position::NONE).into()
    } else {
        fault.into_error()
    }
}
