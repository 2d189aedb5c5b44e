//! What a person wants to know about a result first.
//!
//! [`Summary::from_file`] reads a result file once and counts; the summary
//! prints itself as text ([`Display`](std::fmt::Display)) for a terminal of 80
//! columns, or as one JSON document ([`Summary::to_json`]).
//!
//! # The JSON document
//!
//! Field names are stable; a later version may add fields. An absent value is
//! `null`.
//!
//! ```text
//! { "file", "program_version", "circuit", "noise", "title",      texts
//!   "qubits", "seed", "shots", "shots_total", "shots_planned",   whole numbers
//!   "companion_shots", "clipped", "terms",
//!   "part": { "index", "count" },
//!   "complete": bool            whether all planned shots are in the file
//!   "readout": text, "delta", "mixing_weight",
//!   "sites": { "count", "kept",
//!              "reduction": { "as_written", "merged", "deterministic",
//!                             "unobservable", "log10_extent_as_written",
//!                             "log10_extent_after_noise" },
//!              "log10_extent_without_noise", "log10_extent", "extent" },
//!   "draws": { "mean_attempts", "peak_active", "mean_terms_left" },
//!   "norm": { "estimates", "mean", "standard_error", "expected", "deviation",
//!             "accepted" },
//!   "settings": [[name, value], …],
//!   "registers": [
//!     { "name", "role", "width",
//!       "any_nonzero": QUANTITY, "mean_weight": QUANTITY,
//!       "bits": [QUANTITY, …]            frequency of 1, bit 0 first
//!       "distinct_outcomes": number,
//!       "outcomes": [ { "bits": text, "frequency": QUANTITY }, … ] } ] }
//! QUANTITY = { "raw": ESTIMATE, "companion": ESTIMATE, "corrected": ESTIMATE }
//! ESTIMATE = { "value", "standard_error", "limit_95" }
//! ```
//!
//! `shots_planned` is the share of this part in `shots_total`. `extent` is
//! `null` where it leaves the range of a double. `reduction` says what came of
//! the non-Clifford gates of the circuit: how many there are as written, how many
//! sites merged into others, were found on an axis of known value, or cannot be
//! seen in any recorded bit; the extent as written, and after noise was merged.
//! It is `null` in files that do not tell. `outcomes` holds the most
//! frequent words of a register of up to 64 bits, bit 0 on the right; it is
//! `null` for wider registers and where too many different words turned up to
//! count them. `corrected` is explained at [`estimate`]; it is `null` without
//! companion shots and where there is nothing to correct.
//!
//! `norm` is the norm audit: the mean estimate of ‖Ω‖² over some draws of the
//! run, 1 + (ξ − 1)/k expected (ξ of the sites before the first measurement of
//! an active qubit), its deviation in standard errors, and whether that is at
//! most 5; `accepted` is `null` with fewer than 32 estimates, `norm` for exact
//! runs.
//!
//! This module knows result files, and nothing of how shots are drawn.

pub mod estimate;
pub mod figure;
mod number;
pub mod plan_text;
mod summary;
mod tally;
mod text;
mod verification;

pub use estimate::{Estimate, Sample};
pub use number::format_extent;
pub use summary::{
    Draws, NormCheck, Outcome, Quantity, Reduction, RegisterSummary, Sites, Summary,
};
pub use verification::{
    Corrected, Distances, Drawn, LIMIT, LawTest, Setting, Verification, allowed_bias,
};
