//! Published and derived values. The comparison with plain matrices on random
//! circuits stands beside the sampler's tests, which have both.

use crate::circuit::{self, ParseOptions};
use crate::magic::mixing::{log_extent, mixing_weight};
use crate::magic::{ScheduleOptions, schedule};
use crate::noise::{self, NoisyCircuit};
use crate::program::Program;

use super::{ExactError, Law, companion, ideal};

struct Case {
    noisy: NoisyCircuit,
    program: Program,
    recorded: Vec<u32>,
}

fn case(body: &str) -> Case {
    let text = format!("OPENQASM 3.0;\ninclude \"stdgates.inc\";\n{body}");
    let circuit = circuit::parse("test.qasm", &text, &ParseOptions::default()).unwrap();
    let noisy = noise::attach(&circuit, None).unwrap();
    let qubits = circuit.qubits.len();
    let schedule = schedule(&noisy, qubits, &ScheduleOptions::default());
    let program = Program::compile(schedule, qubits, circuit.bits).unwrap();
    let recorded = circuit
        .registers
        .iter()
        .filter(|register| register.recorded)
        .flat_map(|register| register.first..register.first + register.width)
        .map(|bit| bit as u32)
        .collect();
    Case {
        noisy,
        program,
        recorded,
    }
}

impl Case {
    fn ideal(&self) -> Law {
        ideal(&self.noisy, &self.recorded).unwrap()
    }

    fn companion(&self) -> Law {
        companion(&self.program, &self.recorded).unwrap()
    }

    fn mixed(&self, terms: u64) -> Law {
        let weight = mixing_weight(log_extent(self.program.sites()), terms);
        self.ideal().mixed(&self.companion(), weight)
    }
}

fn close(found: f64, expected: f64) {
    assert!((found - expected).abs() < 1e-10, "{found}, not {expected}");
}

/// h, gate, h: P(0), P_comp(0) and P_out(0). Derived by summing over all draws;
/// the T gate also by hand, cos²(π/8) and 3/4.
#[test]
fn one_rotation() {
    let t = case("qubit q; bit c; h q; t q; h q; c = measure q;");
    close(t.ideal().weight(&[0]), 0.853553390593);
    close(t.companion().weight(&[0]), 0.75);
    for (terms, expected) in [
        (1, 0.75),
        (2, 0.797685892458),
        (5, 0.830094310254),
        (10, 0.841625997942),
        (100, 0.852342265120),
    ] {
        close(t.mixed(terms).weight(&[0]), expected);
    }
    for (angle, ideal, companion, out) in [
        (0.3, 0.977668244563, 0.899427338071, 0.969119989796),
        (1.1, 0.726798060713, 0.654269621158, 0.718626063367),
    ] {
        let rotation = case(&format!(
            "qubit q; bit c; h q; rz({angle}) q; h q; c = measure q;"
        ));
        close(rotation.ideal().weight(&[0]), ideal);
        close(rotation.companion().weight(&[0]), companion);
        close(rotation.mixed(10).weight(&[0]), out);
    }
}

/// h h h, ccz, h h h: 9/16 and seven times 1/16; companion 0.34375 and seven
/// times 0.09375, from the eight diagonal forms of Quantum 3, 181 (2019).
#[test]
fn one_ccz() {
    let ccz = case("qubit[3] q; bit[3] c; h q; ctrl(2) @ z q[0], q[1], q[2]; h q; c = measure q;");
    let (ideal, companion) = (ccz.ideal(), ccz.companion());
    for value in 0..8u64 {
        let (own, other) = if value == 0 {
            (9.0 / 16.0, 0.34375)
        } else {
            (1.0 / 16.0, 0.09375)
        };
        close(ideal.weight(&[value]), own);
        close(companion.weight(&[value]), other);
    }
    // A ccx is the same between two h on its target, which turns one axis to X.
    let ccx = case(
        "qubit[3] q; bit[3] c; h q[0]; h q[1]; ccx q[0], q[1], q[2]; h q[0]; h q[1]; c = measure q;",
    );
    assert!(ccx.ideal().distance(&ideal) < 1e-12);
    assert!(ccx.companion().distance(&companion) < 1e-12);
}

/// n-qubit GHZ state, t on m qubits each dephased by p, all measured in X:
/// P(even parity) = (1 + cos(mπ/4)(1 − 2p)^m)/2.
#[test]
fn phases_of_a_ghz_state() {
    for (count, dephasing, expected) in [(3, 0.1, 0.318980664016), (5, 0.02, 0.211722218166)] {
        let law = case(&format!(
            "qubit[5] q; bit[5] c; output bit even; h q[0];
             for int i in [0:3] {{ cx q[i], q[i + 1]; }}
             for int i in [0:{}] {{
               @noise dephasing({dephasing})
               t q[i];
             }}
             h q; c = measure q; even = !(c[0] ^ c[1] ^ c[2] ^ c[3] ^ c[4]);",
            count - 1
        ))
        .ideal();
        close(law.weight(&[1]), expected);
        close(law.total(), 1.0);
    }
}

/// Textbook laws: depolarizing shrinks the Bloch vector by 1 − 4p/3 a time, two
/// qubits' Paulis by 1 − 16p/15; relaxation leaves the coherence e^{−t/t2}; a
/// readout flip is a stochastic matrix.
#[test]
fn channels() {
    let law = case(
        "qubit q; bit c;
         for int i in [0:9] {
           @noise depolarizing(0.01)
           id q;
         }
         c = measure q;",
    );
    close(law.ideal().weight(&[0]), 0.5 * (1.0 + 0.874388754238));
    // Bell pair after one two-qubit depolarizing: fidelity 1 − 4p/5.
    let bell = case(
        "qubit[2] q; bit[2] c; h q[0]; @noise depolarizing(0.1)
         cx q[0], q[1]; cx q[0], q[1]; h q[0]; c = measure q;",
    );
    close(bell.ideal().weight(&[0]), 0.92);
    // Five qubits jointly, where the words are not listed: 1 − p·(4^5 − 2^5)/(4^5 − 1),
    // the share of words that keep |00000⟩ being (2^5 − 1)/(4^5 − 1).
    let five = case(
        "qubit[5] q; bit[5] c; @noise depolarizing(0.3)
         barrier q; c = measure q;",
    );
    close(five.ideal().weight(&[0]), 1.0 - 0.3 * 992.0 / 1023.0);
    let waiting = case(
        "qubit q; bit c; h q; @noise relaxation(80us, 60us)
         delay[5us] q; h q; c = measure q;",
    );
    close(waiting.ideal().weight(&[0]), 0.5 * (1.0 + 0.920044414629));
    let flipped = case(
        "qubit q; bit c; x q; @noise readout-flip(0.03, 0.11)
         c = measure q;",
    );
    close(flipped.ideal().weight(&[1]), 0.89);
}

/// Amplitude damping takes (x, y, z) to (√(1−γ)x, √(1−γ)y, γ + (1−γ)z), also
/// for half of an entangled pair, where its Pauli twirl would differ.
#[test]
fn amplitude_damping() {
    let damped = |before: &str, after: &str| {
        case(&format!(
            "qubit q; bit c; {before}; @noise amplitude-damping(0.2)
             id q; {after} c = measure q;"
        ))
        .ideal()
        .weight(&[0])
    };
    close(
        damped("ry(1.1) q", ""),
        0.5 * (1.0 + 0.2 + 0.8 * 1.1f64.cos()),
    );
    close(
        damped("ry(1.1) q", "h q;"),
        0.5 * (1.0 + 0.8f64.sqrt() * 1.1f64.sin()),
    );
    // |Φ+⟩ with one half damped: P(00) = 1/2, P(01) = γ/2, P(11) = (1−γ)/2, and
    // ⟨XX⟩ = √(1−γ).
    let pair = "qubit[2] q; output bit[2] c; h q[0]; cx q[0], q[1];
         @noise amplitude-damping(0.2)
         id q[0];";
    let law = case(&format!("{pair} c = measure q;")).ideal();
    for (value, expected) in [(0, 0.5), (1, 0.0), (2, 0.1), (3, 0.4)] {
        close(law.weight(&[value]), expected);
    }
    let turned = case(&format!("{pair} h q; c = measure q;"));
    let even = turned.ideal().weight(&[0]) + turned.ideal().weight(&[3]);
    close(even, 0.5 * (1.0 + 0.8f64.sqrt()));
    // The companion of that: with s = √0.8 the map s·ρ + (1−s)·P0ρP0 + K1ρK1†
    // has trace s + (1−s)/2 + γ/2 on a qubit that is 0 half the time, and leaves
    // the coherence s.
    let s = 0.8f64.sqrt();
    let companion = turned.companion();
    close(companion.total(), s + 0.5 * (1.0 - s) + 0.1);
    let odd = companion.weight(&[1]) + companion.weight(&[2]);
    let even = companion.weight(&[0]) + companion.weight(&[3]);
    close(even - odd, s);
}

/// T by injection with an s correction is T, and each outcome has probability
/// 1/2: Phys. Rev. A 71, 022316 (2005) for the idea. The ancilla is used again,
/// so that two qubits are in use at a time however many injections there are.
#[test]
fn injections_need_two_qubits_at_a_time() {
    let text = "qubit a; qubit b; bit[8] m; output bit c; h a;
         for int i in [0:7] {
           reset b; h b; t b; cx a, b; m[i] = measure b;
           if (m[i]) s a;
         }
         h a; c = measure a;";
    let injected = case(text);
    // t^8 = 1.
    close(injected.ideal().weight(&[0]), 1.0);
    assert_eq!(injected.ideal().len(), 1);
    close(injected.companion().total(), 1.0);
    let recorded = case(&text.replace("bit[8] m", "output bit[8] m"));
    assert_eq!(recorded.ideal().len(), 256);
    for (_, weight) in recorded.ideal().iter() {
        close(weight, 1.0 / 256.0);
    }
}

#[test]
fn what_is_too_large_is_refused_with_numbers() {
    let wide = case(
        "qubit[13] q; bit[13] c; h q[0]; for int i in [0:11] { cx q[i], q[i + 1]; } c = measure q;",
    );
    let error = ideal(&wide.noisy, &wide.recorded).unwrap_err();
    assert_eq!(error, ExactError::TooManyQubits { found: 13 });
    assert!(error.to_string().contains("13") && error.to_string().contains("12"));
    // One qubit, measured again and again: 2^21 outcomes.
    let long = case("qubit q; bit[21] c; for int i in [0:20] { h q; c[i] = measure q; }");
    let error = ideal(&long.noisy, &long.recorded).unwrap_err();
    assert!(
        matches!(error, ExactError::TooManyBranches { .. }),
        "{error}"
    );
    // A product of many qubits is small: each is in use alone.
    let product = case(
        "qubit[40] q; bit[40] c; output bit p; h q; t q; h q; c = measure q; p = c[0] ^ c[39];",
    );
    assert!(ideal(&product.noisy, &product.recorded).is_ok());
}

/// Conditions that change the structure, and what the program leaves out.
#[test]
fn companions_of_branches() {
    let damped = case(
        "qubit[2] q; bit[2] c; h q; c[0] = measure q[0];
         if (c[0]) { @noise amplitude-damping(0.1)
         id q[1]; c[1] = measure q[1]; }",
    );
    let error = companion(&damped.program, &damped.recorded);
    assert_eq!(error, Err(ExactError::BranchingDamping));
    // t on a known axis is left as it is: nothing changes.
    let known =
        case("qubit[2] q; bit[2] c; x q[0]; t q[0]; h q[1]; t q[1]; h q[1]; c = measure q;");
    close(known.companion().weight(&[1]), 0.75);
    close(known.companion().weight(&[3]), 0.25);
}
