//! The library gates.
/// placeholder
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum Gate {
    /// T
    T,
}
