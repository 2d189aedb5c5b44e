//! The few elementary gates everything is taken apart into.
//!
//! Global phases are dropped: no outcome depends on them. The letter `Q` is the
//! type of a qubit index: a position within a call, or a qubit of the circuit.

use smallvec::SmallVec;

/// A one-qubit Pauli letter.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Pauli {
    /// Identity.
    I,
    /// Bit flip.
    X,
    /// Both.
    Y,
    /// Phase flip.
    Z,
}

impl Pauli {
    /// The letter with the given X and Z parts.
    pub fn from_parts(x: bool, z: bool) -> Self {
        match (x, z) {
            (false, false) => Pauli::I,
            (true, false) => Pauli::X,
            (true, true) => Pauli::Y,
            (false, true) => Pauli::Z,
        }
    }

    /// Whether the letter has an X part (X or Y).
    pub fn x(self) -> bool {
        matches!(self, Pauli::X | Pauli::Y)
    }

    /// Whether the letter has a Z part (Z or Y).
    pub fn z(self) -> bool {
        matches!(self, Pauli::Z | Pauli::Y)
    }

    /// The letter as text.
    pub fn letter(self) -> char {
        match self {
            Pauli::I => 'I',
            Pauli::X => 'X',
            Pauli::Y => 'Y',
            Pauli::Z => 'Z',
        }
    }
}

/// A product of Pauli letters on few distinct qubits, sign +, no identities.
pub type PauliProduct<Q = u32> = SmallVec<[(Q, Pauli); 2]>;

/// A Clifford gate, up to a global phase.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Clifford<Q = u32> {
    /// Pauli X.
    X(Q),
    /// Pauli Y.
    Y(Q),
    /// Pauli Z.
    Z(Q),
    /// Hadamard.
    H(Q),
    /// diag(1, i).
    S(Q),
    /// diag(1, −i).
    Sdg(Q),
    /// Controlled X: control, target.
    Cx(Q, Q),
    /// Controlled Z.
    Cz(Q, Q),
    /// Exchange.
    Swap(Q, Q),
    /// exp(−iπP/4) for a Pauli product P.
    QuarterTurn(PauliProduct<Q>),
}

/// What a gate is made of.
#[derive(Debug, Clone, PartialEq)]
pub enum Elementary<Q = u32> {
    /// A Clifford gate.
    Clifford(Clifford<Q>),
    /// exp(−i·angle·P/2), angle in radians, any value.
    Rotation {
        /// P.
        axis: PauliProduct<Q>,
        /// The angle in radians.
        angle: f64,
    },
    /// −1 on |111⟩.
    Ccz([Q; 3]),
}
