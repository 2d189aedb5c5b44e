//! Rows of bits, packed as the sampler makes them and unpacked as HDF5 wants
//! them.

use crate::noise::PauliWord;

/// The recorded bits of some shots. Bit i of a row is recorded bit i, the
/// registers standing in header order one after another; bit i of a word is
/// 2^i.
#[derive(Debug, Clone, PartialEq, Eq, Default)]
pub struct Block {
    /// Number of shots (rows).
    pub shots: usize,
    /// Words a row takes: ⌈bits/64⌉.
    pub words: usize,
    /// The rows one after another, `shots`·`words` words.
    pub bits: Vec<u64>,
}

impl Block {
    /// A block of zeros for `shots` rows of `bits` bits.
    pub fn zeros(shots: usize, bits: usize) -> Self {
        let words = bits.div_ceil(64);
        Block {
            shots,
            words,
            bits: vec![0; shots * words],
        }
    }

    /// Bit `bit` of row `shot`.
    pub fn get(&self, shot: usize, bit: usize) -> bool {
        self.bits[shot * self.words + bit / 64] >> (bit % 64) & 1 == 1
    }

    /// Sets bit `bit` of row `shot` to 1.
    pub fn set(&mut self, shot: usize, bit: usize) {
        self.bits[shot * self.words + bit / 64] |= 1 << (bit % 64);
    }
}

/// Diagnostics of some shots, one value a shot in each list.
#[derive(Debug, Clone, PartialEq, Eq, Default)]
pub struct AuditBlock {
    /// Draws it took until the shot was accepted, at least 1.
    pub attempts: Vec<u32>,
    /// Most qubits active at once.
    pub peak_active: Vec<u16>,
    /// Terms not projected to zero at the end; 0 for the dense read-out.
    pub terms_left: Vec<u32>,
}

/// One noise event that fired.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct FaultEvent {
    /// Index of the shot in this file.
    pub shot: u64,
    /// Row of the table of locations.
    pub location: u32,
    /// The Pauli, see [`pauli_code`]; 0 where the event is not a Pauli (the kind
    /// of the location then says what happened).
    pub pauli: u64,
}

/// A Pauli word as one number: digit i in base 4 is the letter on qubit i of
/// the location, 0 I, 1 X, 2 Y, 3 Z.
pub fn pauli_code(word: PauliWord) -> u64 {
    (0..32).fold(0, |code, qubit| {
        let x = u64::from(word.x >> qubit & 1);
        let z = u64::from(word.z >> qubit & 1);
        // X is 1, Y is 2, Z is 3.
        code | ((x ^ z) | z << 1) << (2 * qubit)
    })
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
pub(super) fn pack(bytes: &[u8], width: usize, first: usize, block: &mut Block) {
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

    #[test]
    fn pauli_letters_have_their_digits() {
        let word = |x, z| PauliWord { x, z };
        assert_eq!(pauli_code(word(0, 0)), 0);
        assert_eq!(pauli_code(word(1, 0)), 1, "X on qubit 0");
        assert_eq!(pauli_code(word(1, 1)), 2, "Y on qubit 0");
        assert_eq!(pauli_code(word(0, 1)), 3, "Z on qubit 0");
        // I X Y Z on qubits 0 to 3: 0 + 1·4 + 2·16 + 3·64.
        assert_eq!(pauli_code(word(0b0110, 0b1100)), 228);
        assert_eq!(pauli_code(word(0, 1 << 31)), 3 << 62);
    }

    proptest! {
        #[test]
        fn unpacking_reads_every_bit_and_packing_puts_it_back(
            rows in 0usize..5, total in 1usize..200, from in 0usize..200, seed: u64,
        ) {
            let first = from % total;
            let width = (total - first).min(77);
            let mut block = Block::zeros(rows, total);
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
            let mut again = Block::zeros(rows, total);
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
