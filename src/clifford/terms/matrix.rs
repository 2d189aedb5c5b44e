//! Bit matrices with one row a slot, and the four passes over their rows all
//! updates are made of.
//!
//! The matrix is kept in planes, one a word: plane w holds word w of every
//! row, one after the other. The passes go over [`LANES`] rows at a time, and
//! decide nothing by a bit, so that they become vector instructions of any
//! width. They reach over all rows below a bound; rows in between that mean
//! nothing to the caller may hold anything, their results are to be masked out.

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
        let mut pairs = Bits::ZERO;
        let bound = Self::bound(a);
        for w in 0..W {
            let mut lanes = [0; LANES];
            let mut below = [0; LANES];
            for (block, rows) in self.plane(w, bound).iter().enumerate() {
                let base = LANES * block;
                let bits = bits_from(a, base);
                // The bits below row `base`, in this plane.
                let earlier = Bits::<W>::first_of_word(base, w);
                let own = base / 64 == w;
                for lane in 0..LANES {
                    let row = rows[lane] & spread(bits, lane);
                    lanes[lane] ^= row;
                    let more = if own {
                        ((1 << lane) - 1) << (base % 64)
                    } else {
                        0
                    };
                    below[lane] ^= row & (earlier | more);
                }
            }
            sum.0[w] = lanes.into_iter().fold(0, |all, lane| all ^ lane);
            pairs.0[w] = below.into_iter().fold(0, |all, lane| all ^ lane);
        }
        (sum, (pairs & a).parity())
    }

    /// The rows among `set` with a bit at this slot.
    #[inline(always)]
    pub(crate) fn column(&self, set: Bits<W>, slot: usize) -> Bits<W> {
        let plane = self.plane(slot / 64, Self::bound(set));
        let mut found = Bits::ZERO;
        for (word, blocks) in plane.chunks(64 / LANES).enumerate() {
            let mut lanes = [0; LANES];
            for (block, rows) in blocks.iter().enumerate() {
                for lane in 0..LANES {
                    lanes[lane] |= (rows[lane] >> (slot % 64) & 1) << (LANES * block);
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
            for block in start..end {
                for lane in 0..LANES {
                    let mut bits = 0;
                    for w in 0..W {
                        bits ^= planes[w][block][lane] & other.0[w];
                    }
                    bits ^= bits >> 32;
                    bits ^= bits >> 16;
                    bits ^= bits >> 8;
                    lanes[lane] |= (bits & 0xff) << (8 * (block - start));
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
                for lane in 0..LANES {
                    rows[lane] ^=
                        (on_first.0[w] & spread(one, lane)) ^ (on_second.0[w] & spread(two, lane));
                }
            }
        }
    }
}
