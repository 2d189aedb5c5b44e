//! The command line.
//!
//! Options are declared in one file; each command has a file of its own.
//! Results go to files, the summary to stdout, everything else to stderr.
//!
//! Exit status: 0 done; 1 failed at run time; 2 the input or the options are
//! wrong and nothing was written; 130 interrupted.

mod input;
mod machine;
mod message;
mod options;
mod picture;
mod places;
mod plan;
mod progress;
mod rehearse;
mod run;
mod show;
mod verify;

use std::process::ExitCode;

use clap::Parser;

use crate::circuit::Diagnostic;
use crate::exact::ExactError;
use crate::program::CompileError;
use crate::readout::choice::ChoiceError;
use crate::sampler::SampleError;
use crate::store::StoreError;

use options::{Command, Options};

/// Why a command ended without doing all it was asked to.
#[derive(Debug, thiserror::Error)]
enum CommandError {
    /// The input files are wrong; the diagnostics have been shown.
    #[error("{} error{} in the input", .0, if *.0 == 1 { "" } else { "s" })]
    Input(usize),
    /// Something about the options or the input, without a place in a file.
    #[error("{0}")]
    Usage(String),
    /// The circuit cannot be compiled.
    #[error(transparent)]
    Compile(#[from] CompileError),
    /// There is no exact distribution to compare with.
    #[error(transparent)]
    Exact(#[from] ExactError),
    /// Drawn shots do not follow their law.
    #[error("{0}")]
    Rejected(String),
    /// No read-out can run the circuit as asked.
    #[error(transparent)]
    Choice(#[from] ChoiceError),
    /// Drawing failed.
    #[error(transparent)]
    Sample(#[from] SampleError),
    /// Reading or writing a result file failed.
    #[error(transparent)]
    Store(#[from] StoreError),
    /// The output of a result file that cannot be written was found out before
    /// any work.
    #[error(transparent)]
    Output(StoreError),
    /// Drawing failed after some shots.
    #[error("{cause}; the {shots} shots before it were written")]
    Stopped {
        /// Why.
        cause: SampleError,
        /// How many shots are in the file.
        shots: u64,
    },
    /// The summary could not be printed.
    #[error("cannot print the summary: {0}")]
    Print(std::io::Error),
    /// A picture could not be written.
    #[error("cannot write the figure {}: {error}", .path.display())]
    Picture {
        /// Where to.
        path: std::path::PathBuf,
        /// Why.
        error: std::io::Error,
    },
    /// Ctrl-C.
    #[error("{0}")]
    Interrupted(String),
}

impl CommandError {
    fn status(&self) -> u8 {
        match self {
            CommandError::Input(_)
            | CommandError::Usage(_)
            | CommandError::Compile(_)
            | CommandError::Choice(_)
            | CommandError::Exact(_)
            | CommandError::Output(_) => 2,
            CommandError::Sample(_)
            | CommandError::Store(_)
            | CommandError::Stopped { .. }
            | CommandError::Rejected(_)
            | CommandError::Picture { .. }
            | CommandError::Print(_) => 1,
            CommandError::Interrupted(_) => 130,
        }
    }
}

/// Runs the command that the arguments of the process ask for.
pub fn main() -> ExitCode {
    let options = match Options::try_parse() {
        Ok(options) => options,
        Err(error) => {
            let status = if error.use_stderr() { 2 } else { 0 };
            // A closed pipe is no reason to fail while showing help.
            let _ = error.print();
            return ExitCode::from(status);
        }
    };
    let result = match &options.command {
        Command::Run(run) => run::run(run),
        Command::Verify(verify) => verify::verify(verify),
        Command::Plan(plan) => plan::plan(plan),
        Command::Show(show) => show::show(show),
    };
    match result {
        Ok(()) => ExitCode::SUCCESS,
        Err(error) => {
            message::error(&error.to_string());
            ExitCode::from(error.status())
        }
    }
}

/// Shows diagnostics and turns errors into the command's error.
fn refuse(texts: &input::Texts, diagnostics: &[Diagnostic]) -> CommandError {
    for diagnostic in diagnostics {
        message::diagnostic(texts, diagnostic);
    }
    CommandError::Input(diagnostics.len())
}

/// Prints a text on stdout. A closed pipe is no error.
fn print(text: &str) -> Result<(), CommandError> {
    use std::io::{ErrorKind, Write};
    let mut stdout = std::io::stdout();
    match writeln!(stdout, "{}", text.trim_end()).and_then(|()| stdout.flush()) {
        Err(error) if error.kind() != ErrorKind::BrokenPipe => Err(CommandError::Print(error)),
        _ => Ok(()),
    }
}
