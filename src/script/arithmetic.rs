//! What the operators mean between plain numbers: a scientist's arithmetic.
//!
//! - `/` is true division: `1 / 2` is 0.5, and so is `x /= 2` after `let x = 1`.
//! - Dividing by zero is an error, as is a root or power that is no real number: neither an
//!   infinity nor a NaN starts its way through a calculation unseen. Where a whole field is
//!   divided, the cell becomes one without a value instead.
//! - Comparison is exact, between whole numbers and floats too: `1e-300 == 0` is false,
//!   `0.1 + 0.2 == 0.3` is false, and 9007199254740993 is not 9007199254740992.0.
//! - `**` takes any exponent: `2 ** -1` is 0.5; a whole power too large for a whole number is a
//!   float.

use std::any::TypeId;
use std::cmp::Ordering;

use rhai::{Array, Dynamic, Engine, EvalAltResult, FLOAT, INT};

use super::answer::Answer;
use super::argument::{Argument, Shape};
use super::call::Call;
use super::fault::Fault;
use super::kind::{Subject, number};
use super::number::number_text;

/// A plain number as it was written.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) enum Plain {
    /// `2`.
    Whole(INT),
    /// `2.0`.
    Float(FLOAT),
}

impl Plain {
    /// The number without its sign.
    pub(super) fn abs(self) -> Self {
        match self {
            Plain::Whole(n) => n
                .checked_abs()
                .map_or(Plain::Float((n as f64).abs()), Plain::Whole),
            Plain::Float(x) => Plain::Float(x.abs()),
        }
    }

    fn float(self) -> f64 {
        match self {
            Plain::Whole(n) => n as f64,
            Plain::Float(x) => x,
        }
    }

    /// True when this is less than `other`.
    pub(super) fn below(self, other: Self) -> bool {
        compare(self, other) == Some(Ordering::Less)
    }

    fn of(value: &Dynamic) -> Self {
        match value.as_int() {
            Ok(n) => Plain::Whole(n),
            Err(_) => Plain::Float(number(value).unwrap_or(f64::NAN)),
        }
    }
}

impl Subject for Plain {
    const NAME: &'static str = "number";

    fn types() -> Vec<TypeId> {
        <f64 as Subject>::types()
    }

    fn lend<R>(value: &Dynamic, f: impl FnOnce(&Self) -> R) -> Option<R> {
        number(value).map(|_| f(&Plain::of(value)))
    }
}

impl Argument for Plain {
    fn shape() -> Shape {
        f64::shape()
    }

    fn take(given: Option<&mut Dynamic>, call: &Call) -> Result<Self, Fault> {
        let plain = given.as_ref().map(|value| Plain::of(value));
        let float = f64::take(given, call)?;
        Ok(plain.unwrap_or(Plain::Float(float)))
    }
}

impl Answer for Plain {
    fn kind() -> String {
        "number".to_owned()
    }

    fn give(self) -> Result<Dynamic, Fault> {
        match self {
            Plain::Whole(n) => n.give(),
            Plain::Float(x) => x.give(),
        }
    }
}

/// Exact order of two numbers; `None` when one of them is NaN.
fn compare(a: Plain, b: Plain) -> Option<Ordering> {
    match (a, b) {
        (Plain::Whole(a), Plain::Whole(b)) => Some(a.cmp(&b)),
        (Plain::Float(a), Plain::Float(b)) => a.partial_cmp(&b),
        (Plain::Whole(a), Plain::Float(b)) => compare_mixed(a, b),
        (Plain::Float(a), Plain::Whole(b)) => compare_mixed(b, a).map(Ordering::reverse),
    }
}

fn compare_mixed(n: INT, x: FLOAT) -> Option<Ordering> {
    // 2^63, the first float above every whole number.
    const ABOVE: f64 = 9_223_372_036_854_775_808.0;
    if x.is_nan() {
        None
    } else if x >= ABOVE {
        Some(Ordering::Less)
    } else if x < -ABOVE {
        Some(Ordering::Greater)
    } else {
        let whole = x.trunc();
        // Exact: |whole| is at most 2^63 and has no fraction.
        let order = n.cmp(&(whole as INT));
        let fraction = x - whole;
        Some(order.then_with(|| 0.0_f64.partial_cmp(&fraction).unwrap_or(Ordering::Equal)))
    }
}

/// True division of plain numbers.
///
/// # Errors
/// Division by zero.
pub(super) fn divide(a: f64, b: f64) -> Result<f64, Fault> {
    if b == 0.0 {
        return Err(Fault::new(format!(
            "division by zero: {} / 0",
            number_text(a)
        )));
    }
    Ok(a / b)
}

/// A power of plain numbers: whole where both are whole and the result fits.
fn power(a: Plain, b: Plain) -> Result<Dynamic, Fault> {
    if let (Plain::Whole(base), Plain::Whole(exponent)) = (a, b)
        && let Ok(exponent) = u32::try_from(exponent)
        && let Some(result) = base.checked_pow(exponent)
    {
        return Ok(Dynamic::from_int(result));
    }
    let (base, exponent) = (a.float(), b.float());
    if base == 0.0 && exponent < 0.0 {
        return Err(Fault::new("division by zero: 0 to a negative power"));
    }
    let result = base.powf(exponent);
    if result.is_nan() && !base.is_nan() && !exponent.is_nan() {
        // Without brackets the minus sign would be outside the power.
        return Err(Fault::new(format!(
            "({}) ** {} is not a real number",
            number_text(base),
            number_text(exponent)
        )));
    }
    Ok(Dynamic::from_float(result))
}

/// Replaces the engine's own meaning of `/`, `**` and the comparisons between plain numbers.
pub(super) fn register(engine: &mut Engine) {
    // Otherwise the engine would not ask what is registered here.
    engine.set_fast_operators(false);
    let kinds = [TypeId::of::<INT>(), TypeId::of::<FLOAT>()];
    for types in kinds.iter().flat_map(|a| kinds.iter().map(|b| [*a, *b])) {
        changing(engine, "/", types, |a, b| {
            let float = |x: &Dynamic| number(x).unwrap_or(f64::NAN);
            divide(float(a), float(b)).map(Dynamic::from_float)
        });
        changing(engine, "**", types, |a, b| {
            power(Plain::of(a), Plain::of(b))
        });
        changing(engine, "%", types, |a, b| {
            remainder(Plain::of(a), Plain::of(b))
        });
        changing(engine, "|", types, |_, _| {
            let message = "`|` does not go between a number and a number";
            Err(Fault::new(message).hint("conditions are joined with `||`"))
        });
        comparing(engine, "==", types, |o| o == Some(Ordering::Equal));
        comparing(engine, "!=", types, |o| o != Some(Ordering::Equal));
        comparing(engine, "<", types, |o| o == Some(Ordering::Less));
        comparing(engine, ">", types, |o| o == Some(Ordering::Greater));
        comparing(engine, "<=", types, |o| o.is_some_and(Ordering::is_le));
        comparing(engine, ">=", types, |o| o.is_some_and(Ordering::is_ge));
    }
    engine.register_raw_fn("sort", [TypeId::of::<Array>()], |_, args| {
        sort(args[0]).map_err(Fault::into_error)
    });
}

/// The remainder of a division, with the sign of the left side.
fn remainder(a: Plain, b: Plain) -> Result<Dynamic, Fault> {
    if let (Plain::Whole(a), Plain::Whole(b)) = (a, b)
        && b != 0
    {
        return Ok(Dynamic::from_int(a.wrapping_rem(b)));
    }
    let (a, b) = (a.float(), b.float());
    if b == 0.0 {
        return Err(Fault::new(format!(
            "division by zero: {} % 0",
            number_text(a)
        )));
    }
    Ok(Dynamic::from_float(a % b))
}

/// Sorts a list of numbers, whole and float together, or of texts. NaN comes last.
fn sort(list: &mut Dynamic) -> Result<(), Fault> {
    let Some(mut list) = list.write_lock::<Array>() else {
        return Ok(());
    };
    if list.iter().all(|item| number(item).is_some()) {
        list.sort_by(|a, b| {
            let (a, b) = (Plain::of(a), Plain::of(b));
            compare(a, b).unwrap_or_else(|| a.float().is_nan().cmp(&b.float().is_nan()))
        });
        Ok(())
    } else if list.iter().all(Dynamic::is_string) {
        list.sort_by_cached_key(|item| item.clone().into_string().unwrap_or_default());
        Ok(())
    } else {
        Err(
            Fault::new("only a list of numbers or of texts has an order of its own")
                .hint("say which comes first: list.sort(|a, b| a.x < b.x)"),
        )
    }
}

/// Registers `a op b` and `a op= b`.
fn changing(
    engine: &mut Engine,
    op: &str,
    types: [TypeId; 2],
    compute: fn(&Dynamic, &Dynamic) -> Result<Dynamic, Fault>,
) {
    engine.register_raw_fn(op, types, move |_, args| {
        compute(args[0], args[1]).map_err(Fault::into_error)
    });
    engine.register_raw_fn(format!("{op}="), types, move |_, args| {
        let result = compute(args[0], args[1]).map_err(Fault::into_error)?;
        *args[0] = result;
        Ok::<(), Box<EvalAltResult>>(())
    });
}

fn comparing(
    engine: &mut Engine,
    op: &str,
    types: [TypeId; 2],
    holds: fn(Option<Ordering>) -> bool,
) {
    engine.register_raw_fn(op, types, move |_, args| {
        Ok(holds(compare(Plain::of(args[0]), Plain::of(args[1]))))
    });
}

#[cfg(test)]
mod tests {
    use super::*;

    fn engine() -> Engine {
        let mut engine = Engine::new();
        register(&mut engine);
        engine
    }

    #[test]
    fn division_is_true_division_everywhere() {
        let engine = engine();
        for (code, value) in [
            ("1 / 2", 0.5),
            ("5 / 2 * 2.0", 5.0),
            ("4 / 2", 2.0),
            ("1.0 / 4", 0.25),
            ("let x = 1; x /= 2; x", 0.5),
            ("let x = 3.0; x /= 2; x", 1.5),
            ("let m = #{a: 1}; m.a /= 4; m.a", 0.25),
            ("let l = [1, 2]; l[1] /= 4; l[1]", 0.5),
            ("2 ** -1", 0.5),
            ("2.0 ** -1", 0.5),
            ("4 ** 0.5", 2.0),
            ("10 ** 20", 1e20),
            ("let x = 2; x **= -2; x", 0.25),
        ] {
            assert_eq!(engine.eval::<f64>(code).unwrap(), value, "{code}");
        }
        assert_eq!(engine.eval::<i64>("2 ** 10").unwrap(), 1024);
    }

    #[test]
    fn what_is_no_number_is_an_error() {
        let engine = engine();
        for code in [
            "1 / 0",
            "1.0 / 0",
            "0 / 0.0",
            "let x = 1; x /= 0",
            "7 % 0",
            "7.5 % 0",
            "0 ** -1",
            "(-8) ** 0.5",
        ] {
            assert!(engine.eval::<Dynamic>(code).is_err(), "{code}");
        }
    }

    #[test]
    fn comparison_is_exact() {
        let engine = engine();
        for (code, value) in [
            ("1e-300 == 0.0", false),
            ("1e-300 == 0", false),
            ("1e-17 > 0.0", true),
            ("0.1 + 0.2 == 0.3", false),
            ("1.0 == 1", true),
            ("1 == 1.0", true),
            ("1 != 1.0", false),
            ("2 > 1.5", true),
            ("2 < 2.5", true),
            ("-2 > -2.5", true),
            ("3 <= 3.0", true),
            ("1.0 + 2.220446049250313e-16 > 1.0", true),
            // 2^53 + 1 has no float of its own.
            ("9007199254740993 == 9007199254740992.0", false),
            ("9007199254740993 > 9007199254740992.0", true),
            ("9223372036854775807 < 9.3e18", true),
            ("-9223372036854775807 > -9.3e18", true),
            ("[1, 2.0] == [1.0, 2]", true),
            ("1e-300 in [0.0]", false),
        ] {
            assert_eq!(engine.eval::<bool>(code).unwrap(), value, "{code}");
        }
    }

    #[test]
    fn the_exact_order_of_mixed_numbers_agrees_with_integer_arithmetic() {
        // Reference: the same comparison made in 128-bit integers, scaled by 2.
        for n in [-5_i64, -1, 0, 1, 7, (1 << 53) - 1, 1 << 53, (1 << 53) + 1] {
            for half in -20_i128..20 {
                let doubled = i128::from(n) * 2 + half;
                let x = doubled as f64 / 2.0;
                // Only where the float is the number meant.
                if (x * 2.0) as i128 == doubled {
                    let expected = (i128::from(n) * 2).cmp(&doubled);
                    assert_eq!(compare_mixed(n, x), Some(expected), "{n} and {x}");
                }
            }
        }
    }
}
