//! The steps a shot is made of.

use std::sync::Arc;

use crate::circuit::BitExpression;
use crate::noise::ReadoutFlip;

use super::flips::SetId;

/// Index of a reading within its segment: a sign that faults and outcomes may
/// flip.
pub type Reading = u32;

/// (1 + i^phase · X^x Z^z)/√2 on the active register; bit s of the masks is
/// slot s. It is unitary: the string squares to −1.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Primitive {
    /// Power of i.
    pub phase: u8,
    /// Slots with an X part.
    pub x: [u64; 4],
    /// Slots with a Z part.
    pub z: [u64; 4],
}

/// Where the outcome of a measurement goes.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Outcome {
    /// The classical bit, if it is recorded.
    pub bit: Option<u32>,
    /// Readout error of the recorded bit.
    pub flip: ReadoutFlip,
    /// Location of the readout error, if there is one.
    pub location: Option<u32>,
}

/// One factor of a CCZ whose axes are not independent: the parity of some
/// slots and a reading.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct AffineInput {
    /// Slots, as positions among [`Step::Quadratic`]'s slots (bit 0 and 1).
    pub slots: u8,
    /// The sign.
    pub reading: Reading,
}

/// One step. Slots are positions in the active register.
#[derive(Debug, Clone, PartialEq)]
pub enum Step {
    /// A measurement whose outcome is a fair coin; 1 flips `flips`.
    Coin {
        /// Its sign; none for a reset.
        reading: Option<Reading>,
        /// What a raw outcome 1 flips.
        flips: SetId,
        /// Where the outcome goes.
        outcome: Outcome,
    },
    /// A measurement whose outcome is its reading.
    Known {
        /// Its value.
        reading: Reading,
        /// Where it goes.
        outcome: Outcome,
    },
    /// An idle slot becomes active in |+⟩.
    Activate {
        /// The slot.
        slot: u16,
    },
    /// An idle slot takes the state of a prepared site.
    Prepare {
        /// The slot.
        slot: u16,
        /// The site.
        site: u32,
    },
    /// The primitive of this index.
    Primitive(u32),
    /// CNOT between slots.
    ControlledNot {
        /// Control.
        control: u16,
        /// Target.
        target: u16,
    },
    /// A rotation site about Z of a slot, its sign the reading.
    Rotate {
        /// The slot.
        slot: u16,
        /// The site.
        site: u32,
        /// Sign of the axis.
        reading: Reading,
        /// The bit that must be 1.
        condition: Option<u32>,
    },
    /// A site that has no effect on this path but counts in the extent.
    Skip {
        /// The site.
        site: u32,
    },
    /// exp(−iπZ/4) on a slot, its sign the reading, under a condition.
    QuarterTurn {
        /// The slot.
        slot: u16,
        /// Sign of the axis.
        reading: Reading,
        /// The bit that must be 1.
        condition: u32,
    },
    /// A CCZ site on three different slots.
    Ccz {
        /// The slots.
        slots: [u16; 3],
        /// Signs of the axes.
        readings: [Reading; 3],
        /// The site.
        site: u32,
        /// The bit that must be 1.
        condition: Option<u32>,
    },
    /// A CCZ whose axes are known or dependent: a Clifford that depends on
    /// signs, −1 where all three inputs are 1.
    Quadratic {
        /// At most two slots that the inputs are made of.
        slots: [Option<u16>; 2],
        /// The inputs.
        inputs: [AffineInput; 3],
        /// The bit that must be 1.
        condition: Option<u32>,
    },
    /// Z of a slot is measured and the slot becomes idle; a raw 1 flips
    /// `flips`.
    Measure {
        /// The slot.
        slot: u16,
        /// Its sign; none for a reset.
        reading: Option<Reading>,
        /// What a raw outcome 1 flips.
        flips: SetId,
        /// Where the outcome goes.
        outcome: Outcome,
    },
    /// Amplitude damping along Z of a slot; a decay flips `flips`.
    Damp {
        /// The slot.
        slot: u16,
        /// Sign of the axis.
        reading: Reading,
        /// Decay probability.
        gamma: f64,
        /// What a decay flips.
        flips: SetId,
        /// Location of the damping.
        location: u32,
    },
    /// Amplitude damping of a qubit whose value is its reading.
    DampKnown {
        /// Its value.
        reading: Reading,
        /// Decay probability.
        gamma: f64,
        /// What a decay flips.
        flips: SetId,
        /// Location of the damping.
        location: u32,
    },
    /// A classical assignment.
    Assign {
        /// The bit written.
        bit: u32,
        /// Its value.
        value: Arc<BitExpression>,
        /// The bit that must be 1.
        condition: Option<u32>,
    },
    /// A Pauli under a condition.
    Flip {
        /// The bit that must be 1.
        condition: u32,
        /// What it flips.
        flips: SetId,
    },
    /// A random Pauli under a condition.
    Fault {
        /// The bit that must be 1.
        condition: u32,
        /// Index into the segment's places.
        place: u32,
    },
}

impl Step {
    /// The site the step uses, if any.
    pub(super) fn site_mut(&mut self) -> Option<&mut u32> {
        match self {
            Step::Skip { site }
            | Step::Prepare { site, .. }
            | Step::Rotate { site, .. }
            | Step::Ccz { site, .. } => Some(site),
            _ => None,
        }
    }

    /// The flip set of the step, if it has one.
    pub(super) fn flips_mut(&mut self) -> Option<&mut SetId> {
        match self {
            Step::Coin { flips, .. }
            | Step::Measure { flips, .. }
            | Step::Damp { flips, .. }
            | Step::DampKnown { flips, .. }
            | Step::Flip { flips, .. } => Some(flips),
            _ => None,
        }
    }
}
