//! Clifford machinery: Pauli strings, the shared frame, stabiliser terms.
//!
//! The state of a shot is C·(|Ω⟩ on few active qubits ⊗ |0…0⟩ on the rest).
//! [`frame::Frame`] is C, as an inverse tableau; |Ω⟩ is a sum of
//! phase-sensitive stabiliser terms. This module knows circuits' elementary
//! gates and nothing of programs, noise or read-outs.

pub mod frame;
pub mod pauli;
