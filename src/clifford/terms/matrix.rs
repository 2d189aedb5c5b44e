//! Bit matrices with one row a slot, and the four passes over their rows all
//! updates are made of.
//!
//! The matrix is kept in planes, one a word: plane w holds word w of every
//! row, one after the other. The passes go over [`LANES`] rows at a time, and
//! decide nothing by a bit, so that they become vector instructions of any
//! width. They reach over all rows below a bound; rows in between that mean
//! nothing to the caller may hold anything, their results are to be masked out.

use std::cmp::Ordering;

use super::bits::Bits;

/// Rows done together. Bounds and strides are multiples of it.
pub(crate) const LANES: usize = 8;

/// A matrix whose words are stored in `S`.
#[derive(Debug, Clone)]
pub(crate) struct Matrix<S, const W: usize> {
    words: S,
    /// Rows of a plane.
    stride: usize,
}

/// The stride for this many rows.
pub(crate) fn stride_of(rows: usize) -> usize {
    rows.next_multiple_of(LANES)
}

impl<const W: usize> Matrix<Vec<u64>, W> {
    /// All zero.
    pub(crate) fn zero(rows: usize) -> Self {
        let stride = stride_of(rows);
        Self::new(vec![0; W * stride], stride)
    }
}

impl<S, const W: usize> Matrix<S, W> {
    /// W·stride words, seen as a matrix.
    #[inline(always)]
    pub(crate) fn new(words: S, stride: usize) -> Self {
        Self { words, stride }
    }
}

/// All ones if bit i is set, otherwise 0.
#[inline(always)]
fn spread(word: u64, i: usize) -> u64 {
    (word >> i & 1).wrapping_neg()
}

/// Σ of the words whose number is a bit of `set`, each masked by number.
#[inline(always)]
fn masked_sum(blocks: &[[u64; LANES]], set: u64, mask: impl Fn(usize) -> u64) -> u64 {
    let mut sum = [0; LANES];
    for (block, words) in blocks.iter().enumerate() {
        let base = LANES * block;
        for (lane, (sum, word)) in sum.iter_mut().zip(words).enumerate() {
            *sum ^= word & spread(set >> base, lane) & mask(base + lane);
        }
    }
    sum.into_iter().fold(0, |all, lane| all ^ lane)
}

/// The bits of a set from row `base` on.
#[inline(always)]
fn bits_from<const W: usize>(set: Bits<W>, base: usize) -> u64 {
    set.0[base / 64] >> (base % 64)
}

impl<S: AsRef<[u64]>, const W: usize> Matrix<S, W> {
    /// The rows of one plane up to a bound.
    #[inline(always)]
    fn plane(&self, word: usize, bound: usize) -> &[[u64; LANES]] {
        let start = word * self.stride;
        self.words.as_ref()[start..start + bound].as_chunks().0
    }

    /// The least bound that includes all rows of a set.
    #[inline(always)]
    fn bound(set: Bits<W>) -> usize {
        stride_of(set.length())
    }

    /// Row p.
    #[inline(always)]
    pub(crate) fn row(&self, p: usize) -> Bits<W> {
        let words = self.words.as_ref();
        Bits(std::array::from_fn(|w| words[w * self.stride + p]))
    }

    /// Σ_{p∈a} R_p, and the parity of Σ_{p<q∈a} R_qp.
    #[inline(always)]
    pub(crate) fn combine(&self, a: Bits<W>) -> (Bits<W>, bool) {
        let mut sum = Bits::ZERO;
        // Bit p: the parity of R_qp over the q ∈ a above p.
        let mut above = Bits::ZERO;
        for (w, (sum, above)) in sum.0.iter_mut().zip(&mut above.0).enumerate() {
            let plane = self.plane(w, Self::bound(a));
            for (word, blocks) in plane.chunks(64 / LANES).enumerate() {
                let part = masked_sum(blocks, a.0[word], |_| !0);
                *sum ^= part;
                *above ^= match word.cmp(&w) {
                    Ordering::Less => 0,
                    Ordering::Equal => masked_sum(blocks, a.0[word], |q| (1 << q) - 1),
                    Ordering::Greater => part,
                };
            }
        }
        (sum, (above & a).parity())
    }

    /// The rows among `set` with a bit at this slot.
    #[inline(always)]
    pub(crate) fn column(&self, set: Bits<W>, slot: usize) -> Bits<W> {
        let plane = self.plane(slot / 64, Self::bound(set));
        let mut found = Bits::ZERO;
        for (word, blocks) in plane.chunks(64 / LANES).enumerate() {
            let mut lanes = [0; LANES];
            for (block, rows) in blocks.iter().enumerate() {
                for (lane, row) in lanes.iter_mut().zip(rows) {
                    *lane |= (row >> (slot % 64) & 1) << (LANES * block);
                }
            }
            found.0[word] = pack(lanes);
        }
        found & set
    }

    /// The rows among `set` that overlap `other` in an odd number of bits.
    #[inline(always)]
    pub(crate) fn odd_overlaps(&self, set: Bits<W>, other: Bits<W>) -> Bits<W> {
        let bound = Self::bound(set);
        let planes: [_; W] = std::array::from_fn(|w| self.plane(w, bound));
        let mut found = Bits::ZERO;
        for (word, start) in (0..bound / LANES).step_by(64 / LANES).enumerate() {
            let end = (start + 64 / LANES).min(bound / LANES);
            // Per lane one byte a block, and its parity at the end.
            let mut lanes = [0; LANES];
            for (byte, block) in (start..end).enumerate() {
                let mut bits = [0; LANES];
                for (plane, other) in planes.iter().zip(other.0) {
                    for (bits, row) in bits.iter_mut().zip(plane[block]) {
                        *bits ^= row & other;
                    }
                }
                for (lane, mut bits) in lanes.iter_mut().zip(bits) {
                    bits ^= bits >> 32;
                    bits ^= bits >> 16;
                    bits ^= bits >> 8;
                    *lane |= (bits & 0xff) << (8 * byte);
                }
            }
            for lane in &mut lanes {
                *lane ^= *lane >> 4;
                *lane ^= *lane >> 2;
                *lane ^= *lane >> 1;
                *lane &= 0x0101_0101_0101_0101;
            }
            found.0[word] = pack(lanes);
        }
        found & set
    }
}

/// One word from lanes that hold every [`LANES`]-th bit.
#[inline(always)]
fn pack(lanes: [u64; LANES]) -> u64 {
    (0..LANES).fold(0, |word, lane| word | lanes[lane] << lane)
}

impl<S: AsRef<[u64]> + AsMut<[u64]>, const W: usize> Matrix<S, W> {
    /// Sets row p.
    #[inline(always)]
    pub(crate) fn set_row(&mut self, p: usize, row: Bits<W>) {
        let words = self.words.as_mut();
        for w in 0..W {
            words[w * self.stride + p] = row.0[w];
        }
    }

    /// Rows p ∈ `first` get `on_first`, rows p ∈ `second` get `on_second`.
    #[inline(always)]
    pub(crate) fn add(
        &mut self,
        (first, on_first): (Bits<W>, Bits<W>),
        (second, on_second): (Bits<W>, Bits<W>),
    ) {
        let bound = Self::bound(first | second);
        for w in 0..W {
            let start = w * self.stride;
            let plane = &mut self.words.as_mut()[start..start + bound];
            for (block, rows) in plane.as_chunks_mut::<LANES>().0.iter_mut().enumerate() {
                let base = LANES * block;
                let (one, two) = (bits_from(first, base), bits_from(second, base));
                for (lane, row) in rows.iter_mut().enumerate() {
                    let first = on_first.0[w] & spread(one, lane);
                    *row ^= first ^ (on_second.0[w] & spread(two, lane));
                }
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use rand::{Rng, RngExt, SeedableRng};
    use rand_pcg::Pcg64Mcg;

    use super::*;

    /// All passes against the same sums bit by bit, with rubbish in the rows
    /// that do not take part.
    fn check<const W: usize>(rows: usize, rng: &mut Pcg64Mcg) {
        let draw = |rng: &mut Pcg64Mcg| Bits::<W>(std::array::from_fn(|_| rng.next_u64()));
        let mut matrix = Matrix::<_, W>::zero(rows);
        for p in 0..rows {
            matrix.set_row(p, draw(rng));
        }
        let set = draw(rng) & Bits::first(rows);
        let other = draw(rng);
        let slot = rng.random_range(0..64 * W);

        let mut sum = Bits::ZERO;
        let mut pairs = false;
        for q in set.ones() {
            for p in set.ones().filter(|&p| p < q) {
                pairs ^= matrix.row(q).has(p);
            }
            sum ^= matrix.row(q);
        }
        assert_eq!(matrix.combine(set), (sum, pairs));
        for p in 0..64 * W {
            let inside = set.has(p);
            let bit = inside && matrix.row(p).has(slot);
            assert_eq!(matrix.column(set, slot).has(p), bit);
            let odd = inside && (matrix.row(p) & other).weight() % 2 == 1;
            assert_eq!(matrix.odd_overlaps(set, other).has(p), odd);
        }

        let before = matrix.clone();
        let second = draw(rng) & Bits::first(rows);
        let (one, two) = (draw(rng), draw(rng));
        matrix.add((set, one), (second, two));
        for p in 0..rows {
            let expected = before.row(p) ^ one.when(set.has(p)) ^ two.when(second.has(p));
            assert_eq!(matrix.row(p), expected);
        }
    }

    #[test]
    fn passes_agree_with_single_bits() {
        let mut rng = Pcg64Mcg::seed_from_u64(3);
        for rows in 0..=64 {
            check::<1>(rows, &mut rng);
        }
        for rows in [5, 63, 64, 65, 72, 100, 128] {
            check::<2>(rows, &mut rng);
        }
        for rows in [64, 129, 191, 250, 256] {
            check::<4>(rows, &mut rng);
        }
    }
}
