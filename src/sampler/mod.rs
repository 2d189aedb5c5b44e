//! Shots: one at a time, and many in parallel.
//!
//! [`machine::Machine`] runs the steps of a program on a register: the only
//! loop over steps there is. [`batch`] runs many shots on all threads and hands
//! finished ones on in order. The bits of a shot depend on the seed, its family
//! and its index alone, never on threads, batches or parts. [`drive`] builds the
//! register that was chosen. [`audit`] checks the norm of the drawn sums.
//!
//! This module knows programs and registers, and nothing of files or terminals.

pub mod audit;
pub mod batch;
pub mod drive;
pub mod machine;
pub mod random;
#[cfg(test)]
mod tests;

pub use crate::readout::Interrupt;
pub use audit::NormAudit;
pub use batch::{Block, Drawing, Rows, Sampler};
pub use drive::Drive;
pub use machine::{FaultEvent, ShotAudit, pauli_code};
pub use random::Family;

/// Why shots could not be drawn.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum SampleError {
    /// A later part of the circuit could not be compiled.
    #[error(transparent)]
    Compile(#[from] crate::program::CompileError),
    /// A branch of the circuit needs more active qubits than the register has.
    #[error(
        "a branch of the circuit keeps {found} qubits active at once, the read-out has room for \
         {room}: choose --readout probe"
    )]
    TooManyActive {
        /// What the branch needs.
        found: usize,
        /// What there is.
        room: usize,
    },
    /// A shot was drawn anew too often.
    #[error(
        "shot {shot} was drawn anew {attempts} times without being accepted: use more terms (a \
         larger --terms, or a smaller --delta)"
    )]
    NeverAccepted {
        /// Index of the shot.
        shot: u64,
        /// How often it was drawn.
        attempts: u32,
    },
}

/// Who is told how far the work is. Called from one thread.
pub trait Progress {
    /// So many more shots are done, after so many draws in all.
    fn advance(&mut self, shots: u64, attempts: u64);

    /// The shots told of next had at most so many active qubits at once.
    fn active(&mut self, _peak: u16) {}
}

/// Tells nobody.
pub struct Silent;

impl Progress for Silent {
    fn advance(&mut self, _shots: u64, _attempts: u64) {}
}
