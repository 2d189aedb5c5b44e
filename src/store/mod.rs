//! The result file: one plain HDF5 file that any HDF5 reader opens with no
//! plug-in.
//!
//! ```text
//! /                       attributes, see [`Header`]
//! /shots/<register>       bool [shots, width]; attribute `role`
//! /companion/<register>   the same for the companion shots, if drawn
//! /audit/                 attempts u32, peak_active u16, terms_left u32, one
//!                         value a shot; attribute `clipped`
//! /audit/norm/            runs with terms: shot u64, estimate f64 (of ‖Ω‖²),
//!                         one entry an audited draw; attributes `expected`,
//!                         `log_extent`, `terms`, `probes`
//! /faults/                with faults: shot u64, location u32, pauli u64, one
//!                         entry an event, and the table `locations`
//! /sites                  the table of non-Clifford places
//! ```
//!
//! `bool` is the HDF5 enumeration FALSE/TRUE over an 8-bit integer, strings are
//! variable-length UTF-8, data is chunked and deflate-compressed. Object times
//! are not stored, so equal contents give equal files.
//!
//! A [`Writer`] fills a temporary in the directory of the result and renames it
//! when everything is on the disk: under its final name a result is complete. A
//! [`ShotFile`] reads it back in blocks. Memory is bounded on both sides,
//! whatever the number of shots.
//!
//! This module knows packed bits, names and numbers; nothing of how shots are
//! drawn.

/// How to take the companion's share out of an average, stored as the root
/// attribute `correction` of files with companion shots.
pub const CORRECTION: &str = "\
/shots follow P_out = (1 - L) P + L P_comp with L = mixing_weight; P is the exact distribution of \
the noisy circuit, P_comp that of /companion. For any number f computed from the bits of a shot \
(an event as 0 or 1, a weight), with mean m, variance v and number of rows n in /shots, and M, V, \
N the same in /companion: f under P = (m - L M) / (1 - L), with standard error \
sqrt(v/n + L^2 V/N) / (1 - L). A histogram is corrected bin by bin, each bin as an event; its \
bins may come out slightly below 0. With L = 1 nothing can be corrected. Where an event was never or always seen in one of the two, use \
1/n^2 (or 1/N^2) for v/n (or V/N).";

mod block;
mod error;
mod header;
mod layout;
mod reader;
mod tables;
mod temporary;
mod writer;

pub use block::AuditBlock;
pub use error::StoreError;
pub use header::{
    FORMAT, FORMAT_VERSION, Header, LocationRow, Part, ReductionHeader, RegisterHeader, SiteRow,
};
pub use reader::{Blocks, ShotFile};
pub use writer::{Damped, Finished, Writer, WriterOptions};
