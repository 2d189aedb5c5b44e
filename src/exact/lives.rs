//! Which qubits and classical bits still matter, and when.
//!
//! A backward pass finds for every operation whether it matters at all, which
//! of its qubits are not needed after it, and which of the bits it reads.

use smallvec::SmallVec;

use super::operation::{Action, Operation, each_bit};

/// What an operation leaves behind.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub(super) struct Life {
    /// Whether nothing of it is ever seen.
    pub skip: bool,
    /// Its qubits that are not needed after it.
    pub retire: SmallVec<[u32; 2]>,
    /// Bits that are not needed after it.
    pub forget: SmallVec<[u32; 2]>,
    /// Whether the bit it writes is needed.
    pub writes: bool,
}

/// One entry an operation. `recorded` are the bits needed at the end.
pub(super) fn lives(operations: &[Operation], recorded: &[u32]) -> Vec<Life> {
    let mut lives = vec![Life::default(); operations.len()];
    let mut needed = Needed::default();
    for &bit in recorded {
        set(&mut needed.bits, bit, true);
    }
    for (operation, life) in operations.iter().zip(&mut lives).rev() {
        needed.before(operation, life);
    }
    lives
}

/// Qubits and bits that later operations need.
#[derive(Default)]
struct Needed {
    qubits: Vec<bool>,
    bits: Vec<bool>,
}

fn get(list: &[bool], index: u32) -> bool {
    list.get(index as usize).copied().unwrap_or(false)
}

fn set(list: &mut Vec<bool>, index: u32, value: bool) {
    let index = index as usize;
    if index >= list.len() {
        list.resize(index + 1, false);
    }
    list[index] = value;
}

impl Needed {
    /// Steps back over an operation.
    fn before(&mut self, operation: &Operation, life: &mut Life) {
        let Operation { action, condition } = operation;
        let always = condition.is_none();
        if let (Action::Reset { qubit }, true) = (action, always) {
            // What comes later finds a fresh qubit.
            set(&mut self.qubits, *qubit, false);
            life.skip = true;
            return;
        }
        let qubits = action.qubits();
        let changes_weight = matches!(
            action,
            Action::Local {
                keeps_trace: false,
                ..
            }
        );
        let written = action.written();
        life.writes = written.is_some_and(|bit| get(&self.bits, bit));
        let seen = qubits.iter().any(|&qubit| get(&self.qubits, qubit));
        if !seen && !life.writes && !changes_weight {
            life.skip = true;
            return;
        }
        for &qubit in &qubits {
            if !get(&self.qubits, qubit) {
                life.retire.push(qubit);
            }
            let forgets = always && matches!(action, Action::Local { forgets: true, .. });
            set(&mut self.qubits, qubit, !forgets);
        }
        let mut reads: SmallVec<[u32; 4]> = condition.iter().copied().collect();
        if let Action::Assign { value, .. } = action {
            each_bit(value, &mut |bit| reads.push(bit));
        }
        for &bit in &reads {
            if !get(&self.bits, bit) && !life.forget.contains(&bit) {
                life.forget.push(bit);
            }
        }
        if let (Some(bit), true) = (written, always) {
            set(&mut self.bits, bit, false);
        }
        for bit in reads {
            set(&mut self.bits, bit, true);
        }
    }
}
