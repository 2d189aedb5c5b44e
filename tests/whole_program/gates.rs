//! Every library gate as a sequence of U(θ, φ, λ) and cx.
//!
//! Source: the library file of OpenQASM 2 (arXiv:1707.03429) and of OpenQASM 3
//! (arXiv:2104.14722), from memory. Exact up to a global phase.

use std::f64::consts::{FRAC_PI_2 as HALF_PI, FRAC_PI_4 as QUARTER_PI, PI};

/// One step: U on a qubit of the call, or cx between two.
pub enum Basic {
    U(usize, [f64; 3]),
    Cx(usize, usize),
}

/// Name, number of qubits, number of angles.
pub const LIBRARY: [(&str, usize, usize); 41] = [
    ("id", 1, 0),
    ("x", 1, 0),
    ("y", 1, 0),
    ("z", 1, 0),
    ("h", 1, 0),
    ("s", 1, 0),
    ("sdg", 1, 0),
    ("t", 1, 0),
    ("tdg", 1, 0),
    ("sx", 1, 0),
    ("sxdg", 1, 0),
    ("p", 1, 1),
    ("phase", 1, 1),
    ("u1", 1, 1),
    ("rx", 1, 1),
    ("ry", 1, 1),
    ("rz", 1, 1),
    ("u2", 1, 2),
    ("u3", 1, 3),
    ("U", 1, 3),
    ("cx", 2, 0),
    ("CX", 2, 0),
    ("cy", 2, 0),
    ("cz", 2, 0),
    ("ch", 2, 0),
    ("swap", 2, 0),
    ("iswap", 2, 0),
    ("cp", 2, 1),
    ("cphase", 2, 1),
    ("cu1", 2, 1),
    ("crx", 2, 1),
    ("cry", 2, 1),
    ("crz", 2, 1),
    ("cu3", 2, 3),
    ("cu", 2, 4),
    ("rxx", 2, 1),
    ("ryy", 2, 1),
    ("rzz", 2, 1),
    ("ccx", 3, 0),
    ("ccz", 3, 0),
    ("cswap", 3, 0),
];

/// A word such as "h 1; cx 0 1" spelled out; angles are given by position.
fn word(text: &str, angles: &[f64], out: &mut Vec<Basic>) {
    for call in text.split(';') {
        let mut parts = call.split_whitespace();
        let name = parts.next().expect("a gate name");
        let qubits: Vec<usize> = parts.map(|q| q.parse().expect("a qubit")).collect();
        let start = out.len();
        expand(name, angles, out);
        for basic in &mut out[start..] {
            match basic {
                Basic::U(q, _) => *q = qubits[*q],
                Basic::Cx(a, b) => (*a, *b) = (qubits[*a], qubits[*b]),
            }
        }
    }
}

/// Appends the gate on qubits 0, 1, … of its call.
pub fn expand(name: &str, a: &[f64], out: &mut Vec<Basic>) {
    let mut u = |q, angles| out.push(Basic::U(q, angles));
    match name {
        "id" => u(0, [0.0; 3]),
        "x" => u(0, [PI, 0.0, PI]),
        "y" => u(0, [PI, HALF_PI, HALF_PI]),
        "z" => u(0, [0.0, 0.0, PI]),
        "h" => u(0, [HALF_PI, 0.0, PI]),
        "s" => u(0, [0.0, 0.0, HALF_PI]),
        "sdg" => u(0, [0.0, 0.0, -HALF_PI]),
        "t" => u(0, [0.0, 0.0, QUARTER_PI]),
        "tdg" => u(0, [0.0, 0.0, -QUARTER_PI]),
        "sx" => u(0, [HALF_PI, -HALF_PI, HALF_PI]),
        "sxdg" => u(0, [-HALF_PI, -HALF_PI, HALF_PI]),
        "p" | "phase" | "u1" | "rz" => u(0, [0.0, 0.0, a[0]]),
        "rx" => u(0, [a[0], -HALF_PI, HALF_PI]),
        "ry" => u(0, [a[0], 0.0, 0.0]),
        "u2" => u(0, [HALF_PI, a[0], a[1]]),
        "u3" | "U" => u(0, [a[0], a[1], a[2]]),
        "cx" | "CX" => out.push(Basic::Cx(0, 1)),
        "cy" => word("sdg 1; cx 0 1; s 1", a, out),
        "cz" => word("h 1; cx 0 1; h 1", a, out),
        "ch" => word(
            "h 1; sdg 1; cx 0 1; h 1; t 1; cx 0 1; t 1; h 1; s 1; x 1; s 0",
            a,
            out,
        ),
        "swap" => word("cx 0 1; cx 1 0; cx 0 1", a, out),
        "iswap" => word("s 0; s 1; h 0; cx 0 1; cx 1 0; h 1", a, out),
        "cp" | "cphase" | "cu1" => {
            word("p 0", &[a[0] / 2.0], out);
            word("cx 0 1; p 1; cx 0 1", &[-a[0] / 2.0], out);
            word("p 1", &[a[0] / 2.0], out);
        }
        "crz" => {
            word("rz 1", &[a[0] / 2.0], out);
            word("cx 0 1; rz 1; cx 0 1", &[-a[0] / 2.0], out);
        }
        "cry" => {
            word("ry 1", &[a[0] / 2.0], out);
            word("cx 0 1; ry 1; cx 0 1", &[-a[0] / 2.0], out);
        }
        "crx" => word("h 1; crz 0 1; h 1", a, out),
        "cu3" => {
            word("p 0", &[(a[2] + a[1]) / 2.0], out);
            word("p 1", &[(a[2] - a[1]) / 2.0], out);
            word(
                "cx 0 1; u3 1; cx 0 1",
                &[-a[0] / 2.0, 0.0, -(a[1] + a[2]) / 2.0],
                out,
            );
            word("u3 1", &[a[0] / 2.0, a[1], 0.0], out);
        }
        "cu" => {
            word("p 0", &a[3..], out);
            word("cu3 0 1", &a[..3], out);
        }
        "rzz" => word("cx 0 1; rz 1; cx 0 1", a, out),
        "rxx" => word("h 0; h 1; rzz 0 1; h 0; h 1", a, out),
        "ryy" => word("sx 0; sx 1; rzz 0 1; sxdg 0; sxdg 1", a, out),
        "ccx" => word(
            "h 2; cx 1 2; tdg 2; cx 0 2; t 2; cx 1 2; tdg 2; cx 0 2; t 1; t 2; h 2; \
             cx 0 1; t 0; tdg 1; cx 0 1",
            a,
            out,
        ),
        "ccz" => word("h 2; ccx 0 1 2; h 2", a, out),
        "cswap" => word("cx 2 1; ccx 0 1 2; cx 2 1", a, out),
        _ => panic!("no gate {name}"),
    }
}
