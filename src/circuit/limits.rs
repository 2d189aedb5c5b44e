//! The limits that keep any input from running away.

/// The most qubits a circuit may declare.
pub const MAX_QUBITS: usize = 4096;
/// The most classical bits a circuit may use, hidden ones included.
pub const MAX_BITS: usize = 1_000_000;
/// The most levels of parentheses, indices, blocks and gate calls.
pub const MAX_NESTING: usize = 200;
/// The longest source text in bytes.
pub const MAX_SOURCE: usize = 16 << 20;
/// The most operands and operators of one expression.
pub const MAX_EXPRESSION: usize = 100_000;
/// The most nodes of the syntax tree held at a time: a few hundred MiB.
pub const MAX_SYNTAX_NODES: usize = 4_000_000;
/// The most annotations on one statement.
pub const MAX_ANNOTATIONS: usize = 1_000;
/// Reading stops after this many errors.
pub const MAX_ERRORS: usize = 20;
/// Warnings beyond this many are only counted.
pub const MAX_WARNINGS: usize = 50;
/// The widest register that can be ordered (`<`, `>=`, …) against a number.
pub const MAX_ORDERED_WIDTH: usize = 64;
/// Steps of evaluation (statements, loop passes, operands) for each operation
/// allowed: unrolling stops when they are used up, whether or not it yields
/// operations.
pub const STEPS_PER_OPERATION: u64 = 64;
/// The fewest steps allowed, whatever the operations.
pub const MIN_STEPS: u64 = 1_000_000;
/// Bytes of the unrolled circuit for each operation allowed.
pub const BYTES_PER_OPERATION: u64 = 1024;
/// The fewest bytes allowed, whatever the operations.
pub const MIN_BYTES: u64 = 64 << 20;
