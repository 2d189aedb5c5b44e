//! Noise on circuits read from text: annotations in loops, gate bodies and
//! conditions, modifiers, and rules on all of them.

use crate::circuit::{ParseOptions, parse};

use super::*;

fn read(text: &str) -> Circuit {
    let text = format!("OPENQASM 3.0;\ninclude \"stdgates.inc\";\n{text}");
    parse("test.qasm", &text, &ParseOptions::default())
        .unwrap_or_else(|errors| panic!("{errors:#?}"))
}

fn of_text(text: &str) -> Vec<String> {
    let noisy = attach(&read(text), None).unwrap_or_else(|errors| panic!("{errors:#?}"));
    shorts(&noisy)
}

#[test]
fn an_annotation_acts_on_every_broadcast_instance() {
    assert_eq!(
        of_text("qubit[2] q;\n@noise dephasing(0.1)\n@noise.before bit-flip(0.2)\nh q;"),
        [
            "pauli [0] X=0.200000",
            "H(0)",
            "pauli [0] Z=0.100000",
            "pauli [1] X=0.200000",
            "H(1)",
            "pauli [1] Z=0.100000",
        ]
    );
}

#[test]
fn arguments_may_use_loop_variables_and_constants() {
    assert_eq!(
        of_text(
            "qubit[3] q;\nconst float p = 0.1;\nfor int i in [1:2] {\n@noise over-rotation(x, i * pi / 4)\n@noise dephasing(p * i)\nx q[i];\n}"
        ),
        [
            "X(1)",
            "rotation X1 0.7854",
            "pauli [1] Z=0.100000",
            "X(2)",
            "rotation X2 1.5708",
            "pauli [2] Z=0.200000",
        ]
    );
}

#[test]
fn noise_inside_a_body_stays_after_each_inner_call() {
    let body = "gate pair a, b {\n@noise pauli(XI=0.1)\ncx a, b;\ns b;\n}\nqubit[2] q;\n";
    let noise = "pauli [0, 1] XI=0.100000";
    let plain = of_text(&format!(
        "{body}@noise depolarizing-each(0.3)\npair q[0], q[1];"
    ));
    assert_eq!(plain[..3], ["Cx(0, 1)", noise, "S(1)"]);
    assert_eq!(plain.len(), 5);
    let inverse = of_text(&format!("{body}inv @ pair q[0], q[1];"));
    assert_eq!(inverse, ["Sdg(1)", "Cx(0, 1)", noise]);
    let twice = of_text(&format!("{body}pow(2) @ pair q[0], q[1];"));
    assert_eq!(
        twice,
        ["Cx(0, 1)", noise, "S(1)", "Cx(0, 1)", noise, "S(1)"]
    );
}

#[test]
fn a_conditional_statement_passes_its_condition_on() {
    let kinds =
        of_text("qubit q;\nbit c;\nc = measure q;\nif (c) {\n@noise bit-flip(0.1)\nx q;\n}");
    let [.., gate, noise] = &kinds[..] else {
        panic!("expected a gate and its noise, found {kinds:?}");
    };
    let when = gate.strip_prefix("X(0)").unwrap();
    assert!(when.starts_with(" if "), "{kinds:?}");
    assert_eq!(*noise, format!("pauli [0] X=0.100000{when}"));
}

#[test]
fn a_condition_outlives_the_bit_it_was_read_from() {
    // The measurement under the condition writes the bit of the condition; the
    // noise after it must still depend on the old value.
    let circuit =
        read("qubit q;\nbit c;\nc = measure q;\nif (c) {\n@noise bit-flip(0.1)\nc = measure q;\n}");
    let noisy = attach(&circuit, None).unwrap();
    let channel = noisy.instructions.last().unwrap();
    assert!(matches!(channel.kind, Kind::Pauli(_)));
    let condition = channel.condition.unwrap();
    let measurement = &noisy.instructions[noisy.instructions.len() - 2];
    assert_eq!(measurement.condition, Some(condition));
    assert!(matches!(
        measurement.kind,
        Kind::Measure { bit: Some(0), .. }
    ));
    assert_ne!(condition, 0);
}

#[test]
fn rules_see_the_gate_a_modifier_makes() {
    let circuit = read(
        "qubit[3] q;\nctrl @ x q[0], q[1];\nctrl(2) @ x q[0], q[1], q[2];\ninv @ t q[0];\nnegctrl @ x q[1], q[0];",
    );
    let count = |on: &str| {
        let noisy = with_file(&circuit, &rule(on, "depolarizing(0.1)", ""));
        let channels = noisy.instructions.iter();
        channels
            .filter(|it| matches!(it.kind, Kind::Pauli(_)))
            .count()
    };
    assert_eq!(count("[\"cx\"]"), 2);
    assert_eq!(count("[\"ccx\"]"), 1);
    assert_eq!(count("[\"tdg\"]"), 1);
    assert_eq!(count("[\"x\", \"t\"]"), 0);
    assert_eq!(count("[\"one-qubit\", \"two-qubit\", \"three-qubit\"]"), 4);
}

#[test]
fn durations_and_registers() {
    assert_eq!(
        of_text(
            "qubit[2] q;\nbit[2] c;\n@noise relaxation(80us, 60us)\ndelay[5us] q[1];\n@noise readout-flip(0.02)\nc = measure q;"
        ),
        [
            "damping 1 0.060587",
            "pauli [1] Z=0.025375",
            "measure 0 Some(0) 0.020000 0.020000",
            "measure 1 Some(1) 0.020000 0.020000",
        ]
    );
}

#[test]
fn errors_point_at_the_channel_in_the_circuit() {
    let circuit = read("qubit q;\n@noise dephasing(1.5)\nh q;\n@noise dephasig(0.5)\nh q;");
    let errors = attach(&circuit, None).unwrap_err();
    let places: Vec<(usize, usize)> = errors
        .iter()
        .map(|error| error.span.unwrap().line_and_column(&circuit.source))
        .collect();
    assert_eq!(places, [(4, 18), (6, 8)]);
    assert!(errors[1].help.as_ref().unwrap().contains("`dephasing`"));
}
