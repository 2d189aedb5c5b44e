//! `run`: draw shots of a circuit into a result file.

use std::cell::Cell;
use std::path::Path;
use std::time::{Duration, Instant};

use crate::circuit::Register as BitRegister;
use crate::magic::mixing::log_extent;
use crate::magic::{Site, SiteKind, Sparsifier};
use crate::program::{Location, MAX_SLOTS, Program};
use crate::readout::Register;
use crate::readout::choice::{self, Choice, Readout, TermCount, Wish};
use crate::readout::dense::Dense;
use crate::readout::probe::{Probe, Settings};
use crate::readout::walk::{self, Walk};
use crate::report::Summary;
use crate::sampler::{Block, Drawing, Family, Interrupt, Sampler};
use crate::store::{
    AuditBlock, Finished, Header, LocationRow, Part, RegisterHeader, ShotFile, SiteRow, StoreError,
    Writer, WriterOptions,
};

use super::input::{self, Input, Reading};
use super::options::{ReadoutOption, Run, Switch, TermsOption};
use super::progress::Shown;
use super::{CommandError, message};

static INTERRUPT: Interrupt = Interrupt::new();

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
        let write = |block: &Block| Ok(writer.append_companion(&block.rows)?);
        let mut progress = Shown::new("companion", self.companion_count(), options.quiet);
        let sampler = self.sampler(program, &sparsifier, MAX_SLOTS, false, Drawing::Companion);
        with_walk(
            program,
            1,
            Sample {
                sampler: &sampler,
                family: Family::Companion,
                range: self.companion.clone(),
                progress: &mut progress,
                sink: write,
            },
        )?;
        progress.finish();
        Ok(())
    }

    fn companion_count(&self) -> u64 {
        self.companion.end - self.companion.start
    }

    fn sampler<'p>(
        &self,
        program: &'p Program,
        sparsifier: &'p Sparsifier,
        room: usize,
        keep_events: bool,
        drawing: Drawing,
    ) -> Sampler<'p> {
        let recorded = self.recorded.clone();
        Sampler::new(
            program,
            sparsifier,
            recorded,
            self.seed,
            room,
            keep_events,
            drawing,
        )
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
        let drawing = match self.choice.terms {
            None => Drawing::Members,
            Some(terms) => Drawing::Terms(terms as usize),
        };
        let sampler = self.sampler(
            program,
            &sparsifier,
            self.choice.room,
            options.faults,
            drawing,
        );
        let sample = Sample {
            sampler: &sampler,
            family: Family::Shots,
            range: self.shots.clone(),
            progress: &mut progress,
            sink: write,
        };
        let active = program.first().peak_active;
        match (self.choice.readout, self.choice.probe, self.choice.terms) {
            (Readout::Probe, Some(settings), _) => with_probe(program, settings, sample)?,
            (Readout::Walk, _, Some(terms)) => with_walk(program, terms, sample)?,
            _ => sample.with(|| Dense::new(program.sites(), active))?,
        };
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

/// A call of the sampler, waiting for its register.
struct Sample<'a, 'p, S> {
    sampler: &'a Sampler<'p>,
    family: Family,
    range: std::ops::Range<u64>,
    progress: &'a mut Shown,
    sink: S,
}

impl<S: FnMut(&Block) -> Result<(), CommandError>> Sample<'_, '_, S> {
    fn with<R: Register + Send>(self, make: impl Fn() -> R + Sync) -> Result<u64, CommandError> {
        self.sampler.sample(
            self.family,
            self.range,
            make,
            &INTERRUPT,
            self.progress,
            self.sink,
        )
    }
}

/// Runs with terms of the smallest width that holds the slots.
fn with_probe<S: FnMut(&Block) -> Result<(), CommandError>>(
    program: &Program,
    settings: Settings,
    sample: Sample<'_, '_, S>,
) -> Result<u64, CommandError> {
    let (sites, slots) = (program.sites(), program.slots());
    match slots {
        0..=64 => sample.with(|| Probe::<1>::new(sites, slots, settings, &INTERRUPT)),
        65..=128 => sample.with(|| Probe::<2>::new(sites, slots, settings, &INTERRUPT)),
        _ => sample.with(|| Probe::<4>::new(sites, slots, settings, &INTERRUPT)),
    }
}

/// The same for the walk.
fn with_walk<S: FnMut(&Block) -> Result<(), CommandError>>(
    program: &Program,
    terms: u64,
    sample: Sample<'_, '_, S>,
) -> Result<u64, CommandError> {
    let (sites, slots) = (program.sites(), program.slots());
    let settings = walk::Settings::new(sites, terms, program.log_damping_trace());
    match slots {
        0..=64 => sample.with(|| Walk::<1>::new(sites, slots, settings)),
        65..=128 => sample.with(|| Walk::<2>::new(sites, slots, settings)),
        _ => sample.with(|| Walk::<4>::new(sites, slots, settings)),
    }
}

/// Names and lines for the tables of a result file.
struct Places<'a> {
    input: &'a Input,
    /// Offsets of all line ends of the circuit text.
    line_ends: Vec<u32>,
}

impl<'a> Places<'a> {
    fn new(input: &'a Input) -> Self {
        let bytes = input.circuit.source.bytes().enumerate();
        let line_ends = bytes
            .filter(|&(_, byte)| byte == b'\n')
            .map(|(offset, _)| offset as u32)
            .collect();
        Places { input, line_ends }
    }

    /// Line of an operation, from 1.
    fn line(&self, operation: u32) -> u32 {
        let start = self.input.circuit.operations[operation as usize].span.start;
        self.line_ends.partition_point(|&end| end < start) as u32 + 1
    }

    fn names(&self, qubits: &[u32]) -> String {
        let name = |&qubit: &u32| self.input.circuit.qubits[qubit as usize].as_str();
        qubits.iter().map(name).collect::<Vec<_>>().join(", ")
    }

    fn sites(&self) -> Vec<SiteRow> {
        let row = |(site, kept): (&Site, bool)| SiteRow {
            line: self.line(site.operation),
            qubits: self.names(&site.qubits),
            kind: match site.kind {
                SiteKind::Rotation(_) => "rotation",
                SiteKind::Ccz(_) => "ccz",
                SiteKind::Prepared(_) => "prepared",
            }
            .to_owned(),
            extent_without_noise: site.extent_without_noise,
            extent: site.extent,
            members: match &site.kind {
                SiteKind::Rotation(rotation) => rotation.members.len(),
                SiteKind::Ccz(_) => 1,
                SiteKind::Prepared(prepared) => prepared.members.len(),
            } as u32,
            kept,
        };
        self.input.program.all_sites().map(row).collect()
    }

    fn locations(&self) -> Vec<LocationRow> {
        let row = |location: &Location| LocationRow {
            line: self.line(location.operation),
            kind: location.kind.word().to_owned(),
            qubits: self.names(&location.qubits),
            probability: location.probability,
        };
        self.input.program.locations().iter().map(row).collect()
    }
}

/// Sets up the thread pool; says how many threads there are.
fn start_threads(wanted: Option<u16>) -> Result<usize, CommandError> {
    let mut builder = rayon::ThreadPoolBuilder::new();
    if let Some(wanted) = wanted {
        builder = builder.num_threads(usize::from(wanted));
    }
    builder
        .build_global()
        .map_err(|error| CommandError::Usage(format!("cannot start threads: {error}")))?;
    Ok(rayon::current_num_threads())
}

/// The first Ctrl-C asks the work to stop; a later one ends the program. Some
/// senders deliver one request twice at once, so a second signal counts only
/// after a while.
fn catch_interrupts() -> Result<(), CommandError> {
    const SAME_REQUEST: Duration = Duration::from_secs(1);
    let mut first: Option<Instant> = None;
    ctrlc::set_handler(move || match first {
        None => {
            first = Some(Instant::now());
            INTERRUPT.raise();
            message::note(
                "stopping; finished shots are kept (a second Ctrl-C ends at once and loses them)",
            );
        }
        Some(first) if first.elapsed() < SAME_REQUEST => {}
        Some(_) => std::process::exit(130),
    })
    .map_err(|error| CommandError::Usage(format!("cannot watch for Ctrl-C: {error}")))
}

/// Bytes of memory that may be used: nine tenths of what the system says is
/// available, or no limit where it does not say.
fn available_memory() -> u64 {
    let said = std::fs::read_to_string("/proc/meminfo")
        .ok()
        .and_then(|text| {
            let line = text
                .lines()
                .find(|line| line.starts_with("MemAvailable:"))?;
            line.split_whitespace().nth(1)?.parse::<u64>().ok()
        });
    said.map_or(u64::MAX, |kibibytes| kibibytes * 1024 / 10 * 9)
}
