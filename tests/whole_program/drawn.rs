//! Drawn shots against the reference and against published values.
//!
//! False-alarm rate 1e-6 a test. 60,000 shots catch an error of about 2 % total
//! variation on up to 32 outcomes.

use super::gates::LIBRARY;
use super::program::{Folder, attribute, counts, succeed};
use super::reference::{
    Channel, Circuit, amplitude_damping, depolarizing, flip, over_rotation, pauli_channel,
    relaxation,
};
use super::statistics::{FALSE_ALARM, fit_p_value};

const SHOTS: u64 = 60_000;

/// Draws a circuit and returns the counts of register `c`, with the folder that
/// holds `out.h5`.
fn draw(circuit: &Circuit, shots: u64, seed: u64, options: &[&str]) -> (Vec<u64>, Folder) {
    let folder = Folder::new();
    let file = folder.write("circuit.qasm", circuit.text());
    let (shots, seed, out) = (shots.to_string(), seed.to_string(), folder.text("out.h5"));
    let mut arguments = vec![
        "run", &file, "--shots", &shots, "--seed", &seed, "--out", &out,
    ];
    arguments.push("--quiet");
    arguments.extend(options);
    succeed(&arguments);
    (counts(&folder.path("out.h5"), "c", circuit.bits()), folder)
}

fn check(name: &str, circuit: &Circuit, law: &[f64], counts: &[u64]) {
    let p_value = fit_p_value(counts, law);
    assert!(
        p_value > FALSE_ALARM,
        "{name}: {counts:?} for {law:?}\n{}",
        circuit.text()
    );
}

/// h, t, h, measure.
fn one_t() -> Circuit {
    let mut circuit = Circuit::new(1, 1);
    circuit.gate("h", &[], &[0], &[]);
    circuit.gate("t", &[], &[0], &[]);
    circuit.gate("h", &[], &[0], &[]);
    circuit.measure_all();
    circuit
}

/// GHZ state, a dephased t on the first qubits, X parity in the last bit.
fn ghz(count: usize, rotated: usize, p: f64) -> Circuit {
    let mut circuit = Circuit::new(count, count + 1);
    circuit.gate("h", &[], &[0], &[]);
    for i in 1..count {
        circuit.gate("cx", &[], &[i - 1, i], &[]);
    }
    for i in 0..rotated {
        circuit.gate("t", &[], &[i], &[flip("dephasing", p)]);
    }
    for i in 0..count {
        circuit.gate("h", &[], &[i], &[]);
    }
    circuit.measure_all();
    let parity: Vec<String> = (0..count).map(|i| format!("c[{i}]")).collect();
    let mask = (1 << count) - 1;
    circuit.assign(count, &parity.join(" ^ "), move |bits| {
        (bits & mask).count_ones() % 2 == 1
    });
    circuit
}

/// A Bell pair with a channel after the cx, measured in the Bell basis.
fn bell(noise: &[Channel]) -> Circuit {
    let mut circuit = Circuit::new(2, 2);
    circuit.gate("h", &[], &[0], &[]);
    circuit.gate("cx", &[], &[0, 1], noise);
    circuit.gate("cx", &[], &[0, 1], &[]);
    circuit.gate("h", &[], &[0], &[]);
    circuit.measure_all();
    circuit
}

/// P(0) of one qubit rotated by u3, sent through a channel and rotated again.
fn one_qubit(channel: Channel, before: [f64; 3], after: &[&str]) -> Circuit {
    let mut circuit = Circuit::new(1, 1);
    circuit.gate("u3", &before, &[0], &[channel]);
    for name in after {
        circuit.gate(name, &[], &[0], &[]);
    }
    circuit.measure_all();
    circuit
}

fn even(law: &[f64]) -> f64 {
    law[..law.len() / 2].iter().sum()
}

/// cos²(π/8); GHZ parities (1 + cos(mπ/4)(1 − 2p)^m)/2; Bell fidelity 1 − 4p/5;
/// damping (√(1−γ)x, √(1−γ)y, γ + (1−γ)z); relaxation (1 + e^{−t/t2})/2. Closed
/// forms of textbooks, the digits recomputed.
#[test]
fn the_reference_gives_published_values() {
    let near = |value: f64, published: f64| {
        assert!(
            (value - published).abs() < 1e-11,
            "{value} is not {published}"
        );
    };
    near(one_t().law()[0], 0.853553390593);
    near(even(&ghz(4, 3, 0.1).law()), 0.318980664016);
    near(even(&ghz(5, 5, 0.02).law()), 0.211722218166);
    near(bell(&[depolarizing(0.1, 2)]).law()[0], 0.92);
    let (polar, azimuth, gamma) = (1.0_f64, 0.7_f64, 0.2_f64);
    let damped = |after: &[&str]| {
        2.0 * one_qubit(amplitude_damping(gamma), [polar, azimuth, 0.0], after).law()[0] - 1.0
    };
    near(damped(&[]), gamma + (1.0 - gamma) * polar.cos());
    near(
        damped(&["h"]),
        (1.0 - gamma).sqrt() * polar.sin() * azimuth.cos(),
    );
    near(
        damped(&["sdg", "h"]),
        (1.0 - gamma).sqrt() * polar.sin() * azimuth.sin(),
    );
    let plus = [std::f64::consts::FRAC_PI_2, 0.0, 0.0];
    let relaxed = one_qubit(relaxation(80.0, 60.0, 5.0), plus, &["h"]).law()[0];
    near(2.0 * relaxed - 1.0, 0.920044414629);
    let turned = one_qubit(over_rotation("x", 0.3), [0.0; 3], &["sdg", "h"]).law()[0];
    near(2.0 * turned - 1.0, -0.3_f64.sin());
    let words = pauli_channel(&[("XI", 0.1), ("IZ", 0.2)]);
    // From |Φ⟩: X on either qubit sets the second outcome, Z the first.
    let law = bell(&[words]).law();
    near(law[0b10], 0.1);
    near(law[0b01], 0.2);
}

#[test]
fn published_circuits_in_dense() {
    for (seed, (name, circuit)) in [
        ("h t h", one_t()),
        ("ghz 4", ghz(4, 3, 0.1)),
        ("bell", bell(&[depolarizing(0.1, 2)])),
        (
            "damped",
            one_qubit(amplitude_damping(0.2), [1.0, 0.7, 0.0], &["sdg", "h"]),
        ),
    ]
    .into_iter()
    .enumerate()
    {
        let (counts, _) = draw(
            &circuit,
            2 * SHOTS,
            10 + seed as u64,
            &["--readout", "dense"],
        );
        check(name, &circuit, &circuit.law(), &counts);
    }
}

/// P_out(0) = [(k − 1)·cos²(π/8) + ξ·3/4]/(k − 1 + ξ), ξ = 1/cos²(π/8). Quantum 3,
/// 181 (2019) for ξ; the law is one line of algebra.
#[test]
fn the_mixing_law_of_one_t() {
    for (terms, published) in [("2", 0.797685892458), ("5", 0.830094310254)] {
        let options = ["--readout", "probe", "--delta", "0.01", "--terms", terms];
        let (counts, folder) = draw(&one_t(), SHOTS, 20, &options);
        check(terms, &one_t(), &[published, 1.0 - published], &counts);
        let extent = attribute(&folder.path("out.h5"), "extent");
        assert!((extent - 1.171572875254).abs() < 1e-9, "{extent}");
        // The ideal law must not pass: 60,000 shots see the admixture.
        assert!(fit_p_value(&counts, &one_t().law()) < FALSE_ALARM);
    }
}

/// SplitMix64, enough to choose circuits.
struct Random(u64);

impl Random {
    fn next(&mut self) -> u64 {
        self.0 = self.0.wrapping_add(0x9E37_79B9_7F4A_7C15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
        z ^ (z >> 31)
    }

    fn below(&mut self, n: usize) -> usize {
        (self.next() % n as u64) as usize
    }

    /// A number with three digits after the point.
    fn number(&mut self, low: f64, high: f64) -> f64 {
        let share = (self.next() >> 11) as f64 / (1_u64 << 53) as f64;
        ((low + (high - low) * share) * 1000.0).round() / 1000.0
    }

    fn channel(&mut self, width: usize) -> Channel {
        let p = self.number(0.01, 0.15);
        match self.below(8) {
            0 => depolarizing(p, width),
            1 => flip("dephasing", p),
            2 => flip("bit-flip", p),
            3 => flip("bit-phase-flip", p),
            4 => amplitude_damping(p),
            5 => relaxation(80.0, 60.0, self.number(1.0, 20.0)),
            6 => over_rotation(["x", "y", "z"][self.below(3)], self.number(-0.6, 0.6)),
            _ => {
                let word = |i: usize| ["X", "Y", "Z", "I"][i];
                let first: String = (0..width).map(|_| word(self.below(3))).collect();
                let second = format!("Z{}", "I".repeat(width - 1));
                if first == second {
                    pauli_channel(&[(&first, p)])
                } else {
                    pauli_channel(&[(&first, p), (&second, p / 2.0)])
                }
            }
        }
    }
}

const QUBITS: usize = 3;

fn random_gates(circuit: &mut Circuit, random: &mut Random, count: usize) {
    for _ in 0..count {
        let (name, width, angles) = LIBRARY[random.below(LIBRARY.len())];
        let mut qubits: Vec<usize> = (0..QUBITS).collect();
        for i in 0..QUBITS {
            qubits.swap(i, i + random.below(QUBITS - i));
        }
        let angles: Vec<f64> = (0..angles).map(|_| random.number(-3.2, 3.2)).collect();
        let noise: Vec<Channel> = (0..random.below(5) / 3)
            .map(|_| random.channel(width))
            .collect();
        circuit.gate(name, &angles, &qubits[..width], &noise);
    }
}

/// Gates, a measurement with readout error, feedback, a reset, a parity.
fn random_circuit(seed: u64) -> Circuit {
    let mut random = Random(seed);
    let mut circuit = Circuit::new(QUBITS, QUBITS + 2);
    for qubit in 0..QUBITS {
        let angles = [random.number(0.3, 2.8), random.number(-3.0, 3.0), 0.4];
        circuit.gate("u3", &angles, &[qubit], &[]);
    }
    random_gates(&mut circuit, &mut random, 6);
    let (measured, reset) = (random.below(QUBITS), random.below(QUBITS));
    circuit.measure(
        measured,
        3,
        [random.number(0.0, 0.1), random.number(0.0, 0.1)],
    );
    let mut inner = Random(random.next());
    let mut other = Random(random.next());
    circuit.when(
        "c[3] == 1",
        |bits| bits >> 3 & 1 == 1,
        |circuit| {
            random_gates(circuit, &mut inner, 2);
            circuit.reset(reset);
        },
        |circuit| random_gates(circuit, &mut other, 2),
    );
    random_gates(&mut circuit, &mut random, 5);
    circuit.measure_all();
    circuit.assign(4, "c[0] ^ c[3] & !c[1]", |bits| {
        (bits & 1) ^ (bits >> 3 & 1 & !(bits >> 1) & 1) == 1
    });
    circuit
}

#[test]
fn random_circuits_in_dense() {
    for seed in 0..10 {
        let circuit = random_circuit(seed);
        let law = circuit.law();
        let (counts, _) = draw(&circuit, SHOTS, 30 + seed, &["--readout", "dense"]);
        check(&format!("random circuit {seed}"), &circuit, &law, &counts);
    }
}

/// Every library gate once, between generic rotations.
#[test]
fn every_gate_in_dense() {
    for (index, &(name, width, angles)) in LIBRARY.iter().enumerate() {
        let mut circuit = Circuit::new(width, width);
        for qubit in 0..width {
            circuit.gate("u3", &[0.8 + 0.3 * qubit as f64, 0.5, 1.1], &[qubit], &[]);
        }
        let angles = &[0.9, -0.4, 1.7, 0.6][..angles];
        let qubits: Vec<usize> = (0..width).rev().collect();
        circuit.gate(name, angles, &qubits, &[]);
        for qubit in 0..width {
            circuit.gate("u3", &[1.2 - 0.4 * qubit as f64, 0.3, 0.7], &[qubit], &[]);
        }
        circuit.measure_all();
        let (counts, _) = draw(&circuit, 30_000, 50 + index as u64, &["--readout", "dense"]);
        check(name, &circuit, &circuit.law(), &counts);
    }
}
