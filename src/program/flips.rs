//! Which later readings a Pauli flips: the backward pass.
//!
//! Walking the circuit backwards, two sets a qubit are kept: the readings that
//! X_q and Z_q flip if they happen now. A gate G maps the set of a Pauli E
//! before it to that of G·E·G† after it, by symmetric difference.
//!
//! Repeated readings of one Pauli are stored relative to each other: sign_t =
//! d_t ⊕ sign_prev(t). A fault before both toggles d of the first only, so set
//! sizes stay flat over many rounds of syndrome measurement. In these terms a
//! reading t toggles {t} ∪ {u : prev(u) = t}.

use crate::circuit::{Clifford, PauliProduct};

/// Index of a stored set.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct SetId(u32);

impl SetId {
    /// The empty set.
    pub const EMPTY: SetId = SetId(0);

    /// Stands for the set of a trigger until the backward pass has found it.
    pub(super) fn pending(trigger: u32) -> Self {
        SetId(trigger)
    }

    /// The trigger a pending set stands for.
    pub(super) fn pending_index(self) -> usize {
        self.0 as usize
    }
}

/// Most bytes the sets of one segment may take.
const MAX_BYTES: usize = 4 << 30;

/// Stored sets, packed: short ones as lists of members, long ones as bit
/// vectors, whichever takes less room.
#[derive(Debug, Clone)]
pub struct SetArena {
    /// Words of a bit vector over all members there can be.
    words: usize,
    sets: Vec<Stored>,
    items: Vec<u32>,
    bits: Vec<u64>,
}

/// Most members that may be merged on the way back: some ten seconds.
const MAX_MERGED: u64 = 5_000_000_000;

/// Where a set is.
#[derive(Debug, Clone, Copy)]
enum Stored {
    /// From here, so many, in `items`.
    Items(usize, u32),
    /// From here in `bits`.
    Bits(usize),
}

impl SetArena {
    /// An arena for sets of numbers below `size`. Holds the empty set.
    pub fn new(size: usize) -> Self {
        SetArena {
            words: size.div_ceil(64),
            sets: vec![Stored::Items(0, 0)],
            items: Vec::new(),
            bits: Vec::new(),
        }
    }

    /// Stores a set.
    pub fn store(&mut self, items: &[u32]) -> SetId {
        if items.is_empty() {
            return SetId::EMPTY;
        }
        if items.len() > 2 * self.words {
            let start = self.bits.len();
            self.bits.resize(start + self.words, 0);
            for &item in items {
                self.bits[start + item as usize / 64] ^= 1 << (item % 64);
            }
            self.sets.push(Stored::Bits(start));
        } else {
            self.sets
                .push(Stored::Items(self.items.len(), items.len() as u32));
            self.items.extend_from_slice(items);
        }
        SetId(self.sets.len() as u32 - 1)
    }

    /// Toggles the members of a set.
    #[inline]
    pub fn toggle(&self, id: SetId, flips: &mut [u64]) {
        match self.sets[id.0 as usize] {
            Stored::Items(start, count) => {
                for &item in &self.items[start..start + count as usize] {
                    flips[item as usize / 64] ^= 1 << (item % 64);
                }
            }
            Stored::Bits(start) => {
                let bits = &self.bits[start..start + self.words];
                flips
                    .iter_mut()
                    .zip(bits)
                    .for_each(|(flips, bits)| *flips ^= bits);
            }
        }
    }

    /// Bytes the sets take.
    pub fn bytes(&self) -> usize {
        4 * self.items.len() + 8 * self.bits.len() + size_of::<Stored>() * self.sets.len()
    }
}

/// Something of the forward walk that the backward pass must see, in circuit
/// order.
#[derive(Debug, Clone)]
pub(super) enum Event {
    /// A gate outside any condition.
    Gate(Clifford),
    /// A reading of a product of letters.
    Read(PauliProduct, u32),
    /// A Pauli that may happen here: its set goes to this slot of `triggers`.
    Trigger(PauliProduct, u32),
    /// A reset: what was on the qubit is gone.
    Clear(u32),
    /// A fault place of this index, on these qubits.
    Place(u32, crate::circuit::Qubits),
}

/// What the backward pass finds.
pub(super) struct Flips {
    pub sets: SetArena,
    /// By trigger.
    pub triggers: Vec<SetId>,
    /// By place: the sets of X and Z of each of its qubits.
    pub places: Vec<Vec<[SetId; 2]>>,
    /// By qubit: the sets of X and Z at the start.
    pub entry: Vec<[SetId; 2]>,
}

/// Two sets a qubit while walking backwards; sorted.
struct Walk {
    sets: Vec<[Vec<u32>; 2]>,
    scratch: Vec<u32>,
    /// Members merged so far.
    merged: u64,
}

/// Symmetric difference of two sorted lists into a third.
fn difference(left: &[u32], right: &[u32], into: &mut Vec<u32>) {
    into.clear();
    let (mut a, mut b) = (0, 0);
    while a < left.len() && b < right.len() {
        match left[a].cmp(&right[b]) {
            std::cmp::Ordering::Less => {
                into.push(left[a]);
                a += 1;
            }
            std::cmp::Ordering::Greater => {
                into.push(right[b]);
                b += 1;
            }
            std::cmp::Ordering::Equal => {
                a += 1;
                b += 1;
            }
        }
    }
    into.extend_from_slice(&left[a..]);
    into.extend_from_slice(&right[b..]);
}

impl Walk {
    fn add(&mut self, to: (u32, usize), items: &[u32]) {
        let target = &mut self.sets[to.0 as usize][to.1];
        self.merged += (target.len() + items.len()) as u64;
        difference(target, items, &mut self.scratch);
        std::mem::swap(target, &mut self.scratch);
    }

    /// set(to) ⊕= set(from).
    fn fold(&mut self, to: (u32, usize), from: (u32, usize)) {
        let items = std::mem::take(&mut self.sets[from.0 as usize][from.1]);
        self.add(to, &items);
        self.sets[from.0 as usize][from.1] = items;
    }

    /// Set of a product of letters.
    fn of(&self, product: &PauliProduct) -> Vec<u32> {
        let (mut sum, mut next) = (Vec::new(), Vec::new());
        for &(qubit, letter) in product {
            for (part, present) in [letter.x(), letter.z()].into_iter().enumerate() {
                if present {
                    difference(&sum, &self.sets[qubit as usize][part], &mut next);
                    std::mem::swap(&mut sum, &mut next);
                }
            }
        }
        sum
    }

    /// Adds `items` to every generator that anticommutes with the product.
    fn add_anticommuting(&mut self, product: &PauliProduct, items: &[u32]) {
        for &(qubit, letter) in product {
            if letter.z() {
                self.add((qubit, X), items);
            }
            if letter.x() {
                self.add((qubit, Z), items);
            }
        }
    }

    fn gate(&mut self, gate: &Clifford) {
        match *gate {
            Clifford::X(_) | Clifford::Y(_) | Clifford::Z(_) => {}
            Clifford::H(q) => self.sets[q as usize].swap(X, Z),
            Clifford::S(q) | Clifford::Sdg(q) => self.fold((q, X), (q, Z)),
            Clifford::Cx(control, target) => {
                self.fold((control, X), (target, X));
                self.fold((target, Z), (control, Z));
            }
            Clifford::Cz(a, b) => {
                self.fold((a, X), (b, Z));
                self.fold((b, X), (a, Z));
            }
            Clifford::Swap(a, b) => self.sets.swap(a as usize, b as usize),
            Clifford::QuarterTurn(ref axis) => {
                let items = self.of(axis);
                self.add_anticommuting(axis, &items);
            }
        }
    }
}

const X: usize = 0;
const Z: usize = 1;

/// Runs the backward pass. `previous[t]` is the reading that t is relative to;
/// `exit` is the number of readings if the Pauli at the end is wanted: then
/// X_q at the end flips `exit + 2q` and Z_q flips `exit + 2q + 1`. None if the
/// sets would take too much memory.
pub(super) fn backward(
    qubits: usize,
    events: &[Event],
    previous: &[Option<u32>],
    triggers: usize,
    places: usize,
    exit: Option<u32>,
) -> Option<Flips> {
    let mut children: Vec<Vec<u32>> = vec![Vec::new(); previous.len()];
    for (reading, previous) in previous.iter().enumerate() {
        if let Some(previous) = previous {
            children[*previous as usize].push(reading as u32);
        }
    }
    let mut walk = Walk {
        sets: vec![[Vec::new(), Vec::new()]; qubits],
        scratch: Vec::new(),
        merged: 0,
    };
    if let Some(base) = exit {
        for (qubit, sets) in walk.sets.iter_mut().enumerate() {
            *sets = [
                vec![base + 2 * qubit as u32],
                vec![base + 2 * qubit as u32 + 1],
            ];
        }
    }
    let mut flips = Flips {
        sets: SetArena::new(previous.len() + exit.map_or(0, |_| 2 * qubits)),
        triggers: vec![SetId::EMPTY; triggers],
        places: vec![Vec::new(); places],
        entry: Vec::new(),
    };
    for event in events.iter().rev() {
        if flips.sets.bytes() > MAX_BYTES || walk.merged > MAX_MERGED {
            return None;
        }
        match event {
            Event::Gate(gate) => walk.gate(gate),
            Event::Read(product, reading) => {
                let mut items = vec![*reading];
                items.extend_from_slice(&children[*reading as usize]);
                walk.add_anticommuting(product, &items);
            }
            Event::Trigger(product, trigger) => {
                let items = walk.of(product);
                flips.triggers[*trigger as usize] = flips.sets.store(&items);
            }
            Event::Clear(qubit) => walk.sets[*qubit as usize] = [Vec::new(), Vec::new()],
            Event::Place(place, qubits) => {
                flips.places[*place as usize] = qubits
                    .iter()
                    .map(|&qubit| {
                        let [x, z] = &walk.sets[qubit as usize];
                        [flips.sets.store(x), flips.sets.store(z)]
                    })
                    .collect();
            }
        }
    }
    for [x, z] in &walk.sets {
        let entry = [flips.sets.store(x), flips.sets.store(z)];
        flips.entry.push(entry);
    }
    Some(flips)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Long sets are stored as bits, short ones as lists; both toggle the same.
    #[test]
    fn sets_toggle_their_members_however_they_are_stored() {
        let mut arena = SetArena::new(200);
        let short: Vec<u32> = vec![0, 63, 64, 199];
        let long: Vec<u32> = (0..200).filter(|item| item % 3 == 0).collect();
        for items in [&short, &long, &Vec::new()] {
            let id = arena.store(items);
            let mut flips = vec![0u64; 4];
            arena.toggle(id, &mut flips);
            let found: Vec<u32> = (0..200)
                .filter(|&item| flips[item as usize / 64] >> (item % 64) & 1 == 1)
                .collect();
            assert_eq!(&found, items);
            arena.toggle(id, &mut flips);
            assert_eq!(flips, [0; 4]);
        }
        assert!(matches!(arena.sets[1], Stored::Items(..)));
        assert!(matches!(arena.sets[2], Stored::Bits(_)));
    }

    /// Repeated readings of one Pauli keep the sets of early faults short: the
    /// ancilla's reading of round t is stored relative to round t − 2 (its
    /// column alternates), so a fault before all of 50 rounds toggles two.
    #[test]
    fn relative_readings_keep_sets_flat() {
        let axis: PauliProduct = smallvec::smallvec![(0, crate::circuit::Pauli::Z)];
        let events: Vec<Event> = std::iter::once(Event::Place(0, smallvec::smallvec![0]))
            .chain((0..50).map(|reading| Event::Read(axis.clone(), reading)))
            .collect();
        let previous: Vec<Option<u32>> =
            (0..50).map(|reading: u32| reading.checked_sub(2)).collect();
        let flips = backward(1, &events, &previous, 0, 1, None).expect("small");
        let mut toggled = vec![0u64];
        flips.sets.toggle(flips.places[0][0][0], &mut toggled);
        assert_eq!(toggled, [0b11]);
    }
}
