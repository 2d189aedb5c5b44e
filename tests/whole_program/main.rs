//! Whole-program tests: the built binary, its files and its exit status.
//!
//! - `reference`: a dense density-matrix simulation that writes the OpenQASM text
//!   of what it simulates; it takes every library gate apart into U and cx by the
//!   published library definitions, and uses nothing of the crate;
//! - `gates`: those definitions;
//! - `statistics`: Pearson's chi-squared, checked against published points;
//! - `program`: runs the binary and reads result files;
//! - `drawn`: drawn shots against the reference and against published values;
//! - `command_line`: exit status, messages, files, reproducibility, interruption.
//!
//! Sampling tests have a false-alarm rate of 1e-6 each and fixed seeds; the shot
//! numbers beside them say what error is caught.

mod command_line;
mod drawn;
mod gates;
mod program;
mod reference;
mod statistics;
