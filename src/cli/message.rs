//! Messages on stderr.

use std::io::IsTerminal;

use ariadne::{Color, Config, IndexType, Label, Report, ReportKind};

use crate::circuit::{Diagnostic, Severity, Source};

use super::input::Texts;

/// Shows an error that has no place in a file.
pub(super) fn error(text: &str) {
    eprintln!("error: {text}");
}

/// Shows a note.
pub(super) fn note(text: &str) {
    eprintln!("note: {text}");
}

/// Shows a diagnostic with its source line.
pub(super) fn diagnostic(texts: &Texts, diagnostic: &Diagnostic) {
    let (name, text) = match diagnostic.source {
        Source::Circuit => (texts.circuit_name.as_str(), texts.circuit.as_str()),
        Source::Noise => (texts.noise_name.as_str(), texts.noise.as_str()),
    };
    let Some(span) = diagnostic.span else {
        let word = match diagnostic.severity {
            Severity::Error => "error",
            Severity::Warning => "warning",
        };
        eprintln!("{word}: {name}: {diagnostic}");
        return;
    };
    let (kind, color) = match diagnostic.severity {
        Severity::Error => (ReportKind::Error, Color::Red),
        Severity::Warning => (ReportKind::Warning, Color::Yellow),
    };
    let start = (span.start as usize).min(text.len());
    let end = (span.end as usize).clamp(start, text.len());
    let config = Config::default()
        .with_index_type(IndexType::Byte)
        .with_color(std::io::stderr().is_terminal());
    let mut report = Report::build(kind, (name, start..end))
        .with_config(config)
        .with_message(&diagnostic.message)
        .with_label(
            Label::new((name, start..end))
                .with_color(color)
                .with_message("here"),
        );
    if let Some(help) = &diagnostic.help {
        report = report.with_help(help);
    }
    // Nothing more can be done if stderr is closed.
    let _ = report.finish().eprint((name, ariadne::Source::from(text)));
}
