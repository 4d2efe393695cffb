//! Elementary functions of plain numbers.

use super::super::arithmetic::Plain;
use super::super::draft::Room;
use super::super::fault::Fault;
use super::super::number::number_text;

/// A function of one real number and everything its record says.
struct Elementary {
    name: &'static str,
    about: &'static str,
    words: &'static str,
    units: (&'static str, &'static str),
    example: (&'static str, &'static str),
    value: fn(f64) -> f64,
}

const fn elementary(
    name: &'static str,
    about: &'static str,
    words: &'static str,
    units: (&'static str, &'static str),
    example: (&'static str, &'static str),
    value: fn(f64) -> f64,
) -> Elementary {
    Elementary {
        name,
        about,
        words,
        units,
        example,
        value,
    }
}

const PLAIN: (&str, &str) = ("plain", "plain");
const ANGLE_IN: (&str, &str) = ("rad", "plain");
const ANGLE_OUT: (&str, &str) = ("plain", "rad");

#[rustfmt::skip]
const ELEMENTARY: [Elementary; 16] = [
    elementary("sqrt", "Square root.", "root", PLAIN, ("sqrt(2)", "1.4142135623731"), f64::sqrt),
    elementary("exp", "e to this power.", "exponential", PLAIN, ("exp(1)", "2.71828182845905"), f64::exp),
    elementary("ln", "Natural logarithm.", "log logarithm", PLAIN, ("ln(exp(2))", "2"), f64::ln),
    elementary("log10", "Logarithm to the base 10.", "logarithm decade", PLAIN, ("log10(1000)", "3"), f64::log10),
    elementary("sin", "Sine.", "trigonometry angle", ANGLE_IN, ("sin(pi / 6)", "0.5"), f64::sin),
    elementary("cos", "Cosine.", "trigonometry angle", ANGLE_IN, ("cos(pi)", "-1"), f64::cos),
    elementary("tan", "Tangent.", "trigonometry angle", ANGLE_IN, ("tan(pi / 4)", "1"), f64::tan),
    elementary("asin", "Angle with this sine, -pi/2 to pi/2.", "inverse sine", ANGLE_OUT, ("asin(1) / pi", "0.5"), f64::asin),
    elementary("acos", "Angle with this cosine, 0 to pi.", "inverse cosine", ANGLE_OUT, ("acos(-1) / pi", "1"), f64::acos),
    elementary("atan", "Angle with this tangent, -pi/2 to pi/2.", "inverse tangent", ANGLE_OUT, ("atan(1) / pi", "0.25"), f64::atan),
    elementary("sinh", "Hyperbolic sine.", "hyperbolic", PLAIN, ("sinh(0)", "0"), f64::sinh),
    elementary("cosh", "Hyperbolic cosine.", "hyperbolic", PLAIN, ("cosh(0)", "1"), f64::cosh),
    elementary("tanh", "Hyperbolic tangent.", "hyperbolic", PLAIN, ("tanh(0)", "0"), f64::tanh),
    elementary("erf", "Error function.", "gaussian integral normal", PLAIN, ("erf(1)", "0.842700792949715"), libm::erf),
    elementary("degrees", "An angle given in radians, in degrees.", "convert angle", ("rad", "°"), ("degrees(pi)", "180"), f64::to_degrees),
    elementary("radians", "An angle given in degrees, in radians.", "convert angle", ("°", "rad"), ("radians(180) / pi", "1"), f64::to_radians),
];

/// Writes the records.
pub(super) fn records(room: &mut Room) {
    room.plain_kind::<f64>(
        "A whole number or a float; a built-in takes either. `/` is true division, comparison is \
         exact, `**` is a power; dividing by zero is an error.",
    );
    room.constant("pi")
        .about("The ratio of a circle's circumference to its diameter.")
        .words("circle constant")
        .unit("plain")
        .example("pi", "3.14159265358979")
        .is(std::f64::consts::PI);
    for f in ELEMENTARY {
        room.function_of::<f64>(f.name)
            .about(f.about)
            .words(f.words)
            .takes(f.units.0)
            .unit(f.units.1)
            .errors("the result is no finite real number")
            .example(f.example.0, f.example.1)
            .does(move |x: &f64| finite(f.name, &[*x], (f.value)(*x)));
    }
    rounding(room);
    of_two(room);
}

#[allow(clippy::type_complexity)] // The table is read once, just below.
fn rounding(room: &mut Room) {
    let rules: [(&str, &str, (&str, &str), fn(f64) -> f64); 3] = [
        (
            "floor",
            "The whole number at or below.",
            ("floor(-1.5)", "-2"),
            f64::floor,
        ),
        (
            "ceil",
            "The whole number at or above.",
            ("ceil(1.2)", "2"),
            f64::ceil,
        ),
        (
            "round",
            "The nearest whole number; a half goes away from zero.",
            ("round(2.5)", "3"),
            f64::round,
        ),
    ];
    for (name, about, example, rule) in rules {
        room.function_of::<f64>(name)
            .about(about)
            .words("integer whole round")
            .takes("any")
            .unit("that of the number")
            .errors("the result is too large for a whole number")
            .example(example.0, example.1)
            .does(move |x: &f64| {
                let rounded = rule(*x);
                if rounded.abs() < 9.2e18 {
                    Ok(rounded as i64)
                } else {
                    Err(Fault::new(format!(
                        "{} is too large for a whole number",
                        number_text(*x)
                    )))
                }
            });
    }
    room.function_of::<f64>("decimals")
        .about("The number as text with so many digits behind the point.")
        .words("format print digits fixed round")
        .takes("any")
        .input("count", "count", "digits behind the point, 0 to 15")
        .errors("the count is larger than 15")
        .example("decimals(2 / 3, 2)", "\"0.67\"")
        .does(|x: &f64, count: usize| {
            if count > 15 {
                return Err(Fault::new(
                    "a number has at most 15 digits behind the point",
                ));
            }
            Ok(format!("{x:.count$}"))
        });
}

fn of_two(room: &mut Room) {
    room.function_of::<Plain>("abs")
        .about("The number without its sign.")
        .words("absolute magnitude")
        .takes("any")
        .unit("that of the number")
        .example("abs(-3)", "3")
        .does(|x: &Plain| x.abs());
    room.function_of::<Plain>("min")
        .about("The smaller of two numbers.")
        .words("least smallest")
        .takes("any")
        .input("other", "any", "the other number")
        .unit("that of the numbers")
        .example("min(2, 1.5)", "1.5")
        .does(|a: &Plain, b: Plain| if b.below(*a) { b } else { *a });
    room.function_of::<Plain>("max")
        .about("The larger of two numbers.")
        .words("greatest largest")
        .takes("any")
        .input("other", "any", "the other number")
        .unit("that of the numbers")
        .example("max(2, 1.5)", "2")
        .does(|a: &Plain, b: Plain| if a.below(b) { b } else { *a });
    room.function_of::<f64>("hypot")
        .about("The hypotenuse: the root of the sum of two squares, without overflow on the way.")
        .words("length distance root sum squares")
        .takes("any")
        .input("y", "any", "the other side")
        .unit("that of the numbers")
        .example("hypot(3, 4)", "5")
        .does(|x: &f64, y: f64| finite("hypot", &[*x, y], x.hypot(y)));
    room.function_of::<f64>("atan2")
        .about("The angle of the point (x, y) seen from the origin, written atan2(y, x).")
        .words("direction angle inverse tangent")
        .takes("any")
        .input(
            "x",
            "any",
            "distance to the right; the first number is the distance up",
        )
        .unit("rad")
        .example("atan2(1, -1) / pi", "0.75")
        .does(|y: &f64, x: f64| y.atan2(x));
}

/// The value, unless it left the finite real numbers while the arguments were in them.
fn finite(name: &str, arguments: &[f64], value: f64) -> Result<f64, Fault> {
    if value.is_finite() || arguments.iter().any(|x| !x.is_finite()) {
        return Ok(value);
    }
    let list: Vec<_> = arguments.iter().map(|x| number_text(*x)).collect();
    let why = if value.is_nan() {
        "is not a real number"
    } else {
        "is not finite"
    };
    Err(Fault::new(format!("{name}({}) {why}", list.join(", "))))
}
