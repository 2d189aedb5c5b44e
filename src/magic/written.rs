//! The non-Clifford gates of a circuit as it is written, before anything is
//! merged: what the rewrites are compared with.

use crate::circuit::{Action, Circuit, Elementary};

use super::schedule::quarters_and_rest;
use super::{CczSite, extent};

/// Non-Clifford gates and the product of their extents.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Written {
    /// Rotations by no multiple of π/2, and CCZ, in the gates of the circuit.
    pub gates: usize,
    /// Natural logarithm of the product of their extents, each by itself and
    /// without noise.
    pub log_extent: f64,
}

/// Counts the non-Clifford gates of a circuit, library gates taken apart.
pub fn as_written(circuit: &Circuit) -> Written {
    let mut written = Written::default();
    for operation in &circuit.operations {
        let Action::Gate {
            gate, parameters, ..
        } = &operation.action
        else {
            continue;
        };
        for elementary in gate.expand(parameters) {
            let extent = match elementary {
                Elementary::Clifford(_) => continue,
                Elementary::Ccz(_) => CczSite::EXTENT,
                Elementary::Rotation { angle, .. } => match quarters_and_rest(angle) {
                    (_, 0.0) => continue,
                    (_, rest) => extent::of_rotation(rest),
                },
            };
            written.gates += 1;
            written.log_extent += extent.ln();
        }
    }
    written
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::circuit::{ParseOptions, parse};

    /// 1/cos²(π/8) a t, 16/9 a ccx: Quantum 3, 181 (2019).
    #[test]
    fn gates_count_one_by_one() {
        let text = "OPENQASM 3.0;\ninclude \"stdgates.inc\";\nqubit[3] q;\nt q[0];\ntdg q[0];\nrz(pi/2) q[1];\ncx q[0], q[1];\nccx q[0], q[1], q[2];\n";
        let circuit = parse("test.qasm", text, &ParseOptions::default()).expect("it is valid");
        let written = as_written(&circuit);
        assert_eq!(written.gates, 3);
        let expected = 2.0 * 1.17157287525381f64.ln() + (16.0f64 / 9.0).ln();
        assert!((written.log_extent - expected).abs() < 1e-12);
    }
}
