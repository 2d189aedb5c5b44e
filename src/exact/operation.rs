//! What the evaluation understands: few kinds of operations on density matrices
//! and classical bits.

use std::sync::Arc;

use num_complex::Complex64;
use smallvec::SmallVec;

use crate::circuit::{BitExpression, Clifford, PauliProduct, Qubits};
use crate::noise::{PauliChannel, ReadoutFlip};

use super::matrix::{Map, kraus};

/// An operation, possibly under a condition.
#[derive(Debug, Clone)]
pub(super) struct Operation {
    pub action: Action,
    /// The classical bit that must be 1.
    pub condition: Option<u32>,
}

/// What an operation does.
#[derive(Debug, Clone)]
pub(super) enum Action {
    Clifford(Clifford),
    /// diag(1, e^{iφ}) in the frame of the axis; `coherence` is the mean of
    /// e^{iφ}.
    Turn {
        axis: PauliProduct,
        coherence: Complex64,
    },
    /// Σ table[s][t]·Π_s·ρ·Π_t over the values of three commuting axes.
    BetweenValues {
        axes: Box<[PauliProduct; 3]>,
        table: Box<[[f64; 8]; 8]>,
    },
    /// A map on one qubit.
    Local {
        qubit: u32,
        map: Box<Map>,
        /// Whether every state keeps its trace.
        keeps_trace: bool,
        /// Whether what the qubit was before does not matter.
        forgets: bool,
    },
    Measure {
        qubit: u32,
        bit: Option<u32>,
        flip: ReadoutFlip,
    },
    /// Reset to |0⟩.
    Reset {
        qubit: u32,
    },
    Assign {
        bit: u32,
        value: Arc<BitExpression>,
    },
    Pauli(PauliChannel),
}

impl Action {
    /// Amplitude damping: √-weighted 1 → 1 and decay 1 → 0.
    pub fn damping(qubit: u32, gamma: f64) -> Self {
        let [zero, one] = [Complex64::ZERO, Complex64::ONE];
        let keep = [[one, zero], [zero, (1.0 - gamma).sqrt().into()]];
        Action::Local {
            qubit,
            map: Box::new(kraus(&[keep, decay(gamma)])),
            keeps_trace: true,
            forgets: false,
        }
    }

    /// What stands for damping in the companion of a run that damps the
    /// register: ρ → s·ρ + (1 − s)·P0·ρ·P0 + K1·ρ·K1†, s = √(1 − γ). It does not
    /// keep the trace.
    pub fn companion_damping(qubit: u32, gamma: f64) -> Self {
        let s = (1.0 - gamma).sqrt();
        let [zero, one] = [Complex64::ZERO, Complex64::ONE];
        let whole = Complex64::from(s.sqrt());
        let part = Complex64::from((1.0 - s).sqrt());
        let stay = [[whole, zero], [zero, whole]];
        let found = [[one * part, zero], [zero, zero]];
        Action::Local {
            qubit,
            map: Box::new(kraus(&[stay, found, decay(gamma)])),
            keeps_trace: false,
            forgets: false,
        }
    }

    /// The qubit takes the mixture of these states.
    pub fn prepare(qubit: u32, states: &[(f64, [Complex64; 2])]) -> Self {
        let mut operators = Vec::with_capacity(2 * states.len());
        for &(probability, state) in states {
            let scaled = state.map(|amplitude| amplitude * probability.sqrt());
            for from in 0..2 {
                let mut operator = [[Complex64::ZERO; 2]; 2];
                operator[0][from] = scaled[0];
                operator[1][from] = scaled[1];
                operators.push(operator);
            }
        }
        Action::Local {
            qubit,
            map: Box::new(kraus(&operators)),
            keeps_trace: true,
            forgets: true,
        }
    }

    /// The qubits it acts on.
    pub fn qubits(&self) -> Qubits {
        match self {
            Action::Clifford(gate) => clifford_qubits(gate),
            Action::Turn { axis, .. } => axis.iter().map(|&(qubit, _)| qubit).collect(),
            Action::BetweenValues { axes, .. } => {
                let mut qubits: Qubits = axes.iter().flatten().map(|&(qubit, _)| qubit).collect();
                qubits.sort_unstable();
                qubits.dedup();
                qubits
            }
            Action::Local { qubit, .. }
            | Action::Measure { qubit, .. }
            | Action::Reset { qubit } => SmallVec::from_slice(&[*qubit]),
            Action::Assign { .. } => Qubits::new(),
            Action::Pauli(channel) => channel.qubits.clone(),
        }
    }

    /// The bit it may write.
    pub fn written(&self) -> Option<u32> {
        match self {
            Action::Measure { bit, .. } => *bit,
            Action::Assign { bit, .. } => Some(*bit),
            _ => None,
        }
    }
}

fn decay(gamma: f64) -> [[Complex64; 2]; 2] {
    let zero = Complex64::ZERO;
    [[zero, gamma.sqrt().into()], [zero, zero]]
}

fn clifford_qubits(gate: &Clifford) -> Qubits {
    match gate {
        Clifford::X(q)
        | Clifford::Y(q)
        | Clifford::Z(q)
        | Clifford::H(q)
        | Clifford::S(q)
        | Clifford::Sdg(q) => SmallVec::from_slice(&[*q]),
        Clifford::Cx(a, b) | Clifford::Cz(a, b) | Clifford::Swap(a, b) => {
            SmallVec::from_slice(&[*a, *b])
        }
        Clifford::QuarterTurn(axis) => axis.iter().map(|&(qubit, _)| qubit).collect(),
    }
}

/// Calls `visit` for every bit a formula reads.
pub(super) fn each_bit(formula: &BitExpression, visit: &mut impl FnMut(u32)) {
    match formula {
        BitExpression::Constant(_) => {}
        BitExpression::Bit(bit) => visit(*bit),
        BitExpression::Not(inner) => each_bit(inner, visit),
        BitExpression::Xor(parts) | BitExpression::And(parts) | BitExpression::Or(parts) => {
            parts.iter().for_each(|part| each_bit(part, visit));
        }
    }
}
