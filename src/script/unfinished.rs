//! Is there more to come? What a prompt asks after each line.

use rhai::{Engine, LexError, ParseErrorType};

/// True when `text` is the beginning of something not yet complete: an open bracket, text,
/// comment or statement.
///
/// The parser has no mode for this; where it stopped says it. A text is unfinished when the
/// parser met its end, or an error placed at the end, or when a comment is open.
pub fn is_unfinished(text: &str) -> bool {
    let engine = super::language::bare_engine();
    unfinished(&engine, text)
}

pub(super) fn unfinished(engine: &Engine, text: &str) -> bool {
    let trimmed = text.trim_end();
    if trimmed.is_empty() {
        return false;
    }
    match engine.compile(trimmed) {
        // A bracket that nothing opened is an error, unless an open comment swallows it.
        Ok(_) => engine.compile(format!("{trimmed}\n)")).is_ok(),
        Err(error) => match error.err_type() {
            ParseErrorType::UnexpectedEOF | ParseErrorType::WrongDocComment => true,
            ParseErrorType::BadInput(LexError::UnterminatedString) => open_backtick(trimmed),
            ParseErrorType::BadInput(_) => false,
            _ => at_the_end(trimmed, error.position()),
        },
    }
}

fn at_the_end(text: &str, position: rhai::Position) -> bool {
    let (Some(line), column) = (position.line(), position.position().unwrap_or(0)) else {
        return true;
    };
    let lines = text.lines().count();
    let last = text.lines().last().unwrap_or_default().chars().count();
    line > lines || (line == lines && column > last)
}

/// A text in backticks may run over lines; one in quotes may not.
fn open_backtick(text: &str) -> bool {
    text.matches('`').count() % 2 == 1
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn what_is_open_waits_for_more() {
        for text in [
            "let x = [1, 2,",
            "fn f(x) {",
            "if a > 1 {\n  print(a);",
            "let x =",
            "plan(#{ overlap: 0.5,",
            "a +",
            "foo(",
            "let m = #{",
            "/* a comment",
            "1 /* a comment",
            "let s = `first line",
            "for i in 0..3",
            "/// about f",
            "while true {",
            "x.",
            "[1, 2].map(|x| {",
        ] {
            assert!(is_unfinished(text), "{text}");
        }
    }

    #[test]
    fn what_is_complete_or_wrong_does_not_wait() {
        for text in [
            "",
            "1 + 1",
            "let x = 3;",
            "let x = 3",
            "fn f(x) { x }",
            "print(\"a\");",
            "let s = \"open",
            "1 +* 2",
            ")",
            "let 3 = x;",
            "a b",
            "/* done */ 1",
            "1 // remark",
            "`a ${1 + 1} b`",
            "if true { 1 } else { 2 }",
        ] {
            assert!(!is_unfinished(text), "{text}");
        }
    }
}
