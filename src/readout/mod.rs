//! Read-outs: the ways a register holds |Ω⟩ and gives up outcomes.
//!
//! A [`Register`] follows the steps of a compiled program on the active qubits.
//! [`dense`] holds all amplitudes of one drawn member exactly; [`probe`] holds
//! stabiliser terms and measures by fast norm estimation; [`walk`] holds terms
//! and one sample of the basis that walks with the circuit; [`norm`] holds terms
//! to audit the norm of their sum, and reads nothing out. The loop over steps
//! is not here: one loop drives every register.
//!
//! This module knows sites, terms and primitives, and nothing of circuits,
//! faults, classical bits or files.

pub mod choice;
pub mod dense;
pub mod norm;
pub mod probe;
pub mod walk;

use std::sync::atomic::{AtomicBool, Ordering};

use num_complex::Complex64;
use rand_pcg::Pcg64Dxsm;

use crate::magic::Draw;
use crate::program::Primitive;

/// 1, i, −1, −i.
const I_POWERS: [Complex64; 4] = [
    Complex64::new(1.0, 0.0),
    Complex64::new(0.0, 1.0),
    Complex64::new(-1.0, 0.0),
    Complex64::new(0.0, -1.0),
];

/// A mask of a primitive in as many words as the terms have.
fn wide<const W: usize>(mask: &[u64; 4]) -> [u64; W] {
    std::array::from_fn(|word| mask[word])
}

/// The generator of a shot.
pub type ShotRng = Pcg64Dxsm;

/// A shot's active qubits. Slots not in use are idle in |0⟩.
///
/// `flipped` says that the sign of the slot's axis is −: the gate D(x) acts as
/// D(x⊕1).
pub trait Register {
    /// Begins a shot: every slot idle, sites as drawn. False: the shot must be
    /// drawn anew.
    fn start(&mut self, draw: &Draw, rng: &mut ShotRng) -> bool;

    /// An idle slot becomes active in |+⟩.
    fn plus(&mut self, slot: u16, rng: &mut ShotRng);

    /// An idle slot becomes active in the drawn state of a prepared site.
    fn prepare(&mut self, slot: u16, site: u32, draw: &Draw);

    /// The unitary (1 + i^a·Q)/√2.
    fn primitive(&mut self, primitive: &Primitive, rng: &mut ShotRng);

    /// CNOT.
    fn controlled_not(&mut self, control: u16, target: u16);

    /// The drawn gate of a rotation site.
    fn rotate(&mut self, slot: u16, site: u32, flipped: bool, draw: &Draw, rng: &mut ShotRng);

    /// diag(1, i), or diag(i, 1) if flipped.
    fn quarter_turn(&mut self, slot: u16, flipped: bool);

    /// A CCZ site.
    fn ccz(&mut self, slots: [u16; 3], flipped: [bool; 3], site: u32, draw: &Draw);

    /// A site that is not executed in this shot. It counts in the extent all the
    /// same: its components act as they would on |0⟩.
    fn skip(&mut self, site: u32, draw: &Draw, rng: &mut ShotRng);

    /// Controlled Z between two slots.
    fn controlled_z(&mut self, a: u16, b: u16);

    /// Z on a slot.
    fn z(&mut self, slot: u16);

    /// Measures Z of a slot and makes it idle. None: the shot must be drawn
    /// anew.
    fn measure(&mut self, slot: u16, rng: &mut ShotRng) -> Option<bool>;

    /// Amplitude damping along ±Z of a slot with decay probability `gamma`.
    /// Returns whether it decayed; then the register is left projected on the
    /// value 1, and the caller flips it. None: the shot must be drawn anew.
    fn damp(&mut self, slot: u16, flipped: bool, gamma: f64, rng: &mut ShotRng) -> Option<bool>;

    /// Ends a shot. False: it must be drawn anew.
    fn finish(&mut self, rng: &mut ShotRng) -> bool;

    /// What there is to tell of the shot.
    fn diagnostics(&self) -> Diagnostics;
}

/// What a register tells of a finished shot.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub struct Diagnostics {
    /// Terms that were not projected to zero; 0 where there are no terms.
    pub terms_left: u32,
    /// Whether an acceptance ratio had to be clipped to 1.
    pub clipped: bool,
}

/// A flag that asks running work to stop at the next shot.
#[derive(Debug, Default)]
pub struct Interrupt(AtomicBool);

impl Interrupt {
    /// A flag not yet raised.
    pub const fn new() -> Self {
        Interrupt(AtomicBool::new(false))
    }

    /// Asks the work to stop.
    pub fn raise(&self) {
        self.0.store(true, Ordering::Relaxed);
    }

    /// Whether the work was asked to stop.
    pub fn raised(&self) -> bool {
        self.0.load(Ordering::Relaxed)
    }
}
