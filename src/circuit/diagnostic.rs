//! Messages with a place in a source text.
//!
//! A diagnostic says what was found, what was expected and what to do. Showing
//! it with the source line and a caret is the command line's business.

/// A range of bytes in a source text.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default, Hash)]
pub struct Span {
    /// First byte.
    pub start: u32,
    /// One past the last byte.
    pub end: u32,
}

impl Span {
    /// The span from `start` up to, not including, `end`.
    pub fn new(start: usize, end: usize) -> Self {
        Span {
            start: start as u32,
            end: end as u32,
        }
    }

    /// Line and column of the start, both from 1, the column in characters.
    pub fn line_and_column(&self, text: &str) -> (usize, usize) {
        let mut start = (self.start as usize).min(text.len());
        while !text.is_char_boundary(start) {
            start -= 1;
        }
        let before = &text[..start];
        let line = before.bytes().filter(|&byte| byte == b'\n').count() + 1;
        let column = before.rsplit('\n').next().unwrap_or("").chars().count() + 1;
        (line, column)
    }
}

/// How bad it is.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Severity {
    /// The work cannot go on.
    Error,
    /// The work goes on.
    Warning,
}

/// Which text a span points into.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Source {
    /// The circuit file.
    Circuit,
    /// The noise file.
    Noise,
}

/// One message about the input.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Diagnostic {
    /// Error or warning.
    pub severity: Severity,
    /// Which text the span is in.
    pub source: Source,
    /// What was found and what was expected.
    pub message: String,
    /// Where, when there is a place.
    pub span: Option<Span>,
    /// What to do about it.
    pub help: Option<String>,
}

impl Diagnostic {
    /// An error at a place in the circuit.
    pub fn error(span: Span, message: impl Into<String>) -> Self {
        Diagnostic {
            severity: Severity::Error,
            source: Source::Circuit,
            message: message.into(),
            span: Some(span),
            help: None,
        }
    }

    /// A warning at a place in the circuit.
    pub fn warning(span: Span, message: impl Into<String>) -> Self {
        Diagnostic {
            severity: Severity::Warning,
            ..Diagnostic::error(span, message)
        }
    }

    /// The same with advice.
    pub fn with_help(mut self, help: impl Into<String>) -> Self {
        self.help = Some(help.into());
        self
    }

    /// The same, pointing into the noise file.
    pub fn in_noise_file(mut self) -> Self {
        self.source = Source::Noise;
        self
    }
}

impl std::fmt::Display for Diagnostic {
    fn fmt(&self, formatter: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        formatter.write_str(&self.message)?;
        if let Some(help) = &self.help {
            write!(formatter, " ({help})")?;
        }
        Ok(())
    }
}

impl std::error::Error for Diagnostic {}
