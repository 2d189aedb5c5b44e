//! Published counts and identities.

use std::collections::HashSet;

use num_complex::Complex64;

use super::dense::{Layout, compare};
use super::{Dense, quarter};
use crate::clifford::terms::{QuadraticPhase, Terms};

/// The state without its phase and norm: for every basis state the quarter
/// turns from the first amplitude that is not zero.
fn fingerprint(terms: &Terms<1>, slots: usize) -> Vec<Option<u8>> {
    let amplitudes: Vec<_> = (0..1 << slots).map(|x| terms.amplitude(0, &[x])).collect();
    let first = *amplitudes.iter().find(|a| a.norm() > 1e-9).unwrap();
    amplitudes
        .iter()
        .map(|a| {
            (a.norm() > 1e-9).then(|| {
                (0..4)
                    .find(|&n| (a / first - quarter(n.into())).norm() < 1e-9)
                    .expect("amplitudes of a stabiliser state differ by quarter turns")
            })
        })
        .collect()
}

/// The number of states reached from |0…0⟩ by S, CNOT and (1 + XZ)/√2, which
/// is a Hadamard gate and a Pauli: 6, 60, 1080, 36720 on 1, 2, 3, 4 qubits,
/// Phys. Rev. A 70, 052328 (2004); formula 2ⁿ ∏ (2ⁱ + 1).
#[test]
fn the_orbit_is_the_set_of_stabiliser_states() {
    for (slots, expected) in [(1, 6), (2, 60), (3, 1080), (4, 36720)] {
        let mut start = Terms::<1>::new(slots);
        start.reset(&[Complex64::ONE]);
        let mut seen = HashSet::from([fingerprint(&start, slots)]);
        let mut open = vec![start];
        while let Some(terms) = open.pop() {
            let mut visit = |change: &dyn Fn(&mut Terms<1>)| {
                let mut next = terms.clone();
                change(&mut next);
                assert!((next.norm_squared(0) - 1.0).abs() < 1e-12);
                if seen.insert(fingerprint(&next, slots)) {
                    open.push(next);
                }
            };
            for s in 0..slots {
                visit(&|t| t.diagonal(s, |_| 1));
                visit(&|t| t.primitive(0, &[1 << s], &[1 << s]));
                for other in (0..slots).filter(|&other| other != s) {
                    visit(&|t| t.controlled_not(s, other));
                }
            }
        }
        assert_eq!(seen.len(), expected, "{slots} slots");
    }
}

/// CCZ = (1/6) Σ_b D_b, D_b|+++⟩ = ∏ (X_i CZ_jk)^{b_i}|+++⟩: Quantum 3, 181
/// (2019). The eight terms together are CCZ|+++⟩.
#[test]
fn eight_components_make_a_ccz() {
    let mut terms = Terms::<1>::new(3);
    terms.reset(&[Complex64::new(1.0 / 6.0, 0.0); 8]);
    for slot in 0..3 {
        terms.plus(slot);
    }
    for i in 0..3 {
        let slots = [i, (i + 1) % 3, (i + 2) % 3];
        let turned = |label: u32| label >> i & 1 == 1;
        terms.quadratic(slots, |label| QuadraticPhase {
            cz: [false, turned(label), false],
            ..Default::default()
        });
        // X on the chosen ones: Z between two Hadamard-like gates.
        let bit = [1 << i];
        terms.primitive(2, &bit, &bit);
        terms.quadratic(slots, |label| QuadraticPhase {
            z: [turned(label), false, false],
            ..Default::default()
        });
        terms.primitive(0, &bit, &bit);
    }
    for x in 0..8u64 {
        let sign = if x == 7 { -1.0 } else { 1.0 };
        let expected = sign / 8f64.sqrt();
        let found = terms.total_amplitude(&[x]);
        assert!((found - expected).norm() < 1e-12, "{x}: {found}");
    }
}

/// Terms that a projection annihilates go, the others keep their labels, and
/// a reset brings all of them back.
#[test]
fn annihilated_terms_are_dropped_and_come_back() {
    let mut terms = Terms::<1>::new(2);
    let weights = [Complex64::ONE; 6];
    for _ in 0..3 {
        terms.reset(&weights);
        terms.plus(1);
        terms.diagonal(1, |label| if label % 3 == 0 { 2 } else { 0 });
        // (1 + X)/√2 annihilates |−⟩ and gives √2|+⟩.
        terms.primitive(0, &[2], &[0]);
        let labels: Vec<_> = (0..terms.len()).map(|i| terms.label(i)).collect();
        assert_eq!(labels, [1, 2, 4, 5]);
        let mut plus = Dense::new(1, Complex64::new(2f64.sqrt(), 0.0));
        plus.prepare(0, crate::magic::Stabiliser::Plus);
        let gone = Dense::new(1, Complex64::ZERO);
        let vectors: Vec<_> = (0..6)
            .map(|j| {
                if j % 3 == 0 {
                    gone.clone()
                } else {
                    plus.clone()
                }
            })
            .collect();
        compare(&terms, &Layout(vec![1]), &vectors, 1e-12);
        // (1 − X)/√2 annihilates the rest.
        terms.primitive(2, &[2], &[0]);
        assert!(terms.is_empty());
    }
}
