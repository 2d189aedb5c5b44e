//! One shot: the steps of a program, driven on a register.

use std::sync::Arc;

use rand::{Rng, RngExt};

use crate::magic::Draw;
use crate::noise::PauliWord;
use crate::program::{Branch, End, FaultPlace, Outcome, Program, Reading, Segment, SetId, Step};
use crate::readout::{Diagnostics, Register, ShotRng};

use super::{Interrupt, SampleError};

/// A noise event that fired.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct FaultEvent {
    /// Index of the shot, counted from the first one of the call.
    pub shot: u64,
    /// Index into the program's locations.
    pub location: u32,
    /// The Pauli, see [`pauli_code`]; 0 where the event is not a Pauli (the kind
    /// of the location then says what happened).
    pub pauli: u64,
}

/// What is kept about one shot besides its bits.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct ShotAudit {
    /// How often the shot was drawn until it was accepted.
    pub attempts: u32,
    /// Most active qubits at once.
    pub peak_active: u16,
    /// What the register tells.
    pub register: Diagnostics,
}

/// State of a shot besides the register.
pub struct Machine<'p> {
    program: &'p Program,
    /// Flips of the segment's readings, relative to the earlier reading until
    /// the reading is made, absolute from then on.
    flips: Vec<u64>,
    bits: Vec<u64>,
    peak_active: usize,
    room: usize,
    keep_events: bool,
    events: Vec<(u32, u64)>,
}

/// A Pauli word as one number: digit i in base 4 is the letter on qubit i of
/// the location, 0 I, 1 X, 2 Y, 3 Z.
pub fn pauli_code(word: PauliWord) -> u64 {
    (0..32).fold(0, |code, qubit| {
        let x = u64::from(word.x >> qubit & 1);
        let z = u64::from(word.z >> qubit & 1);
        // X is 1, Y is 2, Z is 3.
        code | ((x ^ z) | z << 1) << (2 * qubit)
    })
}

impl<'p> Machine<'p> {
    /// A machine for a program, for registers with room for so many active
    /// qubits.
    pub fn new(program: &'p Program, room: usize, keep_events: bool) -> Self {
        Machine {
            program,
            flips: Vec::new(),
            bits: vec![0; program.bits().div_ceil(64)],
            peak_active: 0,
            room,
            keep_events,
            events: Vec::new(),
        }
    }

    /// Value of a classical bit.
    #[inline]
    pub fn bit(&self, index: u32) -> bool {
        self.bits[index as usize / 64] >> (index % 64) & 1 == 1
    }

    fn set_bit(&mut self, index: u32, value: bool) {
        let mask = 1 << (index % 64);
        let word = &mut self.bits[index as usize / 64];
        *word = if value { *word | mask } else { *word & !mask };
    }

    /// Most active qubits of the last attempt.
    pub fn peak_active(&self) -> usize {
        self.peak_active
    }

    /// Events of the last attempt: location and letters.
    pub fn events(&self) -> &[(u32, u64)] {
        &self.events
    }

    /// Runs one attempt at a shot. False: it was not accepted and must be
    /// drawn anew, or `interrupt` was raised.
    pub fn attempt<R: Register>(
        &mut self,
        register: &mut R,
        draw: &Draw,
        rng: &mut ShotRng,
        interrupt: &Interrupt,
    ) -> Result<bool, SampleError> {
        if !self.begin(register, draw, rng, interrupt)? {
            return Ok(false);
        }
        let mut end = self.program.first().clone();
        while let End::Branch(branch) = &end.end {
            let next = self.follow(&end, branch)?;
            if !self.run(&next, register, draw, rng, interrupt) {
                return Ok(false);
            }
            end = next;
        }
        Ok(register.finish(rng))
    }

    /// Runs the first segment only, and ends there. False: the register stopped
    /// before, or does not keep what it did.
    pub fn first_segment<R: Register>(
        &mut self,
        register: &mut R,
        draw: &Draw,
        rng: &mut ShotRng,
        interrupt: &Interrupt,
    ) -> Result<bool, SampleError> {
        Ok(self.begin(register, draw, rng, interrupt)? && register.finish(rng))
    }

    /// Starts anew and runs the first segment. False: it was not accepted.
    fn begin<R: Register>(
        &mut self,
        register: &mut R,
        draw: &Draw,
        rng: &mut ShotRng,
        interrupt: &Interrupt,
    ) -> Result<bool, SampleError> {
        self.bits.fill(0);
        self.events.clear();
        self.peak_active = 0;
        if !register.start(draw, rng) {
            return Ok(false);
        }
        let first = self.program.first();
        self.enter(first, None)?;
        Ok(self.run(first, register, draw, rng, interrupt))
    }

    /// The segment after a branch, entered.
    fn follow(&mut self, segment: &Segment, branch: &Branch) -> Result<Arc<Segment>, SampleError> {
        let next = self.program.next(branch, self.bit(branch.condition))?;
        let base = segment.reference.len();
        let carried: Vec<(bool, bool)> = branch
            .carried
            .iter()
            .enumerate()
            .map(|(qubit, &(x, z))| {
                (
                    x ^ self.flip(base + 2 * qubit),
                    z ^ self.flip(base + 2 * qubit + 1),
                )
            })
            .collect();
        self.enter(&next, Some(&carried))?;
        Ok(next)
    }

    /// Clears the flips for a segment and sets those of the Pauli carried over.
    fn enter(
        &mut self,
        segment: &Segment,
        carried: Option<&[(bool, bool)]>,
    ) -> Result<(), SampleError> {
        if segment.peak_active > self.room {
            return Err(SampleError::TooManyActive {
                found: segment.peak_active,
                room: self.room,
            });
        }
        self.peak_active = self.peak_active.max(segment.peak_active);
        let exits = match &segment.end {
            End::Finished => 0,
            End::Branch(branch) => 2 * branch.carried.len(),
        };
        self.flips.clear();
        self.flips
            .resize((segment.reference.len() + exits).div_ceil(64), 0);
        for (&(x, z), entry) in carried.unwrap_or(&[]).iter().zip(&segment.entry) {
            if x {
                self.toggle(segment, entry[0]);
            }
            if z {
                self.toggle(segment, entry[1]);
            }
        }
        Ok(())
    }

    #[inline]
    fn flip(&self, index: usize) -> bool {
        self.flips[index / 64] >> (index % 64) & 1 == 1
    }

    #[inline]
    fn toggle(&mut self, segment: &Segment, set: SetId) {
        segment.sets.toggle(set, &mut self.flips);
    }

    /// The sign of a reading: reference ⊕ flips.
    #[inline]
    fn read(&mut self, segment: &Segment, reading: Reading) -> bool {
        let index = reading as usize;
        if let Some(previous) = segment.previous[index]
            && self.flip(previous as usize)
        {
            self.flips[index / 64] ^= 1 << (index % 64);
        }
        segment.reference[index] ^ self.flip(index)
    }

    fn holds(&self, condition: Option<u32>) -> bool {
        condition.is_none_or(|bit| self.bit(bit))
    }

    fn fire(&mut self, segment: &Segment, place: &FaultPlace, rng: &mut impl Rng) {
        let word = place.table.draw(rng);
        for (qubit, sets) in place.sets.iter().enumerate() {
            if word.x >> qubit & 1 == 1 {
                self.toggle(segment, sets[0]);
            }
            if word.z >> qubit & 1 == 1 {
                self.toggle(segment, sets[1]);
            }
        }
        self.event(place.location, pauli_code(word));
    }

    fn event(&mut self, location: u32, pauli: u64) {
        if self.keep_events {
            self.events.push((location, pauli));
        }
    }

    /// Stores an outcome, flipped by readout error.
    fn store(&mut self, value: bool, outcome: &Outcome, rng: &mut impl Rng) {
        let Some(bit) = outcome.bit else { return };
        let chance = if value {
            outcome.flip.one_to_zero
        } else {
            outcome.flip.zero_to_one
        };
        let flipped = chance > 0.0 && rng.random::<f64>() < chance;
        if let (true, Some(location)) = (flipped, outcome.location) {
            self.event(location, 0);
        }
        self.set_bit(bit, value ^ flipped);
    }

    /// Runs the steps of a segment. False: the shot must be drawn anew.
    fn run<R: Register>(
        &mut self,
        segment: &Segment,
        register: &mut R,
        draw: &Draw,
        rng: &mut ShotRng,
        interrupt: &Interrupt,
    ) -> bool {
        // A fault acts on later readings only, so all of them are drawn first.
        for group in &segment.groups {
            group.sample(rng, |rng, place| {
                self.fire(segment, &segment.places[place as usize], rng);
            });
        }
        segment
            .steps
            .iter()
            .all(|step| !interrupt.raised() && self.step(step, segment, register, draw, rng))
    }

    fn step<R: Register>(
        &mut self,
        step: &Step,
        segment: &Segment,
        register: &mut R,
        draw: &Draw,
        rng: &mut ShotRng,
    ) -> bool {
        match *step {
            Step::Coin {
                reading,
                flips,
                ref outcome,
            } => {
                let raw = rng.random::<bool>();
                self.measured(raw, reading, flips, outcome, segment, rng);
            }
            Step::Known {
                reading,
                ref outcome,
            } => {
                let value = self.read(segment, reading);
                self.store(value, outcome, rng);
            }
            Step::Measure {
                slot,
                reading,
                flips,
                ref outcome,
            } => {
                let Some(raw) = register.measure(slot, rng) else {
                    return false;
                };
                self.measured(raw, reading, flips, outcome, segment, rng);
            }
            Step::Activate { slot } => register.plus(slot, rng),
            Step::Skip { site } => register.skip(site, draw, rng),
            Step::Prepare { slot, site } => register.prepare(slot, site, draw),
            Step::Primitive(index) => register.primitive(&segment.primitives[index as usize], rng),
            Step::ControlledNot { control, target } => register.controlled_not(control, target),
            Step::Rotate {
                slot,
                site,
                reading,
                condition,
            } => {
                if self.holds(condition) {
                    let flipped = self.read(segment, reading);
                    register.rotate(slot, site, flipped, draw, rng);
                } else {
                    register.skip(site, draw, rng);
                }
            }
            Step::QuarterTurn {
                slot,
                reading,
                condition,
            } => {
                if self.bit(condition) {
                    let flipped = self.read(segment, reading);
                    register.quarter_turn(slot, flipped);
                }
            }
            Step::Ccz {
                slots,
                readings,
                site,
                condition,
            } => {
                if self.holds(condition) {
                    let flipped = readings.map(|reading| self.read(segment, reading));
                    register.ccz(slots, flipped, site, draw);
                } else {
                    register.skip(site, draw, rng);
                }
            }
            Step::Quadratic {
                slots,
                inputs,
                condition,
            } => {
                if self.holds(condition) {
                    let inputs =
                        inputs.map(|input| (input.slots, self.read(segment, input.reading)));
                    quadratic(register, slots, inputs);
                }
            }
            Step::Damp {
                slot,
                reading,
                gamma,
                flips,
                location,
            } => {
                let flipped = self.read(segment, reading);
                match register.damp(slot, flipped, gamma, rng) {
                    None => return false,
                    Some(false) => {}
                    Some(true) => self.decay(segment, flips, location),
                }
            }
            Step::DampKnown {
                reading,
                gamma,
                flips,
                location,
            } => {
                if self.read(segment, reading) && rng.random::<f64>() < gamma {
                    self.decay(segment, flips, location);
                }
            }
            Step::Assign {
                bit,
                ref value,
                condition,
            } => {
                if self.holds(condition) {
                    let value = value.evaluate(&|index| self.bit(index));
                    self.set_bit(bit, value);
                }
            }
            Step::Flip { condition, flips } => {
                if self.bit(condition) {
                    self.toggle(segment, flips);
                }
            }
            Step::Fault { condition, place } => {
                let place = &segment.places[place as usize];
                if self.bit(condition) && rng.random::<f64>() < place.table.probability() {
                    self.fire(segment, place, rng);
                }
            }
        }
        true
    }

    fn measured(
        &mut self,
        raw: bool,
        reading: Option<Reading>,
        flips: SetId,
        outcome: &Outcome,
        segment: &Segment,
        rng: &mut impl Rng,
    ) {
        if let Some(reading) = reading {
            let value = self.read(segment, reading) ^ raw;
            self.store(value, outcome, rng);
        }
        // The other branch differs from the reference by a Pauli, whatever
        // value is reported.
        if raw {
            self.toggle(segment, flips);
        }
    }

    fn decay(&mut self, segment: &Segment, flips: SetId, location: u32) {
        self.toggle(segment, flips);
        self.event(location, 0);
    }
}

/// −1 where all three inputs are 1, each the parity of some of two slots and a
/// sign: a quadratic form of at most two bits, found from its truth table.
fn quadratic<R: Register>(register: &mut R, slots: [Option<u16>; 2], inputs: [(u8, bool); 3]) {
    let value = |bits: u8| {
        inputs
            .iter()
            .all(|&(mask, sign)| ((mask & bits).count_ones() & 1 == 1) ^ sign)
    };
    let (none, first, second, both) = (value(0), value(1), value(2), value(3));
    if let Some(slot) = slots[0]
        && none ^ first
    {
        register.z(slot);
    }
    if let Some(slot) = slots[1]
        && none ^ second
    {
        register.z(slot);
    }
    if let [Some(a), Some(b)] = slots
        && none ^ first ^ second ^ both
    {
        register.controlled_z(a, b);
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn pauli_letters_have_their_digits() {
        let word = |x, z| PauliWord { x, z };
        assert_eq!(pauli_code(word(0, 0)), 0);
        assert_eq!(pauli_code(word(1, 0)), 1, "X on qubit 0");
        assert_eq!(pauli_code(word(1, 1)), 2, "Y on qubit 0");
        assert_eq!(pauli_code(word(0, 1)), 3, "Z on qubit 0");
        // I X Y Z on qubits 0 to 3: 0 + 1·4 + 2·16 + 3·64.
        assert_eq!(pauli_code(word(0b0110, 0b1100)), 228);
        assert_eq!(pauli_code(word(0, 1 << 31)), 3 << 62);
    }
}
