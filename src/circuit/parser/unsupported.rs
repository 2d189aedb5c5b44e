//! What OpenQASM has and this program does not: one error that names it.

use super::{Parsed, Parser};
use crate::circuit::ast::Name;
use crate::circuit::diagnostic::Diagnostic;
use crate::circuit::lexer::{Symbol, TokenKind};

/// What a keyword begins and what to do instead.
fn construct(word: &str) -> Option<(&'static str, &'static str)> {
    Some(match word {
        "def" => (
            "subroutines (`def`) are not supported",
            "write a `gate`, or repeat the statements in a `for` loop",
        ),
        "return" => (
            "`return` is not supported, there are no subroutines",
            "leave it out",
        ),
        "while" => (
            "`while` loops are not supported, the length of a circuit must be known",
            "use a `for` loop with constant bounds and an `if` inside",
        ),
        "extern" => ("`extern` functions are not supported", "leave it out"),
        "cal" | "defcal" | "defcalgrammar" => (
            "calibration blocks are not supported",
            "leave them out, gates are simulated by their definition",
        ),
        "array" => (
            "arrays are not supported",
            "use a `bit[n]` register, or one name for each element",
        ),
        "box" => (
            "timing boxes (`box`) are not supported",
            "keep the statements and put a `barrier` around them",
        ),
        "stretch" => (
            "the type `stretch` is not supported",
            "write the length into `delay[…]`",
        ),
        "duration" | "durationof" => (
            "variables of type `duration` are not supported",
            "write the length into `delay[…]`, such as `delay[100ns] q;`",
        ),
        "complex" => (
            "complex numbers are not supported",
            "use `float` or `angle` constants",
        ),
        "switch" | "case" | "default" => (
            "`switch` is not supported",
            "write `if (c == 0) { … } else if (c == 1) { … }`",
        ),
        "break" | "continue" => (
            "leaving a loop early is not supported, loops are unrolled",
            "put the rest of the body under an `if`",
        ),
        "end" => (
            "`end` is not supported, a circuit runs to its last statement",
            "leave it out, or put the rest under an `if`",
        ),
        "opaque" => (
            "`opaque` gates have no definition to simulate",
            "write a `gate` with a body",
        ),
        "readonly" | "mutable" | "void" => (
            "parameters of subroutines are not supported",
            "leave it out",
        ),
        _ => return None,
    })
}

/// An error for a name called like a function that is none.
pub(super) fn function(name: Name<'_>) -> Diagnostic {
    let error = Diagnostic::error(
        name.span,
        format!("`{}` is no function of constants", name.text),
    );
    match name.text {
        "durationof" | "sizeof" | "real" | "imag" | "rotl" | "rotr" => Diagnostic::error(
            name.span,
            format!("the function `{}` is not supported", name.text),
        ),
        _ => error.with_help(
            "known are sin, cos, tan, arcsin, arccos, arctan, exp, log, sqrt, floor, ceiling, \
             mod, pow and popcount; subroutines are not supported",
        ),
    }
}

impl<'a> Parser<'a> {
    /// The error if the statement is something that is not supported.
    pub(super) fn refuse_unsupported(&mut self, word: &str) -> Parsed<()> {
        let Some((message, help)) = construct(word) else {
            return Ok(());
        };
        let error = Diagnostic::error(self.current.span, message).with_help(help);
        // A header such as `def f(qubit a) -> bit { … }` or `cal { … }` is
        // skipped with its body, and a word such as `else` after it too.
        self.advance();
        Err(error)
    }

    /// The error for a declaration `int n = 3;` without `const`.
    pub(super) fn variable(&mut self) -> Diagnostic {
        let place = self.current.span;
        let kind = self.text();
        let mut ahead = self.lexer.clone();
        let mut name = None;
        // Past the width, if there is one.
        for _ in 0..16 {
            let token = ahead.next_token();
            match token.kind {
                TokenKind::Word => name = Some(ahead.text(token.span)),
                TokenKind::Symbol(Symbol::Assign | Symbol::Semicolon) | TokenKind::End => break,
                _ => {}
            }
        }
        let name = name.unwrap_or("n");
        Diagnostic::error(
            place,
            format!("variables of type `{kind}` are not supported, only constants"),
        )
        .with_help(format!(
            "declare `const {kind} {name} = …;`, or keep measured values in a `bit` register"
        ))
    }
}
