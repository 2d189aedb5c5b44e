//! Pictures as SVG: text stays text, colours follow the reader's light or dark
//! scheme, series differ by shape as well as by colour.
//!
//! The colours are the eight of a palette made for colour-blind readers (Nat.
//! Methods 8, 441 (2011)), brighter ones of it on dark ground.
//!
//! This module knows summaries and plans, and nothing of files.

mod axis;
mod plan;
mod shots;
mod svg;

pub use plan::plan_figure;
pub use shots::shots_figure;
