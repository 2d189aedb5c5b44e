//! Stabiliser machinery: states and operations that Clifford circuits map
//! among themselves, in bits.
//!
//! [`terms`] holds the many small phase-sensitive states a shot is a sum of;
//! [`equatorial`] overlaps them with random states, which estimates norms.
//!
//! This module knows the one-qubit stabiliser states of [`crate::magic`], and
//! nothing of circuits, outcomes or sampling.

pub mod equatorial;
pub mod terms;
