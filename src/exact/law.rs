//! A distribution of recorded bits.

use std::collections::BTreeMap;

use super::ExactError;
use super::evaluate::evaluate;
use super::operation::Operation;

/// Weights of the values of some recorded bits.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Law {
    /// Weight by value. Bit i of a value is bit i mod 64 of word i/64.
    weights: BTreeMap<Vec<u64>, f64>,
}

/// An outcome of less probability than this does not happen.
const IMPOSSIBLE: f64 = 1e-12;

impl Law {
    /// From weights by value; those below 1e-12 count as 0.
    pub fn new(weights: impl IntoIterator<Item = (Vec<u64>, f64)>) -> Self {
        Law {
            weights: weights
                .into_iter()
                .filter(|&(_, weight)| weight > IMPOSSIBLE)
                .collect(),
        }
    }

    /// The law of `recorded` bits, in this order, after some operations.
    pub(super) fn of(operations: &[Operation], recorded: &[u32]) -> Result<Self, ExactError> {
        let words = recorded.len().div_ceil(64);
        let mut places: Vec<(u32, usize)> = (0..).zip(recorded).map(|(i, &bit)| (bit, i)).collect();
        places.sort_unstable();
        let weights = evaluate(operations, recorded)?;
        Ok(Law::new(weights.into_iter().map(|(ones, weight)| {
            let mut value = vec![0u64; words];
            for bit in ones {
                let start = places.partition_point(|&(other, _)| other < bit);
                for &(_, place) in places[start..].iter().take_while(|place| place.0 == bit) {
                    value[place / 64] |= 1 << (place % 64);
                }
            }
            (value, weight)
        })))
    }

    /// Weight of a value.
    pub fn weight(&self, value: &[u64]) -> f64 {
        self.weights.get(value).copied().unwrap_or(0.0)
    }

    /// Values with their weights, in numerical order of the first word, then
    /// the second, and so on.
    pub fn iter(&self) -> impl Iterator<Item = (&[u64], f64)> {
        self.weights
            .iter()
            .map(|(value, &weight)| (value.as_slice(), weight))
    }

    /// Number of values that can happen.
    pub fn len(&self) -> usize {
        self.weights.len()
    }

    /// Whether nothing can happen.
    pub fn is_empty(&self) -> bool {
        self.weights.is_empty()
    }

    /// Sum of the weights.
    pub fn total(&self) -> f64 {
        self.weights.values().sum()
    }

    /// The same with weights that sum to 1.
    pub fn normalised(&self) -> Self {
        let total = self.total();
        Law::new(
            self.weights
                .iter()
                .map(|(value, weight)| (value.clone(), weight / total)),
        )
    }

    /// (1 − λ)·self + λ·other.
    pub fn mixed(&self, other: &Law, weight: f64) -> Self {
        let mut mixed: BTreeMap<Vec<u64>, f64> = BTreeMap::new();
        for (law, share) in [(self, 1.0 - weight), (other, weight)] {
            for (value, &weight) in &law.weights {
                *mixed.entry(value.clone()).or_insert(0.0) += share * weight;
            }
        }
        Law::new(mixed)
    }

    /// Total variation distance, half the sum of the absolute differences.
    pub fn distance(&self, other: &Law) -> f64 {
        let here = self.weights.iter();
        let missing = other.weights.iter();
        let differences: f64 = here
            .map(|(value, weight)| (weight - other.weight(value)).abs())
            .sum();
        let others: f64 = missing
            .filter(|(value, _)| !self.weights.contains_key(*value))
            .map(|(_, weight)| weight)
            .sum();
        0.5 * (differences + others)
    }
}
