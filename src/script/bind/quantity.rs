//! Measured values: a number, its unit and its doubt.

use std::cmp::Ordering;
use std::sync::Arc;

use rhai::Dynamic;

use super::super::argument::NumberOr;
use super::super::draft::Room;
use super::super::fault::Fault;
use super::super::kind::{Kind, kind_name, number, with_article};
use super::super::number::number_text;
use crate::quantity::{Measured, Unit, UnitMismatch};

impl Kind for Measured {
    const NAME: &'static str = "measured value";
    const ABOUT: &'static str = "A number with its unit and its standard uncertainty. Arithmetic checks \
        units and carries the uncertainty along to first order; values that share a source stay \
        correlated, so x - x is exactly 0. It prints rounded to its uncertainty (11.8 ± 0.4 mm), \
        with ± ? while nothing has yet said how good the number is, and bare when it is exact.";

    fn show(&self) -> String {
        self.to_string()
    }
}

/// The unit written so.
///
/// # Errors
/// A unit that is not known, with the symbols that are.
pub(super) fn unit(text: &str) -> Result<Unit, Fault> {
    Unit::parse(text).ok_or_else(|| {
        Fault::new(format!("there is no unit `{text}`")).hint(
            "units are made of px, um, mm, cm, m, frame, us, ms, s, deg: \"mm\", \"mm2/s\", \"1/s\"",
        )
    })
}

fn measured(value: NumberOr<Measured>) -> Arc<Measured> {
    match value {
        NumberOr::Number(x) => Arc::new(Measured::exact(x, Unit::ONE)),
        NumberOr::Other(m) => m,
    }
}

/// Writes the records.
pub(super) fn records(room: &mut Room) {
    room.kind::<Measured>();
    making(room);
    reading(room);
    changing(room);
    sums(room);
    products(room);
    comparisons(room);
}

fn making(room: &mut Room) {
    room.function("measured")
        .about("A measured value from its number, standard uncertainty and unit.")
        .words("uncertainty error quantity unit value")
        .input("value", "the unit named last", "the number")
        .input(
            "unc",
            "",
            "its standard uncertainty in the same unit, 0 or above; () when it is not known",
        )
        .input(
            "unit",
            "",
            "its unit, such as \"mm\" or \"mm2/s\"; left out for a plain number",
        )
        .unit("the unit named last")
        .errors("the uncertainty is negative, or the unit is not known")
        .source("JCGM 100:2008 (GUM), 5.1 and 5.2, for what arithmetic does with it")
        .example("measured(11.8123, 0.41, \"mm\")", "11.8 ± 0.4 mm")
        .example("measured(3, (), \"px\")", "3 ± ? px")
        .does(|value: f64, unc: Dynamic, name: Option<String>| {
            let unit = name.map_or(Ok(Unit::ONE), |name| unit(&name))?;
            if unc.is_unit() {
                return Ok(Measured::without_uncertainty(value, unit));
            }
            match number(&unc) {
                Some(unc) if unc.is_finite() && unc >= 0.0 => Ok(Measured::new(value, unc, unit)),
                Some(unc) => Err(Fault::new(format!(
                    "a standard uncertainty is 0 or above, not {}",
                    number_text(unc)
                ))
                .hint("write () where it is not known")),
                None => Err(Fault::new(format!(
                    "`unc` takes a number or (), not {}",
                    with_article(kind_name(&unc))
                ))),
            }
        });
    room.function("exact")
        .about("A value without doubt: a count, a definition, a setting.")
        .words("constant certain quantity unit")
        .input("value", "the unit named last", "the number")
        .input("unit", "", "its unit; left out for a plain number")
        .unit("the unit named last")
        .errors("the unit is not known")
        .example("exact(12, \"mm\")", "12 mm")
        .does(|value: f64, name: Option<String>| {
            let unit = name.map_or(Ok(Unit::ONE), |name| unit(&name))?;
            Ok::<_, Fault>(Measured::exact(value, unit))
        });
}

fn reading(room: &mut Room) {
    room.property::<Measured>("value")
        .about("The number alone.")
        .words("estimate")
        .unit("that of the measured value")
        .example("measured(11.8, 0.4, \"mm\").value", "11.8")
        .does(|m: &Measured| m.value());
    room.property::<Measured>("unit")
        .about("The unit as text; empty for a plain number.")
        .words("dimension")
        .example("measured(11.8, 0.4, \"mm2/s\").unit", "\"mm²/s\"")
        .does(|m: &Measured| m.unit().to_string());
    room.property::<Measured>("unc")
        .about("The standard uncertainty (one standard deviation).")
        .words("uncertainty error doubt standard deviation")
        .unit("that of the measured value")
        .errors("the uncertainty is missing; `has_unc` tells beforehand")
        .source("JCGM 100:2008 (GUM), 2.3.1")
        .example("measured(11.8, 0.4, \"mm\").unc", "0.4")
        .does(|m: &Measured| m.unc().ok_or_else(|| missing(m)));
    room.property::<Measured>("has_unc")
        .about("True when the uncertainty is known; an exact value's is known to be 0.")
        .words("uncertainty missing known")
        .example("measured(3, (), \"px\").has_unc", "false")
        .does(|m: &Measured| m.unc().is_some());
    room.property::<Measured>("lo95")
        .about("The lower end of the 95 % interval: 1.96 standard uncertainties below the number.")
        .words("interval confidence coverage lower")
        .unit("that of the measured value")
        .errors("the uncertainty is missing")
        .source("JCGM 100:2008 (GUM), annex G, for a normal distribution")
        .example("decimals(measured(10, 1, \"mm\").lo95, 2)", "\"8.04\"")
        .does(|m: &Measured| m.interval95().map(|i| i.0).ok_or_else(|| missing(m)));
    room.property::<Measured>("hi95")
        .about("The upper end of the 95 % interval: 1.96 standard uncertainties above the number.")
        .words("interval confidence coverage upper")
        .unit("that of the measured value")
        .errors("the uncertainty is missing")
        .source("JCGM 100:2008 (GUM), annex G, for a normal distribution")
        .example("decimals(measured(10, 1, \"mm\").hi95, 2)", "\"11.96\"")
        .does(|m: &Measured| m.interval95().map(|i| i.1).ok_or_else(|| missing(m)));
}

fn missing(m: &Measured) -> Fault {
    Fault::new(format!("the uncertainty of {m} is missing"))
        .hint("nothing has yet said how good this number is; `.has_unc` tells beforehand")
}

fn changing(room: &mut Room) {
    room.method::<Measured>("to")
        .about("The same quantity in another unit of its dimension.")
        .words("convert unit conversion")
        .input("unit", "", "the unit wanted, such as \"cm\" or \"m2/s\"")
        .unit("the unit wanted")
        .errors("the units measure different things; px become mm only by a calibration")
        .example("measured(11.8, 0.4, \"mm\").to(\"cm\")", "1.18 ± 0.04 cm")
        .does(|m: &Measured, name: String| Ok::<_, Fault>(m.to(unit(&name)?)?));
    room.method::<Measured>("brief")
        .about("The short printed form, with the uncertainty of the last digits in brackets.")
        .words("print text parentheses")
        .source("JCGM 100:2008 (GUM), 7.2.2")
        .example("measured(11.8123, 0.41, \"mm\").brief()", "\"11.8(4) mm\"")
        .does(|m: &Measured| m.brief());
    room.function_of::<Measured>("sqrt")
        .about("Square root, with its unit's root.")
        .words("root")
        .takes("one whose root is a unit: mm² gives mm")
        .unit("the root of the unit")
        .errors("the value is negative or its unit has no root")
        .example("sqrt(measured(16, 0.8, \"mm2\"))", "4.00 ± 0.10 mm")
        .does(root);
    room.function_of::<Measured>("abs")
        .about("The value without its sign.")
        .words("absolute magnitude")
        .takes("any")
        .unit("that of the measured value")
        .example("abs(measured(-3, 0.2, \"mm2/s\"))", "3.00 ± 0.20 mm²/s")
        .does(|m: &Measured| m.abs());
    room.operator::<Measured>("-")
        .about("The negative.")
        .words("minus sign")
        .unit("that of the measured value")
        .example("-measured(3, 0.5, \"mm\")", "-3.0 ± 0.5 mm")
        .does(|m: &Measured| m.negated());
}

fn root(m: &Measured) -> Result<Measured, Fault> {
    if m.value() < 0.0 {
        return Err(Fault::new(format!(
            "the square root of {m} is not a real number"
        )));
    }
    m.sqrt()
        .ok_or_else(|| Fault::new(format!("the unit of {m} has no square root")))
}

/// `+` and `-`, between measured values and with plain numbers on either side.
#[allow(clippy::type_complexity)] // The table is read once, just below.
fn sums(room: &mut Room) {
    type Sum = fn(&Measured, &Measured) -> Result<Measured, UnitMismatch>;
    let rules: [(&str, &str, Sum, [(&str, &str); 2]); 2] = [
        (
            "+",
            "Sum, in the unit of the left side. The uncertainties add as their correlation says.",
            Measured::plus,
            [
                (
                    "measured(3, 0.3, \"mm\") + measured(4, 0.4, \"mm\")",
                    "7.0 ± 0.5 mm",
                ),
                ("1 + measured(0.5, 0.1)", "1.50 ± 0.10"),
            ],
        ),
        (
            "-",
            "Difference, in the unit of the left side; x - x is exactly 0.",
            Measured::minus,
            [
                ("let x = measured(3, 0.3, \"mm\"); x - x", "0 mm"),
                ("1 - measured(0.25, 0.1)", "0.75 ± 0.10"),
            ],
        ),
    ];
    for (name, about, rule, [example, number_first]) in rules {
        let errors = "the units measure different things (a plain number and mm, px and mm)";
        room.operator::<Measured>(name)
            .about(about)
            .words("arithmetic add subtract")
            .input("other", "one of the same dimension", "the right side")
            .unit("that of the left side")
            .errors(errors)
            .source("JCGM 100:2008 (GUM), 5.2.2")
            .example(example.0, example.1)
            .does(move |m: &Measured, other: NumberOr<Measured>| rule(m, &measured(other)));
        room.operator::<f64>(name)
            .about(about)
            .words("arithmetic add subtract")
            .input("other", "plain", "the right side")
            .unit("plain")
            .errors(errors)
            .example(number_first.0, number_first.1)
            .does(move |x: &f64, other: Arc<Measured>| {
                rule(&Measured::exact(*x, Unit::ONE), &other)
            });
    }
}

/// `*`, `/` and `**`.
fn products(room: &mut Room) {
    room.operator::<Measured>("*")
        .about("Product; units multiply.")
        .words("arithmetic multiply times")
        .input("other", "any", "the right side")
        .unit("the product of the units")
        .source("JCGM 100:2008 (GUM), 5.2.2")
        .example("measured(3, 0.3, \"mm\") * 2", "6.0 ± 0.6 mm")
        .does(|m: &Measured, other: NumberOr<Measured>| m.times(&measured(other)));
    room.operator::<f64>("*")
        .about("Product with a plain number.")
        .words("arithmetic multiply times")
        .input("other", "any", "the right side")
        .unit("that of the right side")
        .example("2 * measured(3, 0.3, \"mm\")", "6.0 ± 0.6 mm")
        .does(|x: &f64, other: Arc<Measured>| Measured::exact(*x, Unit::ONE).times(&other));
    room.operator::<Measured>("/")
        .about("Quotient; units of one dimension cancel, so mm/cm is a plain number.")
        .words("arithmetic divide ratio")
        .input("other", "any", "the right side")
        .unit("the quotient of the units")
        .errors("the right side is 0")
        .source("JCGM 100:2008 (GUM), 5.2.2")
        .example(
            "measured(20, 0.5, \"mm\") / exact(4, \"s\")",
            "5.00 ± 0.13 mm/s",
        )
        .does(|m: &Measured, other: NumberOr<Measured>| over(m, &measured(other)));
    room.operator::<f64>("/")
        .about("A plain number over a measured value.")
        .words("arithmetic divide ratio")
        .input("other", "any", "the right side")
        .unit("one over the unit of the right side")
        .errors("the right side is 0")
        .example("1 / measured(4, 0.2, \"s\")", "0.250 ± 0.013 1/s")
        .does(|x: &f64, other: Arc<Measured>| over(&Measured::exact(*x, Unit::ONE), &other));
    room.operator::<Measured>("**")
        .about("A whole power from -9 to 9, or 0.5 for the square root; the unit is raised too.")
        .words("arithmetic power square exponent")
        .input("exponent", "plain", "the power")
        .unit("the unit to the power")
        .errors("the exponent is neither a whole number from -9 to 9 nor 0.5")
        .example("measured(3, 0.1, \"mm\") ** 2", "9.0 ± 0.6 mm²")
        .does(power);
}

fn over(a: &Measured, b: &Measured) -> Result<Measured, Fault> {
    if b.value() == 0.0 {
        return Err(Fault::new(format!("division by zero: {a} / {b}")));
    }
    Ok(a.over(b))
}

fn power(m: &Measured, exponent: f64) -> Result<Measured, Fault> {
    if exponent == 0.5 {
        return root(m);
    }
    if exponent.fract() != 0.0 || exponent.abs() > 9.0 {
        return Err(Fault::new(format!(
            "a measured value takes whole powers from -9 to 9, or 0.5, not {}",
            number_text(exponent)
        )));
    }
    if m.value() == 0.0 && exponent < 0.0 {
        return Err(Fault::new("division by zero: 0 to a negative power"));
    }
    Ok(m.power(exponent as i8))
}

/// Comparison of the numbers, exactly, after conversion to one unit. The uncertainty plays no
/// part: whether two values differ *significantly* is another question.
#[allow(clippy::type_complexity)] // The table is read once, just below.
fn comparisons(room: &mut Room) {
    type Holds = fn(Ordering) -> bool;
    let rules: [(&str, Holds, (&str, &str), (&str, &str)); 6] = [
        (
            "==",
            |o| o.is_eq(),
            ("exact(1, \"cm\") == exact(10, \"mm\")", "true"),
            ("1 == exact(1)", "true"),
        ),
        (
            "!=",
            |o| o.is_ne(),
            ("exact(1, \"cm\") != exact(10, \"mm\")", "false"),
            ("1 != exact(1)", "false"),
        ),
        (
            "<",
            |o| o.is_lt(),
            (
                "measured(1, 0.1, \"mm\") < measured(2, 0.1, \"mm\")",
                "true",
            ),
            ("2 < measured(1, 0.1)", "false"),
        ),
        (
            ">",
            |o| o.is_gt(),
            (
                "measured(1, 0.1, \"cm\") > measured(2, 0.1, \"mm\")",
                "true",
            ),
            ("2 > measured(1, 0.1)", "true"),
        ),
        (
            "<=",
            |o| o.is_le(),
            ("exact(1, \"s\") <= exact(1000, \"ms\")", "true"),
            ("1 <= exact(1)", "true"),
        ),
        (
            ">=",
            |o| o.is_ge(),
            ("exact(1, \"s\") >= exact(1000, \"ms\")", "true"),
            ("1 >= exact(1)", "true"),
        ),
    ];
    for (name, holds, example, number_first) in rules {
        let about = "Compares the numbers exactly, after conversion to one unit; the uncertainty \
                     plays no part.";
        let compare = move |a: &Measured, b: &Measured| -> Result<bool, UnitMismatch> {
            // A NaN is neither equal, below nor above: only `!=` holds.
            Ok(a.compare(b)?.map_or(name == "!=", holds))
        };
        room.operator::<Measured>(name)
            .about(about)
            .words("comparison compare order equal less greater")
            .input("other", "one of the same dimension", "the right side")
            .errors("the units measure different things")
            .example(example.0, example.1)
            .does(move |m: &Measured, other: NumberOr<Measured>| compare(m, &measured(other)));
        room.operator::<f64>(name)
            .about(about)
            .words("comparison compare order equal less greater")
            .input("other", "plain", "the right side")
            .errors("the right side has a unit")
            .example(number_first.0, number_first.1)
            .does(move |x: &f64, other: Arc<Measured>| {
                compare(&Measured::exact(*x, Unit::ONE), &other)
            });
    }
}
