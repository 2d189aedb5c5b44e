//! Every channel, at its place, and what cannot be placed.

use crate::circuit::{Action, Diagnostic, Edge, Qubits, Severity, Source};

use super::*;

fn delay(qubit: u32, seconds: f64) -> Action {
    Action::Delay { qubit, seconds }
}

#[track_caller]
fn expect(action: Action, channel: &str, expected: &[&str]) {
    let noisy = annotated(action, channel).unwrap_or_else(|errors| panic!("{errors:#?}"));
    assert_eq!(shorts(&noisy), expected, "{channel}");
}

#[track_caller]
fn refused(action: Action, channel: &str, message: &str) -> Diagnostic {
    let errors = annotated(action, channel).expect_err("should be refused");
    assert_eq!(errors.len(), 1, "{errors:#?}");
    let error = errors.into_iter().next().unwrap();
    assert!(error.message.contains(message), "{error:?}");
    assert_eq!(error.severity, Severity::Error);
    assert_eq!(error.source, Source::Circuit);
    assert!(error.span.is_some() && error.help.is_some());
    error
}

#[test]
fn one_qubit_channels_act_on_each_qubit() {
    let cx = || gate("cx", &[], &[3, 1]);
    let with = |kinds: &[&str]| {
        let mut all = vec!["Cx(3, 1)".to_string()];
        all.extend(kinds.iter().map(|kind| kind.to_string()));
        all
    };
    for (channel, kinds) in [
        (
            "dephasing(0.1)",
            ["pauli [3] Z=0.100000", "pauli [1] Z=0.100000"],
        ),
        (
            "bit-flip(0.1)",
            ["pauli [3] X=0.100000", "pauli [1] X=0.100000"],
        ),
        (
            "bit-phase-flip(0.1)",
            ["pauli [3] Y=0.100000", "pauli [1] Y=0.100000"],
        ),
        (
            "depolarizing-each(0.3)",
            [
                "pauli [3] X=0.100000 Y=0.100000 Z=0.100000",
                "pauli [1] X=0.100000 Y=0.100000 Z=0.100000",
            ],
        ),
        (
            "amplitude-damping(0.25)",
            ["damping 3 0.250000", "damping 1 0.250000"],
        ),
        (
            "amplitude-damping(gamma=0.25)",
            ["damping 3 0.250000", "damping 1 0.250000"],
        ),
        (
            "over-rotation(y, -0.2)",
            ["rotation Y3 -0.2000", "rotation Y1 -0.2000"],
        ),
    ] {
        let noisy = annotated(cx(), channel).unwrap();
        assert_eq!(shorts(&noisy), with(&kinds), "{channel}");
    }
}

#[test]
fn depolarizing_is_joint_and_uniform() {
    for (name, qubits) in [("h", &[0][..]), ("cx", &[2, 0]), ("ccx", &[0, 2, 1])] {
        let noisy = annotated(gate(name, &[], qubits), "depolarizing(0.63)").unwrap();
        let Kind::Pauli(channel) = &noisy.instructions.last().unwrap().kind else {
            panic!("expected a Pauli channel");
        };
        let words = listed(channel);
        let count = 4usize.pow(qubits.len() as u32) - 1;
        assert_eq!(channel.qubits.as_slice(), qubits);
        assert_eq!(words.len(), count);
        let mut texts: Vec<&String> = words.iter().map(|(word, _)| word).collect();
        texts.dedup();
        assert_eq!(texts.len(), count, "no word twice");
        assert!(words.iter().all(|(word, _)| word.contains(['X', 'Y', 'Z'])));
        for (_, p) in &words {
            assert!((p - 0.63 / count as f64).abs() < 1e-15);
        }
    }
    let barrier = |count: u32| Action::Barrier {
        qubits: (0..count).collect(),
    };
    let noisy = annotated(barrier(4), "depolarizing(0.1)").unwrap();
    assert_eq!(shorts(&noisy), ["uniform [0, 1, 2, 3] 0.1"]);
    assert!(annotated(barrier(32), "depolarizing(0.1)").is_ok());
    let error = refused(barrier(33), "depolarizing(0.1)", "33 qubits");
    assert!(error.help.unwrap().contains("depolarizing-each"));
    assert!(annotated(barrier(33), "depolarizing-each(0.1)").is_ok());
}

#[test]
fn letter_i_of_a_word_belongs_to_qubit_i() {
    expect(
        gate("cx", &[], &[3, 1]),
        "pauli(XI=0.1, IZ=0.2, YY=0.3)",
        &[
            "Cx(3, 1)",
            "pauli [3, 1] IZ=0.200000 XI=0.100000 YY=0.300000",
        ],
    );
    expect(
        gate("h", &[], &[2]),
        "pauli(I=0.5, X=0.25, Y=0, Z=0.25)",
        &["H(2)", "pauli [2] X=0.250000 Z=0.250000"],
    );
    refused(gate("h", &[], &[2]), "pauli(XX=0.1)", "words of 2 letters");
    refused(gate("h", &[], &[2]), "pauli(X=0.6, Y=0.6)", "sum to 1.2");
    refused(gate("h", &[], &[2]), "pauli(X=0.1, XX=0.1)", "2 letters");
    refused(gate("h", &[], &[2]), "pauli(X=0.1, X=0.1)", "twice");
    refused(gate("h", &[], &[2]), "pauli(x=0.1)", "no Pauli word");
    refused(gate("h", &[], &[2]), "pauli(Q=0.1)", "no Pauli word");
    refused(gate("h", &[], &[2]), "pauli(0.1)", "Pauli word");
    refused(gate("h", &[], &[2]), "pauli()", "no Pauli word");
    let long = format!("pauli({}=0.1)", "X".repeat(33));
    refused(gate("h", &[], &[2]), &long, "33 letters");
}

#[test]
fn probabilities_that_reach_one_by_rounding_are_allowed() {
    let tenths =
        "pauli(IX=0.1, IY=0.1, IZ=0.1, XI=0.1, XX=0.1, XY=0.1, XZ=0.1, YI=0.1, YX=0.1, YY=0.1)";
    assert!(annotated(gate("cx", &[], &[0, 1]), tenths).is_ok());
}

/// γ = 1 − e^{−t/t1}, dephasing (1 − e^{−t/t2 + t/(2 t1)})/2 (textbook); the
/// numbers are a Kraus product's.
#[test]
fn relaxation_is_damping_then_dephasing() {
    let expected = ["damping 1 0.060587", "pauli [1] Z=0.025375"];
    expect(delay(1, 5e-6), "relaxation(80us, 60us)", &expected);
    expect(delay(1, 1.0), "relaxation(80us, 60us, 5us)", &expected);
    let noisy = annotated(delay(1, 5e-6), "relaxation(80us, 60us)").unwrap();
    let Kind::Damping { gamma, .. } = noisy.instructions[0].kind else {
        panic!("expected damping");
    };
    assert!((gamma - 0.060586937187).abs() < 1e-12);
    let Kind::Pauli(channel) = &noisy.instructions[1].kind else {
        panic!("expected dephasing");
    };
    let p = listed(channel)[0].1;
    assert!((p - 0.025375120300).abs() < 1e-12);
    let coherence = (1.0 - gamma).sqrt() * (1.0 - 2.0 * p);
    assert!((coherence - 0.920044414629).abs() < 1e-12);
    // t2 = 2·t1: no dephasing is left over.
    expect(
        delay(1, 5e-6),
        "relaxation(80us, 160us)",
        &["damping 1 0.060587"],
    );
    expect(delay(1, 0.0), "relaxation(80us, 60us)", &[]);
    expect(
        measure(1, Some(0)),
        "relaxation(80us, 60us, 5us)",
        &[
            "measure 1 Some(0) 0.000000 0.000000",
            expected[0],
            expected[1],
        ],
    );
    refused(
        gate("h", &[], &[1]),
        "relaxation(80us, 60us)",
        "takes its time from a delay",
    );
    refused(
        delay(1, 1e-6),
        "relaxation(80us, 161us)",
        "longer than 2·t1",
    );
    refused(delay(1, 1e-6), "relaxation(0us, 0us)", "positive duration");
    refused(delay(1, 1e-6), "relaxation(80, 60)", "positive duration");
    refused(delay(1, 1e-6), "relaxation(80us)", "needs argument `t2`");
}

#[test]
fn readout_flips_compose() {
    expect(
        measure(2, Some(4)),
        "readout-flip(0.02)",
        &["measure 2 Some(4) 0.020000 0.020000"],
    );
    expect(
        measure(2, Some(4)),
        "readout-flip(0.02, 0.1)",
        &["measure 2 Some(4) 0.020000 0.100000"],
    );
    expect(
        measure(2, Some(4)),
        "readout-flip(p10=0.1, p01=0.02)",
        &["measure 2 Some(4) 0.020000 0.100000"],
    );
    let mut circuit = circuit(3, [measure(0, Some(0))]);
    annotate(
        &mut circuit,
        0,
        &[],
        &["readout-flip(0.03, 0.11)", "bit-flip(0.5)"],
    );
    let noisy = with_file(
        &circuit,
        &rule("[\"measure\"]", "readout-flip(0.2, 0.4)", ""),
    );
    // 0 → 1: 0.03·(1 − 0.4) + 0.97·0.2; 1 → 0: 0.11·(1 − 0.2) + 0.89·0.4.
    assert_eq!(
        shorts(&noisy),
        [
            "measure 0 Some(0) 0.212000 0.444000",
            "pauli [0] X=0.500000"
        ]
    );
    refused(
        gate("h", &[], &[1]),
        "readout-flip(0.1)",
        "measures nothing",
    );
    refused(measure(1, Some(0)), "readout-flip()", "needs argument `p`");
    refused(
        measure(1, Some(0)),
        "readout-flip(p01=0.1)",
        "needs argument `p10`",
    );
    refused(
        measure(1, Some(0)),
        "readout-flip(0.1, 0.1, 0.1)",
        "at most 2",
    );
}

#[test]
fn a_flip_before_a_measurement_is_refused() {
    let mut circuit = circuit(1, [measure(0, Some(0))]);
    annotate(&mut circuit, 0, &["readout-flip(0.1)"], &[]);
    let errors = attach(&circuit, None).unwrap_err();
    assert!(errors[0].message.contains("before the measurement"));
}

#[test]
fn a_flip_of_a_discarded_outcome_is_a_warning() {
    let mut circuit = circuit(2, [measure(0, None), measure(1, None), measure(1, Some(0))]);
    annotate(&mut circuit, 0, &[], &["readout-flip(0.1)"]);
    let noisy = with_file(&circuit, &rule("[\"measure\"]", "readout-flip(0.1)", ""));
    let sources: Vec<Source> = noisy
        .warnings
        .iter()
        .map(|warning| warning.source)
        .collect();
    assert_eq!(sources, [Source::Circuit, Source::Noise]);
    for warning in &noisy.warnings {
        assert_eq!(warning.severity, Severity::Warning);
        assert!(warning.message.contains("discarded"));
    }
}

#[test]
fn what_has_probability_zero_leaves_nothing() {
    for channel in [
        "depolarizing(0)",
        "depolarizing-each(0)",
        "dephasing(0)",
        "pauli(XX=0)",
        "pauli(II=1)",
        "amplitude-damping(0)",
        "over-rotation(z, 0)",
        "relaxation(80us, 60us, 0us)",
    ] {
        expect(gate("cz", &[], &[0, 1]), channel, &["Cz(0, 1)"]);
    }
}

#[test]
fn wrong_numbers_and_names_are_refused() {
    let h = || gate("h", &[], &[0]);
    for channel in [
        "dephasing(-0.1)",
        "dephasing(1.0001)",
        "dephasing(nan)",
        "dephasing(5us)",
        "depolarizing(x)",
        "amplitude-damping(2)",
    ] {
        refused(h(), channel, "expected a probability from 0 to 1");
    }
    refused(h(), "dephasing()", "needs argument `p`");
    refused(h(), "dephasing(0.1, 0.1)", "at most 1 arguments");
    refused(h(), "dephasing(q=0.1)", "no argument `q`");
    refused(h(), "over-rotation(w, 0.1)", "expected an axis");
    refused(h(), "over-rotation(z, inf)", "expected an angle");
    refused(h(), "over-rotation(axis=z, axis=x)", "given twice");
    let error = refused(h(), "depolarising(0.1)", "unknown channel");
    assert!(error.help.unwrap().contains("`depolarizing`"));
    let error = refused(h(), "thermal(0.1)", "unknown channel");
    assert!(error.help.unwrap().contains("amplitude-damping"));
}

#[test]
fn an_error_in_a_loop_is_told_once() {
    let mut circuit = circuit(1, (0..50).map(|_| gate("h", &[], &[0])));
    for index in 0..50 {
        annotate(&mut circuit, index, &[], &["dephasing(2)"]);
    }
    assert_eq!(attach(&circuit, None).unwrap_err().len(), 1);
}

#[test]
fn channels_stand_in_order_around_the_statement() {
    let mut circuit = circuit(1, [gate("t", &[], &[0])]);
    annotate(
        &mut circuit,
        0,
        &["dephasing(0.01)", "bit-flip(0.02)"],
        &["over-rotation(z, 0.25)", "bit-flip(0.03)"],
    );
    circuit.operations[0].condition = Some(5);
    let file = rule("[\"t\"]", "dephasing(0.04)", "")
        + &rule("[\"one-qubit\"]", "dephasing(0.05)", "place = \"before\"")
        + &rule("[\"t\"]", "amplitude-damping(0.06)", "place = \"after\"");
    assert_eq!(
        shorts(&with_file(&circuit, &file)),
        [
            "pauli [0] Z=0.010000 if 5",
            "pauli [0] X=0.020000 if 5",
            "pauli [0] Z=0.050000 if 5",
            "rotation Z0 0.7854 if 5",
            "rotation Z0 0.2500 if 5",
            "pauli [0] X=0.030000 if 5",
            "pauli [0] Z=0.040000 if 5",
            "damping 0 0.060000 if 5",
        ]
    );
}

#[test]
fn the_noise_of_a_defined_gate_stands_around_its_body() {
    let mut circuit = circuit(
        3,
        [
            call("inject", &[2, 0], Edge::Start),
            gate("h", &[], &[2]),
            call("inject", &[2, 0], Edge::End),
        ],
    );
    annotate(&mut circuit, 0, &["dephasing(0.1)"], &[]);
    annotate(&mut circuit, 2, &[], &["pauli(ZX=0.2)"]);
    let file = rule("[\"inject\"]", "bit-flip(0.3)", "")
        + &rule("[\"h\"]", "bit-flip(0.4)", "place = \"before\"")
        + &rule("[\"inject\"]", "pauli(YI=0.5)", "place = \"before\"");
    assert_eq!(
        shorts(&with_file(&circuit, &file)),
        [
            "pauli [2] Z=0.100000",
            "pauli [0] Z=0.100000",
            "pauli [2, 0] YI=0.500000",
            "pauli [2] X=0.400000",
            "H(2)",
            "pauli [2, 0] ZX=0.200000",
            "pauli [2] X=0.300000",
            "pauli [0] X=0.300000",
        ]
    );
}

#[test]
fn noise_on_a_barrier_or_a_gate_without_qubits() {
    let barrier = Action::Barrier {
        qubits: Qubits::from_slice(&[0, 2]),
    };
    expect(barrier, "pauli(XZ=0.1)", &["pauli [0, 2] XZ=0.100000"]);
    expect(gate("gphase", &[0.3], &[]), "depolarizing(0.1)", &[]);
}

#[test]
fn an_angle_that_is_not_finite_is_refused() {
    let circuit = circuit(1, [gate("rz", &[f64::NAN], &[0])]);
    let errors = attach(&circuit, None).unwrap_err();
    assert!(errors[0].message.contains("not finite"));
}
