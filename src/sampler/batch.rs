//! Many shots on all threads, handed on in order.

use std::sync::Mutex;
use std::time::Instant;

use rayon::prelude::*;

use crate::magic::{Draw, Sparsifier};
use crate::program::Program;
use crate::readout::Register;

use super::machine::{FaultEvent, Machine, ShotAudit};
use super::random::{self, Family};
use super::{Interrupt, Progress, SampleError};

/// Most draws of one shot before giving up.
const MAX_ATTEMPTS: u32 = 10_000_000;

/// Wall time a batch of shots should take.
pub const BATCH_SECONDS: f64 = 0.1;

/// Most shots one thread takes from a batch at a time.
pub const BATCH_MOST: u64 = 1 << 14;

/// Finished shots in order of their index.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Block {
    /// Index of the first shot.
    pub first: u64,
    /// The recorded bits.
    pub rows: Rows,
    /// One entry a shot.
    pub audit: Vec<ShotAudit>,
    /// Noise events that fired, in order of shots.
    pub faults: Vec<FaultEvent>,
    /// Why the block is shorter than asked for, if that was an error.
    error: Option<SampleError>,
}

/// Recorded bits of some shots. Bit i of a row is recorded bit i, the registers
/// standing one after another; bit i of a word is 2^i.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub struct Rows {
    /// Number of shots (rows).
    pub shots: usize,
    /// Words a row takes: ⌈bits/64⌉.
    pub words: usize,
    /// The rows one after another, `shots`·`words` words.
    pub bits: Vec<u64>,
}

impl Rows {
    /// Zeros for `shots` rows of `bits` bits.
    pub fn zeros(shots: usize, bits: usize) -> Self {
        let words = bits.div_ceil(64);
        Rows {
            shots,
            words,
            bits: vec![0; shots * words],
        }
    }

    /// Bit `bit` of row `shot`.
    pub fn get(&self, shot: usize, bit: usize) -> bool {
        self.bits[shot * self.words + bit / 64] >> (bit % 64) & 1 == 1
    }

    /// Sets bit `bit` of row `shot` to 1.
    pub fn set(&mut self, shot: usize, bit: usize) {
        self.bits[shot * self.words + bit / 64] |= 1 << (bit % 64);
    }
}

/// Draws shots of a program.
pub struct Sampler<'p> {
    program: &'p Program,
    sparsifier: &'p Sparsifier,
    recorded: Vec<u32>,
    seed: u64,
    room: usize,
    keep_events: bool,
    drawing: Drawing,
}

/// What is drawn of the sites for a shot.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Drawing {
    /// Members only, for exact registers.
    Members,
    /// Members and so many terms.
    Terms(usize),
    /// One term of weight 1.
    Companion,
}

/// What one thread needs for a shot.
struct Worker<'p, R> {
    machine: Machine<'p>,
    register: R,
    draw: Draw,
}

impl<'p> Sampler<'p> {
    /// A sampler that records the given classical bits of each shot, for
    /// registers with room for `room` active qubits.
    pub fn new(
        program: &'p Program,
        sparsifier: &'p Sparsifier,
        recorded: Vec<u32>,
        seed: u64,
        room: usize,
        keep_events: bool,
        drawing: Drawing,
    ) -> Self {
        Sampler {
            program,
            sparsifier,
            recorded,
            seed,
            room,
            keep_events,
            drawing,
        }
    }

    /// 64-bit words a shot in a block.
    pub fn words(&self) -> usize {
        self.recorded.len().div_ceil(64)
    }

    /// Draws the shots of `range` and hands finished blocks to `sink` in order.
    /// Returns how many shots were handed on: fewer than asked for only if
    /// `interrupt` was raised. After an error all shots before it have been handed
    /// on.
    pub fn sample<R, E>(
        &self,
        family: Family,
        range: std::ops::Range<u64>,
        make: impl Fn() -> R + Sync,
        interrupt: &Interrupt,
        progress: &mut dyn Progress,
        mut sink: impl FnMut(&Block) -> Result<(), E>,
    ) -> Result<u64, E>
    where
        R: Register + Send,
        E: From<SampleError>,
    {
        let pool: Mutex<Vec<Worker<'p, R>>> = Mutex::new(Vec::new());
        let threads = rayon::current_num_threads().max(1) as u64;
        let mut size = 1u64;
        let mut next = range.start;
        while next < range.end && !interrupt.raised() {
            let started = Instant::now();
            let left = range.end - next;
            // An interruption loses what is past the first unfinished chunk: with
            // slow shots no more than what the other threads have in hand.
            let chunks = if size == 1 { threads } else { 4 * threads };
            let starts: Vec<u64> = (0..chunks.min(left.div_ceil(size)))
                .map(|chunk| next + chunk * size)
                .collect();
            let blocks: Vec<Block> = starts
                .par_iter()
                .map(|&first| {
                    let taken = lock(&pool).pop();
                    let mut worker = taken.unwrap_or_else(|| self.worker(make()));
                    let shots = size.min(range.end - first);
                    let asked = first..first + shots;
                    let block = self.block(family, asked, range.start, &mut worker, interrupt);
                    lock(&pool).push(worker);
                    block
                })
                .collect();
            let mut done = 0;
            for (block, &first) in blocks.into_iter().zip(&starts) {
                let attempts = block
                    .audit
                    .iter()
                    .map(|shot| u64::from(shot.attempts))
                    .sum();
                sink(&block)?;
                done += block.rows.shots as u64;
                let peak = block.audit.iter().map(|shot| shot.peak_active).max();
                progress.active(peak.unwrap_or(0));
                progress.advance(block.rows.shots as u64, attempts);
                if let Some(error) = block.error {
                    return Err(error.into());
                }
                if (block.rows.shots as u64) < size.min(range.end - first) {
                    return Ok(next + done - range.start);
                }
            }
            next += done;
            let seconds = started.elapsed().as_secs_f64().max(1e-6);
            let wanted = size as f64 * BATCH_SECONDS / seconds;
            size = (wanted as u64).clamp(1, (4 * size).min(BATCH_MOST));
        }
        Ok(next - range.start)
    }

    fn worker<R: Register>(&self, register: R) -> Worker<'p, R> {
        Worker {
            machine: Machine::new(self.program, self.room, self.keep_events),
            register,
            draw: Draw::new(),
        }
    }

    /// Draws the shots asked for, fewer if interrupted; events count shots from
    /// `start`.
    fn block<R: Register>(
        &self,
        family: Family,
        asked: std::ops::Range<u64>,
        start: u64,
        worker: &mut Worker<'p, R>,
        interrupt: &Interrupt,
    ) -> Block {
        let rows = Rows {
            words: self.words(),
            ..Rows::default()
        };
        let mut block = Block {
            first: asked.start,
            rows,
            ..Block::default()
        };
        for index in asked {
            if interrupt.raised() {
                break;
            }
            match self.shot(family, index, worker, interrupt) {
                Ok(Some(audit)) => self.record(index - start, audit, &worker.machine, &mut block),
                Ok(None) => break,
                Err(error) => {
                    block.error = Some(error);
                    break;
                }
            }
        }
        block
    }

    /// Draws one shot until it is accepted; none if interrupted.
    fn shot<R: Register>(
        &self,
        family: Family,
        index: u64,
        worker: &mut Worker<'p, R>,
        interrupt: &Interrupt,
    ) -> Result<Option<ShotAudit>, SampleError> {
        let mut rng = random::generator(self.seed, family, index);
        let Worker {
            machine,
            register,
            draw,
        } = worker;
        for attempts in 1..=MAX_ATTEMPTS {
            match self.drawing {
                Drawing::Members => self.sparsifier.draw_members(&mut rng, draw),
                Drawing::Terms(terms) => {
                    self.sparsifier.draw_members(&mut rng, draw);
                    self.sparsifier.draw_terms(terms, &mut rng, draw);
                }
                Drawing::Companion => self.sparsifier.draw_companion(&mut rng, draw),
            }
            if machine.attempt(register, draw, &mut rng, interrupt)? {
                return Ok(Some(ShotAudit {
                    attempts,
                    peak_active: machine.peak_active() as u16,
                    register: register.diagnostics(),
                }));
            }
            if interrupt.raised() {
                return Ok(None);
            }
        }
        Err(SampleError::NeverAccepted {
            shot: index,
            attempts: MAX_ATTEMPTS,
        })
    }

    /// Appends a finished shot to a block.
    fn record(&self, shot: u64, audit: ShotAudit, machine: &Machine<'_>, block: &mut Block) {
        let Rows { shots, words, bits } = &mut block.rows;
        let start = bits.len();
        bits.resize(start + *words, 0);
        for (position, &bit) in self.recorded.iter().enumerate() {
            if machine.bit(bit) {
                bits[start + position / 64] |= 1 << (position % 64);
            }
        }
        block.faults.extend(
            machine
                .events()
                .iter()
                .map(|&(location, pauli)| FaultEvent {
                    shot,
                    location,
                    pauli,
                }),
        );
        block.audit.push(audit);
        *shots += 1;
    }
}

fn lock<T>(mutex: &Mutex<T>) -> std::sync::MutexGuard<'_, T> {
    mutex
        .lock()
        .unwrap_or_else(|poisoned| poisoned.into_inner())
}
