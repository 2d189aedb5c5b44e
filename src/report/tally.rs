//! Counting: one pass over the rows of a family.

use std::collections::HashMap;

use super::Sample;
use crate::sampler::{Family, Rows};
use crate::store::{Header, RegisterHeader, ShotFile, StoreError};

/// Counts of one register.
#[derive(Debug, Clone, Default)]
pub(super) struct Tally {
    shots: u64,
    ones: Vec<u64>,
    nonzero: u64,
    weight: f64,
    weight_squared: f64,
    /// How often each word was seen; `None` for registers wider than a word and
    /// where there are too many.
    pub words: Option<HashMap<u64, u64>>,
}

/// Most different words counted, to bound the memory.
const MOST_WORDS: usize = 1 << 20;

/// Which words a tally counts.
#[derive(Debug, Clone, Copy)]
pub(super) enum Words<'a> {
    /// All, of registers of role `record`.
    All,
    /// Those listed, register by register.
    Listed(&'a [Vec<u64>]),
}

impl Tally {
    /// Counts all rows of `family`, register by register.
    pub fn of(file: &ShotFile, family: Family, words: Words) -> Result<Vec<Tally>, StoreError> {
        let header = file.header();
        let mut tallies = start(header, words);
        for block in file.blocks(family) {
            let block = block?;
            let mut first = 0;
            for (register, tally) in header.registers.iter().zip(&mut tallies) {
                tally.add(&block, first, register.width, matches!(words, Words::All));
                first += register.width;
            }
        }
        Ok(tallies)
    }

    fn add(&mut self, block: &Rows, first: usize, width: usize, new_words: bool) {
        self.shots += block.shots as u64;
        if width == 0 {
            return;
        }
        for row in block.bits.chunks_exact(block.words) {
            let mut weight = 0u32;
            for start in (0..width).step_by(64) {
                let mut word = word_at(row, first + start, width - start);
                weight += word.count_ones();
                while word != 0 {
                    self.ones[start + word.trailing_zeros() as usize] += 1;
                    word &= word - 1;
                }
            }
            self.nonzero += u64::from(weight > 0);
            self.weight += f64::from(weight);
            self.weight_squared += f64::from(weight).powi(2);
            if self.words.is_some() {
                self.count_word(word_at(row, first, width), new_words);
            }
        }
    }

    fn count_word(&mut self, word: u64, new_words: bool) {
        let Some(words) = &mut self.words else {
            return;
        };
        if let Some(count) = words.get_mut(&word) {
            *count += 1;
        } else if new_words && words.len() < MOST_WORDS {
            words.insert(word, 1);
        } else if new_words {
            self.words = None;
        }
    }

    /// Whether bit `bit` is 1.
    pub fn bit(&self, bit: usize) -> Sample {
        Sample::of_event(self.ones[bit], self.shots)
    }

    /// Whether any bit is 1.
    pub fn any(&self) -> Sample {
        Sample::of_event(self.nonzero, self.shots)
    }

    /// The number of bits that are 1.
    pub fn weight(&self) -> Sample {
        Sample::of_number(self.weight, self.weight_squared, self.shots)
    }

    /// Whether the register reads `word`.
    pub fn word(&self, word: u64) -> Sample {
        let hits = self.words.as_ref().and_then(|words| words.get(&word));
        Sample::of_event(hits.copied().unwrap_or(0), self.shots)
    }

    /// The words seen most often, at most `most` of them, ties in numerical
    /// order.
    pub fn most_frequent(&self, most: usize) -> Vec<u64> {
        let mut words: Vec<(u64, u64)> = match &self.words {
            Some(words) => words.iter().map(|(&word, &count)| (word, count)).collect(),
            None => Vec::new(),
        };
        words.sort_by_key(|&(word, count)| (std::cmp::Reverse(count), word));
        words.iter().take(most).map(|&(word, _)| word).collect()
    }
}

fn start(header: &Header, words: Words) -> Vec<Tally> {
    let tally = |(index, register): (usize, &RegisterHeader)| Tally {
        ones: vec![0; register.width],
        words: match words {
            Words::All => {
                (register.role == "record" && (1..=64).contains(&register.width)).then(HashMap::new)
            }
            Words::Listed(lists) => lists
                .get(index)
                .map(|list| list.iter().map(|&word| (word, 0)).collect()),
        },
        ..Tally::default()
    };
    header.registers.iter().enumerate().map(tally).collect()
}

/// Up to 64 bits of a row from bit `first` on; those past `width` are 0.
fn word_at(row: &[u64], first: usize, width: usize) -> u64 {
    let (index, shift) = (first / 64, first % 64);
    let low = row[index] >> shift;
    let high = match row.get(index + 1) {
        Some(next) if shift > 0 => next << (64 - shift),
        _ => 0,
    };
    match width {
        0..64 => (low | high) & ((1 << width) - 1),
        _ => low | high,
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    proptest! {
        #[test]
        fn counts_agree_with_a_count_bit_by_bit(
            rows in 1usize..20, first in 0usize..130, width in 1usize..150, seed: u64,
        ) {
            let mut block = Rows::zeros(rows, first + width + 3);
            let mut state = seed;
            for shot in 0..rows {
                for bit in 0..first + width + 3 {
                    state = state.wrapping_mul(6364136223846793005).wrapping_add(1);
                    if state >> 62 == 3 {
                        block.set(shot, bit);
                    }
                }
            }
            let mut tally = Tally {
                ones: vec![0; width],
                words: (width <= 64).then(HashMap::new),
                ..Tally::default()
            };
            tally.add(&block, first, width, true);
            let weight = |shot| (0..width).filter(|bit| block.get(shot, first + bit)).count();
            let weights: Vec<f64> = (0..rows).map(|shot| weight(shot) as f64).collect();
            let nonzero = weights.iter().filter(|&&weight| weight > 0.0).count() as u64;
            prop_assert_eq!(tally.any(), Sample::of_event(nonzero, rows as u64));
            prop_assert_eq!(tally.weight().sum, weights.iter().sum::<f64>());
            let squares: f64 = weights.iter().map(|weight| weight * weight).sum();
            prop_assert_eq!(tally.weight().sum_of_squares, squares);
            for bit in 0..width {
                let ones = (0..rows).filter(|&shot| block.get(shot, first + bit)).count();
                prop_assert_eq!(tally.bit(bit).sum, ones as f64);
            }
            if width <= 64 {
                let word = |shot: usize| {
                    (0..width).fold(0u64, |word, bit| {
                        word | u64::from(block.get(shot, first + bit)) << bit
                    })
                };
                let same = (0..rows).filter(|&shot| word(shot) == word(0)).count();
                prop_assert_eq!(tally.word(word(0)).sum, same as f64);
            }
        }
    }

    #[test]
    fn the_most_frequent_words_come_first() {
        let tally = Tally {
            words: Some(HashMap::from([(5, 2), (3, 7), (9, 2), (1, 1)])),
            ..Tally::default()
        };
        assert_eq!(tally.most_frequent(3), [3, 5, 9]);
    }
}
