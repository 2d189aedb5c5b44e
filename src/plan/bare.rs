//! The least that a circuit costs which cannot be compiled: one pass over the
//! terms for each of its sites, at the widest terms there are.

use std::time::Instant;

use num_complex::Complex64;
use rayon::prelude::*;

use crate::clifford::terms::Terms;
use crate::program::MAX_SLOTS;

/// What one term costs.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Bare {
    /// Wall-clock seconds of one pass over one term, all threads at work.
    pub seconds: f64,
    /// Bytes of one term.
    pub bytes: f64,
}

/// Times a pass on all threads.
pub fn measure() -> Bare {
    const TERMS: usize = 2048;
    const PASSES: usize = 32;
    let threads = rayon::current_num_threads().max(1);
    let seconds: f64 = (0..threads)
        .into_par_iter()
        .with_max_len(1)
        .map(|_| {
            let mut terms = Terms::<4>::new(MAX_SLOTS);
            terms.reset(&[Complex64::ONE; TERMS]);
            for slot in 0..MAX_SLOTS {
                terms.plus(slot);
            }
            let started = Instant::now();
            for pass in 0..PASSES {
                let mut x = [0u64; 4];
                x[pass & 3] = 0x5555_5555 << (pass / 4);
                // One Y and no factor i: the string squares to −1.
                let mut z = [0u64; 4];
                z[pass & 3] = 1 << (pass / 4);
                terms.primitive(0, &x, &z);
            }
            let seconds = started.elapsed().as_secs_f64();
            std::hint::black_box(terms.amplitude(0, &[0; 4]));
            seconds / (TERMS * PASSES) as f64
        })
        .sum();
    Bare {
        seconds: seconds / (threads * threads) as f64,
        bytes: (Terms::<4>::new(MAX_SLOTS).bytes_per_term() + size_of::<Complex64>()) as f64,
    }
}
