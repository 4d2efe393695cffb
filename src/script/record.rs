//! What is known of one built-in.

use super::argument::Shape;
use super::options::OptionKey;
use super::registry::Registration;

/// How a built-in is written in a script.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Form {
    /// `sqrt(2)`.
    Function,
    /// `flow.gradient()`.
    Method,
    /// `e.diameter`.
    Property,
    /// `a + b`, `-a`.
    Operator,
    /// `found[0]`.
    Index,
    /// `pi`.
    Constant,
}

/// One parameter of a built-in.
#[derive(Clone, Debug)]
pub struct Input {
    /// Its name in the documentation.
    pub name: &'static str,
    /// What may be given: kind of value, whether it may be left out, options.
    pub shape: Shape,
    /// Unit of a number; empty where the value is no number.
    pub unit: &'static str,
    /// What it means, in a few words.
    pub meaning: &'static str,
}

/// What a built-in gives back.
#[derive(Clone, Debug)]
pub struct Outcome {
    /// Kind of the value: "number", "vector field".
    pub kind: String,
    /// Unit of the value, or of the numbers in it; empty where there is none to state.
    pub unit: &'static str,
}

/// A few lines of script and what they print.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Example {
    /// The script.
    pub code: &'static str,
    /// Everything it prints, then its last value as the prompt shows it.
    pub output: &'static str,
}

/// One built-in: documentation and registration in one place.
pub struct Record {
    /// Its name in a script.
    pub name: &'static str,
    /// How it is written.
    pub form: Form,
    /// The kind of value it belongs to, for methods, properties, operators and indexes.
    pub subject: Option<&'static str>,
    /// Unit of the subject, for functions of a number.
    pub subject_unit: &'static str,
    /// What it does, in one or two sentences.
    pub about: &'static str,
    /// Further words to find it by.
    pub words: &'static str,
    /// Its parameters, without the subject.
    pub inputs: Vec<Input>,
    /// What it gives.
    pub outcome: Outcome,
    /// When it fails; empty where it cannot.
    pub errors: &'static str,
    /// Where the method comes from; empty where there is nothing to cite.
    pub source: &'static str,
    /// Examples, each with its output; at least one.
    pub examples: Vec<Example>,
    /// The room that wrote it: "quantity", "field".
    pub room: &'static str,
    pub(super) registration: Registration,
}

impl Record {
    /// Keys of its option map; empty where it takes none.
    pub fn options(&self) -> Vec<OptionKey> {
        self.inputs
            .iter()
            .find_map(|input| input.shape.options)
            .map(|keys| keys().to_vec())
            .unwrap_or_default()
    }

    /// How it is called: `flow.gradient(options)`, `sqrt(x)`, `a + b`.
    pub fn usage(&self) -> String {
        let arguments = self
            .inputs
            .iter()
            .map(|i| {
                if i.shape.optional {
                    format!("[{}]", i.name)
                } else {
                    i.name.to_owned()
                }
            })
            .collect::<Vec<_>>()
            .join(", ");
        let subject = self.subject_name();
        match self.form {
            Form::Function if self.subject.is_some() && arguments.is_empty() => {
                format!("{}({subject})", self.name)
            }
            Form::Function if self.subject.is_some() => {
                format!("{}({subject}, {arguments})", self.name)
            }
            Form::Function => format!("{}({arguments})", self.name),
            Form::Method => format!("{subject}.{}({arguments})", self.name),
            Form::Property => format!("{subject}.{}", self.name),
            Form::Operator if self.inputs.is_empty() => format!("{}{subject}", self.name),
            Form::Operator => format!("{subject} {} {arguments}", self.name),
            Form::Index => format!("{subject}[{arguments}]"),
            Form::Constant => self.name.to_owned(),
        }
    }

    /// The subject as a word that can stand in code: "vector field" is `vector_field`.
    fn subject_name(&self) -> String {
        self.subject.unwrap_or_default().replace(' ', "_")
    }

    /// What is missing from the documentation; empty for a complete record.
    pub fn gaps(&self) -> Vec<String> {
        let mut gaps = Vec::new();
        let mut need = |there: bool, what: &str| {
            if !there {
                gaps.push(format!("{} has no {what}", self.usage()));
            }
        };
        need(!self.about.is_empty(), "summary");
        need(!self.words.is_empty(), "words to find it by");
        need(!self.examples.is_empty(), "example");
        need(
            !(self.outcome.unit.is_empty() && carries_unit(&self.outcome.kind)),
            "unit of its result",
        );
        let of_a_number = self.form == Form::Function && self.subject.is_some_and(carries_unit);
        need(
            !(of_a_number && self.subject_unit.is_empty()),
            "unit of what it takes",
        );
        for input in &self.inputs {
            need(
                !(input.unit.is_empty() && carries_unit(&input.shape.kind)),
                &format!("unit for `{}`", input.name),
            );
            need(
                !input.meaning.is_empty() || input.shape.options.is_some(),
                &format!("meaning for `{}`", input.name),
            );
        }
        for key in self.options() {
            need(
                !key.about.is_empty(),
                &format!("meaning for option `{}`", key.name),
            );
            need(
                !(key.unit.is_empty() && carries_unit(key.kind)),
                &format!("unit for option `{}`", key.name),
            );
        }
        gaps
    }
}

impl std::fmt::Debug for Record {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.debug_struct("Record")
            .field("usage", &self.usage())
            .field("room", &self.room)
            .finish_non_exhaustive()
    }
}

/// True for kinds of value that hold numbers, whose unit the documentation must state.
fn carries_unit(kind: &str) -> bool {
    ["number", "measured value", "field", "trace"]
        .iter()
        .any(|word| kind.contains(word))
}
