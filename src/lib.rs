//! Measurement shots from noisy, T-heavy quantum circuits by mixed-state
//! stabiliser-rank sampling.
//!
//! Data flows in the order of the modules, and a module knows only those
//! before it:
//!
//! circuit file → [`circuit`] (flat operations) → [`noise`] (channels in
//! place) → [`magic`] (sites and ensembles) → [`clifford`] (frame and terms) →
//! [`program`] (steps and flip sets) → [`exact`] (exact laws of small circuits)
//! → [`readout`] (registers) → [`sampler`] (shots) → [`store`] (result file) →
//! [`plan`] (costs) → [`report`] (summaries) → [`cli`].

#![warn(missing_docs)]

pub mod circuit;
pub mod cli;
pub mod clifford;
pub mod exact;
pub mod magic;
pub mod noise;
pub mod plan;
pub mod program;
pub mod readout;
pub mod report;
pub mod sampler;
pub mod store;
