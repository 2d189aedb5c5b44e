//! OpenQASM text into tokens, one at a time.
//!
//! Tokens are only positions; nothing is stored, so the length of a file costs
//! no memory here. Grammar: OpenQASM 3 (arXiv:2104.14722) and 2
//! (arXiv:1707.03429). What a word means is the parser's business.

use super::diagnostic::Span;

/// What a token is.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum TokenKind {
    /// A word: identifier or keyword.
    Word,
    /// A whole number in base 2, 8, 10 or 16.
    Integer,
    /// A number with a point or an exponent.
    Float,
    /// A number with `im` behind it.
    Imaginary,
    /// A number with a unit of time behind it.
    Duration,
    /// Text in quotes.
    Text,
    /// `$0`.
    HardwareQubit,
    /// An operator or a bracket.
    Symbol(Symbol),
    /// Something that is no token; the message says why.
    Invalid(&'static str),
    /// The end of the text.
    End,
}

/// One token.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Token {
    /// What it is.
    pub kind: TokenKind,
    /// Where it is.
    pub span: Span,
}

/// Writes the symbols and their text from one list, longest first where one
/// begins another.
macro_rules! symbols {
    ($($name:ident $text:literal,)*) => {
        /// Operators and brackets.
        #[derive(Debug, Clone, Copy, PartialEq, Eq)]
        pub enum Symbol { $($name,)* }

        const SYMBOLS: &[(Symbol, &str)] = &[$((Symbol::$name, $text),)*];

        impl Symbol {
            /// The symbol as written.
            pub fn text(self) -> &'static str {
                match self { $(Symbol::$name => $text,)* }
            }
        }
    };
}

symbols! {
    PowerAssign "**=",
    ShiftLeftAssign "<<=",
    ShiftRightAssign ">>=",
    Power "**",
    ShiftLeft "<<",
    ShiftRight ">>",
    Concatenate "++",
    AddAssign "+=",
    SubtractAssign "-=",
    MultiplyAssign "*=",
    DivideAssign "/=",
    RemainderAssign "%=",
    OrAssign "|=",
    AndAssign "&=",
    XorAssign "^=",
    NotAssign "~=",
    Equal "==",
    NotEqual "!=",
    LessOrEqual "<=",
    GreaterOrEqual ">=",
    Arrow "->",
    LogicalAnd "&&",
    LogicalOr "||",
    LeftBracket "[",
    RightBracket "]",
    LeftParenthesis "(",
    RightParenthesis ")",
    LeftBrace "{",
    RightBrace "}",
    Colon ":",
    Semicolon ";",
    Comma ",",
    Dot ".",
    Assign "=",
    Plus "+",
    Minus "-",
    Star "*",
    Slash "/",
    Percent "%",
    Or "|",
    And "&",
    Xor "^",
    At "@",
    Tilde "~",
    Exclamation "!",
    Less "<",
    Greater ">",
    Hash "#",
}

/// Units of time, longest first where one ends another, and how many make a
/// second; `dt` is a unit of the machine and has none.
pub const TIME_UNITS: &[(&str, Option<f64>)] = &[
    ("dt", None),
    ("ns", Some(1e9)),
    ("us", Some(1e6)),
    ("µs", Some(1e6)),
    ("μs", Some(1e6)),
    ("ms", Some(1e3)),
    ("s", Some(1.0)),
];

/// Reads tokens from a range of a text.
#[derive(Debug, Clone)]
pub struct Lexer<'a> {
    source: &'a str,
    position: usize,
    end: usize,
}

impl<'a> Lexer<'a> {
    /// A lexer of the whole text.
    pub fn new(source: &'a str) -> Self {
        Lexer::within(source, Span::new(0, source.len()))
    }

    /// A lexer of a part of a text; positions count from the start of the text.
    pub fn within(source: &'a str, range: Span) -> Self {
        Lexer {
            source,
            position: range.start as usize,
            end: range.end as usize,
        }
    }

    /// The text of a token.
    pub fn text(&self, span: Span) -> &'a str {
        &self.source[span.start as usize..span.end as usize]
    }

    /// What is left of the line from `start` on, without the end of line; the
    /// lexer goes on after it.
    pub fn rest_of_line(&mut self, start: u32) -> Span {
        let start = start as usize;
        let rest = &self.source[start..self.end];
        let length = rest.find(['\n', '\r']).unwrap_or(rest.len());
        self.position = start + length;
        Span::new(start, start + length)
    }

    /// The text in the lexer's range that is not read yet.
    fn rest(&self) -> &'a str {
        &self.source[self.position..self.end]
    }

    /// The next token; at the end of the text, [`TokenKind::End`] for ever.
    pub fn next_token(&mut self) -> Token {
        if let Some(start) = self.skip_space() {
            return self.token(start, TokenKind::Invalid("a comment that is never closed"));
        }
        let start = self.position;
        let Some(first) = self.rest().chars().next() else {
            return self.token(start, TokenKind::End);
        };
        let kind = match first {
            '0'..='9' => self.number(),
            '.' if self.rest()[1..].starts_with(|next: char| next.is_ascii_digit()) => {
                self.number()
            }
            '"' | '\'' => self.quoted(first),
            '$' => {
                self.position += 1;
                self.skip_while(|next| next.is_ascii_digit());
                TokenKind::HardwareQubit
            }
            _ if begins_word(first) => {
                self.skip_while(continues_word);
                TokenKind::Word
            }
            _ => self.symbol(),
        };
        self.token(start, kind)
    }

    fn token(&self, start: usize, kind: TokenKind) -> Token {
        Token {
            kind,
            span: Span::new(start, self.position),
        }
    }

    fn skip_while(&mut self, keep: impl Fn(char) -> bool) {
        let rest = self.rest();
        self.position += rest.find(|next| !keep(next)).unwrap_or(rest.len());
    }

    /// Skips white space and comments; the start of a comment that is never
    /// closed comes back.
    fn skip_space(&mut self) -> Option<usize> {
        loop {
            self.skip_while(|next| next.is_whitespace() || next == '\u{feff}');
            let rest = self.rest();
            if rest.starts_with("//") {
                self.position += rest.find('\n').unwrap_or(rest.len());
            } else if let Some(inside) = rest.strip_prefix("/*") {
                let start = self.position;
                match inside.find("*/") {
                    Some(length) => self.position += length + 4,
                    None => {
                        self.position = self.end;
                        return Some(start);
                    }
                }
            } else {
                return None;
            }
        }
    }

    fn symbol(&mut self) -> TokenKind {
        let rest = self.rest();
        if let Some((symbol, text)) = SYMBOLS.iter().find(|(_, text)| rest.starts_with(text)) {
            self.position += text.len();
            return TokenKind::Symbol(*symbol);
        }
        // A run of foreign characters is one mistake.
        self.skip_while(|next| !next.is_ascii() && !next.is_whitespace() && !begins_word(next));
        if self.rest().len() == rest.len() {
            self.position += rest.chars().next().map_or(0, char::len_utf8);
        }
        TokenKind::Invalid("a character that OpenQASM does not use")
    }

    fn quoted(&mut self, quote: char) -> TokenKind {
        self.position += 1;
        self.skip_while(|next| next != quote && next != '\n');
        if self.rest().starts_with(quote) {
            self.position += 1;
            TokenKind::Text
        } else {
            TokenKind::Invalid("a quoted text that is not closed on its line")
        }
    }

    fn number(&mut self) -> TokenKind {
        let lower = self.rest().as_bytes().get(1).map(u8::to_ascii_lowercase);
        let base = match lower {
            _ if !self.rest().starts_with('0') => 10,
            Some(b'x') => 16,
            Some(b'b') => 2,
            Some(b'o') => 8,
            _ => 10,
        };
        if base != 10 {
            self.position += 2;
            let before = self.position;
            self.skip_while(|next| next.is_digit(base) || next == '_');
            let no_digit = self.position == before;
            return match self.rest().chars().next() {
                Some(next) if continues_word(next) => {
                    self.skip_while(continues_word);
                    TokenKind::Invalid("a number with a digit that its base does not have")
                }
                _ if no_digit => TokenKind::Invalid("a number without digits"),
                _ => TokenKind::Integer,
            };
        }
        let digits = |next: char| next.is_ascii_digit() || next == '_';
        let mut kind = TokenKind::Integer;
        self.skip_while(digits);
        if self.rest().starts_with('.') {
            kind = TokenKind::Float;
            self.position += 1;
            self.skip_while(digits);
        }
        if let Some(exponent) = self.rest().strip_prefix(['e', 'E']) {
            let unsigned = exponent.strip_prefix(['+', '-']).unwrap_or(exponent);
            if unsigned.starts_with(|next: char| next.is_ascii_digit()) {
                kind = TokenKind::Float;
                self.position += 1 + exponent.len() - unsigned.len();
                self.skip_while(digits);
            }
        }
        let suffix = self.position;
        self.skip_while(continues_word);
        match &self.source[suffix..self.position] {
            "" => kind,
            "im" => TokenKind::Imaginary,
            unit if TIME_UNITS.iter().any(|(name, _)| *name == unit) => TokenKind::Duration,
            _ => TokenKind::Invalid("a number with letters behind it"),
        }
    }
}

fn begins_word(first: char) -> bool {
    first == '_' || first.is_alphabetic()
}

fn continues_word(next: char) -> bool {
    next == '_' || next.is_alphanumeric()
}

#[cfg(test)]
mod tests {
    use super::*;

    fn kinds(text: &str) -> Vec<TokenKind> {
        let mut lexer = Lexer::new(text);
        std::iter::from_fn(|| Some(lexer.next_token().kind).filter(|kind| *kind != TokenKind::End))
            .collect()
    }

    #[test]
    fn numbers_of_every_kind() {
        use TokenKind::{Duration, Float, Imaginary, Integer};
        assert_eq!(kinds("1_000 0xFF 0b1010_1 0o17"), [Integer; 4]);
        assert_eq!(kinds("1. .5 1e3 2.5E-3 1_0.0_1"), [Float; 5]);
        assert_eq!(kinds("100ns 1.5us 2µs 2μs 3ms 1s 4dt"), [Duration; 7]);
        assert_eq!(kinds("2.0im"), [Imaginary]);
        for wrong in ["0x", "0b12", "12abc", "1e", "0b"] {
            assert!(
                matches!(kinds(wrong)[..], [TokenKind::Invalid(_)]),
                "{wrong}"
            );
        }
    }

    #[test]
    fn longest_symbol_wins() {
        let symbols = "a**=b ** c <<= d -> e - f ++ g ^= h";
        let found: Vec<_> = kinds(symbols)
            .into_iter()
            .filter_map(|kind| match kind {
                TokenKind::Symbol(symbol) => Some(symbol.text()),
                _ => None,
            })
            .collect();
        assert_eq!(found, ["**=", "**", "<<=", "->", "-", "++", "^="]);
    }

    #[test]
    fn comments_are_space_and_must_be_closed() {
        assert_eq!(kinds("a // x y\n /* b\n c */ d"), [TokenKind::Word; 2]);
        assert!(matches!(
            kinds("a /* b")[..],
            [TokenKind::Word, TokenKind::Invalid(_)]
        ));
    }

    #[test]
    fn greek_letters_are_words() {
        assert_eq!(kinds("π τ ℇ θ1 _x"), [TokenKind::Word; 5]);
        assert!(matches!(kinds("→→")[..], [TokenKind::Invalid(_)]));
    }
}
