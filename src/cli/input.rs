//! From file names to a compiled program.

use std::collections::BTreeMap;
use std::fs::File;
use std::io::Read;
use std::path::Path;

use crate::circuit::{self, Circuit, ParseOptions};
use crate::magic::mixing::log_extent;
use crate::magic::{self, Schedule, ScheduleOptions, Written};
use crate::noise::{self, NoiseFile};
use crate::program::{self, Program, Reduced, SiteCounts};

use super::{CommandError, message, refuse};

/// Longest input file.
const MAX_BYTES: u64 = 16 << 20;

/// The texts that diagnostics point into.
pub(super) struct Texts {
    pub circuit_name: String,
    pub circuit: String,
    pub noise_name: String,
    pub noise: String,
}

/// What the input files and options describe.
pub(super) struct Input {
    pub texts: Texts,
    pub circuit: Circuit,
    pub title: Option<String>,
    pub program: Program,
    pub reduction: Reduction,
}

/// What came of the non-Clifford gates.
#[derive(Clone)]
pub(super) struct Reduction {
    pub written: Written,
    /// ln ξ once noise was merged.
    pub log_extent_after_noise: f64,
    pub counts: SiteCounts,
}

/// The same before it is compiled.
pub(super) struct Scheduled {
    pub texts: Texts,
    pub circuit: Circuit,
    pub title: Option<String>,
    pub schedule: Schedule,
    pub reduction: Reduction,
}

/// How the input is read.
pub(super) struct Reading<'a> {
    pub circuit: &'a Path,
    pub noise: Option<&'a Path>,
    pub set: &'a [(String, f64)],
    pub max_operations: usize,
    pub absorb: bool,
}

/// Reads, checks and compiles the input; shows warnings and errors.
pub(super) fn load(reading: &Reading<'_>) -> Result<Input, CommandError> {
    let Scheduled {
        texts,
        circuit,
        title,
        schedule,
        reduction,
    } = schedule(reading)?;
    let program = Program::compile(schedule, circuit.qubits.len(), circuit.bits)?;
    Ok(Input {
        texts,
        circuit,
        title,
        program,
        reduction,
    })
}

/// Reads and checks the input and finds its sites; shows warnings and errors.
pub(super) fn schedule(reading: &Reading<'_>) -> Result<Scheduled, CommandError> {
    let texts = Texts {
        circuit_name: reading.circuit.display().to_string(),
        circuit: read("circuit", reading.circuit)?,
        noise_name: reading
            .noise
            .map(|path| path.display().to_string())
            .unwrap_or_default(),
        noise: reading
            .noise
            .map(|path| read("noise", path))
            .transpose()?
            .unwrap_or_default(),
    };
    let mut set = BTreeMap::new();
    for (name, value) in reading.set {
        if set.insert(name.clone(), *value).is_some() {
            return Err(CommandError::Usage(format!(
                "--set gives {name} two values"
            )));
        }
    }
    let options = ParseOptions {
        set,
        max_operations: reading.max_operations,
    };
    let circuit = circuit::parse(&texts.circuit_name, &texts.circuit, &options)
        .map_err(|errors| refuse(&texts, &errors))?;
    let noise_file = match reading.noise {
        None => None,
        Some(_) => Some(NoiseFile::parse(&texts.noise).map_err(|errors| refuse(&texts, &errors))?),
    };
    let noisy =
        noise::attach(&circuit, noise_file.as_ref()).map_err(|errors| refuse(&texts, &errors))?;
    for warning in circuit.warnings.iter().chain(&noisy.warnings) {
        message::diagnostic(&texts, warning);
    }
    let qubits = circuit.qubits.len();
    let schedule = magic::schedule(
        &noisy,
        qubits,
        &ScheduleOptions {
            absorb: reading.absorb,
        },
    );
    drop(noisy);
    let log_extent_after_noise = log_extent(&schedule.sites);
    let Reduced { schedule, counts } = program::reduce(schedule, qubits, &recorded(&circuit));
    let reduction = Reduction {
        written: magic::as_written(&circuit),
        log_extent_after_noise,
        counts,
    };
    let title = noise_file.and_then(|file| file.title);
    Ok(Scheduled {
        texts,
        circuit,
        title,
        schedule,
        reduction,
    })
}

/// Which bits are written to the result file.
fn recorded(circuit: &Circuit) -> Vec<bool> {
    let mut recorded = vec![false; circuit.bits];
    for register in circuit.registers.iter().filter(|it| it.recorded) {
        recorded[register.first..register.first + register.width].fill(true);
    }
    recorded
}

fn read(what: &str, path: &Path) -> Result<String, CommandError> {
    let shown = path.display();
    let failed = |error: std::io::Error| {
        CommandError::Usage(format!("cannot read {what} file {shown}: {error}"))
    };
    let mut bytes = Vec::new();
    let file = File::open(path).map_err(failed)?;
    file.take(MAX_BYTES + 1)
        .read_to_end(&mut bytes)
        .map_err(failed)?;
    if bytes.len() as u64 > MAX_BYTES {
        return Err(CommandError::Usage(format!(
            "{what} file {shown} is longer than 16 MiB, the most that is read"
        )));
    }
    String::from_utf8(bytes).map_err(|error| {
        let valid = error.utf8_error().valid_up_to();
        CommandError::Usage(format!(
            "{what} file {shown} is not UTF-8 text (first wrong byte at offset {valid})"
        ))
    })
}
