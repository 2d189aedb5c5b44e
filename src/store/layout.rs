//! Names, row types and chunk shapes of the file.

use hdf5::H5Type;
use hdf5::types::VarLenUnicode;

use super::{LocationRow, SiteRow, StoreError};

/// Group of the shots' registers.
pub(super) const SHOTS: &str = "shots";
/// Group of the companion shots' registers.
pub(super) const COMPANION: &str = "companion";
/// Group of the diagnostics.
pub(super) const AUDIT: &str = "audit";
/// Group of the norm audit inside [`AUDIT`].
pub(super) const NORM: &str = "norm";
/// Group of the faults.
pub(super) const FAULTS: &str = "faults";
/// Table of locations inside [`FAULTS`].
pub(super) const LOCATIONS: &str = "locations";
/// Table of non-Clifford places.
pub(super) const SITES: &str = "sites";

/// Deflate level of all data. Random bits take 0.172 of a byte each at level 4
/// and 0.160 at level 6, which takes five times as long; level 1 takes half as
/// long and 0.224 of a byte.
pub(super) const DEFLATE_LEVEL: u8 = 4;

/// Bits of all registers together that one chunk row range aims at.
const CHUNK_BITS: usize = 1 << 22;
/// Fewest and most shots in a chunk.
const CHUNK_SHOTS: (usize, usize) = (256, 1 << 16);
/// Most columns of a register in a chunk.
const CHUNK_COLUMNS: usize = 4096;
/// Entries in a chunk of one number a shot or an event.
pub(super) const CHUNK_NUMBERS: usize = 1 << 14;

/// Shots in a chunk, the same for every register: a power of two such that
/// `bits` bits a shot fill a chunk row range of about half a mebibyte packed.
pub(super) fn chunk_shots(bits: usize) -> usize {
    let shots = (CHUNK_BITS / bits.max(1)).clamp(CHUNK_SHOTS.0, CHUNK_SHOTS.1);
    1 << shots.ilog2()
}

/// Columns in a chunk of a register of `width` > 0 bits.
pub(super) fn chunk_columns(width: usize) -> usize {
    width.min(CHUNK_COLUMNS)
}

/// A row of `/sites`.
#[derive(H5Type, Clone)]
#[repr(C)]
pub(super) struct SiteRecord {
    line: u32,
    qubits: VarLenUnicode,
    kind: VarLenUnicode,
    extent_without_noise: f64,
    extent: f64,
    members: u32,
    kept: bool,
}

/// A row of `/faults/locations`.
#[derive(H5Type, Clone)]
#[repr(C)]
pub(super) struct LocationRecord {
    line: u32,
    kind: VarLenUnicode,
    qubits: VarLenUnicode,
    probability: f64,
}

/// The text as HDF5 stores it. It must not contain the character NUL, which
/// ends a variable-length string.
pub(super) fn text(value: &str) -> Result<VarLenUnicode, StoreError> {
    value.parse().map_err(|_| StoreError::Invalid {
        what: format!(
            "a text contains the character NUL, which HDF5 strings cannot hold: {:?}",
            value.chars().take(40).collect::<String>()
        ),
    })
}

/// The text of a stored string, whatever bytes it holds.
pub(super) fn plain(value: &VarLenUnicode) -> String {
    String::from_utf8_lossy(value.as_bytes()).into_owned()
}

impl SiteRecord {
    pub fn new(row: &SiteRow) -> Result<Self, StoreError> {
        Ok(SiteRecord {
            line: row.line,
            qubits: text(&row.qubits)?,
            kind: text(&row.kind)?,
            extent_without_noise: row.extent_without_noise,
            extent: row.extent,
            members: row.members,
            kept: row.kept,
        })
    }

    pub fn row(&self) -> SiteRow {
        SiteRow {
            line: self.line,
            qubits: plain(&self.qubits),
            kind: plain(&self.kind),
            extent_without_noise: self.extent_without_noise,
            extent: self.extent,
            members: self.members,
            kept: self.kept,
        }
    }
}

impl LocationRecord {
    pub fn new(row: &LocationRow) -> Result<Self, StoreError> {
        Ok(LocationRecord {
            line: row.line,
            kind: text(&row.kind)?,
            qubits: text(&row.qubits)?,
            probability: row.probability,
        })
    }

    pub fn row(&self) -> LocationRow {
        LocationRow {
            line: self.line,
            kind: plain(&self.kind),
            qubits: plain(&self.qubits),
            probability: self.probability,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn chunks_stay_small_for_any_width() {
        assert_eq!(chunk_shots(0), 1 << 16);
        assert_eq!(chunk_shots(10), 1 << 16);
        assert_eq!(chunk_shots(1000), 4096);
        assert_eq!(chunk_shots(1_000_000), 256);
        for bits in [1usize, 7, 64, 1000, 5000, 1_000_000] {
            let bytes = chunk_shots(bits) * chunk_columns(bits);
            assert!(bytes <= 1 << 22, "{bits} bits give chunks of {bytes} bytes");
        }
    }
}
