//! From a choice of read-out to shots: builds the register and runs the sampler.

use std::ops::Range;

use crate::magic::Sparsifier;
use crate::program::{MAX_SLOTS, Program};
use crate::readout::Register;
use crate::readout::choice::{Choice, Readout};
use crate::readout::dense::Dense;
use crate::readout::probe::{self, Probe};
use crate::readout::walk::{self, Walk};

use super::{Block, Drawing, Family, Interrupt, Progress, SampleError, Sampler};

/// Draws shots of a program with a chosen read-out.
pub struct Drive<'p> {
    /// The program.
    pub program: &'p Program,
    /// Draws of its sites.
    pub sparsifier: &'p Sparsifier,
    /// The classical bits to record.
    pub recorded: Vec<u32>,
    /// Seed of the run.
    pub seed: u64,
    /// Whether to keep which noise events fired.
    pub keep_events: bool,
    /// Keep every shot, whatever its weight. For timing alone: the outcomes
    /// then follow no law.
    pub accept_all: bool,
}

impl<'p> Drive<'p> {
    /// Draws the shots of `range`; see [`Sampler::sample`].
    pub fn shots<E: From<SampleError>>(
        &self,
        choice: &Choice,
        range: Range<u64>,
        interrupt: &Interrupt,
        progress: &mut dyn Progress,
        sink: impl FnMut(&Block) -> Result<(), E>,
    ) -> Result<u64, E> {
        let drawing = match choice.terms {
            None => Drawing::Members,
            Some(terms) => Drawing::Terms(terms as usize),
        };
        let call = Call {
            sampler: self.sampler(choice.room, self.keep_events, drawing),
            family: Family::Shots,
            range,
            interrupt,
            progress,
            sink,
        };
        match (choice.readout, choice.probe, choice.terms) {
            (Readout::Probe, Some(settings), _) => self.with_probe(settings, call),
            (Readout::Walk, _, Some(terms)) => self.with_walk(terms, call),
            _ => {
                let active = self.program.first().peak_active;
                call.with(|| Dense::new(self.program.sites(), active))
            }
        }
    }

    /// Draws companion shots: one random component a site.
    pub fn companion<E: From<SampleError>>(
        &self,
        range: Range<u64>,
        interrupt: &Interrupt,
        progress: &mut dyn Progress,
        sink: impl FnMut(&Block) -> Result<(), E>,
    ) -> Result<u64, E> {
        let call = Call {
            sampler: self.sampler(MAX_SLOTS, false, Drawing::Companion),
            family: Family::Companion,
            range,
            interrupt,
            progress,
            sink,
        };
        self.with_walk(1, call)
    }

    fn sampler(&self, room: usize, keep_events: bool, drawing: Drawing) -> Sampler<'p> {
        Sampler::new(
            self.program,
            self.sparsifier,
            self.recorded.clone(),
            self.seed,
            room,
            keep_events,
            drawing,
        )
    }

    /// Runs with terms of the smallest width that holds the slots.
    fn with_probe<E: From<SampleError>, S: FnMut(&Block) -> Result<(), E>>(
        &self,
        mut settings: probe::Settings,
        call: Call<'_, 'p, S>,
    ) -> Result<u64, E> {
        if self.accept_all {
            settings.cap = f64::MIN_POSITIVE;
        }
        let (sites, slots) = (self.program.sites(), self.program.slots());
        let interrupt = call.interrupt;
        match slots {
            0..=64 => call.with(|| Probe::<1>::new(sites, slots, settings, interrupt)),
            65..=128 => call.with(|| Probe::<2>::new(sites, slots, settings, interrupt)),
            _ => call.with(|| Probe::<4>::new(sites, slots, settings, interrupt)),
        }
    }

    /// The same for the walk.
    fn with_walk<E: From<SampleError>, S: FnMut(&Block) -> Result<(), E>>(
        &self,
        terms: u64,
        call: Call<'_, 'p, S>,
    ) -> Result<u64, E> {
        let (sites, slots) = (self.program.sites(), self.program.slots());
        let mut settings = walk::Settings::new(sites, terms, self.program.log_damping_trace());
        if self.accept_all {
            settings = settings.accepting_all();
        }
        match slots {
            0..=64 => call.with(|| Walk::<1>::new(sites, slots, settings)),
            65..=128 => call.with(|| Walk::<2>::new(sites, slots, settings)),
            _ => call.with(|| Walk::<4>::new(sites, slots, settings)),
        }
    }
}

/// A call of the sampler, waiting for its register.
struct Call<'a, 'p, S> {
    sampler: Sampler<'p>,
    family: Family,
    range: Range<u64>,
    interrupt: &'a Interrupt,
    progress: &'a mut dyn Progress,
    sink: S,
}

impl<S> Call<'_, '_, S> {
    fn with<R: Register + Send, E: From<SampleError>>(
        self,
        make: impl Fn() -> R + Sync,
    ) -> Result<u64, E>
    where
        S: FnMut(&Block) -> Result<(), E>,
    {
        self.sampler.sample(
            self.family,
            self.range,
            make,
            self.interrupt,
            self.progress,
            self.sink,
        )
    }
}
