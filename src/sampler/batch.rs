//! Many shots on all threads, handed on in order.

use std::collections::BTreeMap;
use std::sync::{Condvar, Mutex, mpsc};
use std::time::Instant;

use crate::magic::{Draw, Sparsifier};
use crate::program::Program;
use crate::readout::Register;

use super::machine::{FaultEvent, Machine, ShotAudit};
use super::random::{self, Family};
use super::{Interrupt, Progress, SampleError};

/// Most draws of one shot before giving up.
const MAX_ATTEMPTS: u32 = 10_000_000;

/// Wall time a chunk of shots should take.
const CHUNK_SECONDS: f64 = 0.03;

/// Most shots of a chunk.
const MOST_SHOTS: u64 = 1 << 14;

/// Chunks a thread may be ahead of the first unfinished one. An interruption loses
/// what is past that.
const CHUNKS_AHEAD: u64 = 2;

/// Shots drawn and not yet handed on at most, where one takes a thread so long.
pub fn most_in_flight(seconds_a_shot: f64, threads: usize) -> f64 {
    let chunk = (CHUNK_SECONDS / seconds_a_shot.max(1e-12)).clamp(1.0, MOST_SHOTS as f64);
    (CHUNKS_AHEAD as f64 + 1.0) * threads as f64 * chunk
}

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

/// Which shots are drawn next, by whoever is free.
struct Queue {
    state: Mutex<QueueState>,
    moved: Condvar,
    threads: u64,
}

struct QueueState {
    next: u64,
    end: u64,
    /// Everything before it has been handed on.
    handed_on: u64,
    /// Shots of a chunk.
    size: u64,
    stopped: bool,
}

impl Queue {
    fn new(range: std::ops::Range<u64>, threads: u64) -> Self {
        Queue {
            state: Mutex::new(QueueState {
                next: range.start,
                end: range.end,
                handed_on: range.start,
                size: 1,
                stopped: false,
            }),
            moved: Condvar::new(),
            threads,
        }
    }

    /// The next chunk; none if all are taken or the work is to stop. Waits while
    /// too many chunks are under way.
    fn take(&self, interrupt: &Interrupt) -> Option<std::ops::Range<u64>> {
        let mut state = lock(&self.state);
        loop {
            if state.stopped || state.next >= state.end || interrupt.raised() {
                return None;
            }
            let ahead = state.next - state.handed_on;
            if ahead < CHUNKS_AHEAD * self.threads * state.size {
                break;
            }
            state = self
                .moved
                .wait(state)
                .unwrap_or_else(|poisoned| poisoned.into_inner());
        }
        // Small ones at the end, so that all threads finish together.
        let share = (state.end - state.next).div_ceil(2 * self.threads);
        let first = state.next;
        state.next += state.size.min(share);
        Some(first..state.next)
    }

    /// A chunk of so many shots took so long.
    fn took(&self, shots: u64, seconds: f64) {
        let wanted = shots as f64 * CHUNK_SECONDS / seconds.max(1e-6);
        let mut state = lock(&self.state);
        let most = (4 * state.size).min(MOST_SHOTS);
        state.size = (wanted as u64).clamp(1, most);
    }

    fn handed_on(&self, next: u64) {
        lock(&self.state).handed_on = next;
        self.moved.notify_all();
    }

    fn stop(&self) {
        lock(&self.state).stopped = true;
        self.moved.notify_all();
    }
}

/// Without it a panic of one thread would leave the others waiting.
struct StopOnPanic<'a>(&'a Queue);

impl Drop for StopOnPanic<'_> {
    fn drop(&mut self) {
        if std::thread::panicking() {
            self.0.stop();
        }
    }
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
        R: Register,
        E: From<SampleError>,
    {
        let threads = rayon::current_num_threads().max(1) as u64;
        let queue = Queue::new(range.clone(), threads);
        let (sender, finished) = mpsc::channel();
        rayon::in_place_scope(|scope| {
            for _ in 0..threads {
                let (sender, queue, make) = (sender.clone(), &queue, &make);
                scope.spawn(move |_| {
                    let _guard = StopOnPanic(queue);
                    let mut worker = self.worker(make());
                    while let Some(asked) = queue.take(interrupt) {
                        let started = Instant::now();
                        let shots = asked.end - asked.start;
                        let block = self.block(family, asked, range.start, &mut worker, interrupt);
                        queue.took(shots, started.elapsed().as_secs_f64());
                        if sender.send((block, shots)).is_err() {
                            break;
                        }
                    }
                });
            }
            drop(sender);
            let done = self.hand_on(&range, &queue, &finished, progress, &mut sink);
            queue.stop();
            done
        })
    }

    /// Hands finished blocks on in order, until the first one that is short.
    fn hand_on<E: From<SampleError>>(
        &self,
        range: &std::ops::Range<u64>,
        queue: &Queue,
        finished: &mpsc::Receiver<(Block, u64)>,
        progress: &mut dyn Progress,
        sink: &mut impl FnMut(&Block) -> Result<(), E>,
    ) -> Result<u64, E> {
        let mut waiting = BTreeMap::new();
        let mut next = range.start;
        while next < range.end {
            let Ok((block, asked)) = finished.recv() else {
                break;
            };
            waiting.insert(block.first, (block, asked));
            while let Some((block, asked)) = waiting.remove(&next) {
                sink(&block)?;
                let shots = block.rows.shots as u64;
                let attempts = |shot: &ShotAudit| u64::from(shot.attempts);
                let peak = block.audit.iter().map(|shot| shot.peak_active).max();
                progress.active(peak.unwrap_or(0));
                progress.advance(shots, block.audit.iter().map(attempts).sum());
                next += shots;
                if let Some(error) = block.error {
                    return Err(error.into());
                }
                if shots < asked {
                    return Ok(next - range.start);
                }
                queue.handed_on(next);
            }
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
