//! What can go wrong with a result file, in words that say what to do.

use std::io;
use std::path::{Path, PathBuf};

use thiserror::Error;

/// An error of writing or reading a result file.
#[derive(Debug, Error)]
pub enum StoreError {
    /// The output is there already.
    #[error("{} exists already; choose another name, or replace it with --force", path.display())]
    Exists {
        /// The output path.
        path: PathBuf,
    },
    /// The output path names something that is not a regular file.
    #[error("{} is not a regular file; give the name of a file to write", path.display())]
    NotAFile {
        /// The output path.
        path: PathBuf,
    },
    /// The directory the output should go to is not there.
    #[error(
        "{} cannot be written: the directory {} does not exist; create it first",
        path.display(), directory.display()
    )]
    NoDirectory {
        /// The output path.
        path: PathBuf,
        /// Its directory.
        directory: PathBuf,
    },
    /// The operating system refused something.
    #[error("cannot {action} {}: {source}{}", path.display(), advice(&source.to_string()))]
    Io {
        /// What was tried, an infinitive.
        action: &'static str,
        /// The file or directory.
        path: PathBuf,
        /// What the system said.
        source: io::Error,
    },
    /// The HDF5 library reported an error.
    #[error("cannot {action} {}: {detail}{}", path.display(), advice(detail))]
    Hdf5 {
        /// What was tried, an infinitive.
        action: &'static str,
        /// The file.
        path: PathBuf,
        /// What the library said.
        detail: String,
    },
    /// The finished file could not take its final name.
    #[error(
        "the finished result could not be renamed to {}: {source}; it was kept as {}",
        path.display(), kept.display()
    )]
    Rename {
        /// The final name.
        path: PathBuf,
        /// Where the complete file is.
        kept: PathBuf,
        /// What the system said.
        source: io::Error,
    },
    /// A write after one that failed.
    #[error("{} was given up after an earlier error", path.display())]
    GivenUp {
        /// The output path.
        path: PathBuf,
    },
    /// The file to read is not there.
    #[error("{} does not exist", path.display())]
    Missing {
        /// The path.
        path: PathBuf,
    },
    /// The file to read is not HDF5.
    #[error("{} is not an HDF5 file; expected a result written by `run`", path.display())]
    NotHdf5 {
        /// The path.
        path: PathBuf,
    },
    /// The file is HDF5 but not a result of this program.
    #[error(
        "{} is not a shot record: {found}; expected a result written by `run`",
        path.display()
    )]
    NotShotRecord {
        /// The path.
        path: PathBuf,
        /// What stands in place of the format.
        found: String,
    },
    /// The file was written by a later version.
    #[error(
        "{} has format version {found}, this program reads up to {known}; use a newer version of it",
        path.display()
    )]
    NewerFormat {
        /// The path.
        path: PathBuf,
        /// The version found.
        found: u64,
        /// The newest version known here.
        known: u64,
    },
    /// Something in the file is missing or has an impossible shape.
    #[error("{} is damaged or was changed: {what}", path.display())]
    Damaged {
        /// The path.
        path: PathBuf,
        /// What was found and what was expected.
        what: String,
    },
    /// The caller handed over something that does not fit the format.
    #[error("cannot store the result: {what}")]
    Invalid {
        /// What was found and what was expected.
        what: String,
    },
}

impl StoreError {
    /// An error of the HDF5 library while doing `action` (an infinitive).
    pub(super) fn hdf5(action: &'static str, path: &Path, error: &hdf5::Error) -> Self {
        StoreError::Hdf5 {
            action,
            path: path.to_owned(),
            detail: cause(error),
        }
    }

    /// An error of the operating system while doing `action` (an infinitive).
    pub(super) fn io(action: &'static str, path: &Path, source: io::Error) -> Self {
        StoreError::Io {
            action,
            path: path.to_owned(),
            source,
        }
    }
}

/// What the operating system said, if it was the cause, else the library's own
/// summary. The deepest frame of the error stack carries the system's words.
fn cause(error: &hdf5::Error) -> String {
    let summary = error.to_string();
    let hdf5::Error::HDF5(stack) = error else {
        return summary;
    };
    let Ok(frames) = stack.clone().expand() else {
        return summary;
    };
    let system = frames
        .iter()
        .filter_map(|frame| frame.desc().split("error message = '").nth(1))
        .find_map(|rest| rest.split('\'').next());
    system.map_or(summary, str::to_owned)
}

/// What to do about a cause the operating system named.
fn advice(detail: &str) -> &'static str {
    if detail.contains("No space left") || detail.contains("quota exceeded") {
        "; the disk is full: make room or write elsewhere"
    } else if detail.contains("File too large") {
        "; a file-size limit stands in the way: raise it (ulimit -f) or write elsewhere"
    } else if detail.contains("ermission denied") || detail.contains("Read-only file system") {
        "; choose a place you may write to"
    } else {
        ""
    }
}
