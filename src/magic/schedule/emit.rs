//! The rewritten timeline as a schedule: sites numbered, quarter turns as gates.

use smallvec::smallvec;

use crate::circuit::{Clifford, Pauli, PauliProduct, Qubits};
use crate::magic::{
    CczSite, Instruction, Kind, PreparedSite, RotationSite, Schedule, Site, SiteKind, extent,
};
use crate::noise::{PauliChannel, PauliChoices, PauliWord};

use super::timeline::{Prepared, Timeline, Work};

/// Extent of a CCZ: (8/6)². Quantum 3, 181 (2019).
const CCZ_EXTENT: f64 = 16.0 / 9.0;

pub(super) fn emit(timeline: Timeline) -> Schedule {
    let mut writer = Writer {
        instructions: Vec::with_capacity(timeline.nodes.len()),
        sites: Vec::new(),
        condition: None,
        operation: 0,
    };
    for node in timeline.nodes {
        writer.condition = node.condition.map(|(bit, _)| bit);
        writer.operation = node.operation;
        writer.work(node.work);
    }
    Schedule {
        instructions: writer.instructions,
        sites: writer.sites,
    }
}

struct Writer {
    instructions: Vec<Instruction>,
    sites: Vec<Site>,
    condition: Option<u32>,
    operation: u32,
}

impl Writer {
    fn push(&mut self, kind: Kind) {
        self.instructions.push(Instruction {
            kind,
            condition: self.condition,
            operation: self.operation,
        });
    }

    fn clifford(&mut self, clifford: Clifford) {
        self.push(Kind::Clifford(clifford));
    }

    fn work(&mut self, work: Work) {
        match work {
            Work::Clifford(clifford) => self.clifford(clifford),
            Work::Turns(axis, quarters) => self.turns(&axis, quarters),
            Work::Rotation {
                axis,
                quarters,
                angle,
                dephasing,
            } => {
                self.turns(&axis, quarters);
                self.rotation(axis, angle, dephasing);
            }
            Work::Ccz(qubits) => self.ccz(qubits),
            Work::Measure { qubit, bit, flip } => self.push(Kind::Measure { qubit, bit, flip }),
            Work::Reset(qubit) => self.push(Kind::Reset { qubit }),
            Work::Assign { bit, value } => self.push(Kind::Assign { bit, value }),
            Work::Pauli(channel) => self.push(Kind::Pauli(channel)),
            Work::Damping { qubit, gamma } => self.push(Kind::Damping { qubit, gamma }),
            Work::Prepared(prepared) => self.prepared(prepared),
            Work::Eigenstate {
                qubit,
                axis,
                negative,
                flip,
            } => self.eigenstate(qubit, axis, negative, flip),
            Work::Nothing => {}
        }
    }

    /// exp(−iπA/4) so many times, up to a phase. Two of them are A itself.
    fn turns(&mut self, axis: &PauliProduct, quarters: u8) {
        if let [(qubit, Pauli::Z)] = axis[..] {
            match quarters {
                1 => self.clifford(Clifford::S(qubit)),
                2 => self.clifford(Clifford::Z(qubit)),
                3 => self.clifford(Clifford::Sdg(qubit)),
                _ => {}
            }
            return;
        }
        if quarters % 2 == 1 {
            self.clifford(Clifford::QuarterTurn(axis.clone()));
        }
        if quarters >= 2 {
            for &(qubit, letter) in axis {
                match letter {
                    Pauli::I => {}
                    Pauli::X => self.clifford(Clifford::X(qubit)),
                    Pauli::Y => self.clifford(Clifford::Y(qubit)),
                    Pauli::Z => self.clifford(Clifford::Z(qubit)),
                }
            }
        }
    }

    fn site(&mut self, site: Site) -> u32 {
        self.sites.push(site);
        (self.sites.len() - 1) as u32
    }

    fn rotation(&mut self, axis: PauliProduct, angle: f64, dephasing: f64) {
        let rotation = RotationSite::new(angle, dephasing);
        let site = self.site(Site {
            extent_without_noise: rotation.extent_without_noise(),
            extent: rotation.extent(),
            kind: SiteKind::Rotation(rotation),
            operation: self.operation,
            qubits: axis.iter().map(|&(qubit, _)| qubit).collect(),
        });
        let axes = vec![axis];
        self.push(Kind::Gate { site, axes });
    }

    fn ccz(&mut self, qubits: [u32; 3]) {
        let site = self.site(Site {
            kind: SiteKind::Ccz(CczSite),
            operation: self.operation,
            qubits: qubits.to_vec(),
            extent_without_noise: CCZ_EXTENT,
            extent: CCZ_EXTENT,
        });
        let axes = qubits.map(|qubit| smallvec![(qubit, Pauli::Z)]).to_vec();
        self.push(Kind::Gate { site, axes });
    }

    fn prepared(&mut self, prepared: Prepared) {
        let state = PreparedSite::with_ideal(prepared.bloch, prepared.ideal);
        let qubit = prepared.qubit;
        let site = self.site(Site {
            extent_without_noise: extent::of_state(prepared.ideal),
            extent: state.extent(),
            kind: SiteKind::Prepared(state),
            operation: prepared.operation,
            qubits: vec![qubit],
        });
        self.push(Kind::Prepare { site, qubit });
    }

    /// An eigenstate of X, Y or Z from |0⟩, flipped with a probability.
    fn eigenstate(&mut self, qubit: u32, axis: usize, negative: bool, flip: f64) {
        if negative {
            self.clifford(Clifford::X(qubit));
        }
        if axis < 2 {
            self.clifford(Clifford::H(qubit));
        }
        if axis == 1 {
            self.clifford(Clifford::S(qubit));
        }
        if flip > 0.0 {
            let word = match axis {
                2 => PauliWord { x: 1, z: 0 },
                _ => PauliWord { x: 0, z: 1 },
            };
            self.push(Kind::Pauli(PauliChannel {
                qubits: Qubits::from_slice(&[qubit]),
                choices: PauliChoices::Listed(vec![(word, flip)]),
            }));
        }
    }
}
