//! Passes against single operations, and every level against the plain twin.

use num_complex::Complex64;
use rand::{Rng, RngExt, SeedableRng};
use rand_pcg::Pcg64Mcg;

use crate::clifford::kernels::Level;
use crate::clifford::terms::{
    Candidate, Chosen, Mask, Operation, Planes, QuadraticPhase, Release, Resolved, Sums, Terms,
    Turn,
};
use crate::magic::Stabiliser;

const TERMS: usize = 70;
const WORDS: usize = TERMS.div_ceil(64);
const PLANES: usize = 3;

fn mask<const W: usize, R: Rng>(used: &[usize], rng: &mut R) -> Mask<W> {
    let mut mask = [0; W];
    for &slot in used {
        mask[slot / 64] |= u64::from(rng.random::<bool>()) << (slot % 64);
    }
    mask
}

fn overlap<const W: usize>(a: &Mask<W>, b: &Mask<W>) -> u32 {
    a.iter().zip(b).map(|(a, b)| (a & b).count_ones()).sum()
}

fn chosen<T, const N: usize, R: Rng>(
    planes: u8,
    rng: &mut R,
    mut draw: impl FnMut(&mut R) -> T,
) -> Chosen<T, N> {
    if rng.random_bool(0.2) {
        return Chosen::Same(draw(rng));
    }
    Chosen::By {
        first: rng.random_range(0..=(PLANES as u32 - u32::from(planes))),
        planes,
        table: std::array::from_fn(|_| draw(rng)),
    }
}

fn random_operation<const W: usize, R: Rng>(
    used: &mut Vec<usize>,
    idle: &mut Vec<usize>,
    rng: &mut R,
) -> Operation<W> {
    let fresh = used.len() < 2 || (!idle.is_empty() && rng.random_bool(0.2));
    if fresh {
        let slot = idle.swap_remove(rng.random_range(0..idle.len()));
        used.push(slot);
        if rng.random() {
            return Operation::Plus { slot };
        }
        let states = [
            Stabiliser::Zero,
            Stabiliser::One,
            Stabiliser::PlusI,
            Stabiliser::Minus,
        ];
        let release = chosen(2, rng, |rng: &mut R| Release {
            state: states[rng.random_range(0..4)],
            factor: Complex64::from_polar(rng.random_range(0.5..2.0), rng.random_range(0.0..6.3)),
            unblock: false,
        });
        return Operation::Prepare { slot, release };
    }
    let slot = used[rng.random_range(0..used.len())];
    let other = *used
        .iter()
        .cycle()
        .skip(rng.random_range(0..used.len()))
        .find(|&&other| other != slot)
        .expect("two slots are used");
    match rng.random_range(0..9) {
        0 => Operation::ControlledNot {
            control: slot,
            target: other,
        },
        1 | 2 => Operation::Diagonal {
            slot,
            turn: chosen(1, rng, |rng: &mut R| Turn {
                power: rng.random_range(0..4),
                eighths: rng.random_range(0..8),
            }),
        },
        3 => Operation::Phase {
            eighths: chosen(1, rng, |rng: &mut R| rng.random_range(0..8)),
        },
        4 => Operation::Quadratic {
            slots: [slot, other, other],
            phase: chosen(3, rng, |rng: &mut R| QuadraticPhase {
                z: rng.random(),
                cz: [rng.random(), false, false],
                negative: rng.random(),
            }),
        },
        5 => {
            let (x, z) = (mask::<W, _>(used, rng), mask::<W, _>(used, rng));
            let phase = ((overlap(&x, &z) + 1) & 1) as u8 + 2 * rng.random_range(0..2);
            Operation::Primitive { phase, x, z }
        }
        6 => Operation::Flip { slot },
        7 if rng.random_bool(0.3) => Operation::Project {
            slot,
            value: rng.random(),
            when: chosen(1, rng, |rng: &mut R| rng.random()),
        },
        7 => Operation::Scale(rng.random_range(0.5..2.0)),
        _ => {
            used.retain(|&kept| kept != slot);
            idle.push(slot);
            Operation::Measured {
                slot,
                value: rng.random(),
            }
        }
    }
}

fn root(eighths: u8) -> Complex64 {
    Complex64::from_polar(1.0, std::f64::consts::FRAC_PI_4 * f64::from(eighths))
}

/// The same by single operations.
fn one_by_one<const W: usize>(terms: &mut Terms<W>, operation: &Operation<W>, planes: &Planes) {
    match operation {
        Operation::Plus { slot } => terms.plus(*slot),
        Operation::Prepare { slot, release } => {
            terms.prepare(*slot, |label| release.of(planes, label).state);
            terms.scale(|label| release.of(planes, label).factor);
        }
        Operation::ControlledNot { control, target } => terms.controlled_not(*control, *target),
        Operation::Diagonal { slot, turn } => {
            terms.diagonal(*slot, |label| turn.of(planes, label).power);
            terms.scale(|label| root(turn.of(planes, label).eighths));
        }
        Operation::Phase { eighths } => terms.scale(|label| root(eighths.of(planes, label))),
        Operation::Quadratic { slots, phase } => {
            terms.quadratic(*slots, |label| phase.of(planes, label));
        }
        Operation::Primitive { phase, x, z } => terms.primitive(*phase, x, z),
        Operation::Flip { slot } => terms.flip(*slot),
        Operation::Project { slot, value, when } => {
            // (1 ± Z)/2 = ((1 ± Z)/√2)/√2.
            let mut z = [0; W];
            z[slot / 64] = 1 << (slot % 64);
            let mut projected = terms.clone();
            projected.primitive(2 * u8::from(*value), &[0; W], &z);
            projected.scale(|_| std::f64::consts::FRAC_1_SQRT_2.into());
            terms.replace_some(&projected, |label| when.of(planes, label));
        }
        Operation::Measured { slot, value } => terms.measured(*slot, *value),
        Operation::Scale(factor) => terms.scale(|_| (*factor).into()),
    }
}

fn assert_close<const W: usize>(swept: &Terms<W>, single: &Terms<W>, used: &[usize], seed: u64) {
    let labels = |terms: &Terms<W>| (0..terms.len()).map(|i| terms.label(i)).collect::<Vec<_>>();
    assert_eq!(labels(swept), labels(single));
    let mut rng = Pcg64Mcg::seed_from_u64(seed);
    for _ in 0..20 {
        let x = mask(used, &mut rng);
        for index in 0..swept.len() {
            let (a, b) = (swept.amplitude(index, &x), single.amplitude(index, &x));
            assert!((a - b).norm() < 1e-9 * (1.0 + b.norm()), "{a} is not {b}");
        }
    }
}

fn sequence<const W: usize>(slots: usize, steps: usize, seed: u64) {
    let mut rng = Pcg64Mcg::seed_from_u64(seed);
    let weights: Vec<Complex64> = (0..TERMS)
        .map(|_| Complex64::from_polar(rng.random_range(0.5..1.0), rng.random_range(0.0..6.3)))
        .collect();
    let mut levels: Vec<Terms<W>> = Level::all()
        .into_iter()
        .map(|level| Terms::with_level(slots, level))
        .collect();
    levels.iter_mut().for_each(|terms| terms.reset(&weights));
    let mut single = levels[0].clone();
    let (mut used, mut idle) = (Vec::new(), (0..slots).collect::<Vec<_>>());
    let mut resolved: Option<Resolved<W>> = None;
    for step in 0..steps {
        let bits: Vec<u64> = (0..PLANES * WORDS).map(|_| rng.random()).collect();
        let planes = Planes {
            bits: &bits,
            words: WORDS,
        };
        let operations: Vec<Operation<W>> = (0..rng.random_range(0..6))
            .map(|_| random_operation(&mut used, &mut idle, &mut rng))
            .collect();
        let (x, z) = (mask::<W, _>(&used, &mut rng), mask::<W, _>(&used, &mut rng));
        let phase = ((overlap(&x, &z) + 1) & 1) as u8 + 2 * rng.random_range(0..2);
        let candidate = (x != [0; W]).then_some(Candidate { phase, x, z });

        let sums: Vec<Sums> = levels
            .iter_mut()
            .map(|terms| terms.sweep(resolved, &operations, planes, candidate))
            .collect();
        if let Some(Resolved { candidate, moved }) = resolved {
            single.primitive(candidate.phase, &candidate.x, &candidate.z);
            if moved {
                (0..slots)
                    .filter(|slot| candidate.x[slot / 64] >> (slot % 64) & 1 == 1)
                    .for_each(|slot| single.flip(slot));
            }
        }
        for operation in &operations {
            one_by_one(&mut single, operation, &planes);
        }
        assert_close(&levels[0], &single, &used, step as u64);
        let here = single.total_amplitude(&[0; W]);
        assert!((sums[0].here - here).norm() < 1e-9 * (1.0 + here.norm()));
        if candidate.is_some() {
            let there = single.total_amplitude(&x);
            assert!((sums[0].there - there).norm() < 1e-9 * (1.0 + there.norm()));
        }
        for (terms, found) in levels.iter().zip(&sums) {
            assert_eq!(found, &sums[0], "the sums of two levels differ");
            assert!(
                terms.same_bits(&levels[0]),
                "the terms of two levels differ"
            );
        }
        resolved = candidate.map(|candidate| Resolved {
            candidate,
            moved: rng.random(),
        });
    }
}

/// Amplitudes and sums of a pass are those of the single operations, which are
/// tested against dense vectors; the levels agree bit for bit.
#[test]
fn passes_are_their_operations_at_every_level() {
    for seed in 0..60 {
        sequence::<1>(3 + seed as usize % 5, 25, seed);
    }
    for seed in 0..20 {
        sequence::<1>(64, 40, 100 + seed);
        sequence::<2>(5, 25, 200 + seed);
        sequence::<2>(90, 40, 300 + seed);
        sequence::<4>(200, 40, 400 + seed);
    }
}

/// A factor 0 that waits keeps a term out of the sums until it is released.
#[test]
fn blocked_terms_do_not_count() {
    let mut terms = Terms::<1>::new(2);
    terms.reset_with(2, |label| (Complex64::ONE, label as u8, label as u16));
    let bits = [0b10];
    let planes = Planes {
        bits: &bits,
        words: 1,
    };
    assert_eq!(terms.sweep(None, &[], planes, None).here, Complex64::ONE);
    let release = |unblock| Release {
        state: Stabiliser::Zero,
        factor: Complex64::ONE,
        unblock,
    };
    let prepare = Operation::Prepare {
        slot: 0,
        release: Chosen::By {
            first: 0,
            planes: 1,
            table: [
                release(false),
                release(true),
                release(false),
                release(false),
            ],
        },
    };
    let sum = terms.sweep(None, &[prepare], planes, None).here;
    assert!((sum - (Complex64::ONE + root(1))).norm() < 1e-15);
}

impl<const W: usize> Terms<W> {
    /// Whether everything that counts is the same, bit for bit.
    fn same_bits(&self, other: &Self) -> bool {
        let heads = self.heads.iter().zip(&other.heads);
        self.heads.len() == other.heads.len()
            && heads.into_iter().all(|(a, b)| a == b)
            && (0..self.len()).all(|index| {
                let rows = |terms: &Self| {
                    let head = &terms.heads[index];
                    let row = |slot| terms.matrix(index).row(slot);
                    head.pivots.ones().map(row).collect::<Vec<_>>()
                };
                rows(self) == rows(other)
            })
    }

    /// Takes the terms for which `choose` says so from another list: those that it
    /// lacks go.
    fn replace_some(&mut self, other: &Self, choose: impl Fn(u32) -> bool) {
        let mut index = 0;
        while index < self.len() {
            let label = self.label(index);
            if !choose(label) {
                index += 1;
                continue;
            }
            let words = self.words();
            match (0..other.len()).find(|&i| other.label(i) == label) {
                Some(found) => {
                    self.heads[index] = other.heads[found];
                    self.rows[index * words..][..words]
                        .copy_from_slice(&other.rows[found * words..][..words]);
                    index += 1;
                }
                None => {
                    self.heads.remove(index);
                    self.rows.drain(index * words..(index + 1) * words);
                }
            }
        }
    }
}
