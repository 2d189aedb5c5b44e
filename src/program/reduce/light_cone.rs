//! What lies outside the causal past of every recorded bit goes.
//!
//! Walking backwards, a qubit is *live* if something that is kept acts on it
//! later, a bit if it is recorded or something that is kept reads it before it
//! is written again. The joint law of the recorded bits is the trace of what is
//! kept, and a trace-preserving operation on qubits nobody looks at again does
//! not change a partial trace over them: Tr_A[(E_A ⊗ 1)ρ] = Tr_A ρ. So an
//! operation stays only if it touches a live qubit or writes a live bit.
//!
//! Liveness before an operation that stays:
//! - a gate makes all its qubits live, a swap exchanges theirs;
//! - a Pauli channel is a mixture of products of one-qubit unitaries, so what it
//!   does to its live qubits does not depend on the others: these stay as dead
//!   as they were;
//! - a reset forgets what was before; a prepared state needs its fresh qubit, so
//!   what made it fresh stays;
//! - a measurement or an assignment forgets the old value of its bit. Under a
//!   condition neither forgets anything, and the condition becomes live. A
//!   measurement whose bit is dead is kept as a measurement without one.

use crate::circuit::{BitExpression, Clifford};
use crate::magic::{Instruction, Kind, Schedule};

/// Takes out what no recorded bit can see. `recorded[b]` says whether bit b is
/// recorded; bits past its end are not. Returns for every site whether it went.
pub(super) fn trim(schedule: &mut Schedule, qubits: usize, recorded: &[bool]) -> Vec<bool> {
    let mut cone = Cone {
        qubits: vec![false; qubits],
        bits: recorded.to_vec(),
    };
    let mut gone = vec![false; schedule.sites.len()];
    let mut kept: Vec<bool> = schedule
        .instructions
        .iter_mut()
        .rev()
        .map(|instruction| {
            let keep = cone.sees(&instruction.kind);
            if keep {
                cone.widen(instruction);
            } else if let Kind::Gate { site, .. } | Kind::Prepare { site, .. } = instruction.kind {
                gone[site as usize] = true;
            }
            keep
        })
        .collect();
    schedule.instructions.retain(|_| kept.pop().unwrap_or(true));
    gone
}

/// Live qubits and bits.
struct Cone {
    qubits: Vec<bool>,
    bits: Vec<bool>,
}

impl Cone {
    fn qubit(&self, qubit: u32) -> bool {
        self.qubits[qubit as usize]
    }

    fn bit(&self, bit: u32) -> bool {
        self.bits.get(bit as usize).copied().unwrap_or(false)
    }

    fn set_bit(&mut self, bit: u32, live: bool) {
        let bit = bit as usize;
        if bit >= self.bits.len() {
            self.bits.resize(bit + 1, false);
        }
        self.bits[bit] = live;
    }

    /// Whether anything live depends on it.
    fn sees(&self, kind: &Kind) -> bool {
        match kind {
            Kind::Clifford(gate) => any_qubit(gate, |qubit| self.qubit(qubit)),
            Kind::Gate { axes, .. } => axes.iter().flatten().any(|&(qubit, _)| self.qubit(qubit)),
            Kind::Measure { qubit, bit, .. } => {
                self.qubit(*qubit) || bit.is_some_and(|bit| self.bit(bit))
            }
            Kind::Prepare { qubit, .. } | Kind::Reset { qubit } | Kind::Damping { qubit, .. } => {
                self.qubit(*qubit)
            }
            Kind::Assign { bit, .. } => self.bit(*bit),
            Kind::Pauli(channel) => channel.qubits.iter().any(|&qubit| self.qubit(qubit)),
        }
    }

    /// Goes back before an instruction that stays.
    fn widen(&mut self, instruction: &mut Instruction) {
        let always = instruction.condition.is_none();
        match &mut instruction.kind {
            Kind::Clifford(Clifford::Swap(a, b)) if always => {
                self.qubits.swap(*a as usize, *b as usize);
            }
            Kind::Clifford(gate) => {
                any_qubit(gate, |qubit| {
                    self.qubits[qubit as usize] = true;
                    false
                });
            }
            Kind::Gate { axes, .. } => {
                for &(qubit, _) in axes.iter().flatten() {
                    self.qubits[qubit as usize] = true;
                }
            }
            Kind::Measure { qubit, bit, .. } => {
                *bit = bit.filter(|&bit| self.bit(bit));
                if let (Some(bit), true) = (*bit, always) {
                    self.set_bit(bit, false);
                }
                self.qubits[*qubit as usize] = true;
            }
            Kind::Reset { qubit } if always => self.qubits[*qubit as usize] = false,
            Kind::Assign { bit, value } => {
                if always {
                    self.set_bit(*bit, false);
                }
                self.read(value);
            }
            Kind::Prepare { .. } | Kind::Reset { .. } | Kind::Damping { .. } | Kind::Pauli(_) => {}
        }
        if let Some(condition) = instruction.condition {
            self.set_bit(condition, true);
        }
    }

    fn read(&mut self, value: &BitExpression) {
        match value {
            BitExpression::Constant(_) => {}
            BitExpression::Bit(bit) => self.set_bit(*bit, true),
            BitExpression::Not(inner) => self.read(inner),
            BitExpression::Xor(parts) | BitExpression::And(parts) | BitExpression::Or(parts) => {
                parts.iter().for_each(|part| self.read(part));
            }
        }
    }
}

/// Whether the test holds for a qubit of the gate; stops at the first.
fn any_qubit(gate: &Clifford, mut test: impl FnMut(u32) -> bool) -> bool {
    match gate {
        Clifford::X(q)
        | Clifford::Y(q)
        | Clifford::Z(q)
        | Clifford::H(q)
        | Clifford::S(q)
        | Clifford::Sdg(q) => test(*q),
        Clifford::Cx(a, b) | Clifford::Cz(a, b) | Clifford::Swap(a, b) => test(*a) || test(*b),
        Clifford::QuarterTurn(axis) => axis.iter().any(|&(qubit, _)| test(qubit)),
    }
}
