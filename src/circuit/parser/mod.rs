//! Recursive descent over the tokens, one statement at a time.
//!
//! Names are not looked up here, except the few words the language reserves.
//! Every recursion is counted against [`MAX_NESTING`]; a statement that cannot
//! be read is reported and skipped, so that one run shows several mistakes.
//! Grammar: OpenQASM 3 (arXiv:2104.14722) and 2 (arXiv:1707.03429).

mod annotation;
mod declaration;
mod expression;
mod statement;
mod unsupported;

use super::ast::{Name, Statement};
use super::diagnostic::{Diagnostic, Span};
use super::lexer::{Lexer, Symbol, Token, TokenKind};
use super::limits::{MAX_ERRORS, MAX_NESTING, MAX_SYNTAX_NODES};

pub use annotation::parse_channel_text;

type Parsed<T> = Result<T, Diagnostic>;

/// Reads statements from a text.
pub struct Parser<'a> {
    source: &'a str,
    lexer: Lexer<'a>,
    /// The token to be read next.
    current: Token,
    /// End of the token read last.
    previous_end: u32,
    /// Levels of nesting around the current token.
    depth: usize,
    /// Nodes of the syntax tree that are kept.
    nodes: usize,
    /// Whether any statement has been read.
    started: bool,
    /// Whether the header says OpenQASM 2.
    version_2: bool,
    /// What is wrong so far and not yet handed over.
    errors: Vec<Diagnostic>,
    /// What is doubtful so far and not yet handed over.
    warnings: Vec<Diagnostic>,
}

/// What became of one statement of the file.
pub enum Step<'a> {
    /// It was read.
    Statement(Statement<'a>),
    /// It was not; the words in it, first come first, are not to be trusted.
    Broken(Vec<&'a str>),
}

impl<'a> Parser<'a> {
    /// A parser at the start of a text.
    pub fn new(source: &'a str) -> Self {
        Parser::on(source, Lexer::new(source))
    }

    fn on(source: &'a str, mut lexer: Lexer<'a>) -> Self {
        let current = lexer.next_token();
        Parser {
            source,
            lexer,
            current,
            previous_end: current.span.start,
            depth: 0,
            nodes: 0,
            started: false,
            version_2: false,
            errors: Vec::new(),
            warnings: Vec::new(),
        }
    }

    /// Whether the header says OpenQASM 2, where numbers divide without
    /// rounding and `^` is a power.
    pub fn version_2(&self) -> bool {
        self.version_2
    }

    /// Errors since the last time they were taken.
    pub fn take_errors(&mut self) -> Vec<Diagnostic> {
        std::mem::take(&mut self.errors)
    }

    /// Warnings since the last time they were taken.
    pub fn take_warnings(&mut self) -> Vec<Diagnostic> {
        std::mem::take(&mut self.warnings)
    }

    /// The next statement of the file.
    pub fn next_statement(&mut self) -> Option<Step<'a>> {
        if self.current.kind == TokenKind::End {
            return None;
        }
        let start = self.current.span.start;
        let kept = self.nodes;
        let errors = self.errors.len();
        let statement = self.statement();
        self.started = true;
        match statement {
            Ok(statement) if self.errors.len() == errors => {
                // Only gate definitions outlive their own lowering.
                if !matches!(statement.kind, super::ast::StatementKind::Gate(_)) {
                    self.nodes = kept;
                }
                return Some(Step::Statement(statement));
            }
            Ok(_) => {}
            Err(error) => {
                self.errors.push(error);
                self.recover();
                // Nothing opened this brace.
                while self.at(Symbol::RightBrace) {
                    self.advance();
                }
            }
        }
        self.nodes = kept;
        self.depth = 0;
        Some(Step::Broken(self.words(start)))
    }

    /// The first words from `start` up to the current token.
    fn words(&self, start: u32) -> Vec<&'a str> {
        const ENOUGH: usize = 64;
        let mut lexer = Lexer::within(
            self.source,
            Span {
                start,
                end: self.previous_end.max(start),
            },
        );
        std::iter::from_fn(|| {
            let token = lexer.next_token();
            (token.kind != TokenKind::End).then_some(token)
        })
        .take(ENOUGH)
        .filter(|token| token.kind == TokenKind::Word)
        .map(|token| self.lexer.text(token.span))
        .collect()
    }

    /// Skips the rest of a statement that cannot be read: up to and with the
    /// next `;` or balanced `{…}`, or up to a `}` that closes the block around.
    fn recover(&mut self) {
        let mut open = 0usize;
        loop {
            match self.current.kind {
                TokenKind::End => return,
                TokenKind::Symbol(Symbol::Semicolon) if open == 0 => {
                    self.advance();
                    return;
                }
                TokenKind::Symbol(Symbol::LeftBrace) => open += 1,
                TokenKind::Symbol(Symbol::RightBrace) if open == 0 => return,
                TokenKind::Symbol(Symbol::RightBrace) => {
                    open -= 1;
                    if open == 0 {
                        self.advance();
                        if !self.at_word("else") {
                            return;
                        }
                    }
                }
                _ => {}
            }
            self.advance();
        }
    }

    /// Statements up to and with the `}`; mistakes inside are collected.
    fn block(&mut self) -> Parsed<Vec<Statement<'a>>> {
        let opening = self.current.span;
        self.expect(Symbol::LeftBrace)?;
        self.nested(opening, |parser| {
            let mut statements = Vec::new();
            while !parser.at(Symbol::RightBrace) {
                if parser.current.kind == TokenKind::End {
                    return Err(Diagnostic::error(opening, "this `{` is never closed")
                        .with_help("add a `}`"));
                }
                let depth = parser.depth;
                match parser.statement() {
                    Ok(statement) => statements.push(statement),
                    Err(error) => {
                        if parser.errors.len() >= MAX_ERRORS {
                            return Err(error);
                        }
                        parser.errors.push(error);
                        parser.depth = depth;
                        parser.recover();
                    }
                }
            }
            parser.advance();
            Ok(statements)
        })
    }

    /// Runs `inner` one level deeper.
    fn nested<T>(&mut self, place: Span, inner: impl FnOnce(&mut Self) -> Parsed<T>) -> Parsed<T> {
        if self.depth >= MAX_NESTING {
            return Err(Diagnostic::error(
                place,
                format!("more than {MAX_NESTING} levels of nesting"),
            )
            .with_help("split the expression or the block"));
        }
        self.depth += 1;
        let result = inner(self);
        self.depth -= 1;
        result
    }

    /// Counts a node of the syntax tree that stays in memory.
    fn keep(&mut self, place: Span) -> Parsed<()> {
        self.nodes += 1;
        if self.nodes <= MAX_SYNTAX_NODES {
            return Ok(());
        }
        Err(Diagnostic::error(
            place,
            format!("gate bodies and blocks hold more than {MAX_SYNTAX_NODES} words and operators"),
        )
        .with_help("use loops, or move statements out of blocks"))
    }

    fn at(&self, symbol: Symbol) -> bool {
        self.current.kind == TokenKind::Symbol(symbol)
    }

    fn at_word(&self, word: &str) -> bool {
        self.current.kind == TokenKind::Word && self.text() == word
    }

    /// The text of the current token.
    fn text(&self) -> &'a str {
        self.lexer.text(self.current.span)
    }

    /// The token after the current one.
    fn peek(&self) -> Token {
        self.lexer.clone().next_token()
    }

    fn advance(&mut self) -> Token {
        let token = self.current;
        self.previous_end = token.span.end;
        self.current = self.lexer.next_token();
        token
    }

    fn accept(&mut self, symbol: Symbol) -> bool {
        let here = self.at(symbol);
        if here {
            self.advance();
        }
        here
    }

    fn expect(&mut self, symbol: Symbol) -> Parsed<Token> {
        if self.at(symbol) {
            return Ok(self.advance());
        }
        let expected = format!("`{}`", symbol.text());
        if symbol == Symbol::Semicolon && !self.at_invalid() {
            let place = Span {
                start: self.previous_end,
                end: self.previous_end,
            };
            let found = self.found();
            return Err(Diagnostic::error(
                place,
                format!("expected `;` here, before {found}"),
            ));
        }
        Err(self.unexpected(&expected))
    }

    fn at_invalid(&self) -> bool {
        matches!(self.current.kind, TokenKind::Invalid(_))
    }

    fn word(&mut self, what: &str) -> Parsed<Name<'a>> {
        if self.current.kind != TokenKind::Word {
            return Err(self.unexpected(what));
        }
        let text = self.text();
        let span = self.advance().span;
        Ok(Name { text, span })
    }

    /// A word that may name something.
    fn name(&mut self, what: &str) -> Parsed<Name<'a>> {
        if self.current.kind == TokenKind::Word && is_reserved(self.text()) {
            return Err(Diagnostic::error(
                self.current.span,
                format!("`{}` is a word of OpenQASM, expected {what}", self.text()),
            )
            .with_help("use another name"));
        }
        self.word(what)
    }

    /// From `start` to the end of the token read last.
    fn span_from(&self, start: Span) -> Span {
        Span {
            start: start.start,
            end: self.previous_end.max(start.start),
        }
    }

    fn unexpected(&self, expected: &str) -> Diagnostic {
        let found = self.found();
        let error = Diagnostic::error(
            self.current.span,
            format!("expected {expected}, found {found}"),
        );
        if self.current.kind == TokenKind::HardwareQubit {
            return error.with_help("physical qubits are not supported: declare `qubit[n] q;`");
        }
        error
    }

    /// The current token in words.
    fn found(&self) -> String {
        const SHOWN: usize = 40;
        let text: String = self.text().chars().take(SHOWN).collect();
        match self.current.kind {
            TokenKind::End => "the end of the text".to_owned(),
            TokenKind::Invalid(why) => format!("{why}: `{}`", text.trim_end()),
            TokenKind::Integer | TokenKind::Float => format!("the number `{text}`"),
            TokenKind::Duration => format!("the duration `{text}`"),
            TokenKind::Imaginary => format!("the complex number `{text}`"),
            TokenKind::HardwareQubit => format!("the physical qubit `{text}`"),
            TokenKind::Word | TokenKind::Text | TokenKind::Symbol(_) => format!("`{text}`"),
        }
    }
}

/// Words that cannot name anything: the keywords of OpenQASM 3 and its
/// constants.
fn is_reserved(word: &str) -> bool {
    const KEYWORDS: &[&str] = &[
        "OPENQASM",
        "angle",
        "array",
        "barrier",
        "bit",
        "bool",
        "box",
        "break",
        "cal",
        "case",
        "complex",
        "const",
        "continue",
        "creg",
        "ctrl",
        "def",
        "default",
        "defcal",
        "defcalgrammar",
        "delay",
        "duration",
        "durationof",
        "else",
        "end",
        "extern",
        "false",
        "float",
        "for",
        "gate",
        "gphase",
        "if",
        "in",
        "include",
        "input",
        "int",
        "inv",
        "let",
        "measure",
        "mutable",
        "negctrl",
        "opaque",
        "output",
        "pow",
        "pragma",
        "qreg",
        "qubit",
        "readonly",
        "reset",
        "return",
        "stretch",
        "switch",
        "true",
        "U",
        "uint",
        "void",
        "while",
    ];
    KEYWORDS.contains(&word) || expression::constant(word).is_some()
}
