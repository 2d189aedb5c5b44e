//! `show`: print what a result file holds.

use crate::report::Summary;
use crate::store::ShotFile;

use super::CommandError;
use super::options::Show;

/// Prints the summary of a result file.
pub(super) fn show(options: &Show) -> Result<(), CommandError> {
    let file = ShotFile::open(&options.file).map_err(CommandError::Output)?;
    print(&Summary::from_file(&file)?, options.json)
}

/// Prints a summary on stdout.
pub(super) fn print(summary: &Summary, json: bool) -> Result<(), CommandError> {
    print_text(&if json {
        summary.to_json()
    } else {
        summary.to_string()
    })
}

/// Prints a text on stdout. A closed pipe is no error.
pub(super) fn print_text(text: &str) -> Result<(), CommandError> {
    use std::io::{ErrorKind, Write};
    let mut stdout = std::io::stdout();
    match writeln!(stdout, "{}", text.trim_end()).and_then(|()| stdout.flush()) {
        Err(error) if error.kind() != ErrorKind::BrokenPipe => Err(CommandError::Print(error)),
        _ => Ok(()),
    }
}
