//! What a minus sign before a power means, and the operators on bits that are left out.
//!
//! The engine binds a minus sign tighter than `**`: `-2 ** 2` would be 4, and `exp(-r ** 2)` would
//! grow with `r`. In mathematics the power comes first. The engine's grammar is fixed, but its
//! words can be exchanged as they come in: a power whose left side carries a minus sign becomes an
//! operator of its own, which takes the minus away, raises, and puts it back.
//!
//! `^` is a power to some and something else to others, and `&`, `<<`, `>>` act on the bits of
//! whole numbers, which no measurement has; they are errors rather than silently something else.

use std::any::TypeId;
use std::cell::RefCell;

use rhai::{Dynamic, Engine, LexError, Position, Token};

/// The power whose left side carries a minus sign; nobody can write it.
const POWER_BEFORE_MINUS: &str = "-**";
/// Just below `**`, which then binds to the exponent: `-2 ** 3 ** 2` is -(2 ** (3 ** 2)).
const PRECEDENCE: u8 = 189;

/// Makes the engine read signs and powers so.
pub(super) fn register(engine: &mut Engine) {
    // Refused only where the name is a word of the language, which it is not.
    let _ = engine.register_custom_operator(POWER_BEFORE_MINUS, PRECEDENCE);
    engine.register_raw_fn(
        POWER_BEFORE_MINUS,
        [TypeId::of::<Dynamic>(); 2],
        |context, args| {
            let (mut base, mut exponent) = (args[0].clone(), args[1].clone());
            let mut base = context.call_native_fn_raw("-", false, &mut [&mut base])?;
            let both = &mut [&mut base, &mut exponent];
            let mut raised = context.call_native_fn_raw("**", false, both)?;
            context.call_native_fn_raw("-", false, &mut [&mut raised])
        },
    );
    let reading = RefCell::new(Reading::default());
    #[allow(deprecated)] // Not deprecated but marked as subject to change, says its documentation.
    engine.on_parse_token(move |token, position, _| reading.borrow_mut().exchange(token, position));
}

/// What was read of the current operand, in each bracket that is open.
#[derive(Debug)]
struct Reading {
    last: Position,
    operands: Vec<Operand>,
}

impl Default for Reading {
    fn default() -> Self {
        Self {
            last: Position::NONE,
            operands: vec![Operand::default()],
        }
    }
}

#[derive(Clone, Copy, Debug, Default)]
struct Operand {
    /// It carries a minus sign (an odd number of them).
    minus: bool,
    /// It stands to the right of a power.
    exponent: bool,
}

impl Reading {
    /// The word the parser is to see in place of `token`.
    fn exchange(&mut self, token: Token, position: Position) -> Token {
        if position <= self.last {
            // Another text begins.
            *self = Self::default();
        }
        self.last = position;
        if let Some(hint) = left_out(&token) {
            let word = token.literal_syntax().to_owned();
            return Token::LexError(LexError::ImproperSymbol(word, hint.to_owned()).into());
        }
        let Some(operand) = self.operands.last_mut() else {
            self.operands.push(Operand::default());
            return token;
        };
        match &token {
            Token::UnaryMinus => operand.minus = !operand.minus,
            Token::IntegerConstant(n) => operand.minus ^= *n < 0,
            Token::FloatConstant(x) => operand.minus ^= x.0.is_sign_negative(),
            Token::PowerOf => {
                let before = *operand;
                *operand = Operand {
                    minus: false,
                    exponent: true,
                };
                return match (before.minus, before.exponent) {
                    (false, _) => token,
                    (true, false) => Token::Custom(Box::new(POWER_BEFORE_MINUS.into())),
                    (true, true) => {
                        let hint = "write the exponent in brackets: a ** (-b ** c)".to_owned();
                        Token::LexError(LexError::ImproperSymbol("**".to_owned(), hint).into())
                    }
                };
            }
            Token::LeftParen | Token::LeftBracket | Token::LeftBrace | Token::MapStart => {
                self.operands.push(Operand::default());
            }
            Token::RightParen | Token::RightBracket | Token::RightBrace => {
                self.operands.pop();
            }
            token if continues(token) => {}
            _ => *operand = Operand::default(),
        }
        token
    }
}

/// True for what may stand inside one operand.
fn continues(token: &Token) -> bool {
    matches!(
        token,
        Token::Identifier(_)
            | Token::Reserved(_)
            | Token::Period
            | Token::Elvis
            | Token::DoubleColon
            | Token::QuestionBracket
            | Token::UnaryPlus
            | Token::Bang
    )
}

/// What to write instead of an operator on bits.
fn left_out(token: &Token) -> Option<&'static str> {
    match token {
        Token::XOr | Token::XOrAssign => Some("powers are written `**`"),
        Token::Ampersand | Token::AndAssign => Some("conditions are joined with `&&`"),
        Token::OrAssign => Some("conditions are joined with `||`"),
        Token::LeftShift | Token::RightShift | Token::LeftShiftAssign | Token::RightShiftAssign => {
            Some("`<` and `>` compare")
        }
        _ => None,
    }
}

#[cfg(test)]
mod tests {
    use super::super::language::bare_engine;

    #[test]
    fn a_power_comes_before_the_minus_sign() {
        // Reference: the same expressions with the brackets that mathematics implies.
        let engine = bare_engine();
        for (code, value) in [
            ("-2 ** 2", -(2_f64.powi(2))),
            ("-2.0 ** 2", -4.0),
            ("- 2 ** 2", -4.0),
            ("(-2) ** 2", 4.0),
            ("let x = 3; -x ** 2", -9.0),
            ("let x = 3; - -x ** 2", 9.0),
            ("let x = 3; 1 - x ** 2", -8.0),
            ("let x = 3; 1 -x ** 2", -8.0),
            ("let x = 3; 2 * -x ** 2 + 1", -17.0),
            ("-2 ** 3 ** 2", -512.0),
            ("2 ** -2", 0.25),
            ("-2 ** -2", -0.25),
            ("2 ** 3 ** 2", 512.0),
            ("let l = [3]; -l[0] ** 2", -9.0),
            ("let m = #{a: 3}; -m.a ** 2", -9.0),
            ("let f = |x| -x ** 2; f.call(3)", -9.0),
            ("[3].map(|x| -x ** 2)[0]", -9.0),
            ("-(1 + 2) ** 2", -9.0),
            ("(-1 + 2 ** 2)", 3.0),
            ("-1 + 2 ** 2", 3.0),
            ("-3 * 2 ** 2", -12.0),
            ("fn f(x) { return -x ** 2; } f(3)", -9.0),
        ] {
            let found = engine.eval::<rhai::Dynamic>(code);
            let found = found.unwrap_or_else(|error| panic!("{code}: {error}"));
            assert_eq!(super::super::kind::number(&found), Some(value), "{code}");
        }
    }

    #[test]
    fn a_text_that_ends_early_does_not_reach_into_the_next() {
        let engine = bare_engine();
        assert!(engine.compile("(-").is_err());
        assert_eq!(engine.eval::<i64>("let x = 3; x ** 2").unwrap(), 9);
        assert!(engine.compile("-").is_err());
        assert_eq!(engine.eval::<i64>("3 ** 2").unwrap(), 9);
    }

    #[test]
    fn operators_on_bits_are_refused_and_those_of_conditions_are_not() {
        let engine = bare_engine();
        for code in [
            "2 ^ 3",
            "5 & 3",
            "5 | 3",
            "5 | 3.0",
            "1 << 3",
            "8 >> 1",
            "let x = 1; x |= 2",
            "let x = 1; x ^= 2",
            "2 ** -3 ** 2",
        ] {
            assert!(engine.eval::<rhai::Dynamic>(code).is_err(), "{code}");
        }
        for code in ["true && !false", "false || true", "[1].all(|x| x > 0)"] {
            assert!(engine.eval::<bool>(code).unwrap(), "{code}");
        }
    }
}
