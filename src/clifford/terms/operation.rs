//! Operations on all terms, as data: what a [`sweep`](super::sweep) does to each
//! term while it has it in hand.

use num_complex::Complex64;

use super::Mask;
use super::quadratic::QuadraticPhase;
use crate::magic::Stabiliser;

/// Bits of all terms side by side: bit j mod 64 of word j / 64 of a plane belongs
/// to the term labelled j.
#[derive(Debug, Clone, Copy)]
pub struct Planes<'a> {
    /// The planes one after another.
    pub bits: &'a [u64],
    /// Words of a plane.
    pub words: usize,
}

impl Planes<'_> {
    /// No planes.
    pub const NONE: Planes<'static> = Planes {
        bits: &[],
        words: 0,
    };

    /// The number whose bit c is that of plane `first` + c.
    #[inline(always)]
    pub(super) fn number(&self, first: u32, planes: u8, label: u32) -> usize {
        let place = label as usize / 64;
        let mut number = 0;
        for plane in 0..usize::from(planes) {
            let word = self.bits[(first as usize + plane) * self.words + place];
            number |= ((word >> (label % 64) & 1) as usize) << plane;
        }
        number
    }
}

/// Something that is the same for all terms or depends on a few bits of each.
#[derive(Debug, Clone, Copy)]
pub enum Chosen<T, const N: usize = 2> {
    /// The same for all terms.
    Same(T),
    /// The entry of the table that some planes say.
    By {
        /// The first plane.
        first: u32,
        /// How many planes, at most log₂ N.
        planes: u8,
        /// By the number the planes spell, plane `first` its lowest bit.
        table: [T; N],
    },
}

impl<T: Copy, const N: usize> Chosen<T, N> {
    #[inline(always)]
    pub(super) fn of(&self, planes: &Planes<'_>, label: u32) -> T {
        match *self {
            Chosen::Same(value) => value,
            Chosen::By {
                first,
                planes: count,
                ref table,
            } => table[planes.number(first, count, label) & (N - 1)],
        }
    }
}

/// e^{iπ/4·eighths}·diag(1, i^power).
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct Turn {
    /// Power of i, 0 to 3.
    pub power: u8,
    /// 0 to 7.
    pub eighths: u8,
}

/// A factor of a term that waits for the slot it belongs to.
#[derive(Debug, Clone, Copy)]
pub struct Release {
    /// The state the slot takes.
    pub state: Stabiliser,
    /// What the weight is multiplied by.
    pub factor: Complex64,
    /// Whether the factor that waited was 0 and now counts no longer.
    pub unblock: bool,
}

/// One operation on every term. Slots are below the capacity.
#[derive(Debug, Clone, Copy)]
pub enum Operation<const W: usize> {
    /// Idle |0⟩ becomes |+⟩.
    Plus {
        /// The slot.
        slot: usize,
    },
    /// Idle |0⟩ becomes a stabiliser state, and a factor that waited is settled.
    Prepare {
        /// The slot.
        slot: usize,
        /// State and factor.
        release: Chosen<Release, 4>,
    },
    /// CNOT between two different slots.
    ControlledNot {
        /// Control.
        control: usize,
        /// Target.
        target: usize,
    },
    /// A diagonal gate on one slot.
    Diagonal {
        /// The slot.
        slot: usize,
        /// The gate.
        turn: Chosen<Turn>,
    },
    /// A phase.
    Phase {
        /// Power of e^{iπ/4}.
        eighths: Chosen<u8>,
    },
    /// Signs quadratic in three bits.
    Quadratic {
        /// The slots.
        slots: [usize; 3],
        /// The signs.
        phase: Chosen<QuadraticPhase, 8>,
    },
    /// (1 + i^phase·X^x Z^z)/√2, see [`super::Terms::primitive`].
    Primitive {
        /// Power of i.
        phase: u8,
        /// X part.
        x: Mask<W>,
        /// Z part.
        z: Mask<W>,
    },
    /// X on a slot.
    Flip {
        /// The slot.
        slot: usize,
    },
    /// Projection on Z = (−1)^value, not normalised, where chosen.
    Project {
        /// The slot.
        slot: usize,
        /// The value.
        value: bool,
        /// Whether it is done.
        when: Chosen<bool>,
    },
    /// Projection on |value⟩, after which the slot is idle in |0⟩.
    Measured {
        /// The slot.
        slot: usize,
        /// The value.
        value: bool,
    },
    /// A factor common to all terms.
    Scale(f64),
}

/// A unitary (1 + i^phase·X^x Z^z)/√2 about to come: Q² = −1 and x ≠ 0.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Candidate<const W: usize> {
    /// Power of i.
    pub phase: u8,
    /// X part.
    pub x: Mask<W>,
    /// Z part.
    pub z: Mask<W>,
}

/// What became of a candidate.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Resolved<const W: usize> {
    /// The candidate of the sweep before.
    pub candidate: Candidate<W>,
    /// Whether X^x comes first, so that |x⟩ is what |0⟩ was.
    pub moved: bool,
}

/// Sums of amplitudes over all terms, just before a candidate.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Sums {
    /// Σ ⟨0|φ⟩.
    pub here: Complex64,
    /// Σ ⟨x|φ⟩.
    pub there: Complex64,
}
