//! From text to a circuit: statements are read and lowered one by one.

use std::collections::BTreeMap;

use super::diagnostic::{Diagnostic, Span};
use super::limits::MAX_SOURCE;
use super::lower::{Failure, Lowering, grouped};
use super::parser::{Parser, Step, parse_channel_text};
use super::{ChannelCall, Circuit};

/// What a circuit file leaves open.
#[derive(Debug, Clone)]
pub struct ParseOptions {
    /// Values of the inputs that the circuit declares.
    pub set: BTreeMap<String, f64>,
    /// The most operations the circuit may unroll to.
    pub max_operations: usize,
}

impl Default for ParseOptions {
    fn default() -> Self {
        ParseOptions {
            set: BTreeMap::new(),
            max_operations: 1_000_000,
        }
    }
}

/// Reads a circuit from OpenQASM 3 or 2 text and unrolls it. `name` is shown in
/// messages; no file is read.
///
/// # Errors
///
/// Everything that is wrong with the text, in order, up to about twenty errors.
/// All have a place in the text, except those about [`ParseOptions::set`].
pub fn parse(name: &str, source: &str, options: &ParseOptions) -> Result<Circuit, Vec<Diagnostic>> {
    if let Some(error) = too_long(source) {
        return Err(vec![error]);
    }
    let mut parser = Parser::new(source);
    let mut lowering = Lowering::new(source, &options.set, options.max_operations);
    let mut go_on = true;
    while go_on && let Some(step) = parser.next_statement() {
        lowering.set_version_2(parser.version_2());
        for warning in parser.take_warnings() {
            lowering.warn(warning);
        }
        for error in parser.take_errors() {
            go_on &= lowering.report(error);
        }
        match step {
            Step::Statement(statement) => go_on &= lowering.top_level(statement),
            Step::Broken(words) => lowering.doubt(words),
        }
    }
    lowering.finish(name, go_on)
}

/// Reads one noise channel, `NAME(ARGUMENTS)`, whose arguments are constants.
/// Places count from the start of `text`.
///
/// # Errors
///
/// What is wrong with the text.
pub fn parse_channel(text: &str) -> Result<ChannelCall, Diagnostic> {
    if let Some(error) = too_long(text) {
        return Err(error);
    }
    let channel = parse_channel_text(text)?;
    let inputs = BTreeMap::new();
    let mut lowering = Lowering::new(text, &inputs, 0);
    lowering.channel(&channel).map_err(|failure| match failure {
        Failure::Error(error) | Failure::Stop(error) => error,
        Failure::Silent => Diagnostic::error(channel.span, "a channel without a meaning"),
    })
}

fn too_long(text: &str) -> Option<Diagnostic> {
    (text.len() > MAX_SOURCE).then(|| {
        Diagnostic::error(
            Span::default(),
            format!(
                "the text has {} bytes, more than {} MiB",
                grouped(text.len() as u64),
                MAX_SOURCE >> 20
            ),
        )
        .with_help("use loops and gate definitions to shorten it")
    })
}
