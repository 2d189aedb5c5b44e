//! Measures a run before it is made: shots of the circuit itself, and a result
//! file in a temporary directory.

use std::collections::HashSet;
use std::ffi::OsString;
use std::path::Path;
use std::time::Instant;

use clap::Parser;

use crate::magic::Sparsifier;
use crate::magic::mixing::terms_for_delta;
use crate::plan::{
    self, Accuracy, CHOICE_RANGE, Limits, Model, Overhead, Profile, Request, Solved, Survey,
    counted_bytes,
};
use crate::readout::choice::{self, Readout, TermCount, Wish};
use crate::report::Summary;
use crate::sampler::{Block, Drive, SampleError, ShotAudit};
use crate::store::{Finished, ShotFile};

use super::CommandError;
use super::input::Input;
use super::machine::{INTERRUPT, available_memory};
use super::message;
use super::options::{Command, Options, Run};
use super::run::{self, Decided, Job};

/// A drive with the bits that a run records.
pub(super) fn drive<'p>(input: &'p Input, sparsifier: &'p Sparsifier, seed: u64) -> Drive<'p> {
    Drive {
        program: &input.program,
        sparsifier,
        recorded: run::recorded_bits(input),
        seed,
        keep_events: false,
        accept_all: false,
    }
}

/// An error if Ctrl-C came while nothing had been written.
pub(super) fn stopped() -> Result<(), CommandError> {
    if INTERRUPT.raised() {
        return Err(CommandError::Interrupted(
            "interrupted while measuring; nothing was written".to_owned(),
        ));
    }
    Ok(())
}

/// What is to be known about a circuit.
pub(super) struct Question<'a> {
    pub request: Request,
    /// δ that costs are wanted for, from the smallest to the largest.
    pub deltas: (f64, f64),
    /// The δ that were asked for, in any order.
    pub rows: &'a [f64],
    /// Whether all read-outs are of interest, or only those a run would take.
    pub all: bool,
    pub seed: u64,
    pub log_extent: f64,
    /// When the command began.
    pub started: Instant,
    /// The circuit file, for the rehearsal of a result file.
    pub circuit: &'a Path,
}

/// Measures what shots of the input cost; about two seconds.
pub(super) fn model<'p>(
    input: &'p Input,
    sparsifier: &'p Sparsifier,
    question: &Question<'_>,
) -> Result<Model<'p>, CommandError> {
    let Question {
        request,
        log_extent,
        ..
    } = *question;
    let program = &input.program;
    let start = question.started.elapsed().as_secs_f64();
    let wants = |readout| question.all || request.readout.is_none_or(|wanted| wanted == readout);
    let log_damping = program.log_damping_trace();
    let mut survey = Survey::new(
        drive(input, sparsifier, question.seed),
        log_extent + log_damping,
        request.threads,
        available_memory().min(request.memory) as f64,
        &INTERRUPT,
    );
    let unlimited = Wish {
        readout: Some(Readout::Dense),
        delta: 0.1,
        terms: TermCount::FromDelta,
        threads: request.threads,
        memory: available_memory().min(request.memory),
    };
    let exact = choice::choose(program, log_extent, &unlimited).ok();
    let blocks = survey.companion_blocks(FEW as u64)?;
    stopped()?;
    let mut overhead = file_costs(input, question, &blocks)?;
    overhead.start = start;
    overhead.counting = counting_bytes(input, &blocks, request.shots);
    stopped()?;
    let companion = survey.companion(0.1)?;
    stopped()?;
    let mut model = Model {
        program: Some(program),
        log_extent,
        log_damping,
        request,
        profile: Some(Profile::new(program)),
        walk: None,
        probe: None,
        dense: None,
        companion: companion.map(|timing| timing.seconds),
        overhead,
        bare: None,
        blocked: None,
    };
    if wants(Readout::Walk) {
        let (least, most) = term_range(&model, question.deltas);
        model.walk = survey.walk(least, most, counted_bytes(program), 1.2)?;
        stopped()?;
    }
    if (question.all || request.readout == Some(Readout::Probe)) && !program.has_damping() {
        let (_, most) = term_range(&model, question.deltas);
        // The smallest δ that is cheap enough comes closest to what is asked.
        let anchors: Vec<_> = question
            .rows
            .iter()
            .filter_map(|&delta| {
                let wish = Wish {
                    readout: Some(Readout::Probe),
                    delta,
                    ..unlimited
                };
                choice::choose(program, log_extent, &wish).ok()
            })
            .collect();
        model.probe = survey.probe(most, &anchors, 0.3)?;
        stopped()?;
    }
    if wants(Readout::Dense)
        && let Some(profile) = &model.profile
    {
        // A branch that does not fit is a reason of its own, not a failure.
        model.dense = match survey.dense(exact.as_ref(), profile, 0.2) {
            Ok(dense) => dense,
            Err(SampleError::TooManyActive { .. }) => None,
            Err(error) => return Err(error.into()),
        };
        stopped()?;
    }
    Ok(model)
}

/// Numbers of terms from the largest δ to the smallest, the averages' included,
/// as far as they can be counted.
fn term_range(model: &Model<'_>, deltas: (f64, f64)) -> (u64, u64) {
    const MOST: u64 = u32::MAX as u64;
    let at = |delta: f64| {
        terms_for_delta(model.log_extent + model.log_damping, delta).map_or(MOST, |k| k.min(MOST))
    };
    let (average, _) = model.terms(Accuracy::Average, Readout::Walk);
    let average = (average.min(MOST as f64) as u64).max(1);
    (at(deltas.1).min(average), at(deltas.0).max(average))
}

/// Bytes of freed buffers the HDF5 library keeps at most (its documented default).
const KEPT_FOR_REUSE: f64 = (16 << 20) as f64;

/// Most shots of a rehearsed result file, and its bits.
const STORED: usize = 1 << 17;
const STORED_BITS: usize = 1 << 23;
/// Fewest.
const FEW: usize = 1 << 11;

/// Times writing, finishing and summing up result files of two sizes.
fn file_costs(
    input: &Input,
    question: &Question<'_>,
    blocks: &[Block],
) -> Result<Overhead, CommandError> {
    let memory = || plan::peak_memory().unwrap_or(0.0);
    let Some(first) = blocks.iter().find(|block| block.rows.shots > 0) else {
        return Ok(Overhead {
            memory: memory(),
            ..Overhead::default()
        });
    };
    let bits = run::recorded_bits(input).len().max(1);
    let stored = (STORED_BITS / bits).clamp(4 * FEW, STORED);
    // Lists grow by doubling, so up to twice what a shot takes.
    let waiting = 2 * (first.rows.words * size_of::<u64>() + size_of::<ShotAudit>());
    let folder = tempfile::tempdir().map_err(|error| {
        CommandError::Usage(format!(
            "cannot make a temporary directory to time a result file in: {error}"
        ))
    })?;
    let words: Vec<OsString> = vec![
        "shottower".into(),
        "run".into(),
        "--shots".into(),
        stored.to_string().into(),
        "--companion".into(),
        "1".into(),
        "--out".into(),
        folder.path().join("rehearsal.h5").into(),
        "--force".into(),
        "--".into(),
        question.circuit.into(),
    ];
    let Ok(Options {
        command: Command::Run(options),
    }) = Options::try_parse_from(words)
    else {
        return Ok(Overhead::default());
    };
    let time = |shots: usize, companion: usize| -> Result<f64, CommandError> {
        let choice = choice::Choice {
            readout: Readout::Walk,
            terms: Some(2),
            mixing_weight: 0.1,
            probe: None,
            memory: 0,
            room: 0,
        };
        let decided = Decided {
            choice,
            delta: Some(0.1),
        };
        let job = Job::new(&options, input, &decided, question.log_extent, 1)?;
        let started = Instant::now();
        let mut writer = job.open(&options)?;
        for block in some(blocks, companion) {
            writer.append_companion(&block.rows)?;
        }
        for block in some(blocks, shots) {
            run::append(&mut writer, block, false)?;
        }
        writer.finish(Finished::default())?;
        let file = ShotFile::open(&options.out)?;
        let summary = Summary::from_file(&file)?;
        std::hint::black_box(summary.to_string().len());
        Ok(started.elapsed().as_secs_f64())
    };
    time(FEW, 0)?;
    let base = memory();
    let short = time(FEW, 0)?;
    let long = time(stored, 0)?;
    // The HDF5 library keeps the buffers of chunks it has read for reuse.
    let reading = (memory() - base) / stored as f64;
    let shot = (long - short).max(0.0) / written(blocks, stored, FEW);
    let companion = (time(FEW, stored)? - short).max(0.0) / written(blocks, stored, 0);
    Ok(Overhead {
        end: (short - written(blocks, FEW, 0) * shot).max(0.0),
        shot,
        companion,
        memory: base,
        waiting: waiting as f64,
        reading: (reading, KEPT_FOR_REUSE),
        ..Overhead::default()
    })
}

/// Bytes that the summary takes for counting the words of record registers in so
/// many shots. How many different words turn up is a power of the number of
/// shots that some shots give away.
fn counting_bytes(input: &Input, blocks: &[Block], shots: u64) -> f64 {
    let mut first = 0;
    let mut bytes = 0.0;
    for register in run::recorded_registers(input) {
        let (from, width) = (first, register.width);
        first += width;
        if register.role.word() != "record" || !(1..=64).contains(&width) {
            continue;
        }
        let rows = blocks.iter().map(|block| &block.rows);
        let words: Vec<u64> = rows
            .flat_map(|rows| {
                (0..rows.shots).map(move |shot| {
                    (0..width).fold(0, |word, bit| {
                        word | u64::from(rows.get(shot, from + bit)) << bit
                    })
                })
            })
            .collect();
        let different = |words: &[u64]| words.iter().collect::<HashSet<_>>().len() as f64;
        let (half, all) = (different(&words[..words.len() / 2]), different(&words));
        if half < 1.0 {
            continue;
        }
        let power = (all / half).log2().clamp(0.0, 1.0);
        let grown = all * (shots as f64 / words.len() as f64).powf(power);
        let different = grown.min((width as f64).exp2()).min(MOST_COUNTED);
        // A table with 17 bytes a place, at most 7/8 full, its size a power of two;
        // and a sorted list of 16 bytes an entry with half as much for sorting.
        let places = (different * 8.0 / 7.0).log2().ceil().exp2();
        bytes += 17.0 * places + 24.0 * different;
    }
    bytes
}

/// Most different words of a register that a summary counts.
const MOST_COUNTED: f64 = 1_048_576.0;

/// Blocks over and over, up to about so many shots.
fn some(blocks: &[Block], shots: usize) -> impl Iterator<Item = &Block> {
    let mut left = shots;
    blocks.iter().cycle().take_while(move |block| {
        let more = left > 0;
        left = left.saturating_sub(block.rows.shots.max(1));
        more
    })
}

/// How many more shots `some` gives for one number than for another.
fn written(blocks: &[Block], many: usize, few: usize) -> f64 {
    let count = |shots| -> usize { some(blocks, shots).map(|block| block.rows.shots).sum() };
    (count(many) - count(few)).max(1) as f64
}

/// The smallest δ within the limits of a run; says what it chose.
pub(super) fn within_limits(
    options: &Run,
    input: &Input,
    log_extent: f64,
    threads: usize,
) -> Result<Solved, CommandError> {
    let memory = available_memory().min(options.memory.unwrap_or(u64::MAX));
    let sparsifier = Sparsifier::new(input.program.sites());
    let question = Question {
        request: Request {
            readout: options.readout.wanted(),
            shots: options.shots,
            companion: options.companion,
            threads,
            memory,
        },
        deltas: CHOICE_RANGE,
        rows: &[CHOICE_RANGE.1],
        all: false,
        seed: 1,
        log_extent,
        started: Instant::now(),
        circuit: &options.circuit,
    };
    let model = model(input, &sparsifier, &question)?;
    let limits = Limits {
        seconds: options.budget,
        memory,
    };
    let solved = model
        .solve(&limits)
        .map_err(|refusal| CommandError::Usage(super::plan::explain(&refusal, &model, input)))?;
    if !options.quiet {
        message::note(&super::plan::chosen_text(&solved));
    }
    Ok(solved)
}
