//! From a noisy circuit to sites: fewer of them, and cheaper ones.
//!
//! Four exact rewrites, in this order, on the instructions of the circuit
//! threaded along their qubits ([`timeline`]):
//!
//! 1. [`rotations`]: neighbouring rotations about one axis add up, and what is
//!    left of every angle is folded to (0, π/2) by quarter turns.
//! 2. [`unobserved`]: what happens to one qubit alone just before it is reset
//!    is seen by nobody and goes.
//! 3. [`prepare`]: the beginning of a qubit's life, as long as it is alone,
//!    becomes one prepared state.
//! 4. [`merge`]: Pauli noise that dephases a site about its own axis moves into
//!    the site, which lowers the extent.
//!
//! [`emit`] writes the schedule down. None of the rewrites changes the joint
//! distribution of the recorded bits. This module knows the noisy circuit and
//! the ensembles, and nothing of frames or terms.

mod axis;
mod emit;
mod merge;
mod prepare;
mod rotations;
#[cfg(test)]
pub(crate) mod tests;
mod timeline;
mod unobserved;
mod walk;

use crate::noise::NoisyCircuit;

use super::Schedule;
pub(super) use rotations::quarters_and_rest;
use timeline::Timeline;

/// What [`schedule()`] may do.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct ScheduleOptions {
    /// Whether noise moves into sites. If not, every channel is kept as it
    /// stands, amplitude damping on fresh qubits included; only what a fresh
    /// qubit sees before its first channel may become a prepared site.
    pub absorb: bool,
}

impl Default for ScheduleOptions {
    fn default() -> Self {
        ScheduleOptions { absorb: true }
    }
}

/// Turns the non-Clifford gates of a noisy circuit on `circuit_qubits` qubits
/// into sites.
///
/// The time taken grows in proportion to the number of instructions.
pub fn schedule(
    circuit: &NoisyCircuit,
    circuit_qubits: usize,
    options: &ScheduleOptions,
) -> Schedule {
    let mut timeline = Timeline::new(circuit, circuit_qubits);
    rotations::add_up(&mut timeline);
    rotations::fold(&mut timeline);
    unobserved::remove(&mut timeline);
    prepare::collect(&mut timeline, options.absorb);
    if options.absorb {
        merge::absorb(&mut timeline);
    }
    emit::emit(timeline)
}
