//! Annotations, and the channels named in them and in the noise file.
//!
//! An annotation takes the rest of its line. A channel is `NAME(ARGUMENTS)`;
//! what it means is not known here.

use super::{Parsed, Parser};
use crate::circuit::ast::{Annotation, AnnotationKind, Argument, Channel, Name};
use crate::circuit::diagnostic::{Diagnostic, Span};
use crate::circuit::lexer::{Lexer, Symbol, TokenKind};
use crate::circuit::limits::{MAX_ANNOTATIONS, MAX_WARNINGS};

/// Parses a text that is one channel and nothing else.
pub fn parse_channel_text(text: &str) -> Result<Channel<'_>, Diagnostic> {
    channel_in(text, Span::new(0, text.len()))
}

fn channel_in(source: &str, range: Span) -> Parsed<Channel<'_>> {
    Parser::on(source, Lexer::within(source, range)).channel()
}

impl<'a> Parser<'a> {
    /// The annotations in front of a statement. Unknown ones are warned of.
    pub(super) fn annotations(&mut self) -> Parsed<Vec<Annotation<'a>>> {
        let mut annotations = Vec::new();
        let mut last = None;
        while self.at(Symbol::At) {
            let start = self.current.span;
            let line = self.lexer.rest_of_line(start.end);
            let whole = Span {
                start: start.start,
                end: trimmed(self.source, line).end.max(start.end),
            };
            self.previous_end = line.end;
            self.current = self.lexer.next_token();
            last = Some(whole);
            if let Some(kind) = self.annotation(whole, line)? {
                self.keep(whole)?;
                annotations.push(Annotation { kind, span: whole });
            }
            if annotations.len() > MAX_ANNOTATIONS {
                return Err(Diagnostic::error(
                    whole,
                    format!("more than {MAX_ANNOTATIONS} annotations on one statement"),
                ));
            }
        }
        match (last, self.current.kind) {
            (Some(last), TokenKind::End | TokenKind::Symbol(Symbol::RightBrace)) => Err(
                Diagnostic::error(last, "an annotation with no statement after it"),
            ),
            _ => Ok(annotations),
        }
    }

    fn annotation(&mut self, whole: Span, line: Span) -> Parsed<Option<AnnotationKind<'a>>> {
        let text = self.lexer.text(line);
        let word_length = text
            .find(|next: char| !(next.is_alphanumeric() || next == '_' || next == '.'))
            .unwrap_or(text.len());
        let word = &text[..word_length];
        let rest = Span {
            start: line.start + word_length as u32,
            end: line.end,
        };
        match word {
            "" => Err(Diagnostic::error(whole, "an annotation without a name")
                .with_help("write `@noise CHANNEL(ARGUMENTS)`, `@check` or `@logical`")),
            "check" => self.bare(rest, AnnotationKind::Check),
            "logical" => self.bare(rest, AnnotationKind::Logical),
            "noise" => Ok(Some(AnnotationKind::NoiseAfter(channel_in(
                self.source,
                rest,
            )?))),
            "noise.before" => Ok(Some(AnnotationKind::NoiseBefore(channel_in(
                self.source,
                rest,
            )?))),
            _ => {
                self.warn(
                    whole,
                    format!("the annotation `@{word}` means nothing here and is ignored"),
                );
                Ok(None)
            }
        }
    }

    /// An annotation that takes nothing.
    fn bare(&self, rest: Span, kind: AnnotationKind<'a>) -> Parsed<Option<AnnotationKind<'a>>> {
        let next = Lexer::within(self.source, rest).next_token();
        if next.kind == TokenKind::End {
            return Ok(Some(kind));
        }
        Err(
            Diagnostic::error(next.span, "this annotation takes no arguments")
                .with_help("the statement goes on the next line"),
        )
    }

    pub(super) fn warn(&mut self, span: Span, message: String) {
        if self.warnings.len() < MAX_WARNINGS {
            self.warnings.push(Diagnostic::warning(span, message));
        }
    }

    /// A channel up to the end of the text.
    fn channel(&mut self) -> Parsed<Channel<'a>> {
        let name = self.channel_name()?;
        if !self.at(Symbol::LeftParenthesis) {
            return Err(self
                .unexpected(&format!("`(` after the channel `{}`", name.text))
                .with_help("a channel is written `name(arguments)`, such as `dephasing(0.01)`"));
        }
        self.advance();
        let mut arguments = Vec::new();
        while !self.at(Symbol::RightParenthesis) {
            let name = if self.current.kind == TokenKind::Word
                && self.peek().kind == TokenKind::Symbol(Symbol::Assign)
            {
                let name = self.word("a name")?;
                self.advance();
                Some(name)
            } else {
                None
            };
            self.keep(self.current.span)?;
            let value = self.expression()?;
            arguments.push(Argument { name, value });
            if !self.accept(Symbol::Comma) {
                break;
            }
        }
        self.expect(Symbol::RightParenthesis)?;
        let span = self.span_from(name.span);
        if self.current.kind != TokenKind::End {
            return Err(self
                .unexpected("nothing more on the line")
                .with_help("one channel to an annotation; the statement goes on the next line"));
        }
        Ok(Channel {
            name,
            arguments,
            span,
        })
    }

    /// Words with hyphens between them, no space.
    fn channel_name(&mut self) -> Parsed<Name<'a>> {
        let first = self.word("the name of a channel")?;
        let mut span = first.span;
        while self.at(Symbol::Minus)
            && self.current.span.start == span.end
            && self.peek().kind == TokenKind::Word
            && self.peek().span.start == self.current.span.end
        {
            self.advance();
            span.end = self.advance().span.end;
        }
        Ok(Name {
            text: self.lexer.text(span),
            span,
        })
    }
}

/// The range without white space at its end.
fn trimmed(source: &str, range: Span) -> Span {
    let text = &source[range.start as usize..range.end as usize];
    Span {
        start: range.start,
        end: range.start + text.trim_end().len() as u32,
    }
}
