//! `run`: draw shots of a circuit into a result file.

use std::cell::Cell;
use std::path::Path;

use crate::circuit::Register as BitRegister;
use crate::magic::Sparsifier;
use crate::magic::mixing::log_extent;
use crate::plan::auto::{self, Work};
use crate::program::Program;
use crate::readout::choice::{Choice, Readout, TermCount, Wish};
use crate::readout::walk;
use crate::report::Summary;
use crate::sampler::{Block, Drive, audit};
use crate::store::{
    AuditBlock, Damped, Finished, Header, Part, ReductionHeader, RegisterHeader, ShotFile,
    StoreError, Writer, WriterOptions,
};

use super::CommandError;
use super::input::{self, Input, Reading};
use super::machine::{
    INTERRUPT, STOPPING_A_RUN, available_memory, catch_interrupts, start_threads,
};
use super::options::{DEFAULT_DELTA, Run, Switch, TermsOption};
use super::places::Places;
use super::progress::Shown;
use super::rehearse;

/// Draws shots of a circuit into a result file.
pub(super) fn run(options: &Run) -> Result<(), CommandError> {
    if options.out.exists() && !options.force {
        return Err(CommandError::Output(StoreError::Exists {
            path: options.out.clone(),
        }));
    }
    for input in [Some(&options.circuit), options.noise.as_ref()]
        .into_iter()
        .flatten()
    {
        if same_file(input, &options.out) {
            return Err(CommandError::Usage(format!(
                "--out {} is an input file of this run; choose another name",
                options.out.display()
            )));
        }
    }
    let input = input::load(&Reading {
        circuit: &options.circuit,
        noise: options.noise.as_deref(),
        set: &options.set,
        max_operations: options.max_ops,
        absorb: options.absorb == Switch::On,
    })?;
    let threads = start_threads(options.threads)?;
    catch_interrupts(STOPPING_A_RUN)?;
    let log_extent = log_extent(input.program.sites());
    let decided = decide(options, &input, log_extent, threads)?;
    let seed = options.seed.unwrap_or_else(rand::random);
    let job = Job::new(options, &input, &decided, log_extent, seed)?;
    job.draw(options)?;
    if !options.quiet {
        let file = ShotFile::open(&options.out)?;
        super::show::print(&Summary::from_file(&file)?, options.json)?;
    }
    job.ending()
}

/// Whether two paths lead to one existing file.
fn same_file(left: &Path, right: &Path) -> bool {
    match (left.canonicalize(), right.canonicalize()) {
        (Ok(left), Ok(right)) => left == right,
        _ => false,
    }
}

/// Read-out and accuracy of a run.
pub(super) struct Decided {
    pub choice: Choice,
    /// δ; none where the number of terms was given, or time and memory allow the
    /// exact read-out.
    pub delta: Option<f64>,
}

/// Decides on the read-out, and on δ where it is left to a limit of time or
/// memory.
fn decide(
    options: &Run,
    input: &Input,
    log_extent: f64,
    threads: usize,
) -> Result<Decided, CommandError> {
    let limit = options.memory.unwrap_or(u64::MAX);
    let open = options.delta.is_none() && options.terms.is_none();
    let mut wish = Wish {
        readout: options.readout.wanted(),
        delta: options.delta.unwrap_or(DEFAULT_DELTA),
        terms: match options.terms {
            None => TermCount::FromDelta,
            Some(TermsOption::Average) => TermCount::Average,
            Some(TermsOption::Fixed(terms)) => TermCount::Fixed(terms),
        },
        threads,
        memory: available_memory().min(limit),
    };
    let mut delta = options.terms.is_none().then_some(wish.delta);
    if open && (options.budget.is_some() || options.memory.is_some()) {
        let solved = rehearse::within_limits(options, input, log_extent, threads)?;
        wish.readout = Some(solved.readout);
        wish.delta = solved.delta.unwrap_or(DEFAULT_DELTA);
        delta = solved.delta;
    }
    let work = Work {
        shots: options.shots,
        companion: options.companion,
    };
    let sparsifier = Sparsifier::new(input.program.sites());
    // Parts of a run must agree on the read-out: nothing is timed for them.
    let may_time = options.part.is_none();
    let drive = || rehearse::drive(input, &sparsifier, 0);
    let choice = auto::choose(
        &input.program,
        log_extent,
        &wish,
        work,
        may_time,
        &INTERRUPT,
        drive,
    )?;
    rehearse::stopped()?;
    Ok(Decided { choice, delta })
}

/// One run, decided.
pub(super) struct Job<'a> {
    input: &'a Input,
    choice: Choice,
    header: Header,
    recorded: Vec<u32>,
    seed: u64,
    /// Indices of the shots and of the companion shots.
    shots: std::ops::Range<u64>,
    companion: std::ops::Range<u64>,
    finished: Cell<u64>,
    clipped: Cell<u64>,
    /// Companion shots, and how often they were drawn.
    companion_drawn: Cell<(u64, u64)>,
}

impl<'a> Job<'a> {
    pub(super) fn new(
        options: &Run,
        input: &'a Input,
        decided: &Decided,
        log_extent: f64,
        seed: u64,
    ) -> Result<Self, CommandError> {
        let choice = &decided.choice;
        let companion = match options.companion {
            Some(count) => count,
            None if choice.readout == Readout::Dense => 0,
            None => options.shots,
        };
        let part = options
            .part
            .map_or(Part::default(), |(index, count)| Part { index, count });
        let registers = recorded_registers(input);
        let recorded = recorded_bits(input);
        let mut settings = vec![(
            "absorb".to_owned(),
            if options.absorb == Switch::On {
                "on"
            } else {
                "off"
            }
            .to_owned(),
        )];
        settings.extend(
            options
                .set
                .iter()
                .map(|(name, value)| (format!("set {name}"), value.to_string())),
        );
        if let Some(probe) = choice.probe {
            settings.push(("probes".to_owned(), probe.probes.to_string()));
        }
        let texts = &input.texts;
        let places = Places::new(&input.circuit);
        let header = Header {
            circuit_name: texts.circuit_name.clone(),
            circuit: texts.circuit.clone(),
            noise_name: options.noise.is_some().then(|| texts.noise_name.clone()),
            noise: options.noise.is_some().then(|| texts.noise.clone()),
            title: input.title.clone(),
            qubits: Some(input.circuit.qubits.len() as u64),
            seed,
            delta: decided.delta,
            readout: choice.readout.word().to_owned(),
            log_extent,
            reduction: Some(reduction(input)),
            terms: choice.terms,
            mixing_weight: choice.mixing_weight,
            shots_total: options.shots,
            part,
            settings,
            registers: registers
                .iter()
                .map(|register| RegisterHeader {
                    name: register.name.clone(),
                    role: register.role.word().to_owned(),
                    width: register.width,
                })
                .collect(),
            sites: places.sites(&input.program),
            locations: if options.faults {
                places.locations(&input.program)
            } else {
                Vec::new()
            },
        };
        Ok(Job {
            input,
            choice: *choice,
            header,
            recorded,
            seed,
            shots: part.shots(options.shots),
            companion: part.shots(companion),
            finished: Cell::new(0),
            clipped: Cell::new(0),
            companion_drawn: Cell::new((0, 0)),
        })
    }

    /// Draws all shots and writes the file.
    fn draw(&self, options: &Run) -> Result<(), CommandError> {
        let mut writer = self.open(options)?;
        let program = &self.input.program;
        // Companion shots come first: they are cheap, and an interrupted run
        // can then be corrected as well.
        let drawn = self
            .draw_companion(program, options, &mut writer)
            .and_then(|()| self.draw_shots(program, options, &mut writer));
        let drawn = drawn.and_then(|()| self.draw_audit(program, &mut writer));
        let finished = Finished {
            clipped: self.clipped.get(),
            damped: self.damped(program),
        };
        match drawn {
            Ok(()) => writer.finish(finished)?,
            Err(CommandError::Sample(cause)) if self.finished.get() > 0 => {
                writer.finish(finished)?;
                return Err(CommandError::Stopped {
                    cause,
                    shots: self.finished.get(),
                });
            }
            Err(error) => return Err(error),
        }
        Ok(())
    }

    /// The result file, empty.
    pub(super) fn open(&self, options: &Run) -> Result<Writer, CommandError> {
        let writer_options = WriterOptions {
            force: options.force,
            companion: !self.companion.is_empty(),
            faults: options.faults,
        };
        Writer::create(&options.out, &self.header, writer_options).map_err(CommandError::Output)
    }

    fn draw_companion(
        &self,
        program: &Program,
        options: &Run,
        writer: &mut Writer,
    ) -> Result<(), CommandError> {
        if self.companion.is_empty() {
            return Ok(());
        }
        let sparsifier = Sparsifier::new(program.sites());
        let write = |block: &Block| -> Result<(), CommandError> {
            let attempts = block.audit.iter().map(|shot| u64::from(shot.attempts));
            let (shots, sum) = self.companion_drawn.get();
            let sum = sum + attempts.sum::<u64>();
            self.companion_drawn
                .set((shots + block.rows.shots as u64, sum));
            Ok(writer.append_companion(&block.rows)?)
        };
        let total = self.companion.end - self.companion.start;
        let mut progress = Shown::new("companion", total, options.quiet);
        self.drive(program, &sparsifier, false).companion(
            self.companion.clone(),
            &INTERRUPT,
            &mut progress,
            write,
        )?;
        progress.finish();
        Ok(())
    }

    /// Audits the norm of some draws; after an interruption there is none.
    fn draw_audit(&self, program: &Program, writer: &mut Writer) -> Result<(), CommandError> {
        let Some(terms) = self.choice.terms else {
            return Ok(());
        };
        let total = self.header.shots_total;
        let indices = audit::Audited {
            count: audit::audited(program, &self.choice, total),
            total,
            range: self.shots.clone(),
        };
        let sparsifier = Sparsifier::new(program.sites());
        let found = audit::norm_audit(program, &sparsifier, self.seed, terms, indices, &INTERRUPT)?;
        Ok(writer.write_norms(&found)?)
    }

    /// What damping of entangled qubits makes of λ, from how many companion
    /// draws were kept.
    fn damped(&self, program: &Program) -> Option<Damped> {
        let terms = self.choice.terms?;
        let (shots, attempts) = self.companion_drawn.get();
        if !program.has_damping() || shots == 0 {
            return None;
        }
        let settings = walk::Settings::new(program.sites(), 1, program.log_damping_trace());
        let companion_trace = settings.trace(shots, attempts);
        let log_extent = self.header.log_extent + companion_trace.ln();
        let ideal = (terms as f64 - 1.0) * (-log_extent).exp();
        Some(Damped {
            companion_trace,
            mixing_weight: 1.0 / (1.0 + ideal),
        })
    }

    fn drive<'p>(
        &self,
        program: &'p Program,
        sparsifier: &'p Sparsifier,
        keep_events: bool,
    ) -> Drive<'p> {
        Drive {
            program,
            sparsifier,
            recorded: self.recorded.clone(),
            seed: self.seed,
            keep_events,
            accept_all: false,
        }
    }

    fn draw_shots(
        &self,
        program: &Program,
        options: &Run,
        writer: &mut Writer,
    ) -> Result<(), CommandError> {
        let sparsifier = Sparsifier::new(program.sites());
        let write = |block: &Block| -> Result<(), CommandError> {
            let clipped = block
                .audit
                .iter()
                .filter(|shot| shot.register.clipped)
                .count() as u64;
            append(writer, block, options.faults)?;
            self.clipped.set(self.clipped.get() + clipped);
            self.finished
                .set(self.finished.get() + block.rows.shots as u64);
            Ok(())
        };
        let total = self.shots.end - self.shots.start;
        let mut progress = Shown::new("shots", total, options.quiet);
        self.drive(program, &sparsifier, options.faults).shots(
            &self.choice,
            self.shots.clone(),
            &INTERRUPT,
            &mut progress,
            write,
        )?;
        progress.finish();
        Ok(())
    }

    /// What to say at the end: an interruption is an error of its own.
    fn ending(&self) -> Result<(), CommandError> {
        let (done, wanted) = (self.finished.get(), self.shots.end - self.shots.start);
        if done == wanted {
            return Ok(());
        }
        Err(CommandError::Interrupted(format!(
            "interrupted: {done} of {wanted} shots were finished and written"
        )))
    }
}

/// Writes finished shots.
pub(super) fn append(writer: &mut Writer, block: &Block, faults: bool) -> Result<(), CommandError> {
    writer.append_shots(&block.rows)?;
    writer.append_audit(&AuditBlock::new(&block.audit))?;
    if faults {
        writer.append_faults(&block.faults)?;
    }
    Ok(())
}

/// What came of the non-Clifford gates, sites without effect on the compiled
/// program included.
fn reduction(input: &Input) -> ReductionHeader {
    let counts = &input.reduction.counts;
    let idle = input.program.all_sites().filter(|(_, kept)| !kept).count();
    ReductionHeader {
        log_extent_as_written: input.reduction.written.log_extent,
        log_extent_after_noise: input.reduction.log_extent_after_noise,
        sites_as_written: input.reduction.written.gates as u64,
        sites_merged: counts.merged as u64,
        sites_deterministic: (counts.deterministic + idle) as u64,
        sites_unobservable: counts.unobservable as u64,
    }
}

/// The registers that are recorded.
pub(super) fn recorded_registers(input: &Input) -> Vec<&BitRegister> {
    let registers = input.circuit.registers.iter();
    registers.filter(|register| register.recorded).collect()
}

/// The classical bits that are recorded, register by register.
pub(super) fn recorded_bits(input: &Input) -> Vec<u32> {
    recorded_registers(input)
        .iter()
        .flat_map(|register| register.first..register.first + register.width)
        .map(|bit| bit as u32)
        .collect()
}
