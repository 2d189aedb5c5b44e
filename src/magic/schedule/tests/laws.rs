//! Whole circuits, from text to schedule: outcome probabilities and extents
//! with a known answer.

use crate::circuit::{ParseOptions, parse};
use crate::magic::{Kind as Scheduled, Schedule, ScheduleOptions, schedule};
use crate::noise::attach;

use super::dense;

/// A circuit on q[0..] with bits c[0..], annotated.
fn of_text(qubits: usize, body: &str) -> [Schedule; 2] {
    let text = format!(
        "OPENQASM 3.0;\ninclude \"stdgates.inc\";\nqubit[{qubits}] q;\nbit[{qubits}] c;\n{body}"
    );
    let circuit = parse("test.qasm", &text, &ParseOptions::default())
        .unwrap_or_else(|errors| panic!("{errors:#?}"));
    let noisy = attach(&circuit, None).unwrap_or_else(|errors| panic!("{errors:#?}"));
    [true, false].map(|absorb| schedule(&noisy, qubits, &ScheduleOptions { absorb }))
}

/// The probability of an event under both schedules.
#[track_caller]
fn expect(qubits: usize, body: &str, event: impl Fn(u64) -> bool, probability: f64) {
    for schedule in of_text(qubits, body) {
        let found = dense::of_schedule(&schedule, qubits).probability(&event);
        assert!(
            (found - probability).abs() < 1e-11,
            "{found} is not {probability}\n{schedule:#?}"
        );
    }
}

fn extent(schedule: &Schedule) -> f64 {
    schedule.sites.iter().map(|site| site.extent).product()
}

/// P(even) = (1 + cos(mπ/4)(1 − 2p)^m)/2 for a GHZ state with a dephased T on m
/// of its qubits, all measured in X (derived; the numbers by exact simulation).
#[test]
fn parity_of_a_ghz_state_with_dephased_t_gates() {
    let even = |bits: u64| bits.count_ones().is_multiple_of(2);
    for (m, p, probability) in [(3, 0.1, 0.318980664016), (5, 0.02, 0.211722218166)] {
        let body = format!(
            "h q[0];\nfor int i in [1:{last}] {{ cx q[0], q[i]; }}\nfor int i in [0:{last}] {{\n@noise dephasing({p})\nt q[i];\n}}\nh q;\nc = measure q;",
            last = m - 1
        );
        expect(m, &body, even, probability);
        let [absorbed, kept] = of_text(m, &body);
        // Extents multiply: Quantum 3, 181 (2019).
        let t = 1.171572875254f64;
        assert!((extent(&kept) / t.powi(m as i32) - 1.0).abs() < 1e-9);
        assert!((extent(&absorbed) / ((1.0 - p) * t).powi(m as i32) - 1.0).abs() < 1e-9);
    }
}

/// h, delay, h: P(0) = (1 + e^{−t/t2})/2 (textbook).
#[test]
fn relaxation_shrinks_coherences() {
    let body = "h q;\n@noise relaxation(80us, 60us)\ndelay[5us] q[0];\nh q;\nc = measure q;";
    let probability = (1.0 + 0.920044414629) / 2.0;
    expect(1, body, |bits| bits == 0, probability);
}

/// Damping of |1⟩ after being entangled, and its effect on a Bell pair.
#[test]
fn damping_of_half_a_bell_pair() {
    // |11⟩ decays to |01⟩ with γ: P(00) = 1/2, P(11) = (1 − γ)/2.
    let body = "h q[0];\ncx q[0], q[1];\n@noise amplitude-damping(0.2)\nid q[0];\nc = measure q;";
    expect(2, body, |bits| bits == 0b00, 0.5);
    expect(2, body, |bits| bits == 0b11, 0.4);
    expect(2, body, |bits| bits == 0b10, 0.1);
}

/// h, t, h: P(0) = cos²(π/8); h, rz(0.3), h: cos²(0.15) (textbook).
#[test]
fn one_rotation_between_hadamards() {
    expect(
        1,
        "h q;\nt q;\nh q;\nc = measure q;",
        |bits| bits == 0,
        0.853553390593,
    );
    expect(
        1,
        "h q;\nrz(0.3) q;\nh q;\nc = measure q;",
        |bits| bits == 0,
        0.977668244563,
    );
}

/// T-type injection with its S correction equals a T gate; Phys. Rev. A 71,
/// 022316 (2005) for the idea. The X outcome of the result has cos²(π/8).
#[test]
fn injection_equals_a_t_gate() {
    let body = "h q[0];\nh q[1];\nt q[1];\ncx q[0], q[1];\nc[1] = measure q[1];\nif (c[1]) { s q[0]; }\nh q[0];\nc[0] = measure q[0];";
    expect(2, body, |bits| bits & 1 == 0, 0.853553390593);
    expect(2, body, |bits| bits >> 1 & 1 == 1, 0.5);
}

/// rz(a) with over-rotation(z, b) is rz(a + b), also in the extent (definition;
/// extents: Quantum 3, 181 (2019)).
#[test]
fn over_rotation_adds_to_its_rotation() {
    let body = |gate: &str| {
        format!(
            "h q;\ncz q[0], q[1];\n@noise over-rotation(z, 0.1)\n{gate} q[0];\nh q;\nc = measure q;"
        )
    };
    for (gate, expected) in [
        ("rz(0.2)", 1.1039082456),
        ("rz(0.4)", 1.1478775971),
        ("s", 1.0392830127),
    ] {
        for schedule in of_text(2, &body(gate)) {
            assert_eq!(schedule.sites.len(), 1);
            assert!((extent(&schedule) / expected - 1.0).abs() < 1e-9, "{gate}");
        }
    }
}

/// A ccx is one CCZ of extent 16/9, and a written-out one is not cheaper than
/// that; Quantum 3, 181 (2019).
#[test]
fn a_ccx_is_one_site() {
    let start = "h q;\ncz q[0], q[1];\ncz q[1], q[2];\n";
    let [whole, _] = of_text(3, &format!("{start}ccx q[0], q[1], q[2];"));
    assert!((extent(&whole) - 16.0 / 9.0).abs() < 1e-12);
    let written = "h q[2];\ncx q[1], q[2];\ntdg q[2];\ncx q[0], q[2];\nt q[2];\ncx q[1], q[2];\ntdg q[2];\ncx q[0], q[2];\nt q[1];\nt q[2];\nh q[2];\ncx q[0], q[1];\nt q[0];\ntdg q[1];\ncx q[0], q[1];";
    let [apart, _] = of_text(3, &format!("{start}{written}"));
    assert!((extent(&apart) / 3.029599058 - 1.0).abs() < 1e-9);
}

/// Damping of a fresh qubit moves into its prepared state, and stays damping
/// where noise is not absorbed.
#[test]
fn damping_of_a_fresh_qubit() {
    let [absorbed, kept] = of_text(
        1,
        "h q;\n@noise amplitude-damping(0.2)\nt q;\nc = measure q;",
    );
    let dampings = |schedule: &Schedule| {
        let kinds = schedule.instructions.iter();
        kinds
            .filter(|it| matches!(it.kind, Scheduled::Damping { .. }))
            .count()
    };
    assert_eq!((dampings(&absorbed), absorbed.sites.len()), (0, 1));
    assert_eq!((dampings(&kept), kept.sites.len()), (1, 1));
}
