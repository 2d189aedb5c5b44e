//! The result file: one plain HDF5 file that any HDF5 reader opens with no
//! plug-in.
//!
//! ```text
//! /                       attributes, see [`Header`]
//! /shots/<register>       bool [shots, width]; attribute `role`
//! /companion/<register>   the same for the companion shots, if drawn
//! /audit/                 attempts u32, peak_active u16, terms_left u32, norm
//!                         f64 (estimate of ‖Ω‖², NaN where none was made), one
//!                         value a shot; attribute `clipped`
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
pub use writer::{Finished, Writer, WriterOptions};
