//! The instructions, threaded along every qubit they touch.
//!
//! A node knows its neighbours on each of its qubits, so a rewrite looks only
//! at what acts on the qubits it is about, and a node is taken out in the time
//! its qubits take. Nodes keep their index, which is their order in time.

use std::sync::Arc;

use smallvec::SmallVec;

use crate::circuit::{BitExpression, Clifford, PauliProduct};
use crate::noise::{self, NoisyCircuit, PauliChannel, ReadoutFlip};

use super::axis;

/// No node.
pub(super) const NONE: u32 = u32::MAX;

/// What a node does.
#[derive(Debug, Clone)]
pub(super) enum Work {
    /// A Clifford gate.
    Clifford(Clifford),
    /// As many quarter turns about the axis, 1 to 3.
    Turns(PauliProduct, u8),
    /// A rotation. Before folding `quarters` is 0 and the angle any number;
    /// after it the angle is in (0, π/2), and the quarter turns come on top.
    Rotation {
        axis: PauliProduct,
        quarters: u8,
        angle: f64,
        /// Dephasing about the axis that has moved here.
        dephasing: f64,
    },
    /// −1 on |111⟩.
    Ccz([u32; 3]),
    /// A measurement of Z.
    Measure {
        qubit: u32,
        bit: Option<u32>,
        flip: ReadoutFlip,
    },
    /// Reset to |0⟩.
    Reset(u32),
    /// Classical assignment.
    Assign { bit: u32, value: Arc<BitExpression> },
    /// A random Pauli.
    Pauli(PauliChannel),
    /// Amplitude damping.
    Damping { qubit: u32, gamma: f64 },
    /// The fresh qubit takes this state.
    Prepared(Prepared),
    /// The fresh qubit takes an eigenstate of X, Y or Z (axis 0, 1, 2), which
    /// is flipped with a probability.
    Eigenstate {
        qubit: u32,
        axis: usize,
        negative: bool,
        flip: f64,
    },
    /// Taken out.
    Nothing,
}

/// A state of a fresh qubit.
#[derive(Debug, Clone, Copy)]
pub(super) struct Prepared {
    /// The qubit.
    pub qubit: u32,
    /// Its Bloch vector.
    pub bloch: [f64; 3],
    /// The Bloch vector had there been no noise.
    pub ideal: [f64; 3],
    /// The circuit operation that made it non-Clifford.
    pub operation: u32,
}

/// A classical bit at one stage of its life: assigned so many times.
pub(super) type Condition = (u32, u32);

/// Neighbours of a node on one of its qubits.
#[derive(Debug, Clone, Copy)]
pub(super) struct Wire {
    pub qubit: u32,
    pub previous: u32,
    pub next: u32,
}

/// One instruction.
#[derive(Debug)]
pub(super) struct Node {
    pub work: Work,
    pub condition: Option<Condition>,
    pub operation: u32,
    pub wires: SmallVec<[Wire; 2]>,
}

/// All instructions.
#[derive(Debug)]
pub(super) struct Timeline {
    pub nodes: Vec<Node>,
    /// The first node on every qubit.
    pub first: Vec<u32>,
}

/// Which way to go along a wire.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Direction {
    Forward,
    Backward,
}

impl Timeline {
    pub(super) fn new(circuit: &NoisyCircuit, qubits: usize) -> Timeline {
        let mut timeline = Timeline {
            nodes: Vec::with_capacity(circuit.instructions.len()),
            first: vec![NONE; qubits],
        };
        let mut last = vec![NONE; qubits];
        let mut stages: Vec<u32> = Vec::new();
        let mut stage = |bit: u32, step: u32| {
            let bit = bit as usize;
            if stages.len() <= bit {
                stages.resize(bit + 1, 0);
            }
            stages[bit] += step;
            stages[bit]
        };
        for instruction in &circuit.instructions {
            let work = work(&instruction.kind);
            let condition = instruction.condition.map(|bit| (bit, stage(bit, 0)));
            if let Work::Measure { bit: Some(bit), .. } | Work::Assign { bit, .. } = work {
                stage(bit, 1);
            }
            let index = timeline.nodes.len() as u32;
            let mut wires = SmallVec::new();
            for_each_qubit(&work, |qubit| {
                let place = qubit as usize;
                if last.len() <= place {
                    last.resize(place + 1, NONE);
                    timeline.first.resize(place + 1, NONE);
                }
                let previous = std::mem::replace(&mut last[place], index);
                if previous == index {
                    return; // named twice
                }
                match previous {
                    NONE => timeline.first[place] = index,
                    _ => timeline.wire_mut(previous, qubit).next = index,
                }
                wires.push(Wire {
                    qubit,
                    previous,
                    next: NONE,
                });
            });
            timeline.nodes.push(Node {
                work,
                condition,
                operation: instruction.operation,
                wires,
            });
        }
        timeline
    }

    fn wire_mut(&mut self, node: u32, qubit: u32) -> &mut Wire {
        let wires = &mut self.nodes[node as usize].wires;
        let place = wires.iter().position(|wire| wire.qubit == qubit);
        &mut wires[place.expect("a neighbour on a qubit touches that qubit")]
    }

    pub(super) fn node(&self, index: u32) -> &Node {
        &self.nodes[index as usize]
    }

    /// The neighbour of a node on one of its qubits.
    pub(super) fn step(&self, node: u32, qubit: u32, direction: Direction) -> u32 {
        let wires = &self.node(node).wires;
        match (wires.iter().find(|wire| wire.qubit == qubit), direction) {
            (Some(wire), Direction::Forward) => wire.next,
            (Some(wire), Direction::Backward) => wire.previous,
            (None, _) => NONE,
        }
    }

    /// Takes a node out. Its own neighbours stay readable, so that a walk that
    /// stands on it can go on.
    pub(super) fn remove(&mut self, index: u32) {
        let wires = self.nodes[index as usize].wires.clone();
        for wire in wires {
            match wire.previous {
                NONE => self.first[wire.qubit as usize] = wire.next,
                previous => self.wire_mut(previous, wire.qubit).next = wire.next,
            }
            if wire.next != NONE {
                self.wire_mut(wire.next, wire.qubit).previous = wire.previous;
            }
        }
        self.nodes[index as usize].work = Work::Nothing;
    }
}

fn work(kind: &noise::Kind) -> Work {
    match kind {
        noise::Kind::Clifford(Clifford::QuarterTurn(axis)) => {
            Work::Turns(axis::normalised(axis), 1)
        }
        noise::Kind::Clifford(clifford) => Work::Clifford(clifford.clone()),
        noise::Kind::Rotation { axis, angle } => Work::Rotation {
            axis: axis::normalised(axis),
            quarters: 0,
            angle: *angle,
            dephasing: 0.0,
        },
        noise::Kind::Ccz(qubits) => Work::Ccz(*qubits),
        noise::Kind::Measure { qubit, bit, flip } => Work::Measure {
            qubit: *qubit,
            bit: *bit,
            flip: *flip,
        },
        noise::Kind::Reset { qubit } => Work::Reset(*qubit),
        noise::Kind::Assign { bit, value } => Work::Assign {
            bit: *bit,
            value: value.clone(),
        },
        noise::Kind::Pauli(channel) => Work::Pauli(channel.clone()),
        noise::Kind::Damping { qubit, gamma } => Work::Damping {
            qubit: *qubit,
            gamma: *gamma,
        },
    }
}

fn for_each_qubit(work: &Work, mut each: impl FnMut(u32)) {
    match work {
        Work::Clifford(clifford) => match clifford {
            Clifford::X(q)
            | Clifford::Y(q)
            | Clifford::Z(q)
            | Clifford::H(q)
            | Clifford::S(q)
            | Clifford::Sdg(q) => each(*q),
            Clifford::Cx(a, b) | Clifford::Cz(a, b) | Clifford::Swap(a, b) => {
                each(*a);
                each(*b);
            }
            Clifford::QuarterTurn(axis) => axis.iter().for_each(|&(q, _)| each(q)),
        },
        Work::Turns(axis, _) | Work::Rotation { axis, .. } => {
            axis.iter().for_each(|&(q, _)| each(q));
        }
        Work::Ccz(qubits) => qubits.iter().copied().for_each(each),
        Work::Measure { qubit, .. }
        | Work::Reset(qubit)
        | Work::Damping { qubit, .. }
        | Work::Eigenstate { qubit, .. } => each(*qubit),
        Work::Prepared(prepared) => each(prepared.qubit),
        Work::Pauli(channel) => channel.qubits.iter().copied().for_each(each),
        Work::Assign { .. } | Work::Nothing => {}
    }
}
