//! What a result file says about the run that made it.

use std::ops::Range;

use super::StoreError;

/// Value of the root attribute `format`.
pub const FORMAT: &str = "shot record";

/// Value of the root attribute `format_version`; grows when an older reader
/// would misread a new file.
pub const FORMAT_VERSION: u64 = 1;

/// The run, as told to [`Writer::create`](super::Writer::create). Every field
/// is stored under its own name as an attribute of the root group unless it says
/// otherwise; an absent value is an absent attribute.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Header {
    /// Name of the circuit file.
    pub circuit_name: String,
    /// Full text of the circuit. Its SHA-256 is stored as `circuit_sha256`, in
    /// hexadecimal.
    pub circuit: String,
    /// Name of the noise file.
    pub noise_name: Option<String>,
    /// Full text of the noise file.
    pub noise: Option<String>,
    /// Title given in the noise file.
    pub title: Option<String>,
    /// Number of qubits of the circuit.
    pub qubits: Option<u64>,
    /// Seed of all randomness.
    pub seed: u64,
    /// Trace-norm error δ asked for; absent if k was set by hand.
    pub delta: Option<f64>,
    /// How outcomes were read out: probe, walk or dense.
    pub readout: String,
    /// Natural logarithm of the extent ξ after merging noise and leaving out
    /// sites that do not matter. Stored as `log_extent`, and ξ itself as
    /// `extent` (infinite where it leaves the range of a double).
    pub log_extent: f64,
    /// What came of the non-Clifford gates before the run; absent where it was
    /// not told.
    pub reduction: Option<ReductionHeader>,
    /// Number of stabiliser terms k; absent for the dense read-out.
    pub terms: Option<u64>,
    /// λ = ξ/(k − 1 + ξ), 0 for the dense read-out; see
    /// [`crate::magic::mixing::mixing_weight`].
    pub mixing_weight: f64,
    /// Shots asked for in the whole run, over all parts.
    pub shots_total: u64,
    /// Which part of the run this file holds; stored as two numbers.
    pub part: Part,
    /// Other settings that decide the bits, as name and value; stored as a list
    /// of strings `name=value`. Nothing that depends on the machine.
    pub settings: Vec<(String, String)>,
    /// The recorded registers, in the order of their bits in a row.
    pub registers: Vec<RegisterHeader>,
    /// The non-Clifford places; stored as the table `/sites`.
    pub sites: Vec<SiteRow>,
    /// The places where noise may act; stored as `/faults/locations` where
    /// faults are recorded, and nowhere else.
    pub locations: Vec<LocationRow>,
}

/// What came of the non-Clifford gates before the run. Every field is stored
/// under its own name as an attribute of the root group.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct ReductionHeader {
    /// Natural logarithm of the extent of the circuit as written: every
    /// non-Clifford gate by itself, without noise.
    pub log_extent_as_written: f64,
    /// The same after neighbouring gates and noise were merged, before sites were
    /// reduced further.
    pub log_extent_after_noise: f64,
    /// Non-Clifford gates of the circuit as written.
    pub sites_as_written: u64,
    /// Sites that merged into earlier ones, or became Clifford by that.
    pub sites_merged: u64,
    /// Sites on an axis whose value is known, up to a sign.
    pub sites_deterministic: u64,
    /// Sites that no recorded bit depends on.
    pub sites_unobservable: u64,
}

/// Part `index` of `count` of a run, from 1.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Part {
    /// Which part, 1 to `count`.
    pub index: u64,
    /// Number of parts.
    pub count: u64,
}

impl Part {
    /// The shots of this part when the whole run has `total`: the parts follow
    /// one another without gaps and differ by at most one in length.
    pub fn shots(self, total: u64) -> Range<u64> {
        let border = |parts: u64| {
            let shots = u128::from(total) * u128::from(parts) / u128::from(self.count.max(1));
            // No more than `total` for any part there is.
            u64::try_from(shots).unwrap_or(total)
        };
        border(self.index.saturating_sub(1))..border(self.index)
    }
}

impl Default for Part {
    /// A run in one piece.
    fn default() -> Self {
        Part { index: 1, count: 1 }
    }
}

/// One recorded register.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct RegisterHeader {
    /// Name in the circuit file.
    pub name: String,
    /// `record`, `check` or `logical`.
    pub role: String,
    /// Number of bits.
    pub width: usize,
}

/// One non-Clifford place.
#[derive(Debug, Clone, PartialEq)]
pub struct SiteRow {
    /// Line of the circuit file, from 1.
    pub line: u32,
    /// The qubits, by name.
    pub qubits: String,
    /// What it is, in a word or two.
    pub kind: String,
    /// Extent as if no noise were merged into it.
    pub extent_without_noise: f64,
    /// Extent Ξ of its ensemble.
    pub extent: f64,
    /// Number of members of its ensemble.
    pub members: u32,
    /// Whether it counts; a site on a deterministic axis changes nothing.
    pub kept: bool,
}

/// One place where noise may act.
#[derive(Debug, Clone, PartialEq)]
pub struct LocationRow {
    /// Line of the circuit or noise file that put it there, from 1.
    pub line: u32,
    /// The channel, by name.
    pub kind: String,
    /// The qubits, by name, in the order of the letters of a fault.
    pub qubits: String,
    /// Chance that something happens there in one shot.
    pub probability: f64,
}

impl Header {
    /// Bits of one shot, all registers together.
    pub fn bits(&self) -> usize {
        self.registers.iter().map(|register| register.width).sum()
    }

    /// Checks what HDF5 cannot store or readers would stumble over.
    pub(super) fn check(&self) -> Result<(), StoreError> {
        let invalid = |what: String| Err(StoreError::Invalid { what });
        for (index, register) in self.registers.iter().enumerate() {
            let name = &register.name;
            if name.is_empty() || name == "." || name.contains(['/', '\0']) {
                return invalid(format!("{name:?} cannot be the name of a register"));
            }
            let earlier = &self.registers[..index];
            if earlier.iter().any(|other| other.name == *name) {
                return invalid(format!("the register {name} appears twice"));
            }
        }
        if self.settings.len() > MOST_SETTINGS {
            return invalid(format!(
                "{} settings; a result file holds at most {MOST_SETTINGS}",
                self.settings.len()
            ));
        }
        if self.part.index == 0 || self.part.index > self.part.count {
            return invalid(format!(
                "part {} of {}; parts count from 1",
                self.part.index, self.part.count
            ));
        }
        Ok(())
    }
}

/// An HDF5 attribute holds at most 64 KiB; one string of a list takes 16 bytes.
const MOST_SETTINGS: usize = 4000;

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn parts_cover_the_run() {
        for total in [0, 1, 7, 1000, u64::MAX] {
            for count in [1, 2, 3, 10] {
                let mut next = 0;
                for index in 1..=count {
                    let shots = Part { index, count }.shots(total);
                    assert_eq!(shots.start, next);
                    let length = shots.end - shots.start;
                    assert!(length == total / count || length == total / count + 1);
                    next = shots.end;
                }
                assert_eq!(next, total);
            }
        }
    }
}
