//! δ against run time, before anyone waits.
//!
//! A [`Survey`] measures for a second or two what shots of *this* circuit cost
//! on *this* machine; a [`Model`] extends that to any number of terms; a
//! [`Plan`] is the table that a person reads, and the smallest δ within a limit
//! of time or memory. No constant of any machine is written down here.
//!
//! # The model
//!
//! A run takes start + shots·(t + w) + companion·(t_c + w_c) + end: t of a shot
//! and t_c of a companion shot with all threads at work, w and w_c of writing
//! one. t of `walk` is a function of k alone (`plan/walk.rs`), t of `probe` one of k
//! and the number of random states (`plan/probe.rs`), t of `dense` is one number
//! (`plan/dense.rs`). k = ⌈1 + ξ(2/δ − 1)⌉ ties k to δ
//! ([`mixing`](crate::magic::mixing)).
//!
//! # The JSON document
//!
//! Field names are stable; a later version may add fields. An absent value is
//! `null`. Times are wall-clock seconds with all threads at work, sizes bytes.
//!
//! ```text
//! { "program_version", "circuit", "noise", "title",             texts
//!   "qubits", "shots", "companion_shots", "threads",            whole numbers
//!   "sites": { "as_written", "merged", "deterministic", "unobservable", "kept",
//!              "log10_extent_as_written",       every gate by itself, no noise
//!              "log10_extent_after_noise",      noise merged
//!              "log10_extent", "extent" }       of a run, sites reduced
//!   "costliest": [ { "lines": [number, …], "kind", "count", "extent",
//!                   "log10_share" }, … ]
//!   "active": { "peak", "exact", "steps": [number, …] } | null
//!   "inner_measurements": number | null
//!   "measured": { "seconds": time it took,
//!                 "start_seconds", "end_seconds",
//!                 "companion_seconds": a companion shot,
//!                 "write_seconds", "write_companion_seconds": a shot
//!                 "memory_base": bytes without any register,
//!                 "walk": [ { "terms", "seconds_a_shot", "attempts", "shots" }, … ] }
//!   "limits": { "seconds": --budget | null, "memory_bytes" }
//!   "dense": ESTIMATE,
//!   "rows": [ { "delta": number | null, "average": bool,
//!               "log10_terms", "mixing_weight",
//!               "walk": ESTIMATE, "probe": ESTIMATE,
//!               "readout": "dense" | "walk" | "probe" | null }, … ]
//!   "curve": [ { "delta", "seconds", "memory_bytes" }, … ]      of the terms
//!   "choice": { "delta": number | null, "readout", "terms", "seconds",
//!               "memory_bytes" } | null
//!   "refused": text | null                why no δ is within the limits
//!   "blocked": text | null }              why the circuit cannot run at all
//! ESTIMATE = { "terms", "probes", "seconds_a_shot", "seconds",
//!              "memory_bytes", "extrapolated": bool, "refused": text | null }
//! ```
//!
//! A row with `average` set is for `--terms average`, the number of terms that
//! makes averages corrected with companion shots cheapest; it has no δ.
//! `seconds` covers the whole run with its companion shots. `refused` says why a
//! read-out cannot do it; the numbers beside it then say how far it is off.
//!
//! This module knows how shots are drawn, and nothing of terminals or pictures.

pub mod auto;
mod bare;
mod dense;
mod measure;
mod model;
mod probe;
mod profile;
mod resident;
mod solve;
mod survey;
mod table;
pub mod units;
mod walk;

pub use bare::{Bare, measure as measure_bare};
pub use measure::{Slice, Timing};
pub use model::{Accuracy, Model, Overhead, Request, counted_bytes};
pub use profile::Profile;
pub use resident::peak as peak_memory;
pub use solve::{Limits, Refusal, Solved};
pub use survey::{Survey, WalkSurvey};
pub use table::{
    Costly, CurvePoint, Estimate, LimitsRow, Measured, MeasuredWalk, Plan, PlanSites, Row,
};

/// δ of the rows of a table, unless others are asked for.
pub const DELTAS: [f64; 6] = [0.5, 0.2, 0.1, 0.05, 0.02, 0.01];

/// Range of δ that a limit of time or memory chooses from.
pub const CHOICE_RANGE: (f64, f64) = (1e-4, 1.0);
