//! What a shot of `dense` would cost where a whole one takes too long: passes
//! over a smaller register, timed one by one and scaled by 2^r.

use std::time::Instant;

use num_complex::Complex64;
use rand::SeedableRng;
use rayon::prelude::*;

use crate::magic::Draw;
use crate::program::{MAX_SLOTS, Primitive};
use crate::readout::dense::Dense;
use crate::readout::{Interrupt, Register, ShotRng};

use super::profile::{Pass, Profile};

/// Active qubits of the register that is timed: 32 MiB, more than caches hold
/// for one core.
const TIMED_ACTIVE: usize = 21;

/// Nanoseconds a pass takes whatever the register, for the first guess alone.
const OVERHEAD: f64 = 20.0;

/// A first guess: seconds a shot on one thread.
pub(super) fn guess(profile: &Profile) -> f64 {
    let passes = profile.passes.iter();
    let nanoseconds: f64 = passes
        .map(|&(_, active)| OVERHEAD + 1.5 * f64::from(active).exp2())
        .sum();
    nanoseconds * 1e-9
}

/// Seconds one amplitude takes in each kind of pass, all threads at work; as
/// wall-clock seconds over the threads. `None` if stopped.
pub(super) struct Passes {
    seconds: [f64; 6],
}

impl Passes {
    /// Times every kind of pass on all threads, on registers of at most
    /// `active` qubits.
    pub(super) fn measure(active: usize, stop: &Interrupt) -> Option<Self> {
        let active = active.min(TIMED_ACTIVE);
        let threads = rayon::current_num_threads().max(1);
        let per_thread: Vec<Option<[f64; 6]>> = (0..threads)
            .into_par_iter()
            .with_max_len(1)
            .map(|_| one_thread(active, stop))
            .collect();
        let mut seconds = [0.0; 6];
        for found in per_thread {
            let found = found?;
            for (sum, value) in seconds.iter_mut().zip(found) {
                *sum += value / (threads * threads) as f64;
            }
        }
        Some(Passes { seconds })
    }

    /// Wall-clock seconds a shot.
    pub(super) fn predict(&self, profile: &Profile) -> f64 {
        let cost = |&(pass, active): &(Pass, u16)| {
            self.seconds[pass as usize] * f64::from(active).exp2()
                + OVERHEAD * 1e-9 / rayon::current_num_threads().max(1) as f64
        };
        profile.passes.iter().map(cost).sum()
    }
}

fn one_thread(active: usize, stop: &Interrupt) -> Option<[f64; 6]> {
    let slots = active.max(2);
    let mut register = Dense::new(&[], slots);
    let mut rng = ShotRng::from_seed([7; 32]);
    let draw = Draw::new();
    register.start(&draw, &mut rng);
    for slot in 0..slots - 1 {
        register.plus(slot as u16, &mut rng);
    }
    let last = slots as u16 - 1;
    debug_assert!(usize::from(last) < MAX_SLOTS);
    let amplitudes = (slots as f64).exp2();
    let mut x = [0u64; 4];
    x[0] = (1 << slots) - 1;
    // An even number of Y letters and one i: the string squares to −1.
    let primitive = Primitive {
        phase: 1,
        x,
        z: [0b11, 0, 0, 0],
    };
    // Once without the clock, so that no page is fresh.
    register.plus(last, &mut rng);
    register.primitive(&primitive, &mut rng);
    register.measure(last, &mut rng)?;
    let mut seconds = [0.0; 6];
    let mut time = |pass: Pass, work: &mut dyn FnMut(&mut Dense<'_>)| {
        let started = Instant::now();
        work(&mut register);
        seconds[pass as usize] = started.elapsed().as_secs_f64() / amplitudes;
        !stop.raised()
    };
    let mut outcomes = ShotRng::from_seed([9; 32]);
    let finished = time(Pass::Join, &mut |r| r.plus(last, &mut rng))
        && time(Pass::Primitive, &mut |r| {
            r.primitive(&primitive, &mut outcomes)
        })
        && time(Pass::ControlledNot, &mut |r| r.controlled_not(0, last))
        && time(Pass::Phase, &mut |r| r.quarter_turn(1, false))
        && time(Pass::Sign, &mut |r| r.controlled_z(0, last))
        && time(Pass::Measure, &mut |r| {
            r.measure(0, &mut outcomes);
        });
    // Kept from being thought unused.
    std::hint::black_box(register.amplitudes().first().copied() == Some(Complex64::ZERO));
    finished.then_some(seconds)
}
