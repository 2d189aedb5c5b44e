//! What this machine allows, and what one primitive takes next to it: one JSON
//! object a line, for `scripts/bench`. `cargo bench --bench limits`.
//!
//! * `copy`: bytes read plus bytes written per second by copying far more than
//!   the caches hold, with one thread and with two.
//! * `count_ones`: 64-bit words counted per second, from a block in the first
//!   cache.
//! * `primitive`: nanoseconds of (1 + i^a·Q)/√2 on one term, random unitary Q, the
//!   terms together in the second cache or far beyond all caches, and the bytes a
//!   term takes. As `walk` does it: one pass that does a primitive and sums the
//!   amplitudes for the next.
//!
//! All are the best of several rounds taken in turns, so that a busy machine
//! disturbs them alike.

use std::hint::black_box;
use std::time::Instant;

use num_complex::Complex64;
use rand::{RngExt, SeedableRng};
use rand_pcg::Pcg64Mcg;
use shottower::clifford::terms::{Candidate, Planes, Resolved, Terms};

const ROUNDS: usize = 25;
/// Words of the block that is copied, a thread: 256 MiB.
const COPY_WORDS: usize = 1 << 25;
/// Words of the block that is counted: 16 KiB.
const COUNT_WORDS: usize = 1 << 11;
const COUNT_REPEATS: usize = 1 << 13;
const SLOTS: [usize; 3] = [10, 20, 40];
/// Terms beyond the caches.
const MANY: usize = 200_000;
/// Bytes of all terms that fit a second cache with room to spare.
const SECOND_CACHE: usize = 1 << 19;
/// Terms that one round of the small case works on, over all repeats.
const SMALL_WORK: usize = 10_000;

fn seconds(work: impl FnOnce()) -> f64 {
    let start = Instant::now();
    work();
    start.elapsed().as_secs_f64()
}

/// Seconds to copy one block per thread, all threads at once.
fn copy(blocks: &mut [(Vec<u64>, Vec<u64>)]) -> f64 {
    seconds(|| {
        std::thread::scope(|scope| {
            for (from, to) in &mut *blocks {
                scope.spawn(|| to.copy_from_slice(black_box(from)));
            }
        });
        black_box(blocks);
    })
}

/// Ones of a block, with the widest vectors there are.
#[multiversion::multiversion(targets(
    "x86_64+avx512f+avx512vl+avx512vpopcntdq+popcnt",
    "x86_64+avx2+popcnt",
    "x86_64+popcnt"
))]
fn ones(block: &[u64]) -> u64 {
    // A plain loop: closures of iterators may stay outside the chosen target.
    let mut total = 0u64;
    for word in block {
        total = total.wrapping_add(u64::from(word.count_ones()));
    }
    total
}

/// Seconds to count the ones of a block in the first cache, many times.
fn count(block: &[u64]) -> f64 {
    seconds(|| {
        let mut total = 0u64;
        for _ in 0..COUNT_REPEATS {
            total += ones(black_box(block));
        }
        black_box(total);
    })
}

/// Terms in random states that fill all slots.
struct Case {
    slots: usize,
    terms: Terms<1>,
    rng: Pcg64Mcg,
    next: Candidate<1>,
    repeats: usize,
    best: f64,
}

impl Case {
    fn new(slots: usize, count: usize) -> Self {
        let mut rng = Pcg64Mcg::seed_from_u64(slots as u64);
        let mut case = Case {
            slots,
            terms: Terms::new(slots),
            next: Self::candidate(slots, &mut rng),
            rng,
            repeats: (SMALL_WORK / count).max(1),
            best: f64::INFINITY,
        };
        case.terms.reset(&vec![Complex64::ONE; count]);
        for slot in 0..slots {
            case.terms.plus(slot);
        }
        for _ in 0..2 * slots {
            let powers: Vec<u8> = (0..count).map(|_| case.rng.random()).collect();
            let slot = case.rng.random_range(0..slots);
            case.terms.diagonal(slot, |label| powers[label as usize]);
            let Candidate { phase, x, z } = Self::candidate(slots, &mut case.rng);
            case.terms.primitive(phase, &x, &z);
        }
        // A pass does the primitive that the pass before looked at.
        case.terms.sweep(None, &[], Planes::NONE, Some(case.next));
        case
    }

    /// A random (1 + i^a·Q)/√2 with Q² = −1 and an X part.
    fn candidate(slots: usize, rng: &mut Pcg64Mcg) -> Candidate<1> {
        let all = (1 << slots) - 1;
        let x = (rng.random::<u64>() & all).max(1);
        let z = rng.random::<u64>() & all;
        let phase = ((x & z).count_ones() + 1) & 1;
        Candidate {
            phase: phase as u8,
            x: [x],
            z: [z],
        }
    }

    /// The primitive that is due, and the sums for one to come.
    fn primitive(&mut self) {
        let due = Resolved {
            candidate: self.next,
            moved: self.rng.random(),
        };
        self.next = Self::candidate(self.slots, &mut self.rng);
        black_box(
            self.terms
                .sweep(Some(due), &[], Planes::NONE, Some(self.next)),
        );
    }

    fn round(&mut self) {
        let taken = seconds(|| (0..self.repeats).for_each(|_| self.primitive()));
        self.best = self
            .best
            .min(taken / (self.repeats * self.terms.len()) as f64);
    }
}

fn main() {
    let block = || (vec![1u64; COPY_WORDS], vec![2u64; COPY_WORDS]);
    let mut one = [block()];
    let mut two = [block(), block()];
    let counted: Vec<u64> = (0..COUNT_WORDS as u64).collect();
    let bytes = Terms::<1>::new(SLOTS[2]).bytes_per_term();
    let mut cases: Vec<Case> = SLOTS
        .into_iter()
        .flat_map(|slots| [SECOND_CACHE / bytes, MANY].map(|count| Case::new(slots, count)))
        .collect();

    let mut best = [f64::INFINITY; 3];
    for _ in 0..ROUNDS {
        let round = [copy(&mut one), copy(&mut two), count(&counted)];
        best = std::array::from_fn(|i| best[i].min(round[i]));
        cases.iter_mut().for_each(Case::round);
    }
    for (threads, taken) in [(1, best[0]), (2, best[1])] {
        let moved = (threads * 2 * COPY_WORDS * size_of::<u64>()) as f64;
        println!(
            r#"{{"figure":"copy","threads":{threads},"bytes_per_second":{:.4e}}}"#,
            moved / taken
        );
    }
    println!(
        r#"{{"figure":"count_ones","words_per_second":{:.4e}}}"#,
        (COUNT_WORDS * COUNT_REPEATS) as f64 / best[2]
    );
    for case in &cases {
        println!(
            r#"{{"figure":"primitive","slots":{},"terms":{},"bytes_per_term":{},"nanoseconds":{:.2}}}"#,
            case.slots,
            case.terms.len(),
            case.terms.bytes_per_term(),
            case.best * 1e9
        );
    }
}
