//! Terms against dense vectors and published counts.

mod counts;
mod dense;
mod properties;
mod sequences;

pub(crate) use dense::{Dense, quarter};
pub(crate) use sequences::Pair;
mod sweep;
