//! Places where a fault may fire, and how it is drawn.
//!
//! Places of equal probability form a group; within a group the next place
//! that fires is found by a geometric skip, so that a shot costs what fires
//! and not what might.

use std::collections::HashMap;
use std::sync::Arc;

use rand::{Rng, RngExt};

use crate::circuit::Qubits;
use crate::magic::{Kind, Schedule};
use crate::noise::{PauliChannel, PauliChoices, PauliWord};

use super::flips::SetId;

/// A place in the circuit where a fault may happen.
#[derive(Debug, Clone, PartialEq)]
pub struct Location {
    /// What may happen there.
    pub kind: LocationKind,
    /// Index of the circuit operation it comes from.
    pub operation: u32,
    /// The qubits.
    pub qubits: Qubits,
    /// Chance that something happens. For a readout error the larger of its
    /// two chances; for damping the chance of decay from |1⟩.
    pub probability: f64,
}

/// Kinds of locations.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum LocationKind {
    /// A random Pauli.
    Pauli,
    /// A flipped record.
    Readout,
    /// A decay.
    Damping,
}

impl LocationKind {
    /// The word used in files.
    pub fn word(self) -> &'static str {
        match self {
            LocationKind::Pauli => "pauli",
            LocationKind::Readout => "readout-flip",
            LocationKind::Damping => "amplitude-damping",
        }
    }
}

/// Lists the locations of a schedule, and which instruction has which.
pub(super) fn locations(schedule: &Schedule) -> (Vec<Location>, HashMap<usize, u32>) {
    let mut locations = Vec::new();
    let mut location_of = HashMap::new();
    for (index, instruction) in schedule.instructions.iter().enumerate() {
        let (kind, qubits, probability) = match &instruction.kind {
            Kind::Pauli(channel) => (
                LocationKind::Pauli,
                channel.qubits.clone(),
                ChoiceTable::new(channel).probability(),
            ),
            Kind::Measure {
                qubit,
                bit: Some(_),
                flip,
            } if flip.zero_to_one > 0.0 || flip.one_to_zero > 0.0 => {
                let larger = flip.zero_to_one.max(flip.one_to_zero);
                (LocationKind::Readout, Qubits::from_slice(&[*qubit]), larger)
            }
            Kind::Damping { qubit, gamma } => {
                (LocationKind::Damping, Qubits::from_slice(&[*qubit]), *gamma)
            }
            _ => continue,
        };
        location_of.insert(index, locations.len() as u32);
        locations.push(Location {
            kind,
            operation: instruction.operation,
            qubits,
            probability,
        });
    }
    (locations, location_of)
}

/// The alternatives of a Pauli channel, ready to draw from.
#[derive(Debug, Clone, PartialEq)]
pub enum ChoiceTable {
    /// Words with cumulative probabilities.
    Listed {
        /// The words.
        words: Vec<PauliWord>,
        /// Sum of the probabilities up to and including each word.
        cumulative: Vec<f64>,
    },
    /// Any word but the identity on so many qubits.
    Uniform {
        /// Number of qubits.
        qubits: usize,
        /// Chance that something happens.
        probability: f64,
    },
}

impl ChoiceTable {
    /// The table of a channel.
    pub fn new(channel: &PauliChannel) -> Self {
        match &channel.choices {
            PauliChoices::Uniform(probability) => ChoiceTable::Uniform {
                qubits: channel.qubits.len(),
                probability: *probability,
            },
            PauliChoices::Listed(list) => {
                let words = list.iter().map(|&(word, _)| word).collect();
                let mut sum = 0.0;
                let cumulative = list
                    .iter()
                    .map(|&(_, probability)| {
                        sum += probability;
                        sum
                    })
                    .collect();
                ChoiceTable::Listed { words, cumulative }
            }
        }
    }

    /// Chance that something happens, at most 1.
    pub fn probability(&self) -> f64 {
        match self {
            ChoiceTable::Listed { cumulative, .. } => {
                cumulative.last().copied().unwrap_or(0.0).min(1.0)
            }
            ChoiceTable::Uniform { probability, .. } => *probability,
        }
    }

    /// What happens, given that something does.
    pub fn draw(&self, rng: &mut impl Rng) -> PauliWord {
        match self {
            ChoiceTable::Listed { words, cumulative } => {
                if words.len() == 1 {
                    return words[0];
                }
                let total = cumulative[cumulative.len() - 1];
                let target = rng.random::<f64>() * total;
                let index = cumulative.partition_point(|&sum| sum <= target);
                words[index.min(words.len() - 1)]
            }
            ChoiceTable::Uniform { qubits, .. } => {
                let mask = if *qubits >= 32 {
                    u32::MAX
                } else {
                    (1 << qubits) - 1
                };
                loop {
                    let word = PauliWord {
                        x: rng.random::<u32>() & mask,
                        z: rng.random::<u32>() & mask,
                    };
                    if word.x | word.z != 0 {
                        return word;
                    }
                }
            }
        }
    }
}

/// A place of a segment where a random Pauli may act.
#[derive(Debug, Clone)]
pub struct FaultPlace {
    /// Index into the program's locations.
    pub location: u32,
    /// The sets of X and Z of each qubit.
    pub sets: Vec<[SetId; 2]>,
    /// What may happen.
    pub table: Arc<ChoiceTable>,
}

/// Places that fire with one probability.
#[derive(Debug, Clone)]
pub struct FaultGroup {
    /// The probability, above 0.
    pub probability: f64,
    /// 1/ln(1 − probability): a geometric skip is ⌊ln(u)·this⌋. 0 where the
    /// probability is 1.
    skip: f64,
    /// Indices into the segment's places.
    pub places: Vec<u32>,
}

impl FaultGroup {
    /// Groups places by probability, in order of first appearance.
    pub(super) fn collect(places: &[FaultPlace], unconditional: &[u32]) -> Vec<FaultGroup> {
        let mut index_of: HashMap<u64, usize> = HashMap::new();
        let mut groups: Vec<FaultGroup> = Vec::new();
        for &place in unconditional {
            let probability = places[place as usize].table.probability();
            if probability <= 0.0 {
                continue;
            }
            let index = *index_of.entry(probability.to_bits()).or_insert_with(|| {
                let skip = if probability < 1.0 {
                    1.0 / (-probability).ln_1p()
                } else {
                    0.0
                };
                groups.push(FaultGroup {
                    probability,
                    skip,
                    places: Vec::new(),
                });
                groups.len() - 1
            });
            groups[index].places.push(place);
        }
        groups
    }

    /// Calls `fire` for every place that fires in this shot.
    #[inline]
    pub fn sample<R: Rng>(&self, rng: &mut R, mut fire: impl FnMut(&mut R, u32)) {
        let mut next = self.gap(rng);
        while let Some(&place) = self.places.get(next) {
            fire(rng, place);
            next = next.saturating_add(1).saturating_add(self.gap(rng));
        }
    }

    /// How many places are passed over before the next one fires.
    #[inline]
    fn gap(&self, rng: &mut impl Rng) -> usize {
        if self.skip == 0.0 {
            return 0;
        }
        // 1 − u lies in (0, 1]: its logarithm is finite.
        let uniform = 1.0 - rng.random::<f64>();
        // The cast saturates, which is what a gap past the end wants.
        (uniform.ln() * self.skip) as usize
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use rand::SeedableRng;

    fn place(probability: f64) -> FaultPlace {
        let channel = PauliChannel {
            qubits: Qubits::from_slice(&[0]),
            choices: PauliChoices::Listed(vec![(PauliWord { x: 1, z: 0 }, probability)]),
        };
        FaultPlace {
            location: 0,
            sets: Vec::new(),
            table: Arc::new(ChoiceTable::new(&channel)),
        }
    }

    /// Counts of independent trials are binomial; 5 standard deviations are a
    /// false-alarm rate of 6e-7 (normal law, scipy).
    #[test]
    fn skips_fire_every_place_with_its_probability() {
        for probability in [0.003, 0.3, 0.97, 1.0] {
            let places: Vec<_> = (0..50).map(|_| place(probability)).collect();
            let all: Vec<u32> = (0..50).collect();
            let groups = FaultGroup::collect(&places, &all);
            assert_eq!(groups.len(), 1);
            let mut rng = rand_pcg::Pcg64::seed_from_u64(7);
            let mut fired = [0u32; 50];
            let shots = 40_000;
            for _ in 0..shots {
                groups[0].sample(&mut rng, |_, place| fired[place as usize] += 1);
            }
            let mean = f64::from(shots) * probability;
            let deviation = (mean * (1.0 - probability)).sqrt();
            for count in fired {
                assert!(
                    (f64::from(count) - mean).abs() <= 5.5 * deviation,
                    "{count} of {mean}"
                );
            }
        }
    }
}
