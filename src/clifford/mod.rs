//! Clifford machinery: Pauli strings, the shared frame, stabiliser terms.
//!
//! The state of a shot is C·(|Ω⟩ on few active qubits ⊗ |0…0⟩ on the rest).
//! [`frame`] is C, as an inverse tableau; |Ω⟩ is a sum of the small
//! phase-sensitive states of [`terms`]; [`equatorial`] overlaps them with
//! random states, which estimates norms.
//!
//! This module knows elementary gates and one-qubit stabiliser states, and
//! nothing of programs, noise, outcomes or sampling.

pub mod equatorial;
pub mod frame;
pub mod kernels;
pub mod pauli;
pub mod terms;
