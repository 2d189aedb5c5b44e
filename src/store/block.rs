//! Rows of bits, packed as the sampler makes them and unpacked as HDF5 wants
//! them.

use crate::sampler::{Rows, ShotAudit};

/// Diagnostics of some shots, one value a shot in each list.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct AuditBlock {
    /// Draws it took until the shot was accepted, at least 1.
    pub attempts: Vec<u32>,
    /// Most qubits active at once.
    pub peak_active: Vec<u16>,
    /// Terms not projected to zero at the end; 0 for the dense read-out.
    pub terms_left: Vec<u32>,
}

impl AuditBlock {
    /// The diagnostics of some shots, column by column.
    pub fn new(shots: &[ShotAudit]) -> Self {
        AuditBlock {
            attempts: shots.iter().map(|shot| shot.attempts).collect(),
            peak_active: shots.iter().map(|shot| shot.peak_active).collect(),
            terms_left: shots.iter().map(|shot| shot.register.terms_left).collect(),
        }
    }
}

/// Writes bits `first` .. `first` + `width` of every row of `words` words as
/// bytes 0 and 1, row after row, over the old content of `out`.
pub(super) fn unpack(bits: &[u64], words: usize, first: usize, width: usize, out: &mut Vec<bool>) {
    out.clear();
    if words == 0 || width == 0 {
        return;
    }
    out.reserve(bits.len() / words * width);
    for row in bits.chunks_exact(words) {
        let mut bit = first;
        let end = first + width;
        while bit < end {
            let word = row[bit / 64] >> (bit % 64);
            let count = (64 - bit % 64).min(end - bit);
            out.extend((0..count).map(|shift| word >> shift & 1 == 1));
            bit += count;
        }
    }
}

/// Puts rows of `width` bytes (0 or 1) into bits `first` .. `first` + `width`
/// of the rows of `block`, which must be 0 there.
pub(super) fn pack(bytes: &[u8], width: usize, first: usize, block: &mut Rows) {
    if width == 0 {
        return;
    }
    let words = block.words;
    for (row, values) in block
        .bits
        .chunks_exact_mut(words)
        .zip(bytes.chunks_exact(width))
    {
        for (bit, &value) in (first..).zip(values) {
            row[bit / 64] |= u64::from(value & 1) << (bit % 64);
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    proptest! {
        #[test]
        fn unpacking_reads_every_bit_and_packing_puts_it_back(
            rows in 0usize..5, total in 1usize..200, from in 0usize..200, seed: u64,
        ) {
            let first = from % total;
            let width = (total - first).min(77);
            let mut block = Rows::zeros(rows, total);
            let mut state = seed;
            for shot in 0..rows {
                for bit in 0..total {
                    state = state.wrapping_mul(6364136223846793005).wrapping_add(1);
                    if state >> 63 == 1 {
                        block.set(shot, bit);
                    }
                }
            }
            let mut bools = Vec::new();
            unpack(&block.bits, block.words, first, width, &mut bools);
            let expected: Vec<bool> = (0..rows)
                .flat_map(|shot| (first..first + width).map(move |bit| (shot, bit)))
                .map(|(shot, bit)| block.get(shot, bit))
                .collect();
            prop_assert_eq!(&bools, &expected);

            let bytes: Vec<u8> = bools.iter().map(|&bit| u8::from(bit)).collect();
            let mut again = Rows::zeros(rows, total);
            pack(&bytes, width, first, &mut again);
            for shot in 0..rows {
                for bit in 0..total {
                    let inside = (first..first + width).contains(&bit);
                    prop_assert_eq!(again.get(shot, bit), inside && block.get(shot, bit));
                }
            }
        }
    }
}
