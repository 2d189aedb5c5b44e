//! Magic: the non-Clifford places ("sites") of a noisy circuit.
//!
//! [`schedule()`] folds angles to (0, π/2), merges noise into sites, collects
//! fresh qubits into prepared sites, and gives every site its equal-extent
//! ensemble with each member split into stabiliser components. Theory: PRX
//! Quantum 2, 010345 (2021); Quantum 3, 181 (2019).
//!
//! This module knows the noisy circuit, and nothing of frames or terms.

pub mod bloch;
mod ccz;
mod ensemble;
pub mod extent;
pub mod mixing;
mod prepared;
mod rotation;
pub(crate) mod schedule;
pub mod site;
pub mod sparsify;
mod splitting;
mod written;

use std::sync::Arc;

use crate::circuit::{BitExpression, Clifford, PauliProduct};
use crate::noise::{PauliChannel, ReadoutFlip};

pub use ccz::CczComponent;
pub use schedule::{ScheduleOptions, schedule};
pub use site::{
    CczSite, PreparedMember, PreparedSite, RotationMember, RotationSite, Site, SiteKind, Stabiliser,
};
pub use sparsify::{Components, Draw, Sparsifier, draw_plane};
pub use written::{Written, as_written};

/// A noisy circuit whose non-Clifford gates have become sites.
#[derive(Debug, Clone)]
pub struct Schedule {
    /// What happens, in order.
    pub instructions: Vec<Instruction>,
    /// The sites, in order of first use. Some may turn out not to matter when
    /// the circuit is compiled (deterministic axis).
    pub sites: Vec<Site>,
}

/// One step of a schedule.
#[derive(Debug, Clone)]
pub struct Instruction {
    /// What is done.
    pub kind: Kind,
    /// The classical bit that must be 1 for it to happen, if any.
    pub condition: Option<u32>,
    /// Index of the circuit operation it comes from.
    pub operation: u32,
}

/// What a scheduled instruction does.
#[derive(Debug, Clone)]
pub enum Kind {
    /// A Clifford gate.
    Clifford(Clifford),
    /// The site of this index: for [`SiteKind::Rotation`] on `axes[0]`, for
    /// [`SiteKind::Ccz`] on the Z of its three qubits.
    Gate {
        /// Index into [`Schedule::sites`].
        site: u32,
        /// One Pauli axis for a rotation, three for a CCZ.
        axes: Vec<PauliProduct>,
    },
    /// The qubit, known to be fresh (|0⟩, in a product with everything else),
    /// takes the state of a [`SiteKind::Prepared`] site.
    Prepare {
        /// Index into [`Schedule::sites`].
        site: u32,
        /// The qubit.
        qubit: u32,
    },
    /// A measurement of Z.
    Measure {
        /// The qubit.
        qubit: u32,
        /// Where the recorded outcome goes; nowhere if discarded.
        bit: Option<u32>,
        /// Chance that the recorded bit is flipped.
        flip: ReadoutFlip,
    },
    /// Reset to |0⟩.
    Reset {
        /// The qubit.
        qubit: u32,
    },
    /// Classical assignment.
    Assign {
        /// The bit written.
        bit: u32,
        /// Its new value.
        value: Arc<BitExpression>,
    },
    /// A random Pauli, what is left of it after merging.
    Pauli(PauliChannel),
    /// Amplitude damping met after the qubit was entangled or measured.
    Damping {
        /// The qubit.
        qubit: u32,
        /// Decay probability, from 0 (exclusive) to 1.
        gamma: f64,
    },
}
