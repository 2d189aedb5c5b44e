//! The evaluation: one density matrix for every value of the bits still needed.

use std::collections::{BTreeMap, BTreeSet};

use num_complex::Complex64;
use rayon::prelude::*;

use crate::circuit::{Clifford, Pauli, PauliProduct};
use crate::noise::{PauliChannel, PauliChoices, ReadoutFlip};

use super::lives::{Life, lives};
use super::matrix::{Density, Letters, Map, kraus};
use super::operation::{Action, Operation};
use super::{ExactError, MAX_BRANCHES, MAX_ENTRIES, MAX_QUBITS, MAX_WORK};

/// Values of the bits still needed: those that are 1, in order.
type Key = Vec<u32>;

/// A branch of less weight than this is rounding.
const NEGLIGIBLE: f64 = 1e-15;

/// Weight of every value of the recorded bits; the ones of a value in order.
pub(super) fn evaluate(
    operations: &[Operation],
    recorded: &[u32],
) -> Result<BTreeMap<Key, f64>, ExactError> {
    let lives = lives(operations, recorded);
    check_size(operations, &lives)?;
    let mut state = State {
        alive: Vec::new(),
        branches: BTreeMap::from([(Key::new(), Density::scalar(1.0))]),
        work: 0.0,
    };
    for (operation, life) in operations.iter().zip(&lives) {
        if !life.skip {
            state.step(operation, life)?;
        }
    }
    let branches = state.branches.into_iter();
    Ok(branches
        .map(|(bits, density)| (bits, density.trace()))
        .collect())
}

/// Refuses before any work what cannot fit, whatever the outcomes.
fn check_size(operations: &[Operation], lives: &[Life]) -> Result<(), ExactError> {
    let mut alive = BTreeSet::new();
    let (mut most, mut work) = (0, 0.0);
    for (operation, life) in operations.iter().zip(lives).filter(|(_, life)| !life.skip) {
        alive.extend(operation.action.qubits());
        most = most.max(alive.len());
        work += (2.0 * alive.len() as f64).exp2();
        for qubit in &life.retire {
            alive.remove(qubit);
        }
    }
    if most > MAX_QUBITS {
        return Err(ExactError::TooManyQubits { found: most });
    }
    if work > MAX_WORK {
        let operations = operations.len();
        return Err(ExactError::TooMuchWork { operations });
    }
    Ok(())
}

struct State {
    /// The qubit at each position of the matrices.
    alive: Vec<u32>,
    branches: BTreeMap<Key, Density>,
    /// Entries computed so far.
    work: f64,
}

impl State {
    fn step(&mut self, operation: &Operation, life: &Life) -> Result<(), ExactError> {
        let Operation { action, condition } = operation;
        for qubit in action.qubits() {
            self.bring(qubit)?;
        }
        self.spend(action)?;
        match action {
            Action::Measure { qubit, bit, flip } => {
                let bit = bit.filter(|_| life.writes);
                self.measure(*qubit, bit, *flip, *condition, life)?;
            }
            Action::Assign { bit, value } => {
                let mut next = Branches::default();
                for (mut key, density) in std::mem::take(&mut self.branches) {
                    if holds(&key, *condition) {
                        let value = value.evaluate(&|bit| has(&key, bit));
                        put(&mut key, *bit, value);
                    }
                    next.add(key, density)?;
                }
                self.branches = next.by_key;
            }
            action => {
                let alive = &self.alive;
                self.branches.par_iter_mut().for_each(|(key, density)| {
                    if holds(key, *condition) {
                        *density = acted(density, action, alive);
                    }
                });
            }
        }
        for &qubit in &life.retire {
            self.retire(qubit);
        }
        self.forget(&life.forget)
    }

    /// Adds what an operation costs; fails past the limit.
    fn spend(&mut self, action: &Action) -> Result<(), ExactError> {
        let entries: f64 = self.branches.values().map(|d| d.len() as f64).sum();
        let passes = match action {
            Action::Pauli(channel) => match &channel.choices {
                PauliChoices::Listed(list) => list.len(),
                PauliChoices::Uniform(_) => 2 * channel.qubits.len(),
            },
            Action::BetweenValues { .. } => 8,
            _ => 1,
        };
        self.work += entries * passes as f64;
        if self.work > MAX_WORK {
            return Err(ExactError::TooManyBranches {
                found: self.branches.len(),
                qubits: self.alive.len(),
            });
        }
        Ok(())
    }

    /// Makes a qubit that is not there a fresh one.
    fn bring(&mut self, qubit: u32) -> Result<(), ExactError> {
        if self.alive.contains(&qubit) {
            return Ok(());
        }
        self.alive.push(qubit);
        let size = 1usize << (2 * self.alive.len());
        if self.branches.len() > MAX_ENTRIES / size {
            return Err(ExactError::TooManyBranches {
                found: self.branches.len(),
                qubits: self.alive.len(),
            });
        }
        self.branches.values_mut().for_each(Density::join);
        Ok(())
    }

    /// Traces a qubit out, if it is there.
    fn retire(&mut self, qubit: u32) {
        if let Some(position) = self.alive.iter().position(|&other| other == qubit) {
            self.branches
                .par_iter_mut()
                .for_each(|(_, density)| *density = density.traced(position));
            self.alive.remove(position);
        }
    }

    /// Branches that differ in these bits only become one.
    fn forget(&mut self, bits: &[u32]) -> Result<(), ExactError> {
        if bits.is_empty() {
            return Ok(());
        }
        let mut next = Branches::default();
        for (mut key, density) in std::mem::take(&mut self.branches) {
            key.retain(|bit| !bits.contains(bit));
            next.add(key, density)?;
        }
        self.branches = next.by_key;
        Ok(())
    }

    fn measure(
        &mut self,
        qubit: u32,
        bit: Option<u32>,
        flip: ReadoutFlip,
        condition: Option<u32>,
        life: &Life,
    ) -> Result<(), ExactError> {
        let position = place(&self.alive, qubit);
        let leaves = life.retire.contains(&qubit);
        let mut next = Branches::default();
        for (key, density) in std::mem::take(&mut self.branches) {
            if !holds(&key, condition) {
                let kept = if leaves {
                    density.traced(position)
                } else {
                    density
                };
                next.add(key, kept)?;
                continue;
            }
            for value in [false, true] {
                let found = if leaves {
                    density.found(position, value)
                } else {
                    density.projected(position, value)
                };
                let Some(bit) = bit else {
                    next.add(key.clone(), found)?;
                    continue;
                };
                let wrong = if value {
                    flip.one_to_zero
                } else {
                    flip.zero_to_one
                };
                for (recorded, weight) in [(value, 1.0 - wrong), (!value, wrong)] {
                    if weight * found.trace() > NEGLIGIBLE {
                        let mut key = key.clone();
                        put(&mut key, bit, recorded);
                        let mut part = found.clone();
                        part.scale(weight);
                        next.add(key, part)?;
                    }
                }
            }
        }
        self.branches = next.by_key;
        if leaves {
            self.alive.remove(position);
        }
        Ok(())
    }
}

/// Branches being collected.
#[derive(Default)]
struct Branches {
    by_key: BTreeMap<Key, Density>,
    entries: usize,
}

impl Branches {
    fn add(&mut self, key: Key, density: Density) -> Result<(), ExactError> {
        use std::collections::btree_map::Entry;
        match self.by_key.entry(key) {
            Entry::Occupied(mut sum) => sum.get_mut().add(&density),
            Entry::Vacant(place) => {
                self.entries += density.len();
                let qubits = density.len().ilog2() as usize / 2;
                place.insert(density);
                let found = self.by_key.len();
                if found > MAX_BRANCHES || self.entries > MAX_ENTRIES {
                    return Err(ExactError::TooManyBranches { found, qubits });
                }
            }
        }
        Ok(())
    }
}

fn has(key: &Key, bit: u32) -> bool {
    key.binary_search(&bit).is_ok()
}

fn holds(key: &Key, condition: Option<u32>) -> bool {
    condition.is_none_or(|bit| has(key, bit))
}

fn put(key: &mut Key, bit: u32, value: bool) {
    match (key.binary_search(&bit), value) {
        (Ok(place), false) => {
            key.remove(place);
        }
        (Err(place), true) => key.insert(place, bit),
        _ => {}
    }
}

fn place(alive: &[u32], qubit: u32) -> usize {
    alive
        .iter()
        .position(|&other| other == qubit)
        .expect("the qubits of an operation are brought in before it")
}

fn letters(alive: &[u32], product: &[(u32, Pauli)]) -> Letters {
    let mut letters = Letters { x: 0, z: 0, y: 0 };
    for &(qubit, letter) in product {
        let bit = 1 << (2 * place(alive, qubit));
        letters.x |= if letter.x() { bit } else { 0 };
        letters.z |= if letter.z() { bit } else { 0 };
        letters.y = (letters.y + u8::from(letter == Pauli::Y)) & 3;
    }
    letters
}

/// A matrix after an operation that touches no bit.
fn acted(density: &Density, action: &Action, alive: &[u32]) -> Density {
    let at = |qubit: u32| place(alive, qubit);
    match action {
        Action::Clifford(gate) => gated(density, gate, alive),
        Action::Turn { axis, coherence } => density.turned(letters(alive, axis), *coherence),
        Action::BetweenValues { axes, table } => {
            let axes: [Letters; 3] = std::array::from_fn(|index| letters(alive, &axes[index]));
            density.between_values(axes, table)
        }
        Action::Local { qubit, map, .. } => density.local(at(*qubit), map),
        Action::Reset { qubit } => density.local(at(*qubit), &reset()),
        Action::Pauli(channel) => noisy(density, channel, alive),
        // These change bits and are done elsewhere.
        Action::Measure { .. } | Action::Assign { .. } => density.clone(),
    }
}

fn reset() -> Map {
    let [zero, one] = [Complex64::ZERO, Complex64::ONE];
    kraus(&[[[one, zero], [zero, zero]], [[zero, one], [zero, zero]]])
}

fn gated(density: &Density, gate: &Clifford, alive: &[u32]) -> Density {
    let at = |qubit: u32| place(alive, qubit);
    let turned = |product: &PauliProduct, coherence: Complex64| {
        density.turned(letters(alive, product), coherence)
    };
    let one =
        |qubit: u32, letter: Pauli| -> PauliProduct { [(qubit, letter)].into_iter().collect() };
    match gate {
        // A turn by π is the Pauli itself.
        Clifford::X(q) => turned(&one(*q, Pauli::X), -Complex64::ONE),
        Clifford::Y(q) => turned(&one(*q, Pauli::Y), -Complex64::ONE),
        Clifford::Z(q) => turned(&one(*q, Pauli::Z), -Complex64::ONE),
        Clifford::S(q) => turned(&one(*q, Pauli::Z), Complex64::I),
        Clifford::Sdg(q) => turned(&one(*q, Pauli::Z), -Complex64::I),
        Clifford::QuarterTurn(axis) => turned(axis, Complex64::I),
        Clifford::H(q) => {
            let half = Complex64::from(std::f64::consts::FRAC_1_SQRT_2);
            density.local(at(*q), &kraus(&[[[half, half], [half, -half]]]))
        }
        Clifford::Cx(control, target) => density.controlled_not(at(*control), at(*target)),
        Clifford::Cz(a, b) => density.controlled_z(at(*a), at(*b)),
        Clifford::Swap(a, b) => density.swap(at(*a), at(*b)),
    }
}

fn noisy(density: &Density, channel: &PauliChannel, alive: &[u32]) -> Density {
    match &channel.choices {
        PauliChoices::Listed(list) => {
            let words: Vec<(Letters, f64)> = list
                .iter()
                .map(|&(word, probability)| {
                    let product: PauliProduct = channel
                        .qubits
                        .iter()
                        .enumerate()
                        .map(|(index, &qubit)| {
                            let (x, z) = (word.x >> index & 1 == 1, word.z >> index & 1 == 1);
                            (qubit, Pauli::from_parts(x, z))
                        })
                        .collect();
                    (letters(alive, &product), probability)
                })
                .collect();
            density.paulis(&words)
        }
        // All 4^m words together leave 1/2^m on these qubits; the identity is
        // taken out again.
        PauliChoices::Uniform(probability) => {
            let mut mixed = density.clone();
            for &qubit in &channel.qubits {
                let words = [Pauli::X, Pauli::Y, Pauli::Z]
                    .map(|letter| (letters(alive, &[(qubit, letter)]), 0.25));
                mixed = mixed.paulis(&words);
            }
            let words = (2.0 * channel.qubits.len() as f64).exp2();
            let share = probability * words / (words - 1.0);
            mixed.scale(share);
            let mut rest = density.clone();
            rest.scale(1.0 - share);
            mixed.add(&rest);
            mixed
        }
    }
}
