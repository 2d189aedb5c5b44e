//! Every gate against its textbook matrix.

use std::f64::consts::{FRAC_PI_2, PI};

use super::Gate;
use super::matrices::{
    Matrix, adjoint, builtin_u, close, controlled, elementary_matrix, identity, pauli, phase,
    product, same_up_to_phase, scaled, textbook,
};
use crate::circuit::elementary::{Elementary, Pauli};

/// Angles with no special value among them, and a few special ones.
fn angle_sets(count: usize) -> Vec<Vec<f64>> {
    let mut sets: Vec<Vec<f64>> = (0..6)
        .map(|seed| {
            (0..count)
                .map(|index| {
                    6.0 * ((seed * 7 + index * 3 + 1) as f64 * 0.754_877_666).fract() - 3.0
                })
                .collect()
        })
        .collect();
    sets.push(vec![FRAC_PI_2; count]);
    sets.push(vec![0.0; count]);
    sets.push(vec![-7.5 * PI; count]);
    sets
}

fn expanded(gate: Gate, parameters: &[f64]) -> Matrix {
    let qubits = gate.qubits();
    gate.expand(parameters)
        .iter()
        .fold(identity(1 << qubits), |matrix, elementary| {
            product(&elementary_matrix(elementary, qubits), &matrix)
        })
}

fn gates() -> impl Iterator<Item = Gate> {
    Gate::all().chain([Gate::IswapInverse])
}

#[test]
fn every_gate_expands_to_its_textbook_matrix() {
    for gate in gates() {
        for angles in angle_sets(gate.parameters()) {
            assert!(
                same_up_to_phase(&expanded(gate, &angles), &textbook(gate, &angles)),
                "{gate:?} {angles:?}"
            );
        }
    }
}

#[test]
fn inverses_undo_the_gate_with_its_phase() {
    for gate in gates() {
        for angles in angle_sets(gate.parameters()) {
            let (inverse, inverse_angles) = gate.inverse(&angles);
            let undone = product(
                &textbook(inverse, &inverse_angles),
                &textbook(gate, &angles),
            );
            assert!(
                close(&undone, &identity(undone.len())),
                "{gate:?} {angles:?}"
            );
        }
    }
}

#[test]
fn controlled_gates_keep_the_phase_of_the_gate() {
    let mut found = 0;
    for gate in gates() {
        for angles in angle_sets(gate.parameters()) {
            if let Some((result, result_angles)) = gate.controlled(&angles) {
                found += 1;
                let expected = controlled(&[true], &textbook(gate, &angles));
                assert_eq!(result.qubits(), gate.qubits() + 1);
                assert!(
                    same_up_to_phase(&expanded(result, &result_angles), &expected),
                    "{gate:?} {angles:?}"
                );
            }
        }
    }
    assert!(found > 100);
}

#[test]
fn negative_controls_act_on_zero() {
    for mask in 1..4u8 {
        let gate = Gate::Ccx.with_negated(mask);
        // Bit 0 of the mask is position 0 of the call.
        let controls = [mask & 1 == 0, mask & 2 == 0];
        let expected = controlled(&controls, &pauli(Pauli::X));
        assert!(same_up_to_phase(&expanded(gate, &[]), &expected));
        assert_eq!((gate.name(), gate.qubits()), ("ccx", 3));
        assert_eq!(gate.with_negated(mask), Gate::Ccx);
    }
    let angles = [0.3, 1.1, -0.4, 0.9];
    let gate = Gate::Cu.with_negated(1);
    let block = scaled(phase(0.9 - 0.15), &builtin_u(0.3, 1.1, -0.4));
    assert!(same_up_to_phase(
        &expanded(gate, &angles),
        &controlled(&[false], &block)
    ));
    let (inverse, inverse_angles) = gate.inverse(&angles);
    assert!(same_up_to_phase(
        &expanded(inverse, &inverse_angles),
        &controlled(&[false], &adjoint(&block))
    ));
}

#[test]
fn few_rotations_are_spent() {
    let count = |gate: Gate| {
        let angles = vec![0.3; gate.parameters()];
        let expansion = gate.expand(&angles);
        expansion
            .iter()
            .filter(|part| !matches!(part, Elementary::Clifford(_)))
            .count()
    };
    for (gate, most) in [
        (Gate::Ccx, 1),
        (Gate::Cswap, 1),
        (Gate::Ch, 2),
        (Gate::Crz, 2),
        (Gate::Cp, 3),
        (Gate::Cu, 6),
        (Gate::Sx, 0),
        (Gate::U2, 2),
        (Gate::Iswap, 0),
    ] {
        assert_eq!(count(gate), most, "{gate:?}");
    }
}

#[test]
fn names_lead_back_to_gates() {
    for gate in Gate::all() {
        assert_eq!(Gate::from_name(gate.name()), Some(gate));
        assert!(gate.qubits() <= Gate::MAX_QUBITS);
    }
    assert_eq!(Gate::from_name("Cx"), None);
    assert_eq!(Gate::all().count(), 42);
}
