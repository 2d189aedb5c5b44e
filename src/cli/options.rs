//! What may be typed. No other code lives here.

use std::path::PathBuf;

use clap::{Args, Parser, Subcommand, ValueEnum};

use crate::plan::units::{parse_bytes, parse_duration};
use crate::readout::choice::Readout;

/// δ where nothing is said about it.
pub(super) const DEFAULT_DELTA: f64 = 0.1;

/// Draws measurement shots from noisy, T-heavy quantum circuits.
#[derive(Debug, Parser)]
#[command(
    name = "shottower",
    version,
    about = "Draws measurement shots from noisy, T-heavy quantum circuits",
    long_about = "Draws measurement shots from noisy, T-heavy quantum circuits by mixed-state \
                  stabiliser-rank sampling.\n\nThe shots are approximate synthetic data with a \
                  stated error. They are no certificate for any hardware.",
    after_help = "Exit status: 0 done, 1 failed at run time, 2 wrong input or options (nothing \
                  written), 130 interrupted (finished shots are kept)."
)]
pub(super) struct Options {
    #[command(subcommand)]
    pub command: Command,
}

#[derive(Debug, Subcommand)]
pub(super) enum Command {
    /// Draw shots of a circuit into an HDF5 file
    Run(Run),
    /// Tell what a circuit costs before it is run
    Plan(Plan),
    /// Check drawn shots of a small circuit against its exact distribution
    Verify(Verify),
    /// Print what a result file holds
    Show(Show),
}

/// Draw shots of a circuit into an HDF5 file.
#[derive(Debug, Args)]
#[command(after_help = "Examples:\n  \
    shottower run circuit.qasm --noise bench.toml --shots 100000 --out shots.h5\n  \
    shottower run circuit.qasm --shots 1000 --delta 0.05 --seed 7 --readout probe --out shots.h5\n  \
    shottower run sweep.qasm --set theta=0.3 --shots 5000 --out theta-0.3.h5")]
pub(super) struct Run {
    /// Circuit file, OpenQASM 3 or 2
    #[arg(value_name = "CIRCUIT")]
    pub circuit: PathBuf,

    /// Noise file, TOML
    #[arg(long, value_name = "FILE")]
    pub noise: Option<PathBuf>,

    /// Number of shots
    #[arg(long, value_name = "N")]
    pub shots: u64,

    /// Trace-norm error δ of the averaged output state, above 0 and below 2
    /// [default: 0.1]
    #[arg(long, value_name = "D", value_parser = delta)]
    pub delta: Option<f64>,

    /// Take the smallest δ with which the run ends within this time, for
    /// example 10min
    #[arg(long, value_name = "TIME", value_parser = parse_duration,
          conflicts_with_all = ["delta", "terms", "part"])]
    pub budget: Option<f64>,

    /// Use at most so much memory, for example 8GiB; without --delta and
    /// --terms take the smallest δ that fits
    #[arg(long, value_name = "SIZE", value_parser = parse_bytes)]
    pub memory: Option<u64>,

    /// Result file to write
    #[arg(long, value_name = "FILE.h5")]
    pub out: PathBuf,

    /// Seed; the same seed gives the same bits [default: random, recorded]
    #[arg(long, value_name = "S")]
    pub seed: Option<u64>,

    /// How outcomes are read out
    #[arg(long, value_enum, default_value_t = ReadoutOption::Auto)]
    pub readout: ReadoutOption,

    /// Number of stabiliser terms k, instead of --delta. "average" takes k about
    /// ξ + 3, which makes averages corrected with companion shots cheapest; raw
    /// shots are then far from exact [default: from δ]
    #[arg(long, value_name = "K", value_parser = terms)]
    pub terms: Option<TermsOption>,

    /// Number of companion shots [default: as many as shots; 0 for dense]
    #[arg(long, value_name = "M")]
    pub companion: Option<u64>,

    /// Number of threads [default: all cores]
    #[arg(long, value_name = "T", value_parser = clap::value_parser!(u16).range(1..=256))]
    pub threads: Option<u16>,

    /// Draw only part I of N of the shots
    #[arg(long, value_name = "I/N", value_parser = part)]
    pub part: Option<(u64, u64)>,

    /// Overwrite an existing output
    #[arg(long)]
    pub force: bool,

    /// Record which noise events fired, shot by shot
    #[arg(long)]
    pub faults: bool,

    /// Give an `input` of the circuit its value
    #[arg(long, value_name = "NAME=VALUE", value_parser = assignment)]
    pub set: Vec<(String, f64)>,

    /// Merge noise into the non-Clifford places it stands next to
    #[arg(long, value_enum, default_value_t = Switch::On)]
    pub absorb: Switch,

    /// Most operations after unrolling
    #[arg(long, value_name = "N", default_value_t = 1_000_000)]
    pub max_ops: usize,

    /// Print the summary as JSON
    #[arg(long)]
    pub json: bool,

    /// No progress and no summary
    #[arg(long, short)]
    pub quiet: bool,
}

/// Check drawn shots of a small circuit against its exact distribution.
///
/// The exact distributions of the circuit and of its companion are computed with
/// density matrices, straight from the circuit; shots are drawn as `run` would
/// draw them, and tested against [(k − 1)·P + ξ·P_comp]/(k − 1 + ξ).
#[derive(Debug, Args)]
#[command(
    after_help = "Exit status: 0 the shots follow their law, 1 they do not (p below \
    1e-6), 2 wrong input or a circuit that is too large.\n\nExamples:\n  \
    shottower verify circuit.qasm --noise bench.toml --shots 100000 --readout walk\n  \
    shottower verify circuit.qasm --shots 50000 --terms 4 --readout walk --seed 7 --json"
)]
pub(super) struct Verify {
    /// Circuit file, OpenQASM 3 or 2
    #[arg(value_name = "CIRCUIT")]
    pub circuit: PathBuf,

    /// Noise file, TOML
    #[arg(long, value_name = "FILE")]
    pub noise: Option<PathBuf>,

    /// Number of shots
    #[arg(long, value_name = "N", value_parser = clap::value_parser!(u64).range(1..))]
    pub shots: u64,

    /// Trace-norm error δ of the averaged output state, above 0 and below 2
    #[arg(long, value_name = "D", default_value_t = 0.1, value_parser = delta)]
    pub delta: f64,

    /// Seed; the same seed gives the same shots as `run` [default: random]
    #[arg(long, value_name = "S")]
    pub seed: Option<u64>,

    /// How outcomes are read out
    #[arg(long, value_enum, default_value_t = ReadoutOption::Auto)]
    pub readout: ReadoutOption,

    /// Number of stabiliser terms, or "average"; few terms (2 to 8) make the
    /// companion's share large and the test sharp [default: from δ]
    #[arg(long, value_name = "K", value_parser = terms)]
    pub terms: Option<TermsOption>,

    /// Number of companion shots [default: as many as shots; 0 for dense]
    #[arg(long, value_name = "M")]
    pub companion: Option<u64>,

    /// Number of threads [default: all cores]
    #[arg(long, value_name = "T", value_parser = clap::value_parser!(u16).range(1..=256))]
    pub threads: Option<u16>,

    /// Give an `input` of the circuit its value
    #[arg(long, value_name = "NAME=VALUE", value_parser = assignment)]
    pub set: Vec<(String, f64)>,

    /// Merge noise into the non-Clifford places it stands next to
    #[arg(long, value_enum, default_value_t = Switch::On)]
    pub absorb: Switch,

    /// Most operations after unrolling
    #[arg(long, value_name = "N", default_value_t = 1_000_000)]
    pub max_ops: usize,

    /// Print the report as JSON
    #[arg(long)]
    pub json: bool,

    /// No progress and no report, only the exit status
    #[arg(long, short)]
    pub quiet: bool,
}

/// Tell what a circuit costs before it is run.
#[derive(Debug, Args)]
#[command(after_help = "Examples:\n  \
    shottower plan circuit.qasm --noise bench.toml --shots 100000\n  \
    shottower plan circuit.qasm --shots 100000 --budget 10min --memory 8GiB\n  \
    shottower plan circuit.qasm --delta 0.3 --delta 0.1 --figure plan.svg")]
pub(super) struct Plan {
    /// Circuit file, OpenQASM 3 or 2
    #[arg(value_name = "CIRCUIT")]
    pub circuit: PathBuf,

    /// Noise file, TOML
    #[arg(long, value_name = "FILE")]
    pub noise: Option<PathBuf>,

    /// Number of shots
    #[arg(long, value_name = "N", default_value_t = 1000)]
    pub shots: u64,

    /// δ of the rows; may be repeated [default: 0.5 0.2 0.1 0.05 0.02 0.01]
    #[arg(long, value_name = "D", value_parser = delta, num_args = 1..)]
    pub delta: Vec<f64>,

    /// Find the smallest δ with which a run ends within this time, for example
    /// 10min
    #[arg(long, value_name = "TIME", value_parser = parse_duration)]
    pub budget: Option<f64>,

    /// Find the smallest δ with which a run needs at most so much memory, for
    /// example 8GiB
    #[arg(long, value_name = "SIZE", value_parser = parse_bytes)]
    pub memory: Option<u64>,

    /// Draw δ against time into a picture
    #[arg(long, value_name = "FILE.svg")]
    pub figure: Option<PathBuf>,

    /// Overwrite an existing picture
    #[arg(long)]
    pub force: bool,

    /// Seed of the shots that are timed
    #[arg(long, value_name = "S", default_value_t = 1)]
    pub seed: u64,

    /// How outcomes are read out
    #[arg(long, value_enum, default_value_t = ReadoutOption::Auto)]
    pub readout: ReadoutOption,

    /// Number of companion shots [default: as many as shots; 0 for dense]
    #[arg(long, value_name = "M")]
    pub companion: Option<u64>,

    /// Number of threads [default: all cores]
    #[arg(long, value_name = "T", value_parser = clap::value_parser!(u16).range(1..=256))]
    pub threads: Option<u16>,

    /// Give an `input` of the circuit its value
    #[arg(long, value_name = "NAME=VALUE", value_parser = assignment)]
    pub set: Vec<(String, f64)>,

    /// Merge noise into the non-Clifford places it stands next to
    #[arg(long, value_enum, default_value_t = Switch::On)]
    pub absorb: Switch,

    /// Most operations after unrolling
    #[arg(long, value_name = "N", default_value_t = 1_000_000)]
    pub max_ops: usize,

    /// Print the plan as JSON
    #[arg(long)]
    pub json: bool,
}

/// Print what a result file holds.
#[derive(Debug, Args)]
#[command(after_help = "Examples:\n  shottower show shots.h5\n  \
    shottower show shots.h5 --json | python3 -m json.tool")]
pub(super) struct Show {
    /// Result file
    #[arg(value_name = "FILE.h5")]
    pub file: PathBuf,

    /// Print JSON
    #[arg(long)]
    pub json: bool,

    /// Draw the frequencies of the likeliest outcomes into a picture
    #[arg(long, value_name = "FILE.svg")]
    pub figure: Option<PathBuf>,

    /// Overwrite an existing picture
    #[arg(long)]
    pub force: bool,
}

/// How outcomes are read out.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub(super) enum ReadoutOption {
    /// The cheaper one for this circuit
    Auto,
    /// Stabiliser terms and a sample that walks with the circuit
    Walk,
    /// Stabiliser terms with fast norm estimation
    Probe,
    /// Exact amplitudes of the active qubits (at most 28 of them)
    Dense,
}

impl ReadoutOption {
    /// The read-out asked for, if one is.
    pub(super) fn wanted(self) -> Option<Readout> {
        match self {
            ReadoutOption::Auto => None,
            ReadoutOption::Probe => Some(Readout::Probe),
            ReadoutOption::Walk => Some(Readout::Walk),
            ReadoutOption::Dense => Some(Readout::Dense),
        }
    }
}

#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub(super) enum Switch {
    /// Yes
    On,
    /// No
    Off,
}

#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum TermsOption {
    Average,
    Fixed(u64),
}

fn delta(text: &str) -> Result<f64, String> {
    let value: f64 = text.parse().map_err(|_| "expected a number".to_owned())?;
    if value > 0.0 && value < 2.0 {
        Ok(value)
    } else {
        Err("a trace-norm error lies above 0 and below 2".to_owned())
    }
}

fn terms(text: &str) -> Result<TermsOption, String> {
    if text == "average" {
        return Ok(TermsOption::Average);
    }
    match text.parse() {
        Ok(count @ 1..=u64::MAX) => Ok(TermsOption::Fixed(count)),
        _ => Err("expected a number of terms from 1, or the word average".to_owned()),
    }
}

fn part(text: &str) -> Result<(u64, u64), String> {
    let expected = "expected I/N with I from 1 to N, for example 2/8";
    let (index, count) = text.split_once('/').ok_or(expected)?;
    let index: u64 = index.parse().map_err(|_| expected)?;
    let count: u64 = count.parse().map_err(|_| expected)?;
    if index >= 1 && index <= count {
        Ok((index, count))
    } else {
        Err(expected.to_owned())
    }
}

fn assignment(text: &str) -> Result<(String, f64), String> {
    let expected = "expected NAME=VALUE with a number, for example theta=0.3";
    let (name, value) = text.split_once('=').ok_or(expected)?;
    let value: f64 = value.trim().parse().map_err(|_| expected)?;
    if !value.is_finite() || name.trim().is_empty() {
        return Err(expected.to_owned());
    }
    Ok((name.trim().to_owned(), value))
}
