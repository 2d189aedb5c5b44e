//! The modifiers `inv @` and `ctrl @` on library gates.
//!
//! A modified gate that the library has by name becomes that gate. Controls see
//! the phase of a gate, so the definitions of the standard library
//! (arXiv:2104.14722) count with their phases: U(θ, φ, λ) carries e^{iθ/2}
//! before the matrix of `cu`, and `u2`, `u3` have determinant 1.

use std::f64::consts::{FRAC_PI_2, FRAC_PI_4, PI};

use smallvec::{SmallVec, smallvec};

use super::Gate;

/// Angles of a call.
pub type Parameters = SmallVec<[f64; 4]>;

impl Gate {
    /// The inverse of a call with these angles, as a call.
    pub fn inverse(self, parameters: &[f64]) -> (Gate, Parameters) {
        let negated = || parameters.iter().map(|angle| -angle).collect();
        match self {
            Gate::S => (Gate::Sdg, smallvec![]),
            Gate::Sdg => (Gate::S, smallvec![]),
            Gate::T => (Gate::Tdg, smallvec![]),
            Gate::Tdg => (Gate::T, smallvec![]),
            Gate::Sx => (Gate::Sxdg, smallvec![]),
            Gate::Sxdg => (Gate::Sx, smallvec![]),
            Gate::Iswap => (Gate::IswapInverse, smallvec![]),
            Gate::IswapInverse => (Gate::Iswap, smallvec![]),
            // Ry(−π/2) = Rz(π) Ry(π/2) Rz(−π)
            Gate::U2 => (self, smallvec![PI - parameters[1], -parameters[0] - PI]),
            Gate::U | Gate::U3 | Gate::Cu3 => (
                self,
                smallvec![-parameters[0], -parameters[2], -parameters[1]],
            ),
            Gate::Cu => (
                self,
                smallvec![
                    -parameters[0],
                    -parameters[2],
                    -parameters[1],
                    -parameters[3]
                ],
            ),
            Gate::Negated { gate, mask } => {
                let (gate, parameters) = gate.inverse(parameters);
                (gate.with_negated(mask), parameters)
            }
            // Self-inverse gates have no angles, all others turn about a fixed axis.
            _ => (self, negated()),
        }
    }

    /// The call with one more control in front, if the library has such a gate.
    pub fn controlled(self, parameters: &[f64]) -> Option<(Gate, Parameters)> {
        let same = || Parameters::from_slice(parameters);
        let angle = |index: usize| parameters[index];
        Some(match self {
            Gate::GlobalPhase => (Gate::P, same()),
            Gate::X => (Gate::Cx, smallvec![]),
            Gate::Y => (Gate::Cy, smallvec![]),
            Gate::Z => (Gate::Cz, smallvec![]),
            Gate::H => (Gate::Ch, smallvec![]),
            Gate::S => (Gate::Cp, smallvec![FRAC_PI_2]),
            Gate::Sdg => (Gate::Cp, smallvec![-FRAC_PI_2]),
            Gate::T => (Gate::Cp, smallvec![FRAC_PI_4]),
            Gate::Tdg => (Gate::Cp, smallvec![-FRAC_PI_4]),
            // √X = e^{iπ/4} Rx(π/2), and Rx(θ) is the matrix of cu(θ, −π/2, π/2, 0)
            Gate::Sx => (
                Gate::Cu,
                smallvec![FRAC_PI_2, -FRAC_PI_2, FRAC_PI_2, FRAC_PI_4],
            ),
            Gate::Sxdg => (
                Gate::Cu,
                smallvec![-FRAC_PI_2, -FRAC_PI_2, FRAC_PI_2, -FRAC_PI_4],
            ),
            Gate::P => (Gate::Cp, same()),
            Gate::Phase => (Gate::Cphase, same()),
            Gate::U1 => (Gate::Cu1, same()),
            Gate::Rx => (Gate::Crx, same()),
            Gate::Ry => (Gate::Cry, same()),
            Gate::Rz => (Gate::Crz, same()),
            Gate::U => (
                Gate::Cu,
                smallvec![angle(0), angle(1), angle(2), angle(0) / 2.0],
            ),
            Gate::U2 => (
                Gate::Cu,
                smallvec![FRAC_PI_2, angle(0), angle(1), -(angle(0) + angle(1)) / 2.0],
            ),
            Gate::U3 => (
                Gate::Cu,
                smallvec![angle(0), angle(1), angle(2), -(angle(1) + angle(2)) / 2.0],
            ),
            Gate::Cx | Gate::UpperCx => (Gate::Ccx, smallvec![]),
            Gate::Cz => (Gate::Ccz, smallvec![]),
            Gate::Swap => (Gate::Cswap, smallvec![]),
            _ => return None,
        })
    }

    /// The gate with the controls of `mask` (bit i: qubit i of the call) turned
    /// over to act on 0.
    pub fn with_negated(self, mask: u8) -> Gate {
        let (gate, before) = match self {
            Gate::Negated { gate, mask } => (gate, mask),
            gate => (gate.entry().0, 0),
        };
        match before ^ mask {
            0 => *gate,
            mask => Gate::Negated { gate, mask },
        }
    }
}
