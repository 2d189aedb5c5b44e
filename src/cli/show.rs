//! `show`: print what a result file holds.

use crate::report::Summary;
use crate::report::figure::shots_figure;
use crate::store::ShotFile;

use super::CommandError;
use super::options::Show;
use super::picture;

/// Prints the summary of a result file.
pub(super) fn show(options: &Show) -> Result<(), CommandError> {
    let figure = picture::figure_file(options.figure.as_deref(), options.force)?;
    let file = ShotFile::open(&options.file).map_err(CommandError::Output)?;
    let summary = Summary::from_file(&file)?;
    print(&summary, options.json)?;
    match figure {
        Some(figure) => figure.write(&shots_figure(&summary)),
        None => Ok(()),
    }
}

/// Prints a summary on stdout.
pub(super) fn print(summary: &Summary, json: bool) -> Result<(), CommandError> {
    super::print(&match json {
        true => summary.to_json(),
        false => summary.to_string(),
    })
}
