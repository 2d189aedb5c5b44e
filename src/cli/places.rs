//! Names and source lines of sites and fault locations.

use crate::circuit::Circuit;
use crate::magic::{Site, SiteKind};
use crate::program::{Location, Program};
use crate::store::{LocationRow, SiteRow};

/// Names and lines for the tables of a result file.
pub(super) struct Places<'a> {
    circuit: &'a Circuit,
    /// Offsets of all line ends of the circuit text.
    line_ends: Vec<u32>,
}

impl<'a> Places<'a> {
    /// The tables of a circuit.
    pub(super) fn new(circuit: &'a Circuit) -> Self {
        let bytes = circuit.source.bytes().enumerate();
        let line_ends = bytes
            .filter(|&(_, byte)| byte == b'\n')
            .map(|(offset, _)| offset as u32)
            .collect();
        Places { circuit, line_ends }
    }

    /// Line of an operation, from 1.
    pub(super) fn line(&self, operation: u32) -> u32 {
        let start = self.circuit.operations[operation as usize].span.start;
        self.line_ends.partition_point(|&end| end < start) as u32 + 1
    }

    fn names(&self, qubits: &[u32]) -> String {
        let name = |&qubit: &u32| self.circuit.qubits[qubit as usize].as_str();
        qubits.iter().map(name).collect::<Vec<_>>().join(", ")
    }

    /// The non-Clifford places.
    pub(super) fn sites(&self, program: &Program) -> Vec<SiteRow> {
        let row = |(site, kept): (&Site, bool)| SiteRow {
            line: self.line(site.operation),
            qubits: self.names(&site.qubits),
            kind: kind_word(site).to_owned(),
            extent_without_noise: site.extent_without_noise,
            extent: site.extent,
            members: match &site.kind {
                SiteKind::Rotation(rotation) => rotation.members.len(),
                SiteKind::Ccz(_) => 1,
                SiteKind::Prepared(prepared) => prepared.members.len(),
            } as u32,
            kept,
        };
        program.all_sites().map(row).collect()
    }

    /// The places where a fault may happen.
    pub(super) fn locations(&self, program: &Program) -> Vec<LocationRow> {
        let row = |location: &Location| LocationRow {
            line: self.line(location.operation),
            kind: location.kind.word().to_owned(),
            qubits: self.names(&location.qubits),
            probability: location.probability,
        };
        program.locations().iter().map(row).collect()
    }
}

/// The word for the kind of a site.
pub(super) fn kind_word(site: &Site) -> &'static str {
    match site.kind {
        SiteKind::Rotation(_) => "rotation",
        SiteKind::Ccz(_) => "ccz",
        SiteKind::Prepared(_) => "prepared",
    }
}
