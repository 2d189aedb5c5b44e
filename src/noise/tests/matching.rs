//! Which rules are about which statements.

use crate::circuit::{Action, Edge, Severity, Source};

use super::*;

/// How many channels a rule puts around each statement of the circuit.
fn counts(circuit: &Circuit, on: &str, more: &str) -> Vec<usize> {
    let noisy = with_file(circuit, &rule(on, "depolarizing(0.1)", more));
    let mut counts = vec![0; circuit.operations.len()];
    for instruction in &noisy.instructions {
        if matches!(instruction.kind, Kind::Pauli(_)) {
            counts[instruction.operation as usize] += 1;
        }
    }
    counts
}

/// t, cx, ccx, a defined gate on two qubits with an h inside, measure, reset,
/// delay, barrier.
fn sample() -> Circuit {
    circuit(
        4,
        [
            gate("t", &[], &[0]),
            gate("cx", &[], &[0, 1]),
            gate("ccx", &[], &[0, 1, 2]),
            call("pair", &[2, 3], Edge::Start),
            gate("h", &[], &[3]),
            call("pair", &[2, 3], Edge::End),
            measure(0, Some(0)),
            Action::Reset { qubit: 1 },
            Action::Delay {
                qubit: 2,
                seconds: 1e-6,
            },
            Action::Barrier {
                qubits: [0, 1].into_iter().collect(),
            },
        ],
    )
}

#[test]
fn names_match_calls_wherever_they_stand() {
    let sample = sample();
    for (on, expected) in [
        ("[\"t\"]", [1, 0, 0, 0, 0, 0, 0, 0, 0, 0]),
        ("[\"cx\", \"h\"]", [0, 1, 0, 0, 1, 0, 0, 0, 0, 0]),
        ("[\"pair\"]", [0, 0, 0, 0, 0, 1, 0, 0, 0, 0]),
        ("[\"measure\"]", [0, 0, 0, 0, 0, 0, 1, 0, 0, 0]),
        ("[\"reset\", \"delay\"]", [0, 0, 0, 0, 0, 0, 0, 1, 1, 0]),
        // A ccx is not taken apart before matching.
        ("[\"t\", \"h\"]", [1, 0, 0, 0, 1, 0, 0, 0, 0, 0]),
        // Named twice, matched once.
        (
            "[\"t\", \"one-qubit\", \"t\"]",
            [1, 0, 0, 0, 1, 0, 0, 0, 0, 0],
        ),
    ] {
        assert_eq!(counts(&sample, on, ""), expected, "{on}");
    }
}

#[test]
fn groups_match_library_gates_by_number_of_qubits() {
    let sample = sample();
    for (on, expected) in [
        ("[\"one-qubit\"]", [1, 0, 0, 0, 1, 0, 0, 0, 0, 0]),
        ("[\"two-qubit\"]", [0, 1, 0, 0, 0, 0, 0, 0, 0, 0]),
        ("[\"three-qubit\"]", [0, 0, 1, 0, 0, 0, 0, 0, 0, 0]),
    ] {
        assert_eq!(counts(&sample, on, ""), expected, "{on}");
        let before = counts(&sample, on, "place = \"before\"");
        assert_eq!(before, expected, "{on} before");
    }
}

#[test]
fn a_name_is_the_name_called() {
    let circuit = circuit(2, [gate("cx", &[], &[0, 1]), gate("CX", &[], &[0, 1])]);
    assert_eq!(counts(&circuit, "[\"cx\"]", ""), [1, 0]);
    assert_eq!(counts(&circuit, "[\"CX\"]", ""), [0, 1]);
}

#[test]
fn qubits_filter_calls_that_act_on_them_alone() {
    let circuit = circuit(
        4,
        [
            gate("cx", &[], &[0, 1]),
            gate("cx", &[], &[1, 3]),
            gate("cx", &[], &[3, 0]),
        ],
    );
    for filter in ["[0, 3]", "[\"q[3]\", 0]", "[0x3, 0b0, 3]"] {
        let filter = format!("qubits = {filter}");
        assert_eq!(counts(&circuit, "[\"cx\"]", &filter), [0, 0, 1], "{filter}");
    }
}

#[test]
fn a_rule_that_never_matched_is_a_warning() {
    let mut circuit = circuit(2, [gate("cx", &[], &[0, 1]), gate("tdg", &[], &[0])]);
    circuit.operations[1].condition = Some(0);
    let text = rule("[\"cx\"]", "dephasing(0)", "")
        + &rule("[\"tdq\"]", "dephasing(0.1)", "")
        + &rule("[\"cx\"]", "dephasing(0.1)", "qubits = [0]")
        + &rule("[\"reset\"]", "dephasing(0.1)", "");
    let noisy = with_file(&circuit, &text);
    let found: Vec<(usize, String)> = noisy
        .warnings
        .iter()
        .map(|warning| {
            assert_eq!(warning.severity, Severity::Warning);
            assert_eq!(warning.source, Source::Noise);
            assert_eq!(warning.message, "this rule never matched");
            let line = warning.span.unwrap().line_and_column(&text).0;
            (line, warning.help.clone().unwrap())
        })
        .collect();
    // The first rule matched, though it does nothing.
    assert_eq!(found.len(), 3);
    assert_eq!(found[0].0, 6);
    assert!(found[0].1.contains("did you mean `tdg`?"), "{found:?}");
    assert_eq!(found[1].0, 10);
    assert!(found[1].1.contains("listed qubits alone"), "{found:?}");
    assert_eq!(found[2].0, 14);
    assert!(found[2].1.contains("no such statement"), "{found:?}");
}

#[test]
fn qubits_the_circuit_lacks_are_errors() {
    let circuit = circuit(2, [gate("h", &[], &[0])]);
    let text = rule("[\"h\"]", "dephasing(0.1)", "qubits = [0, 2, \"r[0]\"]");
    let file = NoiseFile::parse(&text).unwrap();
    let errors = attach(&circuit, Some(&file)).unwrap_err();
    let places: Vec<(usize, usize)> = errors
        .iter()
        .map(|error| {
            assert_eq!(error.source, Source::Noise);
            error.span.unwrap().line_and_column(&text)
        })
        .collect();
    assert_eq!(places, [(4, 14), (4, 17)]);
    assert!(errors[0].message.contains("no qubit 2"));
    assert!(errors[1].message.contains("no qubit \"r[0]\""));
}

#[test]
fn a_channel_that_does_not_fit_is_told_once_with_the_statement() {
    let circuit = circuit(
        2,
        [
            gate("cx", &[], &[0, 1]),
            gate("h", &[], &[0]),
            gate("h", &[], &[1]),
        ],
    );
    let text = rule("[\"cx\", \"h\"]", "pauli(XX=0.1)", "");
    let file = NoiseFile::parse(&text).unwrap();
    let errors = attach(&circuit, Some(&file)).unwrap_err();
    assert_eq!(errors.len(), 1);
    assert_eq!(errors[0].source, Source::Noise);
    assert_eq!(errors[0].span.unwrap().line_and_column(&text), (3, 11));
    assert!(errors[0].message.contains("line 2 of the circuit"));
}
