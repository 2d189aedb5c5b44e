//! Statements: what the first word says, and the statements that act.

use super::{Parsed, Parser};
use crate::circuit::ast::{
    Binary, Call, For, If, Modifier, ModifierKind, Name, Operand, Scalar, Statement, StatementKind,
    Values,
};
use crate::circuit::diagnostic::{Diagnostic, Span};
use crate::circuit::lexer::{Symbol, TokenKind};

impl<'a> Parser<'a> {
    /// A statement with the annotations in front of it.
    pub(super) fn statement(&mut self) -> Parsed<Statement<'a>> {
        let annotations = self.annotations()?;
        let start = self.current.span;
        self.keep(start)?;
        let kind = self.statement_kind(start)?;
        Ok(Statement {
            kind,
            annotations,
            span: self.span_from(start),
        })
    }

    fn statement_kind(&mut self, start: Span) -> Parsed<StatementKind<'a>> {
        match self.current.kind {
            TokenKind::Word => {}
            TokenKind::Symbol(Symbol::Hash) if self.peek().kind == TokenKind::Word => {
                self.advance();
                if self.at_word("pragma") {
                    return Ok(self.pragma(start));
                }
                return Err(self.unexpected("`pragma`"));
            }
            TokenKind::Symbol(Symbol::Semicolon) => {
                return Err(
                    Diagnostic::error(start, "a `;` without a statement").with_help("remove it")
                );
            }
            TokenKind::Symbol(Symbol::RightBrace) => {
                return Err(
                    Diagnostic::error(start, "this `}` closes nothing").with_help("remove it")
                );
            }
            TokenKind::Symbol(Symbol::LeftBrace) => {
                return Err(
                    Diagnostic::error(start, "a block without `if`, `for` or `gate`")
                        .with_help("remove the braces"),
                );
            }
            _ => return Err(self.unexpected("a statement")),
        }
        let word = self.text();
        match word {
            "OPENQASM" => self.header(),
            "include" => self.include(),
            "pragma" => Ok(self.pragma(start)),
            "qubit" => self.qubit_declaration(),
            "bit" => self.bit_declaration(false),
            "qreg" | "creg" => self.old_declaration(false),
            "const" => self.constant_declaration(),
            "input" => self.input_declaration(),
            "output" => self.output_declaration(),
            "let" => self.alias(),
            "gate" => self.gate_definition(),
            "measure" => self.measurement(),
            "reset" => self.reset(),
            "barrier" => self.barrier(),
            "delay" => self.delay(),
            "if" => self.conditional(start),
            "else" => Err(Diagnostic::error(start, "an `else` without an `if`")),
            "for" => self.for_loop(start),
            "inv" | "pow" | "ctrl" | "negctrl" | "U" | "gphase" => self.call(),
            "int" | "uint" | "float" | "angle" | "bool" => {
                let error = self.variable();
                self.advance();
                Err(error)
            }
            _ => {
                self.refuse_unsupported(word)?;
                self.call_or_assignment()
            }
        }
    }

    /// `OPENQASM 3.0;`
    fn header(&mut self) -> Parsed<StatementKind<'a>> {
        let place = self.advance().span;
        let version = self.current.span;
        let text = self.text();
        if !matches!(self.current.kind, TokenKind::Float | TokenKind::Integer) {
            return Err(self.unexpected("a version such as `3.0`"));
        }
        if !matches!(text, "2" | "2.0" | "3" | "3.0" | "3.1") {
            self.advance();
            return Err(
                Diagnostic::error(version, format!("OpenQASM {text} is not supported"))
                    .with_help("use 3.1, 3.0 or 2.0"),
            );
        }
        if self.started {
            return Err(Diagnostic::error(
                place,
                "the `OPENQASM` header must be the first statement",
            ));
        }
        self.advance();
        self.expect(Symbol::Semicolon)?;
        self.version_2 = text.starts_with('2');
        Ok(StatementKind::Nothing)
    }

    fn include(&mut self) -> Parsed<StatementKind<'a>> {
        self.advance();
        let span = self.current.span;
        if self.current.kind != TokenKind::Text {
            return Err(self.unexpected("a file name in quotes"));
        }
        let quoted = self.text();
        self.advance();
        self.expect(Symbol::Semicolon)?;
        Ok(StatementKind::Include(Name {
            text: &quoted[1..quoted.len() - 1],
            span,
        }))
    }

    fn pragma(&mut self, start: Span) -> StatementKind<'a> {
        let line = self.lexer.rest_of_line(self.current.span.end);
        self.previous_end = line.end;
        self.current = self.lexer.next_token();
        self.warn(
            Span {
                start: start.start,
                end: line.end,
            },
            "this pragma means nothing here and is ignored".to_owned(),
        );
        StatementKind::Nothing
    }

    /// `measure q;`, `measure q -> c;`
    fn measurement(&mut self) -> Parsed<StatementKind<'a>> {
        self.advance();
        let source = self.operand("the qubits to measure")?;
        let target = if self.accept(Symbol::Arrow) {
            Some(self.operand("the bits to write")?)
        } else {
            None
        };
        self.expect(Symbol::Semicolon)?;
        Ok(StatementKind::Measure { source, target })
    }

    fn reset(&mut self) -> Parsed<StatementKind<'a>> {
        self.advance();
        let operand = self.operand("the qubits to reset")?;
        self.expect(Symbol::Semicolon)?;
        Ok(StatementKind::Reset(operand))
    }

    fn barrier(&mut self) -> Parsed<StatementKind<'a>> {
        self.advance();
        Ok(StatementKind::Barrier(self.operands_to_semicolon()?))
    }

    fn delay(&mut self) -> Parsed<StatementKind<'a>> {
        self.advance();
        let Some(duration) = self.width()? else {
            return Err(self.unexpected("a duration in brackets, such as `[100ns]`"));
        };
        let operands = self.operands_to_semicolon()?;
        Ok(StatementKind::Delay { duration, operands })
    }

    /// Comma-separated operands, none at all included, up to and with the `;`.
    fn operands_to_semicolon(&mut self) -> Parsed<Vec<Operand<'a>>> {
        let mut operands = Vec::new();
        if self.accept(Symbol::Semicolon) {
            return Ok(operands);
        }
        loop {
            operands.push(self.operand("a qubit or a register")?);
            if !self.accept(Symbol::Comma) {
                break;
            }
        }
        self.expect(Symbol::Semicolon)?;
        Ok(operands)
    }

    /// A block, or one statement without braces.
    fn body(&mut self, start: Span) -> Parsed<Vec<Statement<'a>>> {
        if self.at(Symbol::LeftBrace) {
            return self.block();
        }
        self.nested(start, |parser| Ok(vec![parser.statement()?]))
    }

    fn conditional(&mut self, start: Span) -> Parsed<StatementKind<'a>> {
        self.advance();
        self.expect(Symbol::LeftParenthesis)?;
        let condition = self.expression()?;
        self.expect(Symbol::RightParenthesis)?;
        let then = self.body(start)?;
        let otherwise = if self.at_word("else") {
            self.advance();
            self.body(start)?
        } else {
            Vec::new()
        };
        Ok(StatementKind::If(Box::new(If {
            condition,
            then,
            otherwise,
        })))
    }

    fn for_loop(&mut self, start: Span) -> Parsed<StatementKind<'a>> {
        self.advance();
        if self.current.kind == TokenKind::Word
            && Scalar::from_name(self.text()).is_none()
            && self.lexer.text(self.peek().span) == "in"
        {
            return Err(Diagnostic::error(
                self.current.span,
                format!("the loop variable `{}` has no type", self.text()),
            )
            .with_help(format!("write `for int {} in …`", self.text())));
        }
        let kind = self.scalar_type("the type of the loop variable, such as `int`")?;
        let variable = self.name("a name for the loop variable")?;
        if !self.at_word("in") {
            return Err(self.unexpected("`in`"));
        }
        self.advance();
        let place = self.current.span;
        let values = if self.at(Symbol::LeftBrace) {
            Values::Set(self.set()?)
        } else if self.accept(Symbol::LeftBracket) {
            let first = self.expression()?;
            let range = self.range(Some(first))?;
            self.expect(Symbol::RightBracket)?;
            Values::Range(range, self.span_from(place))
        } else {
            return Err(self
                .unexpected("the values of the loop variable")
                .with_help("write a range `[0:3]` or a set `{0, 2, 5}`"));
        };
        let body = self.body(start)?;
        Ok(StatementKind::For(Box::new(For {
            kind,
            variable,
            values,
            body,
        })))
    }

    fn call_or_assignment(&mut self) -> Parsed<StatementKind<'a>> {
        match self.peek().kind {
            TokenKind::Symbol(symbol)
                if symbol == Symbol::Assign
                    || symbol == Symbol::LeftBracket
                    || compound(symbol).is_some() =>
            {
                self.assignment()
            }
            _ => self.call(),
        }
    }

    fn assignment(&mut self) -> Parsed<StatementKind<'a>> {
        let target = self.operand("the bits to write")?;
        let place = self.current.span;
        let operator = match self.current.kind {
            TokenKind::Symbol(Symbol::Assign) => None,
            TokenKind::Symbol(symbol) if compound(symbol).is_some() => {
                match compound(symbol).flatten() {
                    Some(operator) => Some(operator),
                    None => {
                        return Err(Diagnostic::error(
                            place,
                            format!("`{}` is not supported on bits", symbol.text()),
                        )
                        .with_help("bits take `=`, `^=`, `&=` and `|=`"));
                    }
                }
            }
            TokenKind::Word => {
                return Err(Diagnostic::error(
                    target.span,
                    "a gate call with something in brackets behind the gate",
                )
                .with_help("gate lengths are not supported; angles stand in parentheses"));
            }
            _ => return Err(self.unexpected("`=`")),
        };
        self.advance();
        let value = Box::new(self.assigned()?);
        self.expect(Symbol::Semicolon)?;
        Ok(StatementKind::Assign {
            target,
            operator,
            value,
        })
    }

    /// `ctrl @ inv @ g(0.1) a, b;`
    fn call(&mut self) -> Parsed<StatementKind<'a>> {
        let mut modifiers = Vec::new();
        while let Some(modifier) = self.modifier()? {
            self.keep(modifier.span)?;
            modifiers.push(modifier);
        }
        let gate = if self.at_word("U") || self.at_word("gphase") {
            self.word("a gate")?
        } else {
            self.name("a gate")?
        };
        let parameters = if self.accept(Symbol::LeftParenthesis) {
            self.arguments()?
        } else {
            Vec::new()
        };
        if !matches!(
            self.current.kind,
            TokenKind::Word | TokenKind::HardwareQubit | TokenKind::Symbol(Symbol::Semicolon)
        ) {
            return Err(self.unexpected(&format!("the qubits of `{}`", gate.text)));
        }
        let operands = self.operands_to_semicolon()?;
        Ok(StatementKind::Call(Box::new(Call {
            modifiers,
            gate,
            parameters,
            operands,
        })))
    }

    fn modifier(&mut self) -> Parsed<Option<Modifier<'a>>> {
        let start = self.current.span;
        if self.current.kind != TokenKind::Word {
            return Ok(None);
        }
        let word = self.text();
        if !matches!(word, "inv" | "pow" | "ctrl" | "negctrl") {
            return Ok(None);
        }
        self.advance();
        let argument = if word != "inv" && self.accept(Symbol::LeftParenthesis) {
            let argument = self.nested(start, Parser::expression)?;
            self.expect(Symbol::RightParenthesis)?;
            Some(argument)
        } else {
            None
        };
        let kind = match (word, argument) {
            ("inv", _) => ModifierKind::Inverse,
            ("pow", Some(exponent)) => ModifierKind::Power(exponent),
            ("pow", None) => return Err(self.unexpected("an integer in parentheses after `pow`")),
            (_, count) => ModifierKind::Control {
                negated: word == "negctrl",
                count,
            },
        };
        self.expect(Symbol::At)?;
        Ok(Some(Modifier {
            kind,
            span: self.span_from(start),
        }))
    }
}

/// Whether the symbol is a compound assignment, and of which operator if bits
/// can take it.
fn compound(symbol: Symbol) -> Option<Option<Binary>> {
    match symbol {
        Symbol::XorAssign => Some(Some(Binary::Xor)),
        Symbol::AndAssign => Some(Some(Binary::And)),
        Symbol::OrAssign => Some(Some(Binary::Or)),
        Symbol::PowerAssign
        | Symbol::ShiftLeftAssign
        | Symbol::ShiftRightAssign
        | Symbol::AddAssign
        | Symbol::SubtractAssign
        | Symbol::MultiplyAssign
        | Symbol::DivideAssign
        | Symbol::RemainderAssign
        | Symbol::NotAssign => Some(None),
        _ => None,
    }
}
