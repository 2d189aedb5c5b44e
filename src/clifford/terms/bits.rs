//! A vector over the two-element field in machine words, with operators, so
//! that the update rules read like their formulas.

use std::ops::{BitAnd, BitAndAssign, BitOr, BitOrAssign, BitXor, BitXorAssign, Not};

/// 64·W bits; bit s is bit s mod 64 of word s / 64.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
#[repr(transparent)]
pub(crate) struct Bits<const W: usize>(pub(crate) [u64; W]);

impl<const W: usize> Bits<W> {
    /// No bit set.
    pub(crate) const ZERO: Self = Self([0; W]);

    /// Only this bit set.
    #[inline(always)]
    pub(crate) fn one(slot: usize) -> Self {
        // No indexing by the slot: it would force the words out of registers.
        Self(std::array::from_fn(|word| {
            u64::from(word == slot / 64) << (slot % 64)
        }))
    }

    /// The bits below `count` set.
    pub(crate) fn first(count: usize) -> Self {
        Self(std::array::from_fn(|word| Self::first_of_word(count, word)))
    }

    /// Word `word` of the set of bits below `count`.
    #[inline(always)]
    pub(crate) fn first_of_word(count: usize, word: usize) -> u64 {
        match count.saturating_sub(64 * word) {
            0 => 0,
            part @ 1..64 => (1 << part) - 1,
            _ => !0,
        }
    }

    /// Whether this bit is set.
    #[inline(always)]
    pub(crate) fn has(self, slot: usize) -> bool {
        let word = (0..W).fold(0, |found, word| {
            found | if word == slot / 64 { self.0[word] } else { 0 }
        });
        word >> (slot % 64) & 1 == 1
    }

    /// Whether no bit is set.
    #[inline(always)]
    pub(crate) fn is_zero(self) -> bool {
        self.0.iter().fold(0, |all, word| all | word) == 0
    }

    /// The lowest set bit.
    #[inline(always)]
    pub(crate) fn lowest(self) -> Option<usize> {
        let word = self.0.iter().position(|&word| word != 0)?;
        Some(64 * word + self.0[word].trailing_zeros() as usize)
    }

    /// The highest set bit.
    #[inline(always)]
    pub(crate) fn highest(self) -> Option<usize> {
        self.length().checked_sub(1)
    }

    /// One more than the highest set bit, 0 if there is none.
    #[inline(always)]
    pub(crate) fn length(self) -> usize {
        let mut length = 0;
        for (word, bits) in self.0.iter().enumerate() {
            if *bits != 0 {
                length = 64 * word + 64 - bits.leading_zeros() as usize;
            }
        }
        length
    }

    /// How many bits are set.
    #[inline(always)]
    pub(crate) fn weight(self) -> u32 {
        self.0.iter().map(|word| word.count_ones()).sum()
    }

    /// Whether an odd number of bits is set.
    #[inline(always)]
    pub(crate) fn parity(self) -> bool {
        self.0.iter().fold(0, |all, word| all ^ word).count_ones() & 1 == 1
    }

    /// These bits if `condition` holds, otherwise none; without a branch.
    #[inline(always)]
    pub(crate) fn when(self, condition: bool) -> Self {
        let mask = u64::from(condition).wrapping_neg();
        Self(self.0.map(|word| word & mask))
    }

    /// The set bits, lowest first.
    #[inline(always)]
    pub(crate) fn ones(self) -> Ones<W> {
        Ones {
            left: self,
            word: 0,
        }
    }
}

/// Iterator over set bits.
pub(crate) struct Ones<const W: usize> {
    left: Bits<W>,
    word: usize,
}

impl<const W: usize> Iterator for Ones<W> {
    type Item = usize;

    #[inline(always)]
    fn next(&mut self) -> Option<usize> {
        while self.word < W {
            let word = &mut self.left.0[self.word];
            if *word != 0 {
                let bit = word.trailing_zeros() as usize;
                *word &= *word - 1;
                return Some(64 * self.word + bit);
            }
            self.word += 1;
        }
        None
    }
}

macro_rules! wordwise {
    ($operator:ident, $method:ident, $assign:ident, $assign_method:ident) => {
        impl<const W: usize> $operator for Bits<W> {
            type Output = Self;
            #[inline(always)]
            fn $method(self, other: Self) -> Self {
                Self(std::array::from_fn(|i| self.0[i].$method(other.0[i])))
            }
        }
        impl<const W: usize> $assign for Bits<W> {
            #[inline(always)]
            fn $assign_method(&mut self, other: Self) {
                *self = (*self).$method(other);
            }
        }
    };
}
wordwise!(BitXor, bitxor, BitXorAssign, bitxor_assign);
wordwise!(BitAnd, bitand, BitAndAssign, bitand_assign);
wordwise!(BitOr, bitor, BitOrAssign, bitor_assign);

impl<const W: usize> Not for Bits<W> {
    type Output = Self;
    #[inline(always)]
    fn not(self) -> Self {
        Self(self.0.map(|word| !word))
    }
}

#[cfg(test)]
mod tests {
    use super::Bits;

    #[test]
    fn bits_are_counted_across_words() {
        let bits = Bits::<4>::one(3) | Bits::one(64) | Bits::one(255);
        assert_eq!(bits.ones().collect::<Vec<_>>(), [3, 64, 255]);
        assert_eq!(bits.lowest(), Some(3));
        assert_eq!((bits ^ Bits::one(3)).lowest(), Some(64));
        assert_eq!(bits.weight(), 3);
        assert!(bits.parity());
        assert!(bits.has(255) && !bits.has(254));
        assert!((bits & !bits).is_zero());
        assert_eq!(bits.when(false), Bits::ZERO);
    }

    #[test]
    fn the_first_bits_end_where_asked() {
        for count in 0..=128 {
            let bits = Bits::<2>::first(count);
            assert_eq!(
                bits.ones().collect::<Vec<_>>(),
                (0..count).collect::<Vec<_>>()
            );
        }
    }
}
