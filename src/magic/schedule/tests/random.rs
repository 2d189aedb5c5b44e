//! Random small noisy circuits: the schedule has the same density matrix, for
//! every value of the classical bits.

use std::f64::consts::{FRAC_PI_4, TAU};
use std::sync::Arc;

use crate::circuit::{BitExpression, Clifford, Pauli, PauliProduct, Qubits};
use crate::magic::{Kind as Scheduled, ScheduleOptions, SiteKind, schedule};
use crate::noise::{
    Instruction, Kind, NoisyCircuit, PauliChannel, PauliChoices, PauliWord, ReadoutFlip,
};

use super::dense;

const TOLERANCE: f64 = 1e-12;
const BITS: u64 = 2;

/// SplitMix64, a small public-domain generator.
struct Random(u64);

impl Random {
    fn bits(&mut self) -> u64 {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut z = self.0;
        z = (z ^ z >> 30).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        z = (z ^ z >> 27).wrapping_mul(0x94d0_49bb_1331_11eb);
        z ^ z >> 31
    }

    fn below(&mut self, end: u64) -> u64 {
        self.bits() % end
    }

    fn unit(&mut self) -> f64 {
        (self.bits() >> 11) as f64 / (1u64 << 53) as f64
    }

    fn chance(&mut self, p: f64) -> bool {
        self.unit() < p
    }

    /// Distinct qubits, in any order.
    fn qubits(&mut self, of: usize, count: usize) -> Vec<u32> {
        let mut all: Vec<u32> = (0..of as u32).collect();
        for place in 0..count {
            let other = place + self.below((of - place) as u64) as usize;
            all.swap(place, other);
        }
        all.truncate(count);
        all
    }

    fn axis(&mut self, of: usize) -> PauliProduct {
        let count = 1 + self.below(of.min(2) as u64) as usize;
        let letters = [Pauli::X, Pauli::Y, Pauli::Z, Pauli::Z];
        let qubits = self.qubits(of, count);
        qubits
            .into_iter()
            .map(|qubit| (qubit, letters[self.below(4) as usize]))
            .collect()
    }

    fn angle(&mut self) -> f64 {
        match self.below(4) {
            0 => FRAC_PI_4 * self.below(16) as f64 - TAU,
            1 => FRAC_PI_4,
            _ => (self.unit() - 0.5) * 20.0,
        }
    }

    fn clifford(&mut self, of: usize) -> Clifford {
        let q = self.below(of as u64) as u32;
        match self.below(if of > 1 { 10 } else { 6 }) {
            0 => Clifford::X(q),
            1 => Clifford::Y(q),
            2 => Clifford::H(q),
            3 => Clifford::S(q),
            4 => Clifford::Sdg(q),
            5 => Clifford::QuarterTurn(self.axis(of)),
            choice => {
                let pair = self.qubits(of, 2);
                match choice {
                    6 | 7 => Clifford::Cx(pair[0], pair[1]),
                    8 => Clifford::Cz(pair[0], pair[1]),
                    _ => Clifford::Swap(pair[0], pair[1]),
                }
            }
        }
    }

    fn channel(&mut self, of: usize) -> PauliChannel {
        let count = 1 + self.below(of.min(2) as u64) as usize;
        let qubits = Qubits::from_vec(self.qubits(of, count));
        let all: Vec<PauliWord> = (1..1u32 << (2 * count))
            .map(|code| PauliWord {
                x: code & ((1 << count) - 1),
                z: code >> count,
            })
            .collect();
        let words: Vec<(PauliWord, f64)> = match self.below(3) {
            // Depolarizing.
            0 => {
                let each = self.unit() * 0.4 / all.len() as f64;
                all.iter().map(|&word| (word, each)).collect()
            }
            // One word, sometimes likely, sometimes certain.
            1 => {
                let word = all[self.below(all.len() as u64) as usize];
                let p = [0.05, 0.5, 0.9, 1.0][self.below(4) as usize];
                vec![(word, p)]
            }
            // Any words.
            _ => {
                let mut words: Vec<(PauliWord, f64)> = Vec::new();
                for &word in &all {
                    if self.chance(0.8) {
                        words.push((word, self.unit()));
                    }
                }
                let sum: f64 = words.iter().map(|(_, p)| p).sum::<f64>().max(1e-9);
                let total = if self.chance(0.2) { 1.0 } else { self.unit() };
                words
                    .iter()
                    .map(|&(word, p)| (word, p * total / sum))
                    .collect()
            }
        };
        let choices = PauliChoices::Listed(words);
        PauliChannel { qubits, choices }
    }

    fn kind(&mut self, of: usize) -> Kind {
        let qubit = self.below(of as u64) as u32;
        match self.below(20) {
            0..=5 => Kind::Clifford(self.clifford(of)),
            6..=10 => Kind::Rotation {
                axis: self.axis(of),
                angle: self.angle(),
            },
            11..=14 => Kind::Pauli(self.channel(of)),
            15 => Kind::Damping {
                qubit,
                gamma: if self.chance(0.1) { 1.0 } else { self.unit() },
            },
            16 if of == 3 => Kind::Ccz([0, 1, 2]),
            16 | 17 => Kind::Measure {
                qubit,
                bit: self.chance(0.9).then(|| self.below(BITS) as u32),
                flip: ReadoutFlip {
                    zero_to_one: self.unit() * 0.2,
                    one_to_zero: self.unit() * 0.2,
                },
            },
            18 => Kind::Reset { qubit },
            _ => Kind::Assign {
                bit: self.below(BITS) as u32,
                value: Arc::new(BitExpression::Not(Box::new(BitExpression::Bit(
                    self.below(BITS) as u32,
                )))),
            },
        }
    }

    fn circuit(&mut self, of: usize) -> NoisyCircuit {
        let length = 3 + self.below(22);
        let conditional = if self.chance(0.5) { 0.15 } else { 0.0 };
        let mut operation = 0;
        let instructions = (0..length).map(|_| {
            operation += u32::from(self.chance(0.6));
            Instruction {
                kind: self.kind(of),
                condition: self.chance(conditional).then(|| self.below(BITS) as u32),
                operation,
            }
        });
        NoisyCircuit {
            instructions: instructions.collect(),
            warnings: Vec::new(),
        }
    }
}

/// What the rewrites did over all circuits, so that a test that stopped
/// exercising one of them fails.
#[derive(Default, Debug)]
struct Tally {
    rotations: usize,
    dephased: usize,
    stabiliser_mixtures: usize,
    prepared: usize,
    noisy_prepared: usize,
    damping: usize,
    channels_gone: usize,
}

fn check(circuits: u64, absorb: bool) -> Tally {
    let mut tally = Tally::default();
    for seed in 0..circuits {
        let mut random = Random(seed);
        let qubits = 1 + random.below(3) as usize;
        let circuit = random.circuit(qubits);
        let schedule = schedule(&circuit, qubits, &ScheduleOptions { absorb });
        let before = dense::of_circuit(&circuit, qubits);
        let after = dense::of_schedule(&schedule, qubits);
        let distance = dense::distance(&before, &after);
        assert!(
            distance < TOLERANCE,
            "seed {seed}: {distance:e}\n{circuit:#?}\n{schedule:#?}"
        );
        for site in &schedule.sites {
            assert!(site.extent >= 1.0 && site.extent_without_noise >= 1.0);
            match &site.kind {
                SiteKind::Rotation(rotation) => {
                    assert!(site.extent <= site.extent_without_noise + 1e-12);
                    tally.rotations += 1;
                    tally.dephased += usize::from(rotation.dephasing > 0.0);
                    tally.stabiliser_mixtures += usize::from(site.extent == 1.0);
                }
                SiteKind::Prepared(_) => {
                    tally.prepared += 1;
                    let noisy = site.extent < site.extent_without_noise - 1e-6;
                    tally.noisy_prepared += usize::from(noisy);
                }
                SiteKind::Ccz(_) => {}
            }
        }
        let channels = circuit.instructions.iter();
        let channels = channels.filter(|it| matches!(it.kind, Kind::Pauli(_)));
        tally.channels_gone += channels.count();
        for instruction in &schedule.instructions {
            match instruction.kind {
                Scheduled::Damping { .. } => tally.damping += 1,
                Scheduled::Pauli(_) => {
                    tally.channels_gone = tally.channels_gone.saturating_sub(1);
                }
                _ => {}
            }
        }
    }
    tally
}

#[test]
fn schedules_have_the_density_matrix_of_their_circuits() {
    let tally = check(3000, true);
    assert!(tally.rotations > 3000, "{tally:?}");
    assert!(tally.dephased > 600, "{tally:?}");
    assert!(tally.stabiliser_mixtures > 100, "{tally:?}");
    assert!(tally.prepared > 600, "{tally:?}");
    assert!(tally.noisy_prepared > 300, "{tally:?}");
    assert!(tally.damping > 300, "{tally:?}");
    assert!(tally.channels_gone > 1000, "{tally:?}");
}

#[test]
fn schedules_without_absorption_have_it_too() {
    let tally = check(1000, false);
    assert_eq!(tally.dephased, 0, "{tally:?}");
    assert_eq!(tally.noisy_prepared, 0, "{tally:?}");
    assert!(tally.prepared > 150, "{tally:?}");
}
