//! Exact distributions of small circuits, by density matrices.
//!
//! [`ideal`] is the distribution of the recorded bits of a noisy circuit,
//! straight from its instructions: nothing of sites, frames or terms is used,
//! so that it can judge all of them. [`companion`] is that of the companion
//! circuit, from the schedule a program was compiled from: every site that
//! matters is replaced by its components, ρ → Σ p·Σ_b (|c_b|/Σ|c|)·D_b·ρ·D_b†,
//! p the chances of its members. The mixing law ([`Law::mixed`]) puts the two
//! together.
//!
//! [`fit`] tests drawn values against such laws.
//!
//! A qubit joins at its first use and is traced out after its last one; there
//! is one matrix for every value of the classical bits that are still needed.
//! What is too large is refused with the number found and the number allowed.
//!
//! This module knows noisy circuits and programs, and nothing of how shots are
//! drawn.

mod companion;
mod evaluate;
pub mod fit;
mod ideal;
mod law;
mod lives;
mod matrix;
mod operation;
pub mod tail;
#[cfg(test)]
mod tests;

pub use companion::companion;
pub use ideal::ideal;
pub use law::Law;

/// Most qubits in use at once: a matrix of 4^12 entries of 16 bytes is 256 MiB.
pub const MAX_QUBITS: usize = 12;

/// Most matrix entries over all branches together.
pub const MAX_ENTRIES: usize = 1 << 24;

/// Most branches: values of the bits still needed, and outcomes at the end.
pub const MAX_BRANCHES: usize = 1 << 20;

/// Most entries computed, all operations together: minutes to an hour.
const MAX_WORK: f64 = (1u64 << 38) as f64;

/// Why there is no exact distribution.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum ExactError {
    /// Too many qubits in use at once.
    #[error(
        "the circuit keeps {found} qubits in use at once, an exact distribution takes at most \
         {MAX_QUBITS}: use fewer qubits, or measure or reset some before others come into use"
    )]
    TooManyQubits {
        /// Most qubits in use at once.
        found: usize,
    },
    /// Too many values of the bits still needed.
    #[error(
        "at least {found} values of the bits that are recorded or read later have to be told \
         apart while {qubits} qubits are in use; an exact distribution takes at most {} then, and \
         at most {MAX_BRANCHES} ever: record fewer bits (output registers), or use fewer qubits \
         at once", most_branches(*.qubits)
    )]
    TooManyBranches {
        /// How many were found before giving up.
        found: usize,
        /// Qubits in use then.
        qubits: usize,
    },
    /// Too many operations on large matrices.
    #[error(
        "{operations} operations on matrices of this size would take hours: use fewer qubits or \
         operations"
    )]
    TooMuchWork {
        /// Number of operations.
        operations: usize,
    },
    /// The companion of a branching program with damping.
    #[error(
        "amplitude damping or relaxation acts on a qubit after it was entangled or measured, in a \
         circuit where a measurement, reset or damping stands under a condition: its companion \
         differs from path to path and has no exact distribution here; choose --readout dense, or \
         take the condition away"
    )]
    BranchingDamping,
    /// The companion of a branching program with a CCZ after the first branch.
    #[error(
        "a ccz, ccx or cswap stands after a measurement, reset or damping under a condition: \
         whether it counts as non-Clifford differs from path to path, and its companion has no \
         exact distribution here; choose --readout dense, or take the condition away"
    )]
    BranchingCcz,
}

fn most_branches(qubits: usize) -> usize {
    (MAX_ENTRIES >> (2 * qubits).min(24)).min(MAX_BRANCHES)
}
