//! One non-Clifford place and its equal-extent ensemble.
//!
//! Words: a *member* is a pure state (or gate) of the ensemble, drawn once a
//! shot; a *component* is a stabiliser state (or Clifford gate) of a member's
//! splitting, drawn once a term. For every member Σ|weight| squared is the
//! extent of the site.

use num_complex::Complex64;

/// A non-Clifford place.
#[derive(Debug, Clone)]
pub struct Site {
    /// What it is.
    pub kind: SiteKind,
    /// Index of the circuit operation it comes from.
    pub operation: u32,
    /// Qubits it acts on, for the summary.
    pub qubits: Vec<u32>,
    /// Extent of the gate or state as if there were no noise merged into it.
    pub extent_without_noise: f64,
    /// Extent Ξ of the ensemble: (Σ|weight|)² of every member. At least 1.
    pub extent: f64,
}

/// The kinds of sites.
#[derive(Debug, Clone)]
pub enum SiteKind {
    /// A rotation about a Pauli axis.
    Rotation(RotationSite),
    /// A CCZ.
    Ccz(CczSite),
    /// A one-qubit state of a fresh qubit.
    Prepared(PreparedSite),
}

impl Site {
    /// What the sparsified sum multiplies a term by for each component of a
    /// member: √Ξ times the phase of the component's weight. 0 for components
    /// that are never drawn.
    pub fn factors(&self, member: usize) -> [Complex64; 8] {
        let root = self.extent.sqrt();
        let factor = |weight: Complex64| {
            let modulus = weight.norm();
            if modulus > 0.0 {
                weight * (root / modulus)
            } else {
                weight
            }
        };
        let mut factors = [Complex64::ZERO; 8];
        match &self.kind {
            SiteKind::Ccz(_) => factors = [Complex64::new(root, 0.0); 8],
            SiteKind::Rotation(rotation) => {
                for (entry, &weight) in factors.iter_mut().zip(&rotation.members[member].weights) {
                    *entry = factor(weight);
                }
            }
            SiteKind::Prepared(prepared) => {
                let components = &prepared.members[member].components;
                for (entry, &(_, weight)) in factors.iter_mut().zip(components) {
                    *entry = factor(weight);
                }
            }
        }
        factors
    }

    /// A site of this kind; its extent is that of the ensemble.
    /// `extent_without_noise` is that of the bare gate or of the state before
    /// any noise, at least 1.
    pub fn new(
        kind: SiteKind,
        operation: u32,
        qubits: Vec<u32>,
        extent_without_noise: f64,
    ) -> Site {
        Site {
            extent: kind.extent(),
            kind,
            operation,
            qubits,
            extent_without_noise,
        }
    }
}

impl SiteKind {
    /// Extent Ξ, the (Σ|weight|)² of every member; at least 1.
    pub fn extent(&self) -> f64 {
        match self {
            SiteKind::Rotation(rotation) => rotation.extent(),
            SiteKind::Ccz(_) => CczSite::EXTENT,
            SiteKind::Prepared(prepared) => prepared.extent(),
        }
    }
}

/// A rotation, possibly dephased about its own axis: an ensemble of rotations.
#[derive(Debug, Clone)]
pub struct RotationSite {
    /// Angle after folding, in (0, π/2).
    pub angle: f64,
    /// Dephasing probability merged into it.
    pub dephasing: f64,
    /// The members; probabilities sum to 1.
    pub members: Vec<RotationMember>,
}

/// diag(1, e^{i·angle}) in the frame where the axis is Z.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct RotationMember {
    /// Chance of this member.
    pub probability: f64,
    /// Angle in radians. In [0, π/2] where the extent is above 1; for a
    /// stabiliser mixture (extent 1) a multiple of π/2 in [0, 2π).
    pub angle: f64,
    /// Weights of the components diag(1, i^b), b = 0…3: their weighted sum is
    /// diag(1, e^{i·angle}) exactly, global phase included. Where the extent is
    /// above 1 only b = 0 and 1 are used; where it is 1 exactly one is not 0.
    pub weights: [Complex64; 4],
}

/// A CCZ, the sum of eight diagonal Clifford gates of weight 1/6:
/// CCZ = (1/6) Σ_b D_b with D_b(x) = sign of b below. Quantum 3, 181 (2019).
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct CczSite;

/// A one-qubit mixed state: an ensemble of pure states.
#[derive(Debug, Clone)]
pub struct PreparedSite {
    /// Bloch vector (x, y, z) of the exact state.
    pub bloch: [f64; 3],
    /// Bloch vector had there been no noise.
    pub ideal: [f64; 3],
    /// The members; probabilities sum to 1.
    pub members: Vec<PreparedMember>,
}

/// A pure one-qubit state and its splitting.
#[derive(Debug, Clone, PartialEq)]
pub struct PreparedMember {
    /// Chance of this member.
    pub probability: f64,
    /// Amplitudes of |0⟩ and |1⟩, normalised.
    pub state: [Complex64; 2],
    /// Components with weights: Σ weight·component = `state` exactly.
    pub components: Vec<(Stabiliser, Complex64)>,
}

/// The six one-qubit stabiliser states, with these phases.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum Stabiliser {
    /// |0⟩
    Zero,
    /// |1⟩
    One,
    /// (|0⟩ + |1⟩)/√2
    Plus,
    /// (|0⟩ − |1⟩)/√2
    Minus,
    /// (|0⟩ + i|1⟩)/√2
    PlusI,
    /// (|0⟩ − i|1⟩)/√2
    MinusI,
}

impl Stabiliser {
    /// Amplitudes of |0⟩ and |1⟩.
    pub fn amplitudes(self) -> [Complex64; 2] {
        let h = std::f64::consts::FRAC_1_SQRT_2;
        let c = Complex64::new;
        match self {
            Stabiliser::Zero => [c(1.0, 0.0), c(0.0, 0.0)],
            Stabiliser::One => [c(0.0, 0.0), c(1.0, 0.0)],
            Stabiliser::Plus => [c(h, 0.0), c(h, 0.0)],
            Stabiliser::Minus => [c(h, 0.0), c(-h, 0.0)],
            Stabiliser::PlusI => [c(h, 0.0), c(0.0, h)],
            Stabiliser::MinusI => [c(h, 0.0), c(0.0, -h)],
        }
    }
}
