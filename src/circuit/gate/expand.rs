//! A library gate taken apart into elementary gates, up to a global phase.
//!
//! Every controlled rotation is written with commuting Pauli rotations,
//! controlled-exp(−iθP/2) = exp(−iθP/4) · exp(+iθ Z⊗P/4), and a controlled
//! one-qubit gate with the five rotations of Rz(φ)Ry(θ)Rz(λ) = A·X·B·X·C,
//! A·B·C = 1 (Phys. Rev. A 52, 3457 (1995)), the two X absorbed into the axes.
//! `ccx` and `cswap` are a CCZ up to Clifford gates, which costs less than the
//! T gates they could be made of.

use std::f64::consts::FRAC_PI_4;

use smallvec::{SmallVec, smallvec};

use super::Gate;
use crate::circuit::elementary::{Clifford, Elementary, Pauli};

use Pauli::{X, Y, Z};

/// What a gate is made of, in time order, on positions of the call.
pub type Expansion = SmallVec<[Elementary<u8>; 4]>;

impl Gate {
    /// The gate as Clifford gates, rotations exp(−i·angle·P/2) and CCZ, in the
    /// order they act, on positions 0, 1, 2 of the call, up to a global phase.
    /// Angles are left as they come; nothing is folded.
    ///
    /// # Panics
    ///
    /// If `parameters` does not hold [`Gate::parameters`] angles.
    pub fn expand(self, parameters: &[f64]) -> Expansion {
        assert_eq!(
            parameters.len(),
            self.parameters(),
            "`{}` takes {} parameters",
            self.name(),
            self.parameters()
        );
        let angle = |index: usize| parameters[index];
        match self {
            Gate::GlobalPhase | Gate::Id => smallvec![],
            Gate::X => smallvec![clifford(Clifford::X(0))],
            Gate::Y => smallvec![clifford(Clifford::Y(0))],
            Gate::Z => smallvec![clifford(Clifford::Z(0))],
            Gate::H => smallvec![clifford(Clifford::H(0))],
            Gate::S => smallvec![clifford(Clifford::S(0))],
            Gate::Sdg => smallvec![clifford(Clifford::Sdg(0))],
            Gate::T => smallvec![rotation(Z, 0, FRAC_PI_4)],
            Gate::Tdg => smallvec![rotation(Z, 0, -FRAC_PI_4)],
            Gate::Sx => smallvec![quarter_turn(X, 0)],
            // exp(+iπX/4) = i · exp(−iπX/4) · X
            Gate::Sxdg => smallvec![quarter_turn(X, 0), clifford(Clifford::X(0))],
            Gate::P | Gate::Phase | Gate::U1 | Gate::Rz => smallvec![rotation(Z, 0, angle(0))],
            Gate::Rx => smallvec![rotation(X, 0, angle(0))],
            Gate::Ry => smallvec![rotation(Y, 0, angle(0))],
            Gate::U2 => smallvec![
                rotation(Z, 0, angle(1)),
                quarter_turn(Y, 0),
                rotation(Z, 0, angle(0)),
            ],
            Gate::U | Gate::U3 => smallvec![
                rotation(Z, 0, angle(2)),
                rotation(Y, 0, angle(0)),
                rotation(Z, 0, angle(1)),
            ],
            Gate::Cx | Gate::UpperCx => smallvec![clifford(Clifford::Cx(0, 1))],
            Gate::Cz => smallvec![clifford(Clifford::Cz(0, 1))],
            // S·X·S† = Y
            Gate::Cy => smallvec![
                clifford(Clifford::Sdg(1)),
                clifford(Clifford::Cx(0, 1)),
                clifford(Clifford::S(1)),
            ],
            // Ry(π/4)·Z·Ry(−π/4) = H
            Gate::Ch => smallvec![
                rotation(Y, 1, -FRAC_PI_4),
                clifford(Clifford::Cz(0, 1)),
                rotation(Y, 1, FRAC_PI_4),
            ],
            Gate::Cp | Gate::Cphase | Gate::Cu1 => smallvec![
                rotation(Z, 0, angle(0) / 2.0),
                rotation(Z, 1, angle(0) / 2.0),
                rotation_of_two(Z, Z, -angle(0) / 2.0),
            ],
            Gate::Crx => controlled_rotation(X, angle(0)),
            Gate::Cry => controlled_rotation(Y, angle(0)),
            Gate::Crz => controlled_rotation(Z, angle(0)),
            Gate::Cu3 => controlled_u([angle(0), angle(1), angle(2), 0.0]),
            Gate::Cu => controlled_u([angle(0), angle(1), angle(2), angle(3)]),
            Gate::Swap => smallvec![clifford(Clifford::Swap(0, 1))],
            // i on |01⟩ and |10⟩ with an exchange
            Gate::Iswap => smallvec![
                clifford(Clifford::S(0)),
                clifford(Clifford::S(1)),
                clifford(Clifford::Cz(0, 1)),
                clifford(Clifford::Swap(0, 1)),
            ],
            Gate::IswapInverse => smallvec![
                clifford(Clifford::Sdg(0)),
                clifford(Clifford::Sdg(1)),
                clifford(Clifford::Cz(0, 1)),
                clifford(Clifford::Swap(0, 1)),
            ],
            Gate::Rxx => smallvec![rotation_of_two(X, X, angle(0))],
            Gate::Ryy => smallvec![rotation_of_two(Y, Y, angle(0))],
            Gate::Rzz => smallvec![rotation_of_two(Z, Z, angle(0))],
            Gate::Ccz => smallvec![Elementary::Ccz([0, 1, 2])],
            Gate::Ccx => smallvec![
                clifford(Clifford::H(2)),
                Elementary::Ccz([0, 1, 2]),
                clifford(Clifford::H(2)),
            ],
            Gate::Cswap => smallvec![
                clifford(Clifford::Cx(2, 1)),
                clifford(Clifford::H(2)),
                Elementary::Ccz([0, 1, 2]),
                clifford(Clifford::H(2)),
                clifford(Clifford::Cx(2, 1)),
            ],
            Gate::Negated { gate, mask } => {
                let flips = (0..8).filter(|position| mask >> position & 1 == 1);
                let flips: Expansion = flips.map(|qubit| clifford(Clifford::X(qubit))).collect();
                let mut expansion = flips.clone();
                expansion.extend(gate.expand(parameters));
                expansion.extend(flips);
                expansion
            }
        }
    }
}

fn clifford(gate: Clifford<u8>) -> Elementary<u8> {
    Elementary::Clifford(gate)
}

fn quarter_turn(axis: Pauli, qubit: u8) -> Elementary<u8> {
    clifford(Clifford::QuarterTurn(smallvec![(qubit, axis)]))
}

fn rotation(axis: Pauli, qubit: u8, angle: f64) -> Elementary<u8> {
    Elementary::Rotation {
        axis: smallvec![(qubit, axis)],
        angle,
    }
}

/// A rotation about a product of one letter on position 0 and one on position 1.
fn rotation_of_two(first: Pauli, second: Pauli, angle: f64) -> Elementary<u8> {
    Elementary::Rotation {
        axis: smallvec![(0, first), (1, second)],
        angle,
    }
}

/// exp(−iθP/2) on position 1, controlled by position 0.
fn controlled_rotation(axis: Pauli, angle: f64) -> Expansion {
    smallvec![
        rotation(axis, 1, angle / 2.0),
        rotation_of_two(Z, axis, -angle / 2.0),
    ]
}

/// `cu(θ, φ, λ, γ)`. The matrix of `cu` is e^{i(φ+λ)/2} Rz(φ)Ry(θ)Rz(λ), so the
/// control takes the phase γ + (φ+λ)/2; B of A·X·B·X·C is Ry(−θ/2)Rz(−(φ+λ)/2).
fn controlled_u([theta, phi, lambda, gamma]: [f64; 4]) -> Expansion {
    smallvec![
        rotation(Z, 0, gamma + (phi + lambda) / 2.0),
        rotation(Z, 1, (lambda - phi) / 2.0),
        rotation_of_two(Z, Z, -(phi + lambda) / 2.0),
        rotation_of_two(Z, Y, -theta / 2.0),
        rotation(Y, 1, theta / 2.0),
        rotation(Z, 1, phi),
    ]
}
