//! The library gates.
//!
//! Names and meanings are those of the OpenQASM 3 standard library
//! (arXiv:2104.14722) and of its OpenQASM 2 compatibility names
//! (arXiv:1707.03429), with a few more two- and three-qubit gates. A gate keeps
//! the name it was called by (`cx` and `CX` are two variants), because noise is
//! attached to calls by name.
//!
//! This module knows nothing of qubits of a circuit: a gate acts on positions
//! 0, 1, 2 of its call.

mod expand;
mod modify;
#[cfg(test)]
mod tests;

pub use expand::Expansion;
pub use modify::Parameters;

/// Writes the enum and what is known of each gate from one list of
/// `Variant "name" parameters qubits`.
macro_rules! library {
    ($($(#[$doc:meta])* $variant:ident $name:literal $parameters:literal $qubits:literal,)*) => {
        /// A library gate, under the name it is called by.
        #[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
        pub enum Gate {
            $($(#[$doc])* $variant,)*
            /// `inv @ iswap`, which has no name of its own and counts as `iswap`.
            IswapInverse,
            /// A gate with `negctrl`: some of its leading qubits control on 0. It
            /// counts as a call of `gate`; the flips around it are no calls.
            Negated {
                /// The gate whose controls are turned over.
                gate: &'static Gate,
                /// Bit i is set when qubit i of the call controls on 0.
                mask: u8,
            },
        }

        /// Every gate that can be called by name.
        const NAMED: &[Gate] = &[$(Gate::$variant,)*];

        impl Gate {
            /// The gate called `name`, if the library has one.
            pub fn from_name(name: &str) -> Option<Gate> {
                match name {
                    $($name => Some(Gate::$variant),)*
                    _ => None,
                }
            }

            /// The gate as a value that lives for ever, and what is known of it.
            fn entry(self) -> (&'static Gate, &'static str, usize, usize) {
                match self {
                    $(Gate::$variant => (&Gate::$variant, $name, $parameters, $qubits),)*
                    Gate::IswapInverse => (&Gate::IswapInverse, "iswap", 0, 2),
                    Gate::Negated { gate, .. } => gate.entry(),
                }
            }
        }
    };
}

library! {
    /// `U(θ, φ, λ)`, the built-in one-qubit gate.
    U "U" 3 1,
    /// `gphase(γ)`, a global phase; acts on no qubit.
    GlobalPhase "gphase" 1 0,
    /// `p(λ)` = diag(1, e^{iλ}).
    P "p" 1 1,
    /// `phase(λ)`, the same as `p`.
    Phase "phase" 1 1,
    /// `u1(λ)`, the same as `p`.
    U1 "u1" 1 1,
    /// `u2(φ, λ)` = Rz(φ) Ry(π/2) Rz(λ).
    U2 "u2" 2 1,
    /// `u3(θ, φ, λ)` = Rz(φ) Ry(θ) Rz(λ).
    U3 "u3" 3 1,
    /// `id`, the identity.
    Id "id" 0 1,
    /// `x`.
    X "x" 0 1,
    /// `y`.
    Y "y" 0 1,
    /// `z`.
    Z "z" 0 1,
    /// `h`.
    H "h" 0 1,
    /// `s` = diag(1, i).
    S "s" 0 1,
    /// `sdg` = diag(1, −i).
    Sdg "sdg" 0 1,
    /// `t` = diag(1, e^{iπ/4}).
    T "t" 0 1,
    /// `tdg` = diag(1, e^{−iπ/4}).
    Tdg "tdg" 0 1,
    /// `sx`, the square root of X.
    Sx "sx" 0 1,
    /// `sxdg`, the inverse of `sx`.
    Sxdg "sxdg" 0 1,
    /// `rx(θ)` = exp(−iθX/2).
    Rx "rx" 1 1,
    /// `ry(θ)` = exp(−iθY/2).
    Ry "ry" 1 1,
    /// `rz(θ)` = exp(−iθZ/2).
    Rz "rz" 1 1,
    /// `cx`: control, target.
    Cx "cx" 0 2,
    /// `CX`, the same as `cx`.
    UpperCx "CX" 0 2,
    /// `cy`.
    Cy "cy" 0 2,
    /// `cz`.
    Cz "cz" 0 2,
    /// `ch`.
    Ch "ch" 0 2,
    /// `cp(λ)`.
    Cp "cp" 1 2,
    /// `cphase(λ)`, the same as `cp`.
    Cphase "cphase" 1 2,
    /// `cu1(λ)`, the same as `cp`.
    Cu1 "cu1" 1 2,
    /// `cu3(θ, φ, λ)`, the same as `cu(θ, φ, λ, 0)`.
    Cu3 "cu3" 3 2,
    /// `crx(θ)`.
    Crx "crx" 1 2,
    /// `cry(θ)`.
    Cry "cry" 1 2,
    /// `crz(θ)`.
    Crz "crz" 1 2,
    /// `cu(θ, φ, λ, γ)`: the phase e^{iγ} and the matrix
    /// ((cos θ/2, −e^{iλ} sin θ/2), (e^{iφ} sin θ/2, e^{i(φ+λ)} cos θ/2)) when the control is 1.
    Cu "cu" 4 2,
    /// `swap`.
    Swap "swap" 0 2,
    /// `iswap` = exp(iπ(XX + YY)/4).
    Iswap "iswap" 0 2,
    /// `rxx(θ)` = exp(−iθXX/2).
    Rxx "rxx" 1 2,
    /// `ryy(θ)` = exp(−iθYY/2).
    Ryy "ryy" 1 2,
    /// `rzz(θ)` = exp(−iθZZ/2).
    Rzz "rzz" 1 2,
    /// `ccx`: two controls, target.
    Ccx "ccx" 0 3,
    /// `ccz`.
    Ccz "ccz" 0 3,
    /// `cswap`: control, two targets.
    Cswap "cswap" 0 3,
}

impl Gate {
    /// The most qubits a library gate acts on.
    pub const MAX_QUBITS: usize = 3;

    /// Every gate that can be called by name.
    pub fn all() -> impl Iterator<Item = Gate> {
        NAMED.iter().copied()
    }

    /// The name the gate is called by. `inv @ iswap` goes by `iswap`, a gate
    /// with negative controls by the name of the gate with ordinary ones.
    pub fn name(self) -> &'static str {
        self.entry().1
    }

    /// Number of angles, from 0 to 4.
    pub fn parameters(self) -> usize {
        self.entry().2
    }

    /// Number of qubits, from 0 (`gphase`) to [`Gate::MAX_QUBITS`].
    pub fn qubits(self) -> usize {
        self.entry().3
    }
}
