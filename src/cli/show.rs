//! `show`: print what a result file holds.

use crate::report::Summary;
use crate::store::ShotFile;

use super::CommandError;
use super::options::Show;

/// Prints the summary of a result file.
pub(super) fn show(options: &Show) -> Result<(), CommandError> {
    let file = ShotFile::open(&options.file).map_err(CommandError::Output)?;
    print(&Summary::from_file(&file)?, options.json);
    Ok(())
}

/// Prints a summary on stdout. A closed pipe is no error.
pub(super) fn print(summary: &Summary, json: bool) {
    use std::io::Write;
    let text = if json {
        summary.to_json()
    } else {
        summary.to_string()
    };
    let _ = writeln!(std::io::stdout(), "{}", text.trim_end());
}
