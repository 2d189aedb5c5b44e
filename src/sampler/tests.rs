//! The whole pipeline from instructions to outcomes against density matrices.
//!
//! Random adaptive noisy circuits on few qubits: every Clifford gate, Pauli
//! rotations by any angle, CCZ, Pauli channels, damping, readout error,
//! measurement, reset, assignments, each possibly under a condition. The
//! reference knows nothing of frames, sites or flips: it carries one
//! unnormalised density matrix for every value of the classical bits and acts
//! on it with plain matrices.

use std::collections::BTreeMap;
use std::sync::Arc;

use num_complex::Complex64;
use rand::{RngExt, SeedableRng};
use rand_pcg::Pcg64;
use smallvec::smallvec;

use crate::circuit::{BitExpression, Clifford, Pauli, PauliProduct, Qubits};
use crate::magic::mixing::log_extent;
use crate::magic::{ScheduleOptions, Sparsifier, schedule};
use crate::noise::{
    Instruction, Kind, NoisyCircuit, PauliChannel, PauliChoices, PauliWord, ReadoutFlip,
};
use crate::program::Program;
use crate::readout::Register;
use crate::readout::dense::Dense;
use crate::readout::probe::{Probe, Settings, acceptance_cap};

use super::{Block, Drawing, Family, Interrupt, SampleError, Sampler, Silent};

type Matrix = Vec<Vec<Complex64>>;

const ZERO: Complex64 = Complex64::new(0.0, 0.0);

#[allow(clippy::needless_range_loop)] // rows and columns are permuted
fn pauli_matrix(qubits: usize, letters: &[(u32, Pauli)]) -> Matrix {
    let size = 1 << qubits;
    let mut matrix = vec![vec![ZERO; size]; size];
    for column in 0..size {
        let (mut row, mut value) = (column, Complex64::ONE);
        for &(qubit, letter) in letters {
            let one = column >> qubit & 1 == 1;
            match letter {
                Pauli::I => {}
                Pauli::X => row ^= 1 << qubit,
                Pauli::Z => value *= if one { -1.0 } else { 1.0 },
                Pauli::Y => {
                    row ^= 1 << qubit;
                    value *= if one { -Complex64::I } else { Complex64::I };
                }
            }
        }
        matrix[row][column] = value;
    }
    matrix
}

fn combine(a: Complex64, left: &Matrix, b: Complex64, right: &Matrix) -> Matrix {
    left.iter()
        .zip(right)
        .map(|(l, r)| l.iter().zip(r).map(|(x, y)| a * x + b * y).collect())
        .collect()
}

fn product(left: &Matrix, right: &Matrix) -> Matrix {
    let size = left.len();
    let mut result = vec![vec![ZERO; size]; size];
    for (row, result) in left.iter().zip(&mut result) {
        for (value, inner) in row.iter().zip(right) {
            if *value != ZERO {
                result
                    .iter_mut()
                    .zip(inner)
                    .for_each(|(sum, entry)| *sum += value * entry);
            }
        }
    }
    result
}

fn dagger(matrix: &Matrix) -> Matrix {
    let size = matrix.len();
    (0..size)
        .map(|row| (0..size).map(|column| matrix[column][row].conj()).collect())
        .collect()
}

fn conjugate(matrix: &Matrix, state: &Matrix) -> Matrix {
    product(&product(matrix, state), &dagger(matrix))
}

fn diagonal(size: usize, entry: impl Fn(usize) -> Complex64) -> Matrix {
    let mut matrix = vec![vec![ZERO; size]; size];
    (0..size).for_each(|index| matrix[index][index] = entry(index));
    matrix
}

fn rotation(qubits: usize, axis: &[(u32, Pauli)], angle: f64) -> Matrix {
    let identity = pauli_matrix(qubits, &[]);
    let (cos, sin) = ((angle / 2.0).cos(), (angle / 2.0).sin());
    combine(
        cos.into(),
        &identity,
        -Complex64::I * sin,
        &pauli_matrix(qubits, axis),
    )
}

fn clifford(qubits: usize, gate: &Clifford) -> Matrix {
    let size = 1usize << qubits;
    let has = |index: usize, qubit: u32| index >> qubit & 1 == 1;
    let permutation = |map: &dyn Fn(usize) -> usize| {
        let mut matrix = vec![vec![ZERO; size]; size];
        (0..size).for_each(|column| matrix[map(column)][column] = Complex64::ONE);
        matrix
    };
    match *gate {
        Clifford::X(q) => pauli_matrix(qubits, &[(q, Pauli::X)]),
        Clifford::Y(q) => pauli_matrix(qubits, &[(q, Pauli::Y)]),
        Clifford::Z(q) => pauli_matrix(qubits, &[(q, Pauli::Z)]),
        Clifford::H(q) => {
            let half = Complex64::from(std::f64::consts::FRAC_1_SQRT_2);
            let (x, z) = (
                pauli_matrix(qubits, &[(q, Pauli::X)]),
                pauli_matrix(qubits, &[(q, Pauli::Z)]),
            );
            combine(half, &x, half, &z)
        }
        Clifford::S(q) => diagonal(size, |i| if has(i, q) { Complex64::I } else { 1.0.into() }),
        Clifford::Sdg(q) => diagonal(size, |i| if has(i, q) { -Complex64::I } else { 1.0.into() }),
        Clifford::Cx(c, t) => permutation(&|i| if has(i, c) { i ^ 1 << t } else { i }),
        Clifford::Cz(a, b) => diagonal(size, |i| {
            if has(i, a) && has(i, b) {
                (-1.0).into()
            } else {
                1.0.into()
            }
        }),
        Clifford::Swap(a, b) => permutation(&|i| {
            if has(i, a) != has(i, b) {
                i ^ 1 << a ^ 1 << b
            } else {
                i
            }
        }),
        Clifford::QuarterTurn(ref axis) => rotation(qubits, axis, std::f64::consts::FRAC_PI_2),
    }
}

fn add(into: &mut BTreeMap<u32, Matrix>, bits: u32, state: Matrix, weight: f64) {
    let size = state.len();
    let entry = into
        .entry(bits)
        .or_insert_with(|| vec![vec![ZERO; size]; size]);
    for (row, other) in entry.iter_mut().zip(state) {
        row.iter_mut()
            .zip(other)
            .for_each(|(sum, value)| *sum += value * weight);
    }
}

/// Exact distribution of the classical bits.
fn reference(circuit: &NoisyCircuit, qubits: usize) -> BTreeMap<u32, f64> {
    let size = 1usize << qubits;
    let start = diagonal(size, |index| if index == 0 { Complex64::ONE } else { ZERO });
    let mut states = BTreeMap::from([(0, start)]);
    for instruction in &circuit.instructions {
        let mut next = BTreeMap::new();
        for (bits, state) in states {
            if instruction
                .condition
                .is_some_and(|bit| bits >> bit & 1 == 0)
            {
                add(&mut next, bits, state, 1.0);
            } else {
                act(&instruction.kind, qubits, bits, state, &mut next);
            }
        }
        states = next;
    }
    states
        .into_iter()
        .map(|(bits, state)| (bits, (0..size).map(|index| state[index][index].re).sum()))
        .collect()
}

fn act(kind: &Kind, qubits: usize, bits: u32, state: Matrix, next: &mut BTreeMap<u32, Matrix>) {
    let size = 1usize << qubits;
    let projector = |qubit: u32, value: bool| {
        diagonal(size, |index| {
            if (index >> qubit & 1 == 1) == value {
                Complex64::ONE
            } else {
                ZERO
            }
        })
    };
    match kind {
        Kind::Clifford(gate) => add(next, bits, conjugate(&clifford(qubits, gate), &state), 1.0),
        Kind::Rotation { axis, angle } => {
            add(
                next,
                bits,
                conjugate(&rotation(qubits, axis, *angle), &state),
                1.0,
            );
        }
        Kind::Ccz(on) => {
            let mask = on.iter().fold(0, |mask, qubit| mask | 1 << qubit);
            let gate = diagonal(size, |i| {
                if i & mask == mask {
                    (-1.0).into()
                } else {
                    1.0.into()
                }
            });
            add(next, bits, conjugate(&gate, &state), 1.0);
        }
        Kind::Measure { qubit, bit, flip } => {
            for value in [false, true] {
                let after = conjugate(&projector(*qubit, value), &state);
                let Some(bit) = bit else {
                    add(next, bits, after, 1.0);
                    continue;
                };
                let chance = if value {
                    flip.one_to_zero
                } else {
                    flip.zero_to_one
                };
                for (recorded, weight) in [(value, 1.0 - chance), (!value, chance)] {
                    let bits = bits & !(1 << bit) | u32::from(recorded) << bit;
                    add(next, bits, after.clone(), weight);
                }
            }
        }
        Kind::Reset { qubit } => {
            let x = pauli_matrix(qubits, &[(*qubit, Pauli::X)]);
            add(
                next,
                bits,
                conjugate(&projector(*qubit, false), &state),
                1.0,
            );
            add(
                next,
                bits,
                conjugate(&product(&x, &projector(*qubit, true)), &state),
                1.0,
            );
        }
        Kind::Assign { bit, value } => {
            let value = value.evaluate(&|index| bits >> index & 1 == 1);
            add(
                next,
                bits & !(1 << bit) | u32::from(value) << bit,
                state,
                1.0,
            );
        }
        Kind::Pauli(channel) => {
            let PauliChoices::Listed(list) = &channel.choices else {
                unreachable!()
            };
            let total: f64 = list.iter().map(|entry| entry.1).sum();
            for (word, probability) in list {
                let letters: Vec<(u32, Pauli)> = channel
                    .qubits
                    .iter()
                    .enumerate()
                    .map(|(i, &q)| {
                        (
                            q,
                            Pauli::from_parts(word.x >> i & 1 == 1, word.z >> i & 1 == 1),
                        )
                    })
                    .collect();
                add(
                    next,
                    bits,
                    conjugate(&pauli_matrix(qubits, &letters), &state),
                    *probability,
                );
            }
            add(next, bits, state, 1.0 - total);
        }
        Kind::Damping { qubit, gamma } => {
            let keep = diagonal(size, |i| {
                Complex64::from(if i >> qubit & 1 == 1 {
                    (1.0 - gamma).sqrt()
                } else {
                    1.0
                })
            });
            let x = pauli_matrix(qubits, &[(*qubit, Pauli::X)]);
            let decay = product(&x, &projector(*qubit, true));
            add(next, bits, conjugate(&keep, &state), 1.0);
            add(next, bits, conjugate(&decay, &state), *gamma);
        }
    }
}

/// What a random circuit may hold.
#[derive(Clone, Copy)]
struct Menu {
    damping: bool,
    generic_angles: bool,
    /// Measurement, reset and damping under a condition.
    branches: bool,
    instructions: usize,
    magic: usize,
}

fn random_axis(rng: &mut Pcg64, qubits: u32) -> PauliProduct {
    let letter = |rng: &mut Pcg64| [Pauli::X, Pauli::Y, Pauli::Z][rng.random_range(0..3)];
    let first = rng.random_range(0..qubits);
    let mut axis: PauliProduct = smallvec![(first, letter(rng))];
    if qubits > 1 && rng.random_bool(0.4) {
        let second = (first + rng.random_range(1..qubits)) % qubits;
        axis.push((second, letter(rng)));
    }
    axis
}

fn random_clifford(rng: &mut Pcg64, qubits: u32) -> Clifford {
    let a = rng.random_range(0..qubits);
    let b = (a + rng.random_range(1..qubits)) % qubits;
    match rng.random_range(0..14) {
        0 => Clifford::X(a),
        1 => Clifford::Y(a),
        2 => Clifford::Z(a),
        3..=5 => Clifford::H(a),
        6 => Clifford::S(a),
        7 => Clifford::Sdg(a),
        8..=10 => Clifford::Cx(a, b),
        11 => Clifford::Cz(a, b),
        12 => Clifford::Swap(a, b),
        _ => Clifford::QuarterTurn(random_axis(rng, qubits)),
    }
}

fn random_channel(rng: &mut Pcg64, qubits: u32) -> PauliChannel {
    let a = rng.random_range(0..qubits);
    let mut on = Qubits::from_slice(&[a]);
    if rng.random_bool(0.5) {
        on.push((a + rng.random_range(1..qubits)) % qubits);
    }
    let words = 1u32 << (2 * on.len());
    let mut list = Vec::new();
    for code in 1..words {
        if rng.random_bool(0.5) {
            let mask = (1 << on.len()) - 1;
            let word = PauliWord {
                x: code & mask,
                z: code >> on.len(),
            };
            list.push((word, rng.random::<f64>() * 0.3 / f64::from(words)));
        }
    }
    PauliChannel {
        qubits: on,
        choices: PauliChoices::Listed(list),
    }
}

/// A random circuit that ends with a measurement of every qubit. Bits are the
/// qubits' own and two more.
fn random_circuit(rng: &mut Pcg64, qubits: u32, menu: Menu) -> NoisyCircuit {
    let bits = qubits + 2;
    let mut instructions = Vec::new();
    let mut magic = menu.magic;
    for operation in 0..menu.instructions as u32 {
        let qubit = rng.random_range(0..qubits);
        let kind = match rng.random_range(0..20) {
            0..=7 => Kind::Clifford(random_clifford(rng, qubits)),
            8..=10 if magic > 0 => {
                magic -= 1;
                let angle = match rng.random_range(0..4) {
                    0 if menu.generic_angles => rng.random::<f64>() * 6.0 - 3.0,
                    turns => std::f64::consts::FRAC_PI_4 * f64::from(2 * turns + 1),
                };
                Kind::Rotation {
                    axis: random_axis(rng, qubits),
                    angle,
                }
            }
            11 if magic > 1 && qubits >= 3 => {
                magic -= 2;
                Kind::Ccz([qubit, (qubit + 1) % qubits, (qubit + 2) % qubits])
            }
            12..=13 => {
                let small = |rng: &mut Pcg64| rng.random::<f64>() * 0.2;
                let flip = ReadoutFlip {
                    zero_to_one: small(rng),
                    one_to_zero: small(rng),
                };
                let bit = rng.random_bool(0.9).then(|| rng.random_range(0..bits));
                Kind::Measure { qubit, bit, flip }
            }
            14 => Kind::Reset { qubit },
            15 => {
                let bit = |rng: &mut Pcg64| BitExpression::Bit(rng.random_range(0..bits));
                let parts = vec![bit(rng), BitExpression::Not(Box::new(bit(rng)))];
                let value = match rng.random_range(0..3) {
                    0 => BitExpression::Xor(parts),
                    1 => BitExpression::And(parts),
                    _ => BitExpression::Or(parts),
                };
                Kind::Assign {
                    bit: rng.random_range(0..bits),
                    value: Arc::new(value),
                }
            }
            16 if menu.damping => Kind::Damping {
                qubit,
                gamma: rng.random::<f64>() * 0.6,
            },
            _ => Kind::Pauli(random_channel(rng, qubits)),
        };
        let structural = matches!(
            kind,
            Kind::Measure { .. } | Kind::Reset { .. } | Kind::Damping { .. }
        );
        let conditional = rng.random_bool(0.3) && (menu.branches || !structural);
        let condition = conditional.then(|| rng.random_range(0..bits));
        instructions.push(Instruction {
            kind,
            condition,
            operation,
        });
    }
    for qubit in 0..qubits {
        let kind = Kind::Measure {
            qubit,
            bit: Some(qubit),
            flip: ReadoutFlip::default(),
        };
        instructions.push(Instruction {
            kind,
            condition: None,
            operation: 0,
        });
    }
    NoisyCircuit {
        instructions,
        warnings: Vec::new(),
    }
}

/// Counts of recorded bits.
fn sample<R: Register + Send>(
    program: &Program,
    family: Family,
    drawing: Drawing,
    shots: u64,
    seed: u64,
    make: impl Fn() -> R + Sync,
) -> BTreeMap<u32, f64> {
    let sparsifier = Sparsifier::new(program.sites());
    let recorded = (0..program.bits() as u32).collect();
    let sampler = Sampler::new(program, &sparsifier, recorded, seed, 28, false, drawing);
    let mut counts = BTreeMap::new();
    let done = sampler.sample(
        family,
        0..shots,
        make,
        &Interrupt::new(),
        &mut Silent,
        |block: &Block| -> Result<(), SampleError> {
            for row in &block.rows.bits {
                *counts.entry(*row as u32).or_insert(0.0) += 1.0;
            }
            Ok(())
        },
    );
    assert_eq!(done, Ok(shots));
    counts
}

/// Pearson's χ² of counts against a law, bins of fewer than 10 expected counts
/// pooled, as standard deviations of the normal law by the Wilson–Hilferty
/// approximation (Proc. Natl. Acad. Sci. USA 17, 684 (1931), from memory).
fn deviation(counts: &BTreeMap<u32, f64>, law: &BTreeMap<u32, f64>) -> f64 {
    let shots: f64 = counts.values().sum();
    for (bits, count) in counts {
        let chance = law.get(bits).copied().unwrap_or(0.0);
        assert!(
            chance > 1e-12 || *count == 0.0,
            "outcome {bits:b} of probability 0 was drawn"
        );
    }
    let (mut statistic, mut bins) = (0.0, 0.0);
    let (mut rest_count, mut rest_expected) = (0.0, 0.0);
    for (bits, chance) in law {
        let (count, expected) = (counts.get(bits).copied().unwrap_or(0.0), chance * shots);
        if expected < 10.0 {
            rest_count += count;
            rest_expected += expected;
        } else {
            statistic += (count - expected).powi(2) / expected;
            bins += 1.0;
        }
    }
    if rest_expected > 10.0 {
        statistic += (rest_count - rest_expected).powi(2) / rest_expected;
        bins += 1.0;
    }
    let freedom: f64 = bins - 1.0;
    if freedom < 1.0 {
        return 0.0;
    }
    let spread = 2.0 / (9.0 * freedom);
    ((statistic / freedom).cbrt() - (1.0 - spread)) / spread.sqrt()
}

fn compile(circuit: &NoisyCircuit, qubits: usize, absorb: bool) -> Program {
    let schedule = schedule(circuit, qubits, &ScheduleOptions { absorb });
    Program::compile(schedule, qubits, qubits + 2).expect("a small circuit compiles")
}

/// Largest deviation that passes: one-sided false-alarm rate 3e-7 a test
/// (normal law).
const LIMIT: f64 = 5.0;

/// `dense` follows the ideal law. 40,000 shots of each circuit: a wrong sign or
/// a lost flip moves some outcome by several per cent, which is ten standard
/// deviations or more.
#[test]
fn dense_shots_follow_the_density_matrix() {
    let mut rng = Pcg64::seed_from_u64(1);
    for round in 0..150 {
        let qubits = 2 + round % 3;
        let menu = Menu {
            damping: round % 2 == 0,
            generic_angles: true,
            branches: round % 3 == 0,
            instructions: 14 + 4 * qubits,
            magic: 6,
        };
        let circuit = random_circuit(&mut rng, qubits as u32, menu);
        let program = compile(&circuit, qubits, round % 5 != 4);
        let law = reference(&circuit, qubits);
        let active = program.peak_active().min(16);
        let counts = sample(
            &program,
            Family::Shots,
            Drawing::Members,
            40_000,
            round as u64,
            || Dense::new(program.sites(), active),
        );
        let found = deviation(&counts, &law);
        assert!(
            found < LIMIT,
            "round {round}: {found} deviations\n{circuit:#?}"
        );
    }
}

/// Terms follow the mixing law P_out = [(k − 1)·P + ξ·P_comp]/(k − 1 + ξ), with
/// P_comp sampled by companion shots: the same circuit with single terms.
/// Circuits measure only at the end, where the law is exact but for the bias
/// of the estimates, which 32 random states keep below the resolution.
#[test]
fn probe_shots_follow_the_mixing_law() {
    let mut rng = Pcg64::seed_from_u64(2);
    let mut tested = 0;
    for round in 0..44 {
        let qubits = 2 + round % 3;
        let menu = Menu {
            damping: false,
            generic_angles: true,
            branches: false,
            instructions: 12 + 3 * qubits,
            magic: 5,
        };
        let mut circuit = random_circuit(&mut rng, qubits as u32, menu);
        let last = circuit.instructions.len() - qubits;
        let mut index = 0;
        circuit.instructions.retain(|instruction| {
            index += 1;
            let reads = matches!(instruction.kind, Kind::Measure { .. } | Kind::Reset { .. });
            index > last || (!reads && instruction.condition.is_none())
        });
        let program = compile(&circuit, qubits, round % 4 != 3);
        let extent = log_extent(program.sites());
        if extent < 0.1 {
            continue;
        }
        tested += 1;
        let terms = [2, 3, 5, 8][round % 4];
        let slots = program.slots();
        let seed = round as u64;
        let single = Settings {
            probes: 1,
            cap: 1.0,
        };
        let companion = sample(
            &program,
            Family::Companion,
            Drawing::Companion,
            400_000,
            seed,
            || Probe::<1>::new(program.sites(), slots, single),
        );
        let settings = Settings {
            probes: 64,
            cap: acceptance_cap(extent, terms, 64),
        };
        let shots = 15_000;
        let counts = sample(
            &program,
            Family::Shots,
            Drawing::Terms(terms as usize),
            shots,
            seed,
            || Probe::<1>::new(program.sites(), slots, settings),
        );
        let ideal = reference(&circuit, qubits);
        let (rest, extent) = ((terms - 1) as f64, extent.exp());
        let law: BTreeMap<u32, f64> = ideal
            .iter()
            .map(|(&bits, &chance)| {
                let mixed = companion.get(&bits).copied().unwrap_or(0.0) / 400_000.0;
                (bits, (rest * chance + extent * mixed) / (rest + extent))
            })
            .filter(|entry| entry.1 > 1e-9)
            .collect();
        let found = deviation(&counts, &law);
        assert!(
            found < LIMIT,
            "round {round}: {found} deviations\n{circuit:#?}"
        );
    }
    assert!(tested > 20, "{tested} circuits had magic");
}

/// E‖Ω‖² = 1 + (ξ − 1)/k at a size no dense reference reaches: 30 dephased T
/// gates on 36 qubits. 400 draws; 5.1 standard errors are a false-alarm rate
/// of 4e-7 (normal law). The first estimate of a shot is made before anything
/// is accepted, so its mean is the mean over all draws.
#[test]
fn mean_norm_is_exact_on_thirty_sites() {
    let mut rng = Pcg64::seed_from_u64(3);
    let qubits = 36;
    let mut instructions = Vec::new();
    let mut push = |kind| {
        instructions.push(Instruction {
            kind,
            condition: None,
            operation: 0,
        });
    };
    for site in 0..30u32 {
        for _ in 0..40 {
            push(Kind::Clifford(random_clifford(&mut rng, qubits)));
        }
        let qubit = site;
        push(Kind::Clifford(Clifford::H(qubit)));
        push(Kind::Rotation {
            axis: smallvec![(qubit, Pauli::Z)],
            angle: std::f64::consts::FRAC_PI_4,
        });
        let word = PauliWord { x: 0, z: 1 };
        let choices = PauliChoices::Listed(vec![(word, 0.01)]);
        push(Kind::Pauli(PauliChannel {
            qubits: Qubits::from_slice(&[qubit]),
            choices,
        }));
    }
    for qubit in 0..qubits {
        push(Kind::Measure {
            qubit,
            bit: Some(qubit),
            flip: ReadoutFlip::default(),
        });
    }
    let circuit = NoisyCircuit {
        instructions,
        warnings: Vec::new(),
    };
    let program = compile(&circuit, qubits as usize, true);
    let extent = log_extent(program.sites()).exp();
    assert!(
        program.peak_active() > 20 && extent > 20.0,
        "{} {extent}",
        program.peak_active()
    );
    let terms = 64;
    let sparsifier = Sparsifier::new(program.sites());
    // A cap that no estimate reaches: every draw is refused after its first one.
    let settings = Settings {
        probes: 8,
        cap: 1e300,
    };
    let mut register = Probe::<1>::new(program.sites(), program.slots(), settings);
    let mut machine = super::machine::Machine::new(&program, crate::program::MAX_SLOTS, false);
    let mut draw = crate::magic::Draw::new();
    let draws = 400;
    let (mut sum, mut squares) = (0.0, 0.0);
    for index in 0..draws {
        let mut rng = super::random::generator(5, Family::Shots, index);
        sparsifier.draw_members(&mut rng, &mut draw);
        sparsifier.draw_terms(terms, &mut rng, &mut draw);
        let accepted = machine.attempt(&mut register, &draw, &mut rng);
        assert_eq!(accepted, Ok(false));
        let norm = register
            .diagnostics()
            .norm
            .expect("a first estimate was made");
        sum += norm;
        squares += norm * norm;
    }
    let mean = sum / draws as f64;
    let error = ((squares / draws as f64 - mean * mean) / draws as f64).sqrt();
    let expected = 1.0 + (extent - 1.0) / terms as f64;
    assert!(
        (mean - expected).abs() < 5.1 * error,
        "{mean} ± {error}, expected {expected}"
    );
    assert!(
        error < 0.1 * expected,
        "the test could not see an error of half the mean"
    );
}
