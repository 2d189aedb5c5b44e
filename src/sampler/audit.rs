//! The norm audit: E‖Ω‖² = 1 + (ξ − 1)/k, checked on a few draws of a run.
//!
//! Some shot indices, spread evenly over the whole run and the same in every
//! part of it, get one more draw of terms with a generator of its own, so that
//! no shot changes. It is taken through the program to the first step that
//! reads or damps an active qubit, and its norm is estimated there
//! ([`crate::readout::norm`]). Where the program branches before that, the end
//! of the first segment is the place: it is the same in every shot.

use std::ops::Range;
use std::sync::Mutex;

use rayon::prelude::*;

use crate::magic::mixing::mean_norm;
use crate::magic::{Draw, Sparsifier};
use crate::program::{MAX_SLOTS, Program, Step};
use crate::readout::choice::{Choice, Readout};
use crate::readout::norm::Norm;

use super::machine::Machine;
use super::{Family, Interrupt, SampleError, random};

/// Random states an estimate is made of.
pub const AUDIT_PROBES: usize = 16;

/// Most draws of a run that are audited.
pub const MOST_AUDITED: u64 = 64;

/// The share of a run's time that the audit may take, roughly.
const TIME_SHARE: f64 = 0.03;

/// Estimates of ‖Ω‖² and what their mean should be.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct NormAudit {
    /// Indices of the audited shots, in the whole run.
    pub shots: Vec<u64>,
    /// One estimate of ‖Ω‖² each.
    pub estimates: Vec<f64>,
    /// log of the extent of the sites met before the estimate.
    pub log_extent: f64,
    /// Number of terms k.
    pub terms: u64,
    /// Random states an estimate is made of.
    pub probes: u64,
}

impl NormAudit {
    /// 1 + (ξ − 1)/k.
    pub fn expected(&self) -> f64 {
        mean_norm(self.log_extent, self.terms)
    }
}

/// How many of the `total` shots of a run with terms are audited.
///
/// Costs are those of one term and count from the steps alone, never from the
/// clock, so that every part of a run comes to the same number. The unit is one
/// step of `walk`; a step on terms that are not kept relative to a sample takes
/// about 5, an overlap with a random state about 10.
pub fn audited(program: &Program, choice: &Choice, total: u64) -> u64 {
    const PLAIN_STEP: f64 = 5.0;
    const OVERLAP: f64 = 10.0;
    let steps = &program.first().steps;
    let reads = |step: &Step| matches!(step, Step::Measure { .. } | Step::Damp { .. });
    let early = steps.iter().take_while(|step| !reads(step)).count() as f64;
    let all = steps.len() as f64 + program.sites().len() as f64;
    let estimates = AUDIT_PROBES as f64 * OVERLAP;
    let shot = match (choice.readout, choice.probe) {
        (Readout::Probe, Some(settings)) => {
            let overlaps = program.inner_measurements() as f64 * settings.probes as f64;
            PLAIN_STEP * all + OVERLAP * overlaps
        }
        _ => all,
    };
    let cost = (PLAIN_STEP * early + estimates) / shot.max(1.0);
    let affordable = TIME_SHARE * total as f64 / cost;
    (affordable as u64).min(MOST_AUDITED).min(total)
}

/// Audits those of `range` that are among the `count` audited shots of a run of
/// `total`. Empty if `interrupt` is raised.
///
/// # Errors
///
/// If a draw needs more active qubits than there may be.
pub fn norm_audit(
    program: &Program,
    sparsifier: &Sparsifier,
    seed: u64,
    terms: u64,
    indices: Audited,
    interrupt: &Interrupt,
) -> Result<NormAudit, SampleError> {
    let shots = indices.list();
    let estimates = match program.slots() {
        0..=64 => estimates::<1>(program, sparsifier, seed, terms, &shots, interrupt),
        65..=128 => estimates::<2>(program, sparsifier, seed, terms, &shots, interrupt),
        _ => estimates::<4>(program, sparsifier, seed, terms, &shots, interrupt),
    }?;
    let sites = program.sites();
    let met = program.early_sites();
    let extents = met.iter().map(|&site| sites[site as usize].extent.ln());
    let complete = estimates.len() == shots.len();
    Ok(NormAudit {
        log_extent: extents.sum(),
        shots: if complete { shots } else { Vec::new() },
        estimates: if complete { estimates } else { Vec::new() },
        terms,
        probes: AUDIT_PROBES as u64,
    })
}

/// Which shots are audited.
#[derive(Debug, Clone)]
pub struct Audited {
    /// How many of the whole run.
    pub count: u64,
    /// Shots of the whole run.
    pub total: u64,
    /// Only those in this range.
    pub range: Range<u64>,
}

impl Audited {
    /// Their indices, ⌊j·total/count⌋ for j from 0, cut to the range.
    fn list(&self) -> Vec<u64> {
        let index = |j: u64| {
            let wide = u128::from(j) * u128::from(self.total) / u128::from(self.count.max(1));
            wide as u64
        };
        let indices = (0..self.count).map(index);
        indices.filter(|index| self.range.contains(index)).collect()
    }
}

/// What a thread needs for an estimate.
type Worker<'p, const W: usize> = (Machine<'p>, Norm<'p, W>, Draw);

/// One estimate a shot, fewer if interrupted.
fn estimates<'p, const W: usize>(
    program: &'p Program,
    sparsifier: &Sparsifier,
    seed: u64,
    terms: u64,
    shots: &[u64],
    interrupt: &'p Interrupt,
) -> Result<Vec<f64>, SampleError> {
    let pool: Mutex<Vec<Worker<'p, W>>> = Mutex::new(Vec::new());
    let lock = || pool.lock().unwrap_or_else(|poisoned| poisoned.into_inner());
    let make = || {
        let register = Norm::new(program.sites(), program.slots(), AUDIT_PROBES, interrupt);
        (
            Machine::new(program, MAX_SLOTS, false),
            register,
            Draw::new(),
        )
    };
    let estimate = |&index: &u64| {
        let taken = lock().pop();
        let (mut machine, mut register, mut draw) = taken.unwrap_or_else(make);
        let mut rng = random::generator(seed, Family::Audit, index);
        sparsifier.draw_members(&mut rng, &mut draw);
        sparsifier.draw_terms(terms as usize, &mut rng, &mut draw);
        machine.first_segment(&mut register, &draw, &mut rng, interrupt)?;
        let estimate = register.estimate();
        lock().push((machine, register, draw));
        Ok(estimate)
    };
    let found: Vec<Option<f64>> = shots
        .par_iter()
        .with_max_len(1)
        .map(estimate)
        .collect::<Result<_, SampleError>>()?;
    Ok(found.into_iter().flatten().collect())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn parts_audit_what_the_whole_run_does() {
        for (count, total) in [(64, 1000), (64, 64), (3, 10), (1, u64::MAX), (0, 5)] {
            let list = |range| {
                Audited {
                    count,
                    total,
                    range,
                }
                .list()
            };
            let whole = list(0..total);
            assert_eq!(whole.len() as u64, count);
            assert!(whole.windows(2).all(|pair| pair[0] < pair[1]));
            let middle = total / 3;
            assert_eq!([list(0..middle), list(middle..total)].concat(), whole);
        }
    }
}
