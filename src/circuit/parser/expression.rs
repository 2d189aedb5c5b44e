//! Expressions, by operator precedence, into postfix order.
//!
//! Operators wait on a stack of their own; only parentheses, indices and
//! function calls recurse. Precedence follows the OpenQASM 3 specification.

use super::{Parsed, Parser};
use crate::circuit::ast::{
    Binary, Expression, Function, Index, IndexKind, Node, NodeKind, Operand, Range, Scalar, Unary,
};
use crate::circuit::diagnostic::{Diagnostic, Span};
use crate::circuit::lexer::{Symbol, TIME_UNITS, TokenKind};
use crate::circuit::limits::{MAX_EXPRESSION, MAX_NESTING};

/// The value of a built-in constant.
pub fn constant(name: &str) -> Option<f64> {
    use std::f64::consts;
    match name {
        "pi" | "π" => Some(consts::PI),
        "tau" | "τ" => Some(consts::TAU),
        "euler" | "ℇ" => Some(consts::E),
        _ => None,
    }
}

/// An operator that waits for its right operand.
#[derive(Clone, Copy)]
enum Waiting {
    Unary(Unary, Span),
    Binary(Binary, Span),
}

/// How tightly prefix operators bind: less than `**`, more than `*`.
const UNARY_PRECEDENCE: u8 = 11;

fn precedence(operator: Binary) -> u8 {
    match operator {
        Binary::LogicalOr => 1,
        Binary::LogicalAnd => 2,
        Binary::Or => 3,
        Binary::Xor => 4,
        Binary::And => 5,
        Binary::Equal | Binary::NotEqual => 6,
        Binary::Less | Binary::LessOrEqual | Binary::Greater | Binary::GreaterOrEqual => 7,
        Binary::ShiftLeft | Binary::ShiftRight => 8,
        Binary::Add | Binary::Subtract => 9,
        Binary::Multiply | Binary::Divide | Binary::Remainder => 10,
        Binary::Power => 12,
    }
}

impl Waiting {
    fn precedence(self) -> u8 {
        match self {
            Waiting::Unary(..) => UNARY_PRECEDENCE,
            Waiting::Binary(operator, _) => precedence(operator),
        }
    }

    fn node<'a>(self) -> Node<'a> {
        match self {
            Waiting::Unary(operator, span) => Node {
                kind: NodeKind::Unary(operator),
                span,
            },
            Waiting::Binary(operator, span) => Node {
                kind: NodeKind::Binary(operator),
                span,
            },
        }
    }
}

impl<'a> Parser<'a> {
    /// An expression.
    pub(super) fn expression(&mut self) -> Parsed<Expression<'a>> {
        let start = self.current.span;
        let mut nodes = Vec::new();
        self.expression_into(&mut nodes)?;
        Ok(Expression {
            nodes,
            span: self.span_from(start),
        })
    }

    fn expression_into(&mut self, nodes: &mut Vec<Node<'a>>) -> Parsed<()> {
        let mut waiting: Vec<Waiting> = Vec::new();
        loop {
            let mut prefixes = 0;
            while let Some(operator) = self.prefix() {
                prefixes += 1;
                if prefixes > MAX_NESTING {
                    return Err(Diagnostic::error(
                        self.current.span,
                        format!("more than {MAX_NESTING} operators in front of one operand"),
                    ));
                }
                let span = self.advance().span;
                waiting.push(Waiting::Unary(operator, span));
            }
            self.primary(nodes)?;
            let Some(operator) = self.infix() else {
                break;
            };
            let span = self.advance().span;
            while let Some(&top) = waiting.last() {
                let left_first = operator != Binary::Power;
                let binds = precedence(operator);
                if top.precedence() < binds || (top.precedence() == binds && !left_first) {
                    break;
                }
                self.push(nodes, top.node())?;
                waiting.pop();
            }
            waiting.push(Waiting::Binary(operator, span));
        }
        while let Some(top) = waiting.pop() {
            self.push(nodes, top.node())?;
        }
        Ok(())
    }

    fn push(&mut self, nodes: &mut Vec<Node<'a>>, node: Node<'a>) -> Parsed<()> {
        self.keep(node.span)?;
        if nodes.len() >= MAX_EXPRESSION {
            return Err(Diagnostic::error(
                node.span,
                format!("an expression with more than {MAX_EXPRESSION} operands and operators"),
            )
            .with_help("split it over several statements"));
        }
        nodes.push(node);
        Ok(())
    }

    fn prefix(&self) -> Option<Unary> {
        match self.current.kind {
            TokenKind::Symbol(Symbol::Minus) => Some(Unary::Negate),
            TokenKind::Symbol(Symbol::Exclamation) => Some(Unary::LogicalNot),
            TokenKind::Symbol(Symbol::Tilde) => Some(Unary::BitNot),
            _ => None,
        }
    }

    fn infix(&self) -> Option<Binary> {
        let TokenKind::Symbol(symbol) = self.current.kind else {
            return None;
        };
        Some(match symbol {
            Symbol::LogicalOr => Binary::LogicalOr,
            Symbol::LogicalAnd => Binary::LogicalAnd,
            Symbol::Or => Binary::Or,
            Symbol::Xor if self.version_2 => Binary::Power,
            Symbol::Xor => Binary::Xor,
            Symbol::And => Binary::And,
            Symbol::Equal => Binary::Equal,
            Symbol::NotEqual => Binary::NotEqual,
            Symbol::Less => Binary::Less,
            Symbol::LessOrEqual => Binary::LessOrEqual,
            Symbol::Greater => Binary::Greater,
            Symbol::GreaterOrEqual => Binary::GreaterOrEqual,
            Symbol::ShiftLeft => Binary::ShiftLeft,
            Symbol::ShiftRight => Binary::ShiftRight,
            Symbol::Plus => Binary::Add,
            Symbol::Minus => Binary::Subtract,
            Symbol::Star => Binary::Multiply,
            Symbol::Slash => Binary::Divide,
            Symbol::Percent => Binary::Remainder,
            Symbol::Power => Binary::Power,
            _ => return None,
        })
    }

    /// An operand: a literal, a name, parentheses, a function or a cast.
    fn primary(&mut self, nodes: &mut Vec<Node<'a>>) -> Parsed<()> {
        let span = self.current.span;
        let kind = match self.current.kind {
            TokenKind::Symbol(Symbol::LeftParenthesis) => {
                self.advance();
                self.nested(span, |parser| parser.expression_into(nodes))?;
                self.expect(Symbol::RightParenthesis)?;
                return Ok(());
            }
            TokenKind::Integer | TokenKind::Float => self.number()?,
            TokenKind::Duration => {
                let text = self.text();
                self.advance();
                duration(text, span)?
            }
            TokenKind::Text => {
                let text = self.text();
                let digits = &text[1..text.len() - 1];
                if digits.is_empty() || digits.bytes().any(|b| !b"01_".contains(&b)) {
                    return Err(Diagnostic::error(
                        span,
                        format!("expected a bit string of 0 and 1, found {}", self.found()),
                    ));
                }
                self.advance();
                NodeKind::BitString(digits)
            }
            TokenKind::Imaginary => {
                return Err(Diagnostic::error(span, "complex numbers are not supported"));
            }
            TokenKind::Word => return self.word_operand(nodes),
            _ => return Err(self.unexpected("an expression")),
        };
        self.push(nodes, Node { kind, span })
    }

    /// A number; with a unit of time behind it, a duration.
    fn number(&mut self) -> Parsed<NodeKind<'a>> {
        let span = self.current.span;
        let integer = self.current.kind == TokenKind::Integer;
        let text = self.text();
        self.advance();
        if self.current.kind == TokenKind::Word
            && let Some((_, in_second)) = TIME_UNITS.iter().find(|(unit, _)| *unit == self.text())
        {
            self.advance();
            return seconds_of(text, *in_second, span);
        }
        if integer {
            integer_value(text).map(NodeKind::Integer).ok_or_else(|| {
                Diagnostic::error(span, "an integer of more than 127 bits")
                    .with_help("compare wide registers with a bit string")
            })
        } else {
            float_value(text, span).map(NodeKind::Float)
        }
    }

    /// An operand that begins with a word.
    fn word_operand(&mut self, nodes: &mut Vec<Node<'a>>) -> Parsed<()> {
        let span = self.current.span;
        let text = self.text();
        let kind = match text {
            "true" => Some(NodeKind::Boolean(true)),
            "false" => Some(NodeKind::Boolean(false)),
            _ => constant(text).map(NodeKind::Float),
        };
        if let Some(kind) = kind {
            self.advance();
            return self.push(nodes, Node { kind, span });
        }
        if let Some(scalar) = Scalar::from_name(text) {
            return self.cast(scalar, nodes);
        }
        if self.peek().kind == TokenKind::Symbol(Symbol::LeftParenthesis) {
            return self.function(nodes);
        }
        if text == "measure" {
            return Err(
                Diagnostic::error(span, "a measurement inside an expression")
                    .with_help("measure into a bit first, `c = measure q;`, and use the bit"),
            );
        }
        let operand = self.operand("an expression")?;
        let span = operand.span;
        let kind = if operand.indices.is_empty() {
            NodeKind::Name(operand.name.text)
        } else {
            NodeKind::Element(Box::new(operand))
        };
        self.push(nodes, Node { kind, span })
    }

    fn cast(&mut self, scalar: Scalar, nodes: &mut Vec<Node<'a>>) -> Parsed<()> {
        let start = self.advance().span;
        let width = self.width()?;
        self.expect(Symbol::LeftParenthesis)?;
        self.nested(start, |parser| parser.expression_into(nodes))?;
        self.expect(Symbol::RightParenthesis)?;
        let span = self.span_from(start);
        let kind = NodeKind::Cast(scalar, width.map(Box::new));
        self.push(nodes, Node { kind, span })
    }

    /// `[n]` behind a type.
    pub(super) fn width(&mut self) -> Parsed<Option<Expression<'a>>> {
        let place = self.current.span;
        if !self.accept(Symbol::LeftBracket) {
            return Ok(None);
        }
        let width = self.nested(place, Parser::expression)?;
        self.expect(Symbol::RightBracket)?;
        Ok(Some(width))
    }

    fn function(&mut self, nodes: &mut Vec<Node<'a>>) -> Parsed<()> {
        let name = self.word("a function")?;
        let Some(function) = Function::from_name(name.text) else {
            return Err(super::unsupported::function(name));
        };
        self.expect(Symbol::LeftParenthesis)?;
        let mut found = 0;
        while !self.at(Symbol::RightParenthesis) {
            self.nested(name.span, |parser| parser.expression_into(nodes))?;
            found += 1;
            if !self.accept(Symbol::Comma) {
                break;
            }
        }
        self.expect(Symbol::RightParenthesis)?;
        let span = self.span_from(name.span);
        if found != function.operands() {
            return Err(Diagnostic::error(
                span,
                format!(
                    "`{}` takes {} operand{}, found {found}",
                    name.text,
                    function.operands(),
                    if function.operands() == 1 { "" } else { "s" },
                ),
            ));
        }
        let kind = NodeKind::Function(function, found);
        self.push(nodes, Node { kind, span })
    }

    /// A name with any number of indices.
    pub(super) fn operand(&mut self, what: &str) -> Parsed<Operand<'a>> {
        let name = self.name(what)?;
        self.keep(name.span)?;
        let mut indices = Vec::new();
        while self.at(Symbol::LeftBracket) {
            self.keep(self.current.span)?;
            indices.push(self.index()?);
            if indices.len() > MAX_NESTING {
                return Err(Diagnostic::error(
                    self.span_from(name.span),
                    format!("more than {MAX_NESTING} indices on one name"),
                ));
            }
        }
        Ok(Operand {
            name,
            indices,
            span: self.span_from(name.span),
        })
    }

    fn index(&mut self) -> Parsed<Index<'a>> {
        let start = self.expect(Symbol::LeftBracket)?.span;
        let kind = self.nested(start, |parser| {
            if parser.at(Symbol::LeftBrace) {
                return parser.set().map(IndexKind::Set);
            }
            let first = if parser.at(Symbol::Colon) {
                None
            } else {
                Some(parser.expression()?)
            };
            match first {
                Some(first) if !parser.at(Symbol::Colon) => Ok(IndexKind::Element(first)),
                first => Ok(IndexKind::Range(Box::new(parser.range(first)?))),
            }
        })?;
        if self.at(Symbol::Comma) {
            return Err(Diagnostic::error(
                self.current.span,
                "registers have one dimension, found a second index",
            )
            .with_help("select several elements with a set, `q[{0, 2}]`"));
        }
        self.expect(Symbol::RightBracket)?;
        Ok(Index {
            kind,
            span: self.span_from(start),
        })
    }

    /// The rest of a range after its start.
    pub(super) fn range(&mut self, start: Option<Expression<'a>>) -> Parsed<Range<'a>> {
        self.expect(Symbol::Colon)?;
        let ends = |parser: &Self| parser.at(Symbol::RightBracket);
        let second = if ends(self) || self.at(Symbol::Colon) {
            None
        } else {
            Some(self.expression()?)
        };
        if !self.accept(Symbol::Colon) {
            return Ok(Range {
                start,
                step: None,
                end: second,
            });
        }
        let end = if ends(self) {
            None
        } else {
            Some(self.expression()?)
        };
        Ok(Range {
            start,
            step: second,
            end,
        })
    }

    /// `{a, b, c}`
    pub(super) fn set(&mut self) -> Parsed<Vec<Expression<'a>>> {
        self.expect(Symbol::LeftBrace)?;
        let mut elements = Vec::new();
        while !self.at(Symbol::RightBrace) {
            elements.push(self.expression()?);
            if !self.accept(Symbol::Comma) {
                break;
            }
        }
        self.expect(Symbol::RightBrace)?;
        Ok(elements)
    }
}

fn integer_value(text: &str) -> Option<i128> {
    let digits = text.replace('_', "");
    let base = match digits.as_bytes() {
        [b'0', b'x' | b'X', ..] => 16,
        [b'0', b'b' | b'B', ..] => 2,
        [b'0', b'o' | b'O', ..] => 8,
        _ => return digits.parse().ok(),
    };
    i128::from_str_radix(&digits[2..], base).ok()
}

fn float_value(text: &str, span: Span) -> Parsed<f64> {
    match text.replace('_', "").parse::<f64>() {
        Ok(value) if value.is_finite() => Ok(value),
        _ => Err(Diagnostic::error(
            span,
            format!("`{text}` is too large for a number"),
        )),
    }
}

fn duration<'a>(text: &str, span: Span) -> Parsed<NodeKind<'a>> {
    let (unit, in_second) = TIME_UNITS
        .iter()
        .find(|(unit, _)| text.ends_with(unit))
        .expect("the lexer saw a unit");
    seconds_of(&text[..text.len() - unit.len()], *in_second, span)
}

fn seconds_of<'a>(number: &str, unit: Option<f64>, span: Span) -> Parsed<NodeKind<'a>> {
    let Some(unit) = unit else {
        return Err(
            Diagnostic::error(span, "a duration in `dt`, whose length no circuit says")
                .with_help("use ns, us, ms or s"),
        );
    };
    let digits = number.to_ascii_lowercase();
    if digits.starts_with("0x") || digits.starts_with("0b") || digits.starts_with("0o") {
        return Err(Diagnostic::error(span, "a duration needs a decimal number"));
    }
    Ok(NodeKind::Duration(float_value(number, span)? / unit))
}
