//! Random small circuits: with conditions, faults, measurements and resets in
//! between, and rotations placed so that many of them would merge if nothing
//! forbade it.

use std::collections::BTreeMap;
use std::f64::consts::FRAC_PI_4;
use std::sync::Arc;

use rand::{RngExt, SeedableRng};
use rand_pcg::Pcg64;
use smallvec::smallvec;

use super::super::{SiteCounts, reduce};
use super::circuit;
use crate::circuit::{BitExpression, Clifford, Pauli, PauliProduct, Qubits};
use crate::clifford::frame::Frame;
use crate::clifford::pauli::PauliString;
use crate::magic::schedule::tests::dense;
use crate::magic::{Schedule, ScheduleOptions, schedule};
use crate::noise::{Kind, PauliChannel, PauliChoices, PauliWord, ReadoutFlip};

const BITS: u32 = 3;

struct Generator {
    rng: Pcg64,
    qubits: u32,
    kinds: Vec<(Kind, Option<u32>)>,
    /// Gates so far, to place axes that are carried along.
    frame: Frame,
    /// Axes used, in coordinates of the start.
    axes: Vec<PauliString>,
    /// Chances of noise and of a condition.
    noise: f64,
    conditions: f64,
}

impl Generator {
    fn qubit(&mut self) -> u32 {
        self.rng.random_range(0..self.qubits)
    }

    fn pair(&mut self) -> (u32, u32) {
        let a = self.qubit();
        (a, (a + self.rng.random_range(1..self.qubits)) % self.qubits)
    }

    fn product(&mut self) -> PauliProduct {
        let (a, b) = self.pair();
        let mut letter = || [Pauli::X, Pauli::Y, Pauli::Z, Pauli::Z][self.rng.random_range(0..4)];
        let (first, second) = (letter(), letter());
        if self.rng.random_bool(0.5) {
            smallvec![(a, first)]
        } else {
            smallvec![(a, first), (b, second)]
        }
    }

    /// An axis: new, or an earlier one carried here by the gates in between.
    fn axis(&mut self) -> PauliProduct {
        if !self.axes.is_empty() && self.rng.random_bool(0.7) {
            let wanted = self.axes[self.rng.random_range(0..self.axes.len())].clone();
            let every = (1u32..1 << (2 * self.qubits)).map(|code| -> PauliProduct {
                (0..self.qubits)
                    .map(|qubit| {
                        let bits = code >> (2 * qubit);
                        (qubit, Pauli::from_parts(bits & 1 == 1, bits >> 1 & 1 == 1))
                    })
                    .filter(|&(_, letter)| letter != Pauli::I)
                    .collect()
            });
            for axis in every {
                let pulled = self.frame.pull_back(&axis);
                if pulled.x == wanted.x && pulled.z == wanted.z {
                    return axis;
                }
            }
        }
        let axis = self.product();
        self.axes.push(self.frame.pull_back(&axis));
        axis
    }

    fn gate(&mut self) -> Clifford {
        let (a, b) = self.pair();
        match self.rng.random_range(0..12) {
            0 => Clifford::X(a),
            1 => Clifford::Y(a),
            2..=4 => Clifford::H(a),
            5 => Clifford::S(a),
            6 => Clifford::Sdg(a),
            7 | 8 => Clifford::Cx(a, b),
            9 => Clifford::Cz(a, b),
            10 => Clifford::Swap(a, b),
            _ => Clifford::QuarterTurn(self.product()),
        }
    }

    fn channel(&mut self) -> PauliChannel {
        let (a, b) = self.pair();
        let on = if self.rng.random_bool(0.7) {
            Qubits::from_slice(&[a])
        } else {
            Qubits::from_slice(&[a, b])
        };
        if self.rng.random_bool(0.05) {
            let choices = PauliChoices::Uniform(0.2);
            return PauliChannel {
                qubits: on,
                choices,
            };
        }
        let mut words = Vec::new();
        for code in 1u32..1 << (2 * on.len()) {
            let word = PauliWord {
                x: code & ((1 << on.len()) - 1),
                z: code >> on.len(),
            };
            if self.rng.random_bool(0.3) {
                words.push((word, self.rng.random::<f64>() * 0.06));
            }
        }
        PauliChannel {
            qubits: on,
            choices: PauliChoices::Listed(words),
        }
    }

    fn angle(&mut self) -> f64 {
        match self.rng.random_range(0..4) {
            0 => self.rng.random::<f64>() * 3.0 - 1.5,
            1 => -FRAC_PI_4,
            _ => FRAC_PI_4,
        }
    }

    fn kind(&mut self) -> Kind {
        let qubit = self.qubit();
        if self.rng.random_bool(self.noise) {
            return if self.rng.random_bool(0.2) {
                Kind::Damping { qubit, gamma: 0.3 }
            } else {
                Kind::Pauli(self.channel())
            };
        }
        match self.rng.random_range(0..24) {
            0..=8 => Kind::Rotation {
                axis: self.axis(),
                angle: self.angle(),
            },
            9 if self.qubits == 3 => Kind::Ccz([0, 1, 2]),
            10 => Kind::Measure {
                qubit,
                bit: self
                    .rng
                    .random_bool(0.9)
                    .then(|| self.rng.random_range(0..BITS)),
                flip: ReadoutFlip {
                    zero_to_one: 0.1,
                    one_to_zero: 0.05,
                },
            },
            11 => Kind::Reset { qubit },
            12 => {
                let bit = self.rng.random_range(0..BITS);
                let other = Box::new(BitExpression::Bit(self.rng.random_range(0..BITS)));
                let parts = vec![BitExpression::Not(other), BitExpression::Bit(bit)];
                Kind::Assign {
                    bit: self.rng.random_range(0..BITS),
                    value: Arc::new(BitExpression::Xor(parts)),
                }
            }
            _ => Kind::Clifford(self.gate()),
        }
    }

    fn circuit(mut self, length: usize) -> crate::noise::NoisyCircuit {
        for _ in 0..length {
            let kind = self.kind();
            let condition = self
                .rng
                .random_bool(self.conditions)
                .then(|| self.rng.random_range(0..BITS));
            if let (Kind::Clifford(gate), None) = (&kind, condition) {
                self.frame.apply(gate);
            }
            self.kinds.push((kind, condition));
        }
        for qubit in 0..self.qubits {
            let gate = self.gate();
            self.kinds.push((Kind::Clifford(gate), None));
            self.kinds.push((super::measure(qubit, BITS + qubit), None));
        }
        circuit(self.kinds)
    }
}

fn random_circuit(seed: u64, qubits: u32) -> crate::noise::NoisyCircuit {
    let mut rng = Pcg64::seed_from_u64(seed);
    let noise = [0.0, 0.05, 0.15][rng.random_range(0..3)];
    let conditions = [0.0, 0.0, 0.1, 0.25][rng.random_range(0..4)];
    let length = rng.random_range(5..28);
    Generator {
        rng,
        qubits,
        kinds: Vec::new(),
        frame: Frame::identity(qubits as usize),
        axes: Vec::new(),
        noise,
        conditions,
    }
    .circuit(length)
}

/// The largest difference of two laws.
fn distance(a: &BTreeMap<u64, f64>, b: &BTreeMap<u64, f64>) -> f64 {
    let keys = a.keys().chain(b.keys());
    keys.map(|bits| {
        let [a, b] = [a, b].map(|law| law.get(bits).copied().unwrap_or(0.0));
        (a - b).abs()
    })
    .fold(0.0, f64::max)
}

fn log_extent(schedule: &Schedule) -> f64 {
    schedule.sites.iter().map(|site| site.extent.ln()).sum()
}

/// 6,000 circuits, half of them recording every bit and half only two: the law
/// of the recorded bits is the same to rounding, and the extent never grows.
#[test]
fn reduced_schedules_have_the_same_law() {
    let mut total = SiteCounts::default();
    let (mut before, mut after, mut conditional) = (0, 0, 0);
    for seed in 0..6000u64 {
        let qubits = 2 + (seed % 2) as u32;
        let circuit = random_circuit(seed, qubits);
        let options = ScheduleOptions {
            absorb: seed % 3 != 0,
        };
        let schedule = schedule(&circuit, qubits as usize, &options);
        let recorded: Vec<bool> = (0..BITS + qubits)
            .map(|bit| seed / 2 % 2 == 0 || bit == 1 || bit == BITS)
            .collect();
        let mask = (0..recorded.len())
            .filter(|&bit| recorded[bit])
            .fold(0, |mask, bit| mask | 1 << bit);
        let reduced = reduce(schedule.clone(), qubits as usize, &recorded);
        let [expected, found] = [&schedule, &reduced.schedule]
            .map(|schedule| dense::of_schedule(schedule, qubits as usize).law(mask));
        let distance = distance(&expected, &found);
        assert!(
            distance < 1e-11,
            "seed {seed}: {distance:e}\n{schedule:#?}\n{reduced:#?}"
        );
        assert!(
            log_extent(&reduced.schedule) < log_extent(&schedule) + 1e-9,
            "seed {seed}: the extent grew\n{schedule:#?}\n{reduced:#?}"
        );
        let counts = reduced.counts;
        assert_eq!(
            counts.merged + counts.deterministic + counts.unobservable,
            schedule.sites.len() - reduced.schedule.sites.len(),
            "seed {seed}"
        );
        total.merged += counts.merged;
        total.deterministic += counts.deterministic;
        total.unobservable += counts.unobservable;
        before += schedule.sites.len();
        after += reduced.schedule.sites.len();
        conditional += usize::from(
            counts.merged > 0
                && circuit
                    .instructions
                    .iter()
                    .any(|instruction| instruction.condition.is_some()),
        );
    }
    // So that a test that no longer exercises a rewrite fails.
    assert!(total.merged > 2000, "{total:?}");
    assert!(total.deterministic > 300, "{total:?}");
    assert!(total.unobservable > 2000, "{total:?}");
    assert!(conditional > 300, "{conditional}");
    assert!(after > before / 5, "{after} of {before} sites are left");
}
