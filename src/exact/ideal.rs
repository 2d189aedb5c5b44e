//! A noisy circuit as operations, one for one.

use num_complex::Complex64;

use crate::circuit::{Pauli, PauliProduct};
use crate::noise::{Instruction, Kind, NoisyCircuit};

use super::operation::{Action, Operation};
use super::{ExactError, Law};

/// The distribution of the `recorded` bits of a noisy circuit, in this order.
///
/// # Errors
///
/// If the circuit is too large, see [`ExactError`].
pub fn ideal(circuit: &NoisyCircuit, recorded: &[u32]) -> Result<Law, ExactError> {
    let operations: Vec<Operation> = circuit.instructions.iter().map(operation).collect();
    Law::of(&operations, recorded)
}

fn operation(instruction: &Instruction) -> Operation {
    let action = match &instruction.kind {
        Kind::Clifford(gate) => Action::Clifford(gate.clone()),
        Kind::Rotation { axis, angle } => Action::Turn {
            axis: axis.clone(),
            coherence: Complex64::from_polar(1.0, *angle),
        },
        Kind::Ccz(qubits) => ccz(qubits.map(z_of)),
        Kind::Measure { qubit, bit, flip } => Action::Measure {
            qubit: *qubit,
            bit: *bit,
            flip: *flip,
        },
        Kind::Reset { qubit } => Action::Reset { qubit: *qubit },
        Kind::Assign { bit, value } => Action::Assign {
            bit: *bit,
            value: value.clone(),
        },
        Kind::Pauli(channel) => Action::Pauli(channel.clone()),
        Kind::Damping { qubit, gamma } => Action::damping(*qubit, *gamma),
    };
    Operation {
        action,
        condition: instruction.condition,
    }
}

fn z_of(qubit: u32) -> PauliProduct {
    [(qubit, Pauli::Z)].into_iter().collect()
}

/// −1 where the values of all three axes are 1.
pub(super) fn ccz(axes: [PauliProduct; 3]) -> Action {
    let sign = |value: usize| if value == 7 { -1.0 } else { 1.0 };
    Action::BetweenValues {
        axes: Box::new(axes),
        table: Box::new(std::array::from_fn(|s| {
            std::array::from_fn(|t| sign(s) * sign(t))
        })),
    }
}
