//! `run`: draw shots of a circuit into a result file.

use std::cell::Cell;
use std::path::Path;

use crate::circuit::Register as BitRegister;
use crate::magic::Sparsifier;
use crate::magic::mixing::log_extent;
use crate::program::Program;
use crate::readout::choice::{self, Choice, Readout, TermCount, Wish};
use crate::report::Summary;
use crate::sampler::{Block, Drive};
use crate::store::{
    AuditBlock, Finished, Header, Part, RegisterHeader, ShotFile, StoreError, Writer, WriterOptions,
};

use super::CommandError;
use super::input::{self, Input, Reading};
use super::machine::{INTERRUPT, available_memory, catch_interrupts, start_threads};
use super::options::{ReadoutOption, Run, Switch, TermsOption};
use super::places::Places;
use super::progress::Shown;

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
    let log_extent = log_extent(input.program.sites());
    let wish = Wish {
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
    };
    let choice = choice::choose(&input.program, log_extent, &wish)?;
    let seed = options.seed.unwrap_or_else(rand::random);
    let plan = Plan::new(options, &input, &choice, log_extent, seed)?;
    catch_interrupts()?;
    plan.draw(options)?;
    if !options.quiet {
        let file = ShotFile::open(&options.out)?;
        super::show::print(&Summary::from_file(&file)?, options.json)?;
    }
    plan.ending()
}

/// Whether two paths lead to one existing file.
fn same_file(left: &Path, right: &Path) -> bool {
    match (left.canonicalize(), right.canonicalize()) {
        (Ok(left), Ok(right)) => left == right,
        _ => false,
    }
}

/// One run, decided.
struct Plan<'a> {
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
}

impl<'a> Plan<'a> {
    fn new(
        options: &Run,
        input: &'a Input,
        choice: &Choice,
        log_extent: f64,
        seed: u64,
    ) -> Result<Self, CommandError> {
        let companion = match options.companion {
            Some(count) => count,
            None if choice.readout == Readout::Dense => 0,
            None => options.shots,
        };
        let part = options
            .part
            .map_or(Part::default(), |(index, count)| Part { index, count });
        let registers: Vec<&BitRegister> = input
            .circuit
            .registers
            .iter()
            .filter(|register| register.recorded)
            .collect();
        let recorded = registers
            .iter()
            .flat_map(|register| register.first..register.first + register.width)
            .map(|bit| bit as u32)
            .collect();
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
        let places = Places::new(input);
        let header = Header {
            circuit_name: texts.circuit_name.clone(),
            circuit: texts.circuit.clone(),
            noise_name: options.noise.is_some().then(|| texts.noise_name.clone()),
            noise: options.noise.is_some().then(|| texts.noise.clone()),
            title: input.title.clone(),
            qubits: Some(input.circuit.qubits.len() as u64),
            seed,
            delta: options.terms.is_none().then_some(options.delta),
            readout: choice.readout.word().to_owned(),
            log_extent,
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
            sites: places.sites(),
            locations: if options.faults {
                places.locations()
            } else {
                Vec::new()
            },
        };
        Ok(Plan {
            input,
            choice: *choice,
            header,
            recorded,
            seed,
            shots: part.shots(options.shots),
            companion: part.shots(companion),
            finished: Cell::new(0),
            clipped: Cell::new(0),
        })
    }

    /// Draws all shots and writes the file.
    fn draw(&self, options: &Run) -> Result<(), CommandError> {
        let writer_options = WriterOptions {
            force: options.force,
            companion: !self.companion.is_empty(),
            faults: options.faults,
        };
        let mut writer = Writer::create(&options.out, &self.header, writer_options)
            .map_err(CommandError::Output)?;
        let program = &self.input.program;
        // Companion shots come first: they are cheap, and an interrupted run
        // can then be corrected as well.
        let drawn = self
            .draw_companion(program, options, &mut writer)
            .and_then(|()| self.draw_shots(program, options, &mut writer));
        let finished = Finished {
            clipped: self.clipped.get(),
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
        let write = |block: &Block| Ok::<_, CommandError>(writer.append_companion(&block.rows)?);
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
            writer.append_shots(&block.rows)?;
            writer.append_audit(&AuditBlock::new(&block.audit))?;
            if options.faults {
                writer.append_faults(&block.faults)?;
            }
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
