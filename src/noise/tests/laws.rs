//! Laws of channels: factors after many of them, from the probabilities that
//! were attached.

use super::*;

/// Factor by which the channel shrinks the expectation of each Pauli word:
/// 1 − 2·(probability of the words that anticommute with it).
fn shrink(channel: &PauliChannel, x: u32, z: u32) -> f64 {
    let PauliChoices::Listed(words) = &channel.choices else {
        panic!("expected a list");
    };
    let anticommutes = |word: &super::super::PauliWord| {
        ((word.x & z).count_ones() + (word.z & x).count_ones()) % 2 == 1
    };
    let flipping = words.iter().filter(|(word, _)| anticommutes(word));
    1.0 - 2.0 * flipping.map(|(_, p)| p).sum::<f64>()
}

fn channel_of(name: &str, qubits: &[u32], channel: &str) -> PauliChannel {
    let noisy = annotated(gate(name, &[], qubits), channel).unwrap();
    match &noisy.instructions.last().unwrap().kind {
        Kind::Pauli(channel) => channel.clone(),
        other => panic!("expected a Pauli channel, found {other:?}"),
    }
}

/// Bloch factor (1 − 4p/3)^m. Phys. Rev. A 77, 012307 (2008) for the form.
#[test]
fn one_qubit_depolarizing_decays() {
    let channel = channel_of("id", &[0], "depolarizing(0.01)");
    for (x, z) in [(1, 0), (1, 1), (0, 1)] {
        let factor = shrink(&channel, x, z).powi(10);
        assert!((factor - 0.874388754238).abs() < 1e-12);
    }
}

/// Pauli factor (1 − 16p/15)^m, and 1 − 4p/5 for the fidelity of a Bell state,
/// the same for all fifteen words. Phys. Rev. A 77, 012307 (2008).
#[test]
fn two_qubit_depolarizing_decays() {
    let channel = channel_of("cx", &[0, 1], "depolarizing(0.01)");
    for code in 1..16 {
        let factor = shrink(&channel, code & 3, code >> 2).powi(10);
        assert!((factor - 0.898310381822).abs() < 1e-9);
    }
    // |00⟩ + |11⟩ is stabilised by XX, YY (with −) and ZZ.
    let channel = channel_of("cx", &[0, 1], "depolarizing(0.1)");
    let stabilisers = [(3, 0), (3, 3), (0, 3)];
    let sum: f64 = stabilisers
        .iter()
        .map(|&(x, z)| shrink(&channel, x, z))
        .sum();
    assert!(((1.0 + sum) / 4.0 - 0.92).abs() < 1e-12);
}

/// p_m = (1 − (1 − 2p)^m)/2 (textbook).
#[test]
fn dephasing_decays() {
    let channel = channel_of("id", &[0], "dephasing(0.01)");
    let flips = (1.0 - shrink(&channel, 1, 0).powi(3)) / 2.0;
    assert!((flips - 0.029404).abs() < 1e-12);
    assert_eq!(shrink(&channel, 0, 1), 1.0);
}

/// measured = [[1−p01, p10], [p01, 1−p10]]·true: 0.4 becomes 0.374 (textbook).
#[test]
fn readout_flips_mix_outcomes() {
    let noisy = annotated(measure(0, Some(0)), "readout-flip(0.03, 0.11)").unwrap();
    let Kind::Measure { flip, .. } = noisy.instructions[0].kind else {
        panic!("expected a measurement");
    };
    let reads_one = |one: f64| (1.0 - one) * flip.zero_to_one + one * (1.0 - flip.one_to_zero);
    assert!((reads_one(0.4) - 0.374).abs() < 1e-12);
    // Twice is the matrix squared.
    let twice = flip.then(flip);
    let expected =
        (1.0 - reads_one(0.4)) * flip.zero_to_one + reads_one(0.4) * (1.0 - flip.one_to_zero);
    let found = 0.6 * twice.zero_to_one + 0.4 * (1.0 - twice.one_to_zero);
    assert!((found - expected).abs() < 1e-15);
}
