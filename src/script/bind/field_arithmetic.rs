//! Operators between fields, and between fields and numbers.

use std::sync::Arc;

use super::super::argument::NumberOr;
use super::super::draft::Room;
use super::super::fault::Fault;
use super::field::{quantity, with_a_flow};
use crate::field::{FieldError, Operand, ScalarField, VectorField};
use crate::quantity::{Measured, Unit};

type Combine = fn(&ScalarField, Operand<'_>) -> Result<ScalarField, FieldError>;

/// One operator of scalar fields: name, summary, unit, examples with a field, with a number on
/// the right and with a number on the left, rule, and the rule for a number on the left.
struct Rule {
    name: &'static str,
    about: &'static str,
    words: &'static str,
    unit: &'static str,
    examples: [(&'static str, &'static str); 3],
    combine: Combine,
    number_first: Combine,
}

#[rustfmt::skip]
const RULES: [Rule; 10] = [
    Rule {
        name: "+", about: "Sum, cell by cell, in the unit of the left side.", words: "arithmetic add",
        unit: "that of the left side",
        examples: [
            (with_a_flow!("(flow.u + flow.v).name"), "\"u + v\""),
            (with_a_flow!("(flow.u / flow.u.max() + 1).max()"), "2 ± ?"),
            (with_a_flow!("(1 + flow.u / flow.u.max()).max()"), "2 ± ?"),
        ],
        combine: |a, b| a.plus(b), number_first: |a, b| a.plus(b),
    },
    Rule {
        name: "-", about: "Difference, cell by cell, in the unit of the left side.", words: "arithmetic subtract",
        unit: "that of the left side",
        examples: [
            (with_a_flow!("(flow.u - flow.u).max()"), "0 ± ? px/frame"),
            (with_a_flow!("(flow.u - flow.u.max()).max()"), "0 ± ? px/frame"),
            (with_a_flow!("(flow.u.max() - flow.u).min()"), "0 ± ? px/frame"),
        ],
        combine: |a, b| a.minus(b), number_first: |a, b| a.negated().plus(b),
    },
    Rule {
        name: "*", about: "Product, cell by cell; units multiply.", words: "arithmetic multiply times",
        unit: "the product of the units",
        examples: [
            (with_a_flow!("(flow.u * flow.v).unit"), "\"px²/frame²\""),
            (with_a_flow!("(flow.u * 2).max()"), "1.273 ± ? px/frame"),
            (with_a_flow!("(2 * flow.u).max()"), "1.273 ± ? px/frame"),
        ],
        combine: |a, b| a.times(b), number_first: |a, b| a.times(b),
    },
    Rule {
        name: "/", about: "Quotient, cell by cell; a cell divided by 0 has no value.", words: "arithmetic divide ratio",
        unit: "the quotient of the units",
        examples: [
            (with_a_flow!("(flow.u / flow.u).mean()"), "1 ± ?"),
            (with_a_flow!("(flow.u / 2).max()"), "0.3183 ± ? px/frame"),
            (with_a_flow!("(2 / flow.u).unit"), "\"frame/px\""),
        ],
        combine: |a, b| a.over(b), number_first: number_over,
    },
    Rule {
        name: ">", about: "1 where the left side is greater, 0 elsewhere.", words: "comparison compare greater mask",
        unit: "1 or 0",
        examples: [
            (with_a_flow!("(flow.u > flow.u).max()"), "0 ± ?"),
            (with_a_flow!("(flow.u > flow.u.min()).max()"), "1 ± ?"),
            (with_a_flow!("(flow.u.max() > flow.u).max()"), "1 ± ?"),
        ],
        combine: |a, b| a.greater(b), number_first: |a, b| a.less(b),
    },
    Rule {
        name: ">=", about: "1 where the left side is greater or equal, 0 elsewhere.", words: "comparison compare greater mask",
        unit: "1 or 0",
        examples: [
            (with_a_flow!("(flow.u >= flow.u).min()"), "1 ± ?"),
            (with_a_flow!("(flow.u >= flow.u.min()).min()"), "1 ± ?"),
            (with_a_flow!("(flow.u.max() >= flow.u).min()"), "1 ± ?"),
        ],
        combine: |a, b| a.at_least(b), number_first: |a, b| a.at_most(b),
    },
    Rule {
        name: "<", about: "1 where the left side is less, 0 elsewhere.", words: "comparison compare less mask",
        unit: "1 or 0",
        examples: [
            (with_a_flow!("(flow.u < flow.u).max()"), "0 ± ?"),
            (with_a_flow!("(flow.u < flow.u.max()).max()"), "1 ± ?"),
            (with_a_flow!("(0 < flow.speed()).max()"), "1 ± ?"),
        ],
        combine: |a, b| a.less(b), number_first: |a, b| a.greater(b),
    },
    Rule {
        name: "<=", about: "1 where the left side is less or equal, 0 elsewhere.", words: "comparison compare less mask",
        unit: "1 or 0",
        examples: [
            (with_a_flow!("(flow.u <= flow.u).min()"), "1 ± ?"),
            (with_a_flow!("(flow.u <= flow.u.max()).min()"), "1 ± ?"),
            (with_a_flow!("(0 <= flow.speed()).min()"), "1 ± ?"),
        ],
        combine: |a, b| a.at_most(b), number_first: |a, b| a.at_least(b),
    },
    Rule {
        name: "==", about: "1 where both sides are exactly equal, 0 elsewhere.", words: "comparison compare equal mask",
        unit: "1 or 0",
        examples: [
            (with_a_flow!("(flow.u == flow.u).min()"), "1 ± ?"),
            (with_a_flow!("(flow.u * 0 == 0).min()"), "1 ± ?"),
            (with_a_flow!("(0 == flow.u * 0).min()"), "1 ± ?"),
        ],
        combine: |a, b| a.equals(b), number_first: |a, b| a.equals(b),
    },
    Rule {
        name: "!=", about: "1 where the two sides differ, 0 elsewhere.", words: "comparison compare different mask",
        unit: "1 or 0",
        examples: [
            (with_a_flow!("(flow.u != flow.u).max()"), "0 ± ?"),
            (with_a_flow!("(flow.u * 0 != 0).max()"), "0 ± ?"),
            (with_a_flow!("(0 != flow.u * 0).max()"), "0 ± ?"),
        ],
        combine: |a, b| a.differs_from(b), number_first: |a, b| a.differs_from(b),
    },
];

fn number_over(field: &ScalarField, number: Operand<'_>) -> Result<ScalarField, FieldError> {
    let one = field.map(
        "1",
        Unit::ONE,
        |value| if value.is_nan() { value } else { 1.0 },
    );
    one.times(number)?.over(field)
}

/// Writes the records.
pub(super) fn records(room: &mut Room) {
    for rule in &RULES {
        between_scalars(room, rule);
    }
    of_one_field(room);
    between_vectors(room);
}

fn between_scalars(room: &mut Room, rule: &'static Rule) {
    let errors = "the grids differ, or for sums and comparisons the units do";
    let [fields, number, first] = rule.examples;
    room.operator::<ScalarField>(rule.name)
        .about(rule.about)
        .words(rule.words)
        .input(
            "other",
            "one that goes with the left side",
            "the right side",
        )
        .unit(rule.unit)
        .errors(errors)
        .example(fields.0, fields.1)
        .does(|a: &ScalarField, b: Arc<ScalarField>| (rule.combine)(a, Operand::from(&*b)));
    room.operator::<ScalarField>(rule.name)
        .about(rule.about)
        .words(rule.words)
        .input(
            "number",
            "one that goes with the left side",
            "the right side, for every cell",
        )
        .unit(rule.unit)
        .errors(errors)
        .example(number.0, number.1)
        .does(|a: &ScalarField, b: NumberOr<Measured>| {
            (rule.combine)(a, Operand::from(&*quantity(b)))
        });
    room.operator::<f64>(rule.name)
        .about(rule.about)
        .words(rule.words)
        .input(
            "field",
            "one that goes with the left side",
            "the right side",
        )
        .unit(rule.unit)
        .errors(errors)
        .example(first.0, first.1)
        .does(|a: &f64, b: Arc<ScalarField>| (rule.number_first)(&b, Operand::from(*a)));
    room.operator::<Measured>(rule.name)
        .about(rule.about)
        .words(rule.words)
        .input(
            "field",
            "one that goes with the left side",
            "the right side",
        )
        .unit(rule.unit)
        .errors(errors)
        .example(first.0, first.1)
        .does(|a: &Measured, b: Arc<ScalarField>| (rule.number_first)(&b, Operand::from(a)));
}

fn of_one_field(room: &mut Room) {
    room.operator::<ScalarField>("-")
        .about("The negative, cell by cell.")
        .words("minus sign")
        .unit("that of the field")
        .example(with_a_flow!("(-flow.u).max()"), "0.6366 ± ? px/frame")
        .does(|field: &ScalarField| field.negated());
    room.operator::<ScalarField>("**")
        .about("A whole power from -9 to 9 of every cell, or 0.5 for the square root.")
        .words("power square exponent")
        .input("exponent", "plain", "the power")
        .unit("the unit to the power")
        .errors("the exponent is neither a whole number from -9 to 9 nor 0.5")
        .example(with_a_flow!("(flow.u ** 2).unit"), "\"px²/frame²\"")
        .does(|field: &ScalarField, exponent: f64| power(field, exponent));
    room.function_of::<ScalarField>("sqrt")
        .about("Square root of every cell; a negative one then has no value.")
        .words("root")
        .takes("one whose root is a unit")
        .unit("the root of the unit")
        .errors("the unit has no square root")
        .example(
            with_a_flow!("sqrt(flow.u ** 2).max()"),
            "0.6366 ± ? px/frame",
        )
        .does(|field: &ScalarField| field.sqrt());
    room.function_of::<ScalarField>("abs")
        .about("Every cell without its sign.")
        .words("absolute magnitude")
        .takes("any")
        .unit("that of the field")
        .example(with_a_flow!("abs(-flow.u).min().value >= 0"), "true")
        .does(|field: &ScalarField| field.abs());
}

fn power(field: &ScalarField, exponent: f64) -> Result<ScalarField, Fault> {
    if exponent == 0.5 {
        return Ok(field.sqrt()?);
    }
    if exponent.fract() != 0.0 || exponent.abs() > 9.0 {
        return Err(Fault::new(
            "a field takes whole powers from -9 to 9, or 0.5 for the square root",
        ));
    }
    Ok(field.power(exponent as i8))
}

fn between_vectors(room: &mut Room) {
    room.operator::<VectorField>("+")
        .about("Sum of two vector fields on one grid; a vector is measured only where both are.")
        .words("arithmetic add")
        .input("other", "one of the same dimension", "the right side")
        .unit("that of the left side")
        .errors("the grids or the units differ")
        .example(
            with_a_flow!("(flow + flow).speed().max()"),
            "1.273 ± ? px/frame",
        )
        .does(|a: &VectorField, b: Arc<VectorField>| a.plus(&b));
    room.operator::<VectorField>("-")
        .about("Difference of two vector fields on one grid; measured only where both are.")
        .words("arithmetic subtract fluctuation")
        .input("other", "one of the same dimension", "the right side")
        .unit("that of the left side")
        .errors("the grids or the units differ")
        .example(
            with_a_flow!("(flow - flow).speed().max()"),
            "0 ± ? px/frame",
        )
        .does(|a: &VectorField, b: Arc<VectorField>| a.minus(&b));
    room.operator::<VectorField>("*")
        .about("Every vector times a plain number.")
        .words("arithmetic multiply scale")
        .input("number", "plain", "the factor")
        .unit("that of the field")
        .example(
            with_a_flow!("(flow * 2).speed().max()"),
            "1.273 ± ? px/frame",
        )
        .does(|a: &VectorField, b: f64| a.times(b));
    room.operator::<f64>("*")
        .about("Every vector times a plain number.")
        .words("arithmetic multiply scale")
        .input("field", "any", "the vector field")
        .unit("that of the field")
        .example(
            with_a_flow!("(2 * flow).speed().max()"),
            "1.273 ± ? px/frame",
        )
        .does(|a: &f64, b: Arc<VectorField>| b.times(*a));
}
