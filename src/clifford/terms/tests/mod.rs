//! Terms against dense vectors and published counts.

mod counts;
mod dense;
mod overlaps;
mod properties;
mod sequences;

pub(crate) use dense::{Dense, Layout};
