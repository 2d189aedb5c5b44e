//! Pauli axes, and what they pass.
//!
//! Two questions about a rotation exp(−iθA/2) and the dephasing
//! D: ρ → (1 − q)ρ + qAρA about the same axis A, as one of them moves past an
//! instruction:
//!
//! - the rotation passes what commutes with A as an operation. For amplitude
//!   damping, K0 = diag(1, √(1−γ)) and K1 = √γ|0⟩⟨1|: both commute with a
//!   rotation about Z up to a phase; if A has further letters K1 turns the
//!   rotation round, so only A = Z passes.
//! - the dephasing asks less, since D is the same for A and −A: a Clifford
//!   gate C turns it into the dephasing about CAC†, every Pauli channel passes
//!   (Paulis commute up to sign), and so does amplitude damping where A has the
//!   letter Z (ZK1 = −K1Z up to the sign that D does not see). A measurement
//!   of Z passes where A has the letter Z.

use crate::circuit::{Clifford, Pauli, PauliProduct};
use crate::noise::{PauliChannel, PauliChoices, PauliWord};

use super::timeline::{Node, Work};

/// The product with its qubits in order and without identities.
pub(super) fn normalised(axis: &PauliProduct) -> PauliProduct {
    let mut letters: PauliProduct = axis
        .iter()
        .copied()
        .filter(|&(_, letter)| letter != Pauli::I)
        .collect();
    letters.sort_unstable_by_key(|&(qubit, _)| qubit);
    letters
}

/// The letter on a qubit.
pub(super) fn letter(axis: &PauliProduct, qubit: u32) -> Pauli {
    axis.iter()
        .find(|&&(q, _)| q == qubit)
        .map_or(Pauli::I, |&(_, letter)| letter)
}

fn anticommute(a: Pauli, b: Pauli) -> bool {
    a != Pauli::I && b != Pauli::I && a != b
}

/// Whether two products commute.
pub(super) fn commute(a: &PauliProduct, b: &PauliProduct) -> bool {
    let clashes = a
        .iter()
        .filter(|&&(qubit, pauli)| anticommute(pauli, letter(b, qubit)));
    clashes.count() % 2 == 0
}

/// The axis as a word of the channel; `None` if it has a letter on a qubit
/// that is not the channel's.
pub(super) fn as_word(axis: &PauliProduct, channel: &PauliChannel) -> Option<PauliWord> {
    let mut word = PauliWord::default();
    for &(qubit, pauli) in axis {
        let place = channel.qubits.iter().position(|&q| q == qubit)?;
        word.x |= u32::from(pauli.x()) << place;
        word.z |= u32::from(pauli.z()) << place;
    }
    Some(word)
}

/// Whether every word of the channel commutes with the axis.
fn channel_commutes(axis: &PauliProduct, channel: &PauliChannel) -> bool {
    let PauliChoices::Listed(words) = &channel.choices else {
        return false;
    };
    let mut own = PauliWord::default();
    for (place, &qubit) in channel.qubits.iter().enumerate() {
        let pauli = letter(axis, qubit);
        own.x |= u32::from(pauli.x()) << place;
        own.z |= u32::from(pauli.z()) << place;
    }
    words.iter().all(|(word, _)| {
        ((word.x & own.z).count_ones() + (word.z & own.x).count_ones()).is_multiple_of(2)
    })
}

/// Whether a Clifford gate leaves the axis as it is, sign included.
fn clifford_commutes(axis: &PauliProduct, clifford: &Clifford) -> bool {
    let at = |qubit: &u32| letter(axis, *qubit);
    match clifford {
        Clifford::X(q) => !at(q).z(),
        Clifford::Y(q) => at(q).x() == at(q).z(),
        Clifford::Z(q) | Clifford::S(q) | Clifford::Sdg(q) => !at(q).x(),
        Clifford::H(q) => at(q) == Pauli::I,
        Clifford::Cx(control, target) => !at(control).x() && !at(target).z(),
        Clifford::Cz(a, b) => !at(a).x() && !at(b).x(),
        Clifford::Swap(a, b) => at(a) == at(b),
        Clifford::QuarterTurn(other) => commute(axis, other),
    }
}

/// Whether a rotation about the axis passes the node, whatever its angle and
/// whether or not either of the two depends on a bit.
pub(super) fn rotation_passes(axis: &PauliProduct, node: &Node) -> bool {
    match &node.work {
        Work::Clifford(clifford) => clifford_commutes(axis, clifford),
        Work::Turns(other, _) | Work::Rotation { axis: other, .. } => commute(axis, other),
        Work::Ccz(qubits) => qubits.iter().all(|&qubit| !letter(axis, qubit).x()),
        Work::Measure { qubit, .. } => !letter(axis, *qubit).x(),
        Work::Pauli(channel) => channel_commutes(axis, channel),
        Work::Damping { qubit, .. } => match letter(axis, *qubit) {
            Pauli::I => true,
            Pauli::Z => axis.len() == 1,
            _ => false,
        },
        Work::Assign { .. } | Work::Nothing => true,
        Work::Reset(_) | Work::Prepared(_) | Work::Eigenstate { .. } => false,
    }
}

/// The axis about which the dephasing acts on the other side of the node;
/// `None` if it does not pass. Up to sign a Clifford gate and its inverse do
/// the same to every axis here, so the direction does not matter.
pub(super) fn dephasing_passes(axis: &PauliProduct, node: &Node) -> Option<PauliProduct> {
    let moved = match &node.work {
        Work::Clifford(clifford) => conjugated(axis, clifford),
        Work::Turns(other, quarters) if quarters % 2 == 1 => turned(axis, other),
        Work::Turns(..) | Work::Pauli(_) => axis.clone(),
        Work::Damping { qubit, .. } => (!letter(axis, *qubit).x()).then(|| axis.clone())?,
        _ => rotation_passes(axis, node).then(|| axis.clone())?,
    };
    // Under a condition only an axis that stays put can move on.
    (node.condition.is_none() || moved == *axis).then_some(moved)
}

/// CAC† without its sign.
fn conjugated(axis: &PauliProduct, clifford: &Clifford) -> PauliProduct {
    let parts = |qubit: u32| {
        let pauli = letter(axis, qubit);
        (pauli.x(), pauli.z())
    };
    match *clifford {
        Clifford::X(_) | Clifford::Y(_) | Clifford::Z(_) => axis.clone(),
        Clifford::H(q) => {
            let (x, z) = parts(q);
            replaced(axis, &[(q, z, x)])
        }
        Clifford::S(q) | Clifford::Sdg(q) => {
            let (x, z) = parts(q);
            replaced(axis, &[(q, x, z ^ x)])
        }
        Clifford::Cx(c, t) => {
            let ((xc, zc), (xt, zt)) = (parts(c), parts(t));
            replaced(axis, &[(c, xc, zc ^ zt), (t, xt ^ xc, zt)])
        }
        Clifford::Cz(a, b) => {
            let ((xa, za), (xb, zb)) = (parts(a), parts(b));
            replaced(axis, &[(a, xa, za ^ xb), (b, xb, zb ^ xa)])
        }
        Clifford::Swap(a, b) => {
            let ((xa, za), (xb, zb)) = (parts(a), parts(b));
            replaced(axis, &[(a, xb, zb), (b, xa, za)])
        }
        Clifford::QuarterTurn(ref other) => turned(axis, other),
    }
}

/// The axis after a quarter turn about another: itself if they commute, else
/// their product.
fn turned(axis: &PauliProduct, other: &PauliProduct) -> PauliProduct {
    if commute(axis, other) {
        return axis.clone();
    }
    let product = other.iter().map(|&(qubit, pauli)| {
        let own = letter(axis, qubit);
        (qubit, own.x() ^ pauli.x(), own.z() ^ pauli.z())
    });
    replaced(axis, &product.collect::<Vec<_>>())
}

/// The axis with the letters of some qubits replaced.
fn replaced(axis: &PauliProduct, letters: &[(u32, bool, bool)]) -> PauliProduct {
    let untouched = |&(qubit, _): &(u32, Pauli)| letters.iter().all(|&(q, _, _)| q != qubit);
    let kept = axis.iter().copied().filter(untouched);
    let new = letters
        .iter()
        .map(|&(qubit, x, z)| (qubit, Pauli::from_parts(x, z)));
    normalised(&kept.chain(new).collect())
}
