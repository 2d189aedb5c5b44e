//! Measurement shots from noisy, T-heavy quantum circuits by mixed-state
//! stabiliser-rank sampling.
//!
//! Data flows in the order of the modules, and a module knows only those
//! before it:
//!
//! circuit file → [`circuit`] (flat operations) → [`noise`] (channels in
//! place) → [`magic`] (sites and ensembles)

#![warn(missing_docs)]

pub mod circuit;
pub mod magic;
pub mod noise;
pub mod report;
pub mod store;
