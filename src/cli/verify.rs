//! `verify`: drawn shots of a small circuit against its exact distribution.

use crate::exact::fit::Counts;
use crate::exact::{self, Law};
use crate::magic::Sparsifier;
use crate::magic::mixing::log_extent;
use crate::noise::{self, NoiseFile, NoisyCircuit};
use crate::readout::choice::{self, Choice, Readout, TermCount, Wish};
use crate::report::{LIMIT, Setting, Verification, allowed_bias};
use crate::sampler::{Block, Drive, Rows};

use super::input::{self, Input, Reading};
use super::machine::{INTERRUPT, STOPPING, available_memory, catch_interrupts, start_threads};
use super::options::{ReadoutOption, Switch, TermsOption, Verify};
use super::progress::Shown;
use super::{CommandError, refuse};

/// Draws shots and tests them.
pub(super) fn verify(options: &Verify) -> Result<(), CommandError> {
    let input = input::load(&Reading {
        circuit: &options.circuit,
        noise: options.noise.as_deref(),
        set: &options.set,
        max_operations: options.max_ops,
        absorb: options.absorb == Switch::On,
    })?;
    let threads = start_threads(options.threads)?;
    let log_extent = log_extent(input.program.sites());
    let choice = choice::choose(&input.program, log_extent, &wish(options, threads))?;
    let recorded = recorded_bits(&input);
    let companion_shots = companion_shots(options, &choice);

    let ideal = exact::ideal(&noisy(&input)?, &recorded)?;
    let companion = if choice.terms.is_some() || companion_shots > 0 {
        Some(exact::companion(&input.program, &recorded)?)
    } else {
        None
    };
    let mixing_weight = match (choice.terms, &companion) {
        (Some(terms), Some(companion)) if input.program.has_damping() => {
            // ξ·tr P̃ in the place of ξ.
            let weight = log_extent.exp() * companion.total();
            weight / (terms as f64 - 1.0 + weight)
        }
        _ => choice.mixing_weight,
    };
    let setting = Setting {
        circuit: input.texts.circuit_name.clone(),
        noise: options
            .noise
            .is_some()
            .then(|| input.texts.noise_name.clone()),
        readout: choice.readout.word().to_owned(),
        seed: options.seed.unwrap_or_else(rand::random),
        terms: choice.terms,
        delta: options.delta,
        log_extent,
        extent: log_extent.exp(),
        mixing_weight,
    };
    let late_sites = input.program.early_sites().len() < input.program.sites().len();
    let bias = match choice.readout {
        Readout::Probe => allowed_bias(options.delta, mixing_weight, late_sites),
        Readout::Walk | Readout::Dense => 0.0,
    };
    catch_interrupts(STOPPING)?;
    let (shots, others) = draw(
        options,
        &input,
        &choice,
        &recorded,
        setting.seed,
        companion_shots,
    )?;
    let companion = companion.map(|law| law.normalised());
    let report = Verification::new(
        setting,
        &ideal,
        companion.as_ref() as Option<&Law>,
        &shots,
        &others,
        bias,
    );
    if !options.quiet {
        let text = if options.json {
            report.to_json()
        } else {
            report.to_string()
        };
        super::print(&text)?;
    }
    conclude(&report, choice.readout)
}

fn wish(options: &Verify, threads: usize) -> Wish {
    Wish {
        readout: match options.readout {
            ReadoutOption::Auto => None,
            ReadoutOption::Probe => Some(Readout::Probe),
            ReadoutOption::Walk => Some(Readout::Walk),
            ReadoutOption::Dense => Some(Readout::Dense),
        },
        delta: options.delta,
        terms: match options.terms {
            None => TermCount::FromDelta,
            Some(TermsOption::Average) => TermCount::Average,
            Some(TermsOption::Fixed(terms)) => TermCount::Fixed(terms),
        },
        threads,
        memory: available_memory(),
    }
}

fn recorded_bits(input: &Input) -> Vec<u32> {
    let registers = input.circuit.registers.iter();
    registers
        .filter(|register| register.recorded)
        .flat_map(|register| register.first..register.first + register.width)
        .map(|bit| bit as u32)
        .collect()
}

fn companion_shots(options: &Verify, choice: &Choice) -> u64 {
    match options.companion {
        Some(count) => count,
        None if choice.readout == Readout::Dense => 0,
        None => options.shots,
    }
}

/// The circuit with its noise in place, once more from the texts: the program
/// has been compiled from another one, and is what is being tested.
fn noisy(input: &Input) -> Result<NoisyCircuit, CommandError> {
    let texts = &input.texts;
    let file = if texts.noise.is_empty() {
        None
    } else {
        Some(NoiseFile::parse(&texts.noise).map_err(|errors| refuse(texts, &errors))?)
    };
    noise::attach(&input.circuit, file.as_ref()).map_err(|errors| refuse(texts, &errors))
}

/// Shots and companion shots, counted.
fn draw(
    options: &Verify,
    input: &Input,
    choice: &Choice,
    recorded: &[u32],
    seed: u64,
    companion_shots: u64,
) -> Result<(Counts, Counts), CommandError> {
    let sparsifier = Sparsifier::new(input.program.sites());
    let drive = Drive {
        program: &input.program,
        sparsifier: &sparsifier,
        recorded: recorded.to_vec(),
        seed,
        keep_events: false,
        accept_all: false,
    };
    let (mut shots, mut others) = (Counts::default(), Counts::default());
    if companion_shots > 0 {
        let mut progress = Shown::new("companion", companion_shots, options.quiet);
        let count = |block: &Block| {
            count(&block.rows, &mut others);
            Ok::<_, CommandError>(())
        };
        drive.companion(0..companion_shots, &INTERRUPT, &mut progress, count)?;
        progress.finish();
    }
    let mut progress = Shown::new("shots", options.shots, options.quiet);
    let count = |block: &Block| {
        count(&block.rows, &mut shots);
        Ok::<_, CommandError>(())
    };
    drive.shots(choice, 0..options.shots, &INTERRUPT, &mut progress, count)?;
    progress.finish();
    if shots.shots() < options.shots || others.shots() < companion_shots {
        return Err(CommandError::Interrupted(format!(
            "interrupted after {} of {} shots; nothing was tested",
            shots.shots(),
            options.shots
        )));
    }
    Ok((shots, others))
}

fn count(rows: &Rows, counts: &mut Counts) {
    for shot in 0..rows.shots {
        counts.add(&rows.bits[shot * rows.words..(shot + 1) * rows.words]);
    }
}

/// A rejected law is an error.
fn conclude(report: &Verification, readout: Readout) -> Result<(), CommandError> {
    let Some(what) = report.rejected() else {
        return Ok(());
    };
    let advice = match readout {
        Readout::Probe => {
            "with read-out probe the cause may be its bias: lower --delta, or choose --readout \
             walk; if that is rejected too, the program is at fault"
        }
        Readout::Walk | Readout::Dense => {
            "repeat it with another --seed: by chance this happens once in a million runs; if it \
             is rejected again, the program is at fault, and results for this circuit should not \
             be used"
        }
    };
    Err(CommandError::Rejected(format!(
        "{what} (p below {LIMIT:e}): {advice}"
    )))
}
