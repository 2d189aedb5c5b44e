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

/// Stored sets, packed.
#[derive(Debug, Clone)]
pub struct SetArena {
    offsets: Vec<u32>,
    items: Vec<u32>,
}

impl Default for SetArena {
    fn default() -> Self {
        SetArena {
            offsets: vec![0, 0],
            items: Vec::new(),
        }
    }
}

impl SetArena {
    /// Stores a set.
    pub fn store(&mut self, items: &[u32]) -> SetId {
        if items.is_empty() {
            return SetId::EMPTY;
        }
        self.items.extend_from_slice(items);
        self.offsets.push(self.items.len() as u32);
        SetId(self.offsets.len() as u32 - 2)
    }

    /// The members of a set.
    #[inline]
    pub fn get(&self, id: SetId) -> &[u32] {
        let index = id.0 as usize;
        &self.items[self.offsets[index] as usize..self.offsets[index + 1] as usize]
    }

    /// Total number of stored members.
    pub fn len(&self) -> usize {
        self.items.len()
    }

    /// Whether nothing is stored.
    pub fn is_empty(&self) -> bool {
        self.items.is_empty()
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
/// X_q at the end flips `exit + 2q` and Z_q flips `exit + 2q + 1`.
pub(super) fn backward(
    qubits: usize,
    events: &[Event],
    previous: &[Option<u32>],
    triggers: usize,
    places: usize,
    exit: Option<u32>,
) -> Flips {
    let mut children: Vec<Vec<u32>> = vec![Vec::new(); previous.len()];
    for (reading, previous) in previous.iter().enumerate() {
        if let Some(previous) = previous {
            children[*previous as usize].push(reading as u32);
        }
    }
    let mut walk = Walk {
        sets: vec![[Vec::new(), Vec::new()]; qubits],
        scratch: Vec::new(),
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
        sets: SetArena::default(),
        triggers: vec![SetId::EMPTY; triggers],
        places: vec![Vec::new(); places],
        entry: Vec::new(),
    };
    for event in events.iter().rev() {
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
    flips
}
