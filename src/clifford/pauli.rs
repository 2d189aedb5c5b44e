//! Pauli strings on many qubits.
//!
//! A string is i^phase · X^x Z^z, every X to the left of every Z. It is
//! Hermitian when phase ≡ |x∧z| (mod 2), and a plain product of letters X, Y,
//! Z with sign + when phase ≡ |x∧z| (mod 4), because Y = iXZ.

use crate::circuit::{Pauli, PauliProduct};

/// Number of 64-bit words that hold `bits` bits.
pub fn words_for(bits: usize) -> usize {
    bits.div_ceil(64)
}

/// Bit `index` of a packed bit vector.
#[inline]
pub fn bit(words: &[u64], index: usize) -> bool {
    words[index / 64] >> (index % 64) & 1 == 1
}

/// Toggles bit `index` of a packed bit vector.
#[inline]
pub fn toggle(words: &mut [u64], index: usize) {
    words[index / 64] ^= 1 << (index % 64);
}

/// Number of ones in the bitwise and of two bit vectors.
#[inline]
pub fn overlap(left: &[u64], right: &[u64]) -> u32 {
    left.iter()
        .zip(right)
        .map(|(a, b)| (a & b).count_ones())
        .sum()
}

/// Indices of the ones of a bit vector, ascending.
pub fn ones(words: &[u64]) -> impl Iterator<Item = usize> + '_ {
    words.iter().enumerate().flat_map(|(word, &bits)| {
        let mut rest = bits;
        std::iter::from_fn(move || {
            if rest == 0 {
                return None;
            }
            let index = rest.trailing_zeros() as usize;
            rest &= rest - 1;
            Some(word * 64 + index)
        })
    })
}

/// A Pauli string i^phase · X^x Z^z.
#[derive(Debug, Clone, PartialEq, Eq, Hash)]
pub struct PauliString {
    /// X parts, bit q for qubit q.
    pub x: Vec<u64>,
    /// Z parts, bit q for qubit q.
    pub z: Vec<u64>,
    /// Power of i, 0 to 3.
    pub phase: u8,
}

impl PauliString {
    /// The identity on room for `qubits` qubits.
    pub fn identity(qubits: usize) -> Self {
        let words = words_for(qubits);
        PauliString {
            x: vec![0; words],
            z: vec![0; words],
            phase: 0,
        }
    }

    /// A product of letters with sign +.
    pub fn from_product(qubits: usize, product: &PauliProduct) -> Self {
        let mut string = PauliString::identity(qubits);
        for &(qubit, letter) in product {
            string.multiply_letter(qubit as usize, letter);
        }
        string
    }

    /// Multiplies by a letter from the right.
    fn multiply_letter(&mut self, qubit: usize, letter: Pauli) {
        if letter.x() {
            self.phase ^= (bit(&self.z, qubit) as u8) << 1;
            toggle(&mut self.x, qubit);
        }
        if letter.z() {
            toggle(&mut self.z, qubit);
        }
        if letter == Pauli::Y {
            self.phase = (self.phase + 1) & 3;
        }
    }

    /// Multiplies by `other` from the right.
    pub fn multiply(&mut self, other: &PauliString) {
        let swapped = overlap(&self.z, &other.x);
        self.phase = ((u32::from(self.phase + other.phase) + 2 * swapped) & 3) as u8;
        self.x.iter_mut().zip(&other.x).for_each(|(a, b)| *a ^= b);
        self.z.iter_mut().zip(&other.z).for_each(|(a, b)| *a ^= b);
    }

    /// Whether the two strings anticommute.
    pub fn anticommutes(&self, other: &PauliString) -> bool {
        (overlap(&self.x, &other.z) + overlap(&self.z, &other.x)) & 1 == 1
    }

    /// The phase that makes this string a product of letters with sign +.
    pub fn plain_phase(&self) -> u8 {
        (overlap(&self.x, &self.z) & 3) as u8
    }

    /// Whether a Hermitian string carries the sign −.
    pub fn negative(&self) -> bool {
        let sign = self.phase.wrapping_sub(self.plain_phase()) & 3;
        debug_assert!(sign & 1 == 0, "the string is not Hermitian");
        sign == 2
    }

    /// The same letters with sign +.
    pub fn unsigned(mut self) -> Self {
        self.phase = self.plain_phase();
        self
    }

    /// Letter on a qubit.
    pub fn letter(&self, qubit: usize) -> Pauli {
        Pauli::from_parts(bit(&self.x, qubit), bit(&self.z, qubit))
    }

    /// The letters on the qubits of `mask`, with sign +; identity elsewhere.
    pub fn restricted(&self, mask: &[u64]) -> PauliString {
        let and = |part: &[u64]| part.iter().zip(mask).map(|(a, b)| a & b).collect();
        PauliString {
            x: and(&self.x),
            z: and(&self.z),
            phase: 0,
        }
        .unsigned()
    }

    /// Whether every letter is the identity.
    pub fn is_identity(&self) -> bool {
        self.x.iter().chain(&self.z).all(|&word| word == 0)
    }

    /// The letters that are not the identity, by ascending qubit.
    pub fn letters(&self) -> PauliProduct {
        let support: Vec<u64> = self.x.iter().zip(&self.z).map(|(a, b)| a | b).collect();
        ones(&support)
            .map(|qubit| (qubit as u32, self.letter(qubit)))
            .collect()
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use smallvec::smallvec;

    /// X·Y = iZ and cyclic (textbook).
    #[test]
    fn letters_multiply_as_the_textbook_says() {
        let one = |letter| PauliString::from_product(1, &smallvec![(0, letter)]);
        for (a, b, c) in [
            (Pauli::X, Pauli::Y, Pauli::Z),
            (Pauli::Y, Pauli::Z, Pauli::X),
            (Pauli::Z, Pauli::X, Pauli::Y),
        ] {
            let mut product = one(a);
            product.multiply(&one(b));
            let mut expected = one(c);
            expected.phase = (expected.phase + 1) & 3;
            assert_eq!(product, expected);
            assert!(one(a).anticommutes(&one(b)));
            assert!(!one(a).negative());
        }
    }

    #[test]
    fn ones_lists_set_bits_across_words() {
        assert_eq!(ones(&[1 << 63, 0, 5]).collect::<Vec<_>>(), [63, 128, 130]);
    }
}
