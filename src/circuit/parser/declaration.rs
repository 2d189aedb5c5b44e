//! Declarations: registers, constants, inputs, aliases and gates.

use super::{Parsed, Parser};
use crate::circuit::ast::{
    Assigned, BitDeclaration, Expression, GateDefinition, Name, Scalar, StatementKind, Type,
};
use crate::circuit::diagnostic::Diagnostic;
use crate::circuit::lexer::{Symbol, TokenKind};

impl<'a> Parser<'a> {
    /// `qubit q;`, `qubit[n] q;`
    pub(super) fn qubit_declaration(&mut self) -> Parsed<StatementKind<'a>> {
        self.advance();
        let size = self.width()?;
        let name = self.declared_name("a name for the qubits")?;
        self.refuse_size_behind("qubit", name)?;
        self.expect(Symbol::Semicolon)?;
        Ok(StatementKind::Qubits { name, size })
    }

    /// `bit c;`, `bit[n] c;`, with a first value or not.
    pub(super) fn bit_declaration(&mut self, output: bool) -> Parsed<StatementKind<'a>> {
        self.advance();
        let size = self.width()?;
        let name = self.declared_name("a name for the bits")?;
        self.refuse_size_behind("bit", name)?;
        let value = if !output && self.accept(Symbol::Assign) {
            Some(self.assigned()?)
        } else {
            None
        };
        self.expect(Symbol::Semicolon)?;
        Ok(StatementKind::Bits(Box::new(BitDeclaration {
            name,
            size,
            output,
            value,
        })))
    }

    /// `qreg q[n];`, `creg c[n];`
    pub(super) fn old_declaration(&mut self, output: bool) -> Parsed<StatementKind<'a>> {
        let keyword = self.text();
        self.advance();
        if self.at(Symbol::LeftBracket) {
            let new = if keyword == "qreg" { "qubit" } else { "bit" };
            return Err(Diagnostic::error(
                self.current.span,
                format!("the size of a `{keyword}` stands behind its name"),
            )
            .with_help(format!("write `{keyword} name[n];` or `{new}[n] name;`")));
        }
        let name = self.declared_name("a name for the register")?;
        let size = self.width()?;
        self.expect(Symbol::Semicolon)?;
        Ok(if keyword == "qreg" {
            StatementKind::Qubits { name, size }
        } else {
            StatementKind::Bits(Box::new(BitDeclaration {
                name,
                size,
                output,
                value: None,
            }))
        })
    }

    fn declared_name(&mut self, what: &str) -> Parsed<Name<'a>> {
        self.name(what)
    }

    fn refuse_size_behind(&mut self, keyword: &str, name: Name<'a>) -> Parsed<()> {
        if !self.at(Symbol::LeftBracket) {
            return Ok(());
        }
        Err(Diagnostic::error(
            self.current.span,
            format!("the size of a `{keyword}` register stands before its name"),
        )
        .with_help(format!("write `{keyword}[n] {};`", name.text)))
    }

    /// What stands behind the `=` of bits.
    pub(super) fn assigned(&mut self) -> Parsed<Assigned<'a>> {
        if self.at_word("measure") {
            self.advance();
            return Ok(Assigned::Measure(self.operand("the qubits to measure")?));
        }
        Ok(Assigned::Expression(self.expression()?))
    }

    /// `int[32]` and the like.
    pub(super) fn scalar_type(&mut self, what: &str) -> Parsed<Type<'a>> {
        let start = self.current.span;
        let word = if self.current.kind == TokenKind::Word {
            self.text()
        } else {
            ""
        };
        let Some(scalar) = Scalar::from_name(word) else {
            self.refuse_unsupported(word)?;
            return Err(self.unexpected(what));
        };
        self.advance();
        let width = self.width()?;
        Ok(Type {
            scalar,
            width,
            span: self.span_from(start),
        })
    }

    /// `const int n = 3;`
    pub(super) fn constant_declaration(&mut self) -> Parsed<StatementKind<'a>> {
        self.advance();
        let kind = self.scalar_type("the type of the constant: int, uint, float, angle or bool")?;
        let name = self.declared_name("a name for the constant")?;
        self.expect(Symbol::Assign)?;
        let value = self.expression()?;
        self.expect(Symbol::Semicolon)?;
        Ok(StatementKind::Constant { kind, name, value })
    }

    /// `input float x;`
    pub(super) fn input_declaration(&mut self) -> Parsed<StatementKind<'a>> {
        self.advance();
        let kind = self.scalar_type("the type of the input: int, uint, float, angle or bool")?;
        let name = self.declared_name("a name for the input")?;
        self.expect(Symbol::Semicolon)?;
        Ok(StatementKind::Input { kind, name })
    }

    /// `output bit[n] c;`
    pub(super) fn output_declaration(&mut self) -> Parsed<StatementKind<'a>> {
        self.advance();
        if self.at_word("creg") {
            return self.old_declaration(true);
        }
        if !self.at_word("bit") {
            return Err(
                Diagnostic::error(self.current.span, "only bits can be declared `output`")
                    .with_help("write `output bit[n] c;`"),
            );
        }
        self.bit_declaration(true)
    }

    /// `let a = q[0:3] ++ r;`
    pub(super) fn alias(&mut self) -> Parsed<StatementKind<'a>> {
        self.advance();
        let name = self.declared_name("a name for the alias")?;
        self.expect(Symbol::Assign)?;
        let mut parts = vec![self.operand("a register")?];
        while self.accept(Symbol::Concatenate) {
            parts.push(self.operand("a register")?);
        }
        self.expect(Symbol::Semicolon)?;
        Ok(StatementKind::Alias { name, parts })
    }

    /// `gate g(x) a, b { … }`
    pub(super) fn gate_definition(&mut self) -> Parsed<StatementKind<'a>> {
        self.advance();
        let name = self.name("a name for the gate")?;
        let mut parameters = Vec::new();
        if self.accept(Symbol::LeftParenthesis) {
            if !self.at(Symbol::RightParenthesis) {
                parameters = self.names("a name for a parameter")?;
            }
            self.expect(Symbol::RightParenthesis)?;
        }
        let qubits = self.names("a name for a qubit of the gate")?;
        if self.at(Symbol::LeftBracket) {
            return Err(Diagnostic::error(
                self.current.span,
                "the qubits of a gate are single qubits, found a size",
            )
            .with_help("name the qubits one by one, `gate g a, b { … }`"));
        }
        let body = self.block()?;
        Ok(StatementKind::Gate(Box::new(GateDefinition {
            name,
            parameters,
            qubits,
            body,
        })))
    }

    fn names(&mut self, what: &str) -> Parsed<Vec<Name<'a>>> {
        let mut names = Vec::new();
        loop {
            let name = self.name(what)?;
            self.keep(name.span)?;
            names.push(name);
            if !self.accept(Symbol::Comma) {
                return Ok(names);
            }
        }
    }

    /// Comma-separated expressions up to and with the `)`.
    pub(super) fn arguments(&mut self) -> Parsed<Vec<Expression<'a>>> {
        let mut arguments = Vec::new();
        while !self.at(Symbol::RightParenthesis) {
            arguments.push(self.expression()?);
            if !self.accept(Symbol::Comma) {
                break;
            }
        }
        self.expect(Symbol::RightParenthesis)?;
        Ok(arguments)
    }
}
