//! A plain density-matrix evaluator for noisy circuits and for schedules: one
//! unnormalised matrix for every value of the classical bits.

use std::collections::BTreeMap;

use num_complex::Complex64;

use crate::circuit::{BitExpression, Clifford, Pauli, PauliProduct};
use crate::magic::{self, Schedule, SiteKind};
use crate::noise::{self, NoisyCircuit, PauliChannel, PauliChoices, PauliWord, ReadoutFlip};

fn c(re: f64, im: f64) -> Complex64 {
    Complex64::new(re, im)
}

/// A square matrix, row by row.
#[derive(Clone, PartialEq)]
pub(crate) struct Matrix {
    size: usize,
    entries: Vec<Complex64>,
}

impl Matrix {
    fn zero(size: usize) -> Matrix {
        Matrix {
            size,
            entries: vec![c(0.0, 0.0); size * size],
        }
    }

    fn identity(size: usize) -> Matrix {
        let mut matrix = Matrix::zero(size);
        for i in 0..size {
            matrix.entries[i * size + i] = c(1.0, 0.0);
        }
        matrix
    }

    fn times(&self, other: &Matrix) -> Matrix {
        let n = self.size;
        let mut product = Matrix::zero(n);
        for i in 0..n {
            for k in 0..n {
                let a = self.entries[i * n + k];
                for j in 0..n {
                    product.entries[i * n + j] += a * other.entries[k * n + j];
                }
            }
        }
        product
    }

    fn adjoint(&self) -> Matrix {
        let n = self.size;
        let mut adjoint = Matrix::zero(n);
        for i in 0..n {
            for j in 0..n {
                adjoint.entries[j * n + i] = self.entries[i * n + j].conj();
            }
        }
        adjoint
    }

    fn add(&mut self, factor: Complex64, other: &Matrix) {
        for (a, b) in self.entries.iter_mut().zip(&other.entries) {
            *a += factor * b;
        }
    }

    fn sandwich(&self, operator: &Matrix) -> Matrix {
        operator.times(self).times(&operator.adjoint())
    }

    /// The largest difference of two entries.
    pub(super) fn distance(&self, other: &Matrix) -> f64 {
        let pairs = self.entries.iter().zip(&other.entries);
        pairs.map(|(a, b)| (a - b).norm()).fold(0.0, f64::max)
    }

    /// The largest entry.
    pub(super) fn norm(&self) -> f64 {
        self.entries.iter().map(|a| a.norm()).fold(0.0, f64::max)
    }
}

/// A 2 × 2 matrix on one qubit; qubit 0 is the least significant bit.
fn on_qubit(qubits: usize, qubit: u32, gate: [[Complex64; 2]; 2]) -> Matrix {
    let size = 1 << qubits;
    let mut matrix = Matrix::zero(size);
    for column in 0..size {
        let bit = column >> qubit & 1;
        for (value, row) in gate.iter().enumerate() {
            let target = column & !(1 << qubit) | value << qubit;
            matrix.entries[target * size + column] = row[bit];
        }
    }
    matrix
}

fn letter(qubits: usize, qubit: u32, pauli: Pauli) -> Matrix {
    let (o, i) = (c(0.0, 0.0), c(0.0, 1.0));
    let one = c(1.0, 0.0);
    let gate = match pauli {
        Pauli::I => [[one, o], [o, one]],
        Pauli::X => [[o, one], [one, o]],
        Pauli::Y => [[o, -i], [i, o]],
        Pauli::Z => [[one, o], [o, -one]],
    };
    on_qubit(qubits, qubit, gate)
}

fn pauli(qubits: usize, axis: &PauliProduct) -> Matrix {
    let start = Matrix::identity(1 << qubits);
    axis.iter().fold(start, |matrix, &(qubit, p)| {
        matrix.times(&letter(qubits, qubit, p))
    })
}

/// a·1 + b·P
fn combination(qubits: usize, a: Complex64, b: Complex64, axis: &PauliProduct) -> Matrix {
    let mut matrix = Matrix::zero(1 << qubits);
    matrix.add(a, &Matrix::identity(1 << qubits));
    matrix.add(b, &pauli(qubits, axis));
    matrix
}

fn rotation(qubits: usize, axis: &PauliProduct, angle: f64) -> Matrix {
    let (sin, cos) = (angle / 2.0).sin_cos();
    combination(qubits, c(cos, 0.0), c(0.0, -sin), axis)
}

/// −1 where all these qubits are 1, or a permutation of basis states.
fn basis_map(qubits: usize, map: impl Fn(usize) -> (usize, f64)) -> Matrix {
    let size = 1 << qubits;
    let mut matrix = Matrix::zero(size);
    for column in 0..size {
        let (row, sign) = map(column);
        matrix.entries[row * size + column] = c(sign, 0.0);
    }
    matrix
}

fn all_ones(qubits: usize, ones: &[u32]) -> Matrix {
    basis_map(qubits, |x| {
        let all = ones.iter().all(|&q| x >> q & 1 == 1);
        (x, if all { -1.0 } else { 1.0 })
    })
}

fn clifford(qubits: usize, gate: &Clifford) -> Matrix {
    let h = std::f64::consts::FRAC_1_SQRT_2;
    let phase = |q: u32, im: f64| {
        on_qubit(
            qubits,
            q,
            [[c(1.0, 0.0), c(0.0, 0.0)], [c(0.0, 0.0), c(0.0, im)]],
        )
    };
    match gate {
        Clifford::X(q) => letter(qubits, *q, Pauli::X),
        Clifford::Y(q) => letter(qubits, *q, Pauli::Y),
        Clifford::Z(q) => letter(qubits, *q, Pauli::Z),
        Clifford::H(q) => on_qubit(
            qubits,
            *q,
            [[c(h, 0.0), c(h, 0.0)], [c(h, 0.0), c(-h, 0.0)]],
        ),
        Clifford::S(q) => phase(*q, 1.0),
        Clifford::Sdg(q) => phase(*q, -1.0),
        Clifford::Cx(a, b) => basis_map(qubits, |x| (x ^ (x >> a & 1) << b, 1.0)),
        Clifford::Cz(a, b) => all_ones(qubits, &[*a, *b]),
        Clifford::Swap(a, b) => basis_map(qubits, |x| {
            let differ = (x >> a ^ x >> b) & 1;
            (x ^ differ << a ^ differ << b, 1.0)
        }),
        Clifford::QuarterTurn(axis) => rotation(qubits, axis, std::f64::consts::FRAC_PI_2),
    }
}

/// The state: for every value of the bits, the matrix of that case.
pub(crate) struct State {
    qubits: usize,
    pub(super) cases: BTreeMap<u64, Matrix>,
}

impl State {
    fn new(qubits: usize) -> State {
        let mut start = Matrix::zero(1 << qubits);
        start.entries[0] = c(1.0, 0.0);
        State {
            qubits,
            cases: BTreeMap::from([(0, start)]),
        }
    }

    fn each(&mut self, condition: Option<u32>, map: impl Fn(&Matrix) -> Matrix) {
        for (bits, matrix) in &mut self.cases {
            if condition.is_none_or(|bit| bits >> bit & 1 == 1) {
                *matrix = map(matrix);
            }
        }
    }

    fn unitary(&mut self, condition: Option<u32>, gate: &Matrix) {
        self.each(condition, |matrix| matrix.sandwich(gate));
    }

    /// Σ probability·K·ρ·K†
    fn kraus(&mut self, condition: Option<u32>, operators: &[(f64, Matrix)]) {
        self.each(condition, |matrix| {
            let mut sum = Matrix::zero(matrix.size);
            for (probability, operator) in operators {
                sum.add(c(*probability, 0.0), &matrix.sandwich(operator));
            }
            sum
        });
    }

    fn single(&self, qubit: u32, entries: [[f64; 2]; 2]) -> Matrix {
        on_qubit(
            self.qubits,
            qubit,
            entries.map(|row| row.map(|entry| c(entry, 0.0))),
        )
    }

    fn reset(&mut self, condition: Option<u32>, qubit: u32) {
        let keep = self.single(qubit, [[1.0, 0.0], [0.0, 0.0]]);
        let drop = self.single(qubit, [[0.0, 1.0], [0.0, 0.0]]);
        self.kraus(condition, &[(1.0, keep), (1.0, drop)]);
    }

    fn damping(&mut self, condition: Option<u32>, qubit: u32, gamma: f64) {
        let keep = self.single(qubit, [[1.0, 0.0], [0.0, (1.0 - gamma).sqrt()]]);
        let decay = self.single(qubit, [[0.0, gamma.sqrt()], [0.0, 0.0]]);
        self.kraus(condition, &[(1.0, keep), (1.0, decay)]);
    }

    fn channel(&mut self, condition: Option<u32>, channel: &PauliChannel) {
        let words = match &channel.choices {
            PauliChoices::Listed(words) => words.clone(),
            PauliChoices::Uniform(p) => {
                let count = channel.qubits.len();
                let each = p / f64::from((1u32 << (2 * count)) - 1);
                let word = |code: u32| PauliWord {
                    x: code & ((1 << count) - 1),
                    z: code >> count,
                };
                (1u32..1 << (2 * count))
                    .map(|code| (word(code), each))
                    .collect()
            }
        };
        let total: f64 = words.iter().map(|(_, p)| p).sum();
        let mut operators = vec![(1.0 - total, Matrix::identity(1 << self.qubits))];
        for (word, p) in &words {
            let axis = channel.qubits.iter().enumerate().map(|(place, &qubit)| {
                let (x, z) = (word.x >> place & 1 == 1, word.z >> place & 1 == 1);
                (qubit, Pauli::from_parts(x, z))
            });
            operators.push((*p, pauli(self.qubits, &axis.collect())));
        }
        self.kraus(condition, &operators);
    }

    fn measure(&mut self, condition: Option<u32>, qubit: u32, bit: Option<u32>, flip: ReadoutFlip) {
        let projectors = [
            self.single(qubit, [[1.0, 0.0], [0.0, 0.0]]),
            self.single(qubit, [[0.0, 0.0], [0.0, 1.0]]),
        ];
        let mut cases: BTreeMap<u64, Matrix> = BTreeMap::new();
        let mut put = |bits: u64, p: f64, matrix: &Matrix| {
            let zero = || Matrix::zero(matrix.size);
            cases
                .entry(bits)
                .or_insert_with(zero)
                .add(c(p, 0.0), matrix);
        };
        for (bits, matrix) in &self.cases {
            if condition.is_some_and(|bit| bits >> bit & 1 == 0) {
                put(*bits, 1.0, matrix);
                continue;
            }
            for (value, projector) in projectors.iter().enumerate() {
                let projected = matrix.sandwich(projector);
                let Some(bit) = bit else {
                    put(*bits, 1.0, &projected);
                    continue;
                };
                let one = match value {
                    0 => flip.zero_to_one,
                    _ => 1.0 - flip.one_to_zero,
                };
                put(bits & !(1 << bit), 1.0 - one, &projected);
                put(bits | 1 << bit, one, &projected);
            }
        }
        self.cases = cases;
    }

    fn assign(&mut self, condition: Option<u32>, bit: u32, value: &BitExpression) {
        let mut cases: BTreeMap<u64, Matrix> = BTreeMap::new();
        for (bits, matrix) in &self.cases {
            let value = value.evaluate(&|bit| bits >> bit & 1 == 1);
            let skipped = condition.is_some_and(|bit| bits >> bit & 1 == 0);
            let new = match (skipped, value) {
                (true, _) => *bits,
                (false, true) => bits | 1 << bit,
                (false, false) => bits & !(1 << bit),
            };
            let zero = || Matrix::zero(matrix.size);
            cases
                .entry(new)
                .or_insert_with(zero)
                .add(c(1.0, 0.0), matrix);
        }
        self.cases = cases;
    }

    /// Σ over the components of weight·(|component⟩⟨0| on the qubit).
    fn prepare(&mut self, qubit: u32, site: &magic::PreparedSite) {
        let one = self.single(qubit, [[0.0, 0.0], [0.0, 1.0]]);
        for matrix in self.cases.values() {
            let excited = matrix.sandwich(&one).norm();
            assert!(excited < 1e-12, "a prepared qubit has to be fresh");
        }
        let operators: Vec<(f64, Matrix)> = site
            .members
            .iter()
            .map(|member| {
                let mut state = [c(0.0, 0.0); 2];
                for (component, weight) in &member.components {
                    let amplitudes = component.amplitudes();
                    state[0] += weight * amplitudes[0];
                    state[1] += weight * amplitudes[1];
                }
                let gate = [[state[0], c(0.0, 0.0)], [state[1], c(0.0, 0.0)]];
                (member.probability, on_qubit(self.qubits, qubit, gate))
            })
            .collect();
        self.kraus(None, &operators);
    }
}

/// The state after a noisy circuit.
pub(crate) fn of_circuit(circuit: &NoisyCircuit, qubits: usize) -> State {
    let mut state = State::new(qubits);
    for instruction in &circuit.instructions {
        let when = instruction.condition;
        match &instruction.kind {
            noise::Kind::Clifford(gate) => state.unitary(when, &clifford(qubits, gate)),
            noise::Kind::Rotation { axis, angle } => {
                state.unitary(when, &rotation(qubits, axis, *angle));
            }
            noise::Kind::Ccz(ones) => state.unitary(when, &all_ones(qubits, ones)),
            noise::Kind::Measure { qubit, bit, flip } => state.measure(when, *qubit, *bit, *flip),
            noise::Kind::Reset { qubit } => state.reset(when, *qubit),
            noise::Kind::Assign { bit, value } => state.assign(when, *bit, value),
            noise::Kind::Pauli(channel) => state.channel(when, channel),
            noise::Kind::Damping { qubit, gamma } => state.damping(when, *qubit, *gamma),
        }
    }
    state
}

/// The state after a schedule, every site averaged over its members, every
/// member put together from its components.
pub(crate) fn of_schedule(schedule: &Schedule, qubits: usize) -> State {
    let mut state = State::new(qubits);
    for instruction in &schedule.instructions {
        let when = instruction.condition;
        match &instruction.kind {
            magic::Kind::Clifford(gate) => state.unitary(when, &clifford(qubits, gate)),
            magic::Kind::Gate { site, axes } => match &schedule.sites[*site as usize].kind {
                SiteKind::Rotation(site) => {
                    let operators: Vec<(f64, Matrix)> = site
                        .members
                        .iter()
                        .map(|member| (member.probability, member_gate(qubits, member, &axes[0])))
                        .collect();
                    state.kraus(when, &operators);
                }
                SiteKind::Ccz(_) => {
                    let ones: Vec<u32> = axes.iter().map(|axis| axis[0].0).collect();
                    state.unitary(when, &all_ones(qubits, &ones));
                }
                SiteKind::Prepared(_) => panic!("a prepared site is no gate"),
            },
            magic::Kind::Prepare { site, qubit } => {
                let SiteKind::Prepared(site) = &schedule.sites[*site as usize].kind else {
                    panic!("only a prepared site is prepared");
                };
                assert_eq!(when, None);
                state.prepare(*qubit, site);
            }
            magic::Kind::Measure { qubit, bit, flip } => state.measure(when, *qubit, *bit, *flip),
            magic::Kind::Reset { qubit } => state.reset(when, *qubit),
            magic::Kind::Assign { bit, value } => state.assign(when, *bit, value),
            magic::Kind::Pauli(channel) => state.channel(when, channel),
            magic::Kind::Damping { qubit, gamma } => state.damping(when, *qubit, *gamma),
        }
    }
    state
}

/// Σ_b weight_b·diag(1, i^b) in the frame of the axis:
/// diag(1, w) is (1 + A)/2 + w·(1 − A)/2.
fn member_gate(qubits: usize, member: &magic::RotationMember, axis: &PauliProduct) -> Matrix {
    let (mut on_plus, mut on_minus) = (c(0.0, 0.0), c(0.0, 0.0));
    let mut power = c(1.0, 0.0);
    for weight in member.weights {
        on_plus += weight;
        on_minus += weight * power;
        power *= c(0.0, 1.0);
    }
    combination(
        qubits,
        (on_plus + on_minus) / 2.0,
        (on_plus - on_minus) / 2.0,
        axis,
    )
}

impl Matrix {
    fn trace(&self) -> f64 {
        (0..self.size)
            .map(|i| self.entries[i * (self.size + 1)].re)
            .sum()
    }
}

impl State {
    /// Probability that the classical bits satisfy a condition.
    pub(super) fn probability(&self, holds: impl Fn(u64) -> bool) -> f64 {
        let cases = self.cases.iter().filter(|(bits, _)| holds(**bits));
        cases.map(|(_, matrix)| matrix.trace()).sum()
    }

    /// The law of the classical bits of a mask.
    pub(crate) fn law(&self, mask: u64) -> BTreeMap<u64, f64> {
        let mut law = BTreeMap::new();
        for (bits, matrix) in &self.cases {
            *law.entry(bits & mask).or_insert(0.0) += matrix.trace();
        }
        law
    }
}

/// The largest difference between two states, over all cases.
pub(super) fn distance(a: &State, b: &State) -> f64 {
    let keys = a.cases.keys().chain(b.cases.keys());
    keys.map(|bits| match (a.cases.get(bits), b.cases.get(bits)) {
        (Some(a), Some(b)) => a.distance(b),
        (Some(one), None) | (None, Some(one)) => one.norm(),
        (None, None) => 0.0,
    })
    .fold(0.0, f64::max)
}
