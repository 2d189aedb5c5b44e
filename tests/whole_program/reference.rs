//! Exact law of a circuit's bits from full density matrices.
//!
//! A [`Circuit`] is built call by call; every call writes its OpenQASM line and
//! keeps its meaning as Kraus operators or classical steps. The simulation holds
//! one 2ⁿ × 2ⁿ matrix for every value of the classical bits. Qubit q is bit q of
//! a basis index. Meant for n ≤ 5.

use std::collections::BTreeMap;

use num_complex::Complex64;

use super::gates::{Basic, expand};

/// A square matrix by rows.
type Matrix = Vec<Vec<Complex64>>;
type Condition = Box<dyn Fn(u64) -> bool>;

enum Step {
    /// Σ K ρ K† on some qubits; qubit i of the list is bit i of an index of K.
    Kraus {
        qubits: Vec<usize>,
        operators: Vec<Matrix>,
    },
    Measure {
        qubit: usize,
        bit: usize,
        flip: [f64; 2],
    },
    Assign {
        bit: usize,
        value: Condition,
    },
    If {
        condition: Condition,
        then: Vec<Step>,
        otherwise: Vec<Step>,
    },
}

/// A noise channel: its text and its meaning.
#[derive(Clone)]
pub struct Channel {
    text: String,
    /// Whether it acts on all qubits of a call at once.
    joint: bool,
    operators: Vec<Matrix>,
}

fn complex(re: f64, im: f64) -> Complex64 {
    Complex64::new(re, im)
}

fn real(rows: [[f64; 2]; 2]) -> Matrix {
    rows.iter()
        .map(|row| row.iter().map(|&v| complex(v, 0.0)).collect())
        .collect()
}

fn scaled(matrix: &Matrix, factor: f64) -> Matrix {
    matrix
        .iter()
        .map(|row| row.iter().map(|v| v * factor).collect())
        .collect()
}

fn product(a: &Matrix, b: &Matrix) -> Matrix {
    let n = a.len();
    (0..n)
        .map(|i| {
            (0..n)
                .map(|j| (0..n).map(|k| a[i][k] * b[k][j]).sum())
                .collect()
        })
        .collect()
}

/// Tensor product with `low` on the lower bits of the index.
fn tensor(high: &Matrix, low: &Matrix) -> Matrix {
    let (n, m) = (high.len(), low.len());
    (0..n * m)
        .map(|i| {
            (0..n * m)
                .map(|j| high[i / m][j / m] * low[i % m][j % m])
                .collect()
        })
        .collect()
}

fn pauli(letter: u8) -> Matrix {
    let (i, one, zero) = (complex(0.0, 1.0), complex(1.0, 0.0), complex(0.0, 0.0));
    match letter {
        b'I' => vec![vec![one, zero], vec![zero, one]],
        b'X' => vec![vec![zero, one], vec![one, zero]],
        b'Y' => vec![vec![zero, -i], vec![i, zero]],
        _ => vec![vec![one, zero], vec![zero, -one]],
    }
}

/// Letter i acts on qubit i, which is bit i of the index.
fn pauli_word(word: &str) -> Matrix {
    let identity = vec![vec![complex(1.0, 0.0)]];
    word.bytes()
        .fold(identity, |low, letter| tensor(&pauli(letter), &low))
}

fn universal([theta, phi, lambda]: [f64; 3]) -> Matrix {
    let (s, c) = (theta / 2.0).sin_cos();
    let turn = |angle: f64| Complex64::from_polar(1.0, angle);
    vec![
        vec![complex(c, 0.0), -turn(lambda) * s],
        vec![turn(phi) * s, turn(phi + lambda) * c],
    ]
}

/// A random Pauli; the identity takes the rest.
pub fn pauli_channel(words: &[(&str, f64)]) -> Channel {
    let listed: Vec<String> = words
        .iter()
        .map(|(word, p)| format!("{word}={p}"))
        .collect();
    let width = words[0].0.len();
    let rest = 1.0 - words.iter().map(|(_, p)| p).sum::<f64>();
    let mut operators = vec![scaled(
        &pauli_word(&"I".repeat(width)),
        rest.max(0.0).sqrt(),
    )];
    operators.extend(
        words
            .iter()
            .map(|(word, p)| scaled(&pauli_word(word), p.sqrt())),
    );
    Channel {
        text: format!("pauli({})", listed.join(", ")),
        joint: true,
        operators,
    }
}

/// Depolarizing on all qubits of a call, `width` of them, by listing all words.
pub fn depolarizing(p: f64, width: usize) -> Channel {
    let mut words = vec![String::new()];
    for _ in 0..width {
        words = words
            .iter()
            .flat_map(|w| ["I", "X", "Y", "Z"].map(|l| format!("{w}{l}")))
            .collect();
    }
    words.remove(0);
    let share = p / words.len() as f64;
    let list: Vec<(&str, f64)> = words.iter().map(|w| (w.as_str(), share)).collect();
    Channel {
        text: format!("depolarizing({p})"),
        ..pauli_channel(&list)
    }
}

/// A flip about one axis on each qubit.
pub fn flip(name: &str, p: f64) -> Channel {
    let letter = match name {
        "dephasing" => "Z",
        "bit-flip" => "X",
        _ => "Y",
    };
    Channel {
        text: format!("{name}({p})"),
        joint: false,
        ..pauli_channel(&[(letter, p)])
    }
}

fn damping_operators(gamma: f64) -> Vec<Matrix> {
    vec![
        real([[1.0, 0.0], [0.0, (1.0 - gamma).sqrt()]]),
        real([[0.0, gamma.sqrt()], [0.0, 0.0]]),
    ]
}

/// Amplitude damping on each qubit.
pub fn amplitude_damping(gamma: f64) -> Channel {
    let text = format!("amplitude-damping({gamma})");
    Channel {
        text,
        joint: false,
        operators: damping_operators(gamma),
    }
}

/// Relaxation on each qubit, all times in microseconds. Textbook: coherence
/// e^{−t/t2}, population e^{−t/t1}.
pub fn relaxation(t1: f64, t2: f64, time: f64) -> Channel {
    let coherence = (-time / t2).exp() / (-time / (2.0 * t1)).exp();
    let dephase = pauli_channel(&[("Z", (1.0 - coherence) / 2.0)]).operators;
    let damp = damping_operators(1.0 - (-time / t1).exp());
    let operators = dephase
        .iter()
        .flat_map(|d| damp.iter().map(|k| product(d, k)))
        .collect();
    Channel {
        text: format!("relaxation({t1}us, {t2}us, {time}us)"),
        joint: false,
        operators,
    }
}

/// Coherent rotation exp(−i·angle·P/2) on each qubit.
pub fn over_rotation(axis: &str, angle: f64) -> Channel {
    let letter = axis.to_uppercase();
    let (s, c) = (angle / 2.0).sin_cos();
    let (identity, generator) = (pauli(b'I'), pauli(letter.as_bytes()[0]));
    let matrix = (0..2)
        .map(|i| {
            (0..2)
                .map(|j| identity[i][j] * c - complex(0.0, s) * generator[i][j])
                .collect()
        })
        .collect();
    let text = format!("over-rotation({axis}, {angle})");
    Channel {
        text,
        joint: false,
        operators: vec![matrix],
    }
}

/// A circuit with one qubit register `q` and one bit register `c`.
pub struct Circuit {
    qubits: usize,
    bits: usize,
    text: String,
    /// Innermost block last.
    blocks: Vec<Vec<Step>>,
}

impl Circuit {
    /// An empty circuit.
    pub fn new(qubits: usize, bits: usize) -> Self {
        let text = format!(
            "OPENQASM 3.0;\ninclude \"stdgates.inc\";\nqubit[{qubits}] q;\nbit[{bits}] c;\n"
        );
        Circuit {
            qubits,
            bits,
            text,
            blocks: vec![Vec::new()],
        }
    }

    /// The OpenQASM text.
    pub fn text(&self) -> &str {
        &self.text
    }

    /// Number of bits.
    pub fn bits(&self) -> usize {
        self.bits
    }

    fn line(&mut self, text: &str) {
        self.text += &"  ".repeat(self.blocks.len() - 1);
        self.text += text;
        self.text.push('\n');
    }

    fn push(&mut self, step: Step) {
        self.blocks.last_mut().expect("an open block").push(step);
    }

    fn apply(&mut self, channel: &Channel, qubits: &[usize]) {
        if channel.joint {
            self.push(Step::Kraus {
                qubits: qubits.to_vec(),
                operators: channel.operators.clone(),
            });
        } else {
            for &qubit in qubits {
                self.push(Step::Kraus {
                    qubits: vec![qubit],
                    operators: channel.operators.clone(),
                });
            }
        }
    }

    /// A library gate, then its noise.
    pub fn gate(&mut self, name: &str, angles: &[f64], qubits: &[usize], noise: &[Channel]) {
        for channel in noise {
            self.line(&format!("@noise {}", channel.text));
        }
        let listed: Vec<String> = angles.iter().map(f64::to_string).collect();
        let names: Vec<String> = qubits.iter().map(|q| format!("q[{q}]")).collect();
        let angle_text = if angles.is_empty() {
            String::new()
        } else {
            format!("({})", listed.join(", "))
        };
        self.line(&format!("{name}{angle_text} {};", names.join(", ")));
        let mut basics = Vec::new();
        expand(name, angles, &mut basics);
        for basic in basics {
            let (qubits, operator) = match basic {
                Basic::U(q, angles) => (vec![qubits[q]], universal(angles)),
                Basic::Cx(a, b) => {
                    // Bit 0 is the control.
                    let permute = [0, 3, 2, 1];
                    let row =
                        |i: usize| (0..4).map(move |j| complex(f64::from(permute[i] == j), 0.0));
                    (
                        vec![qubits[a], qubits[b]],
                        (0..4).map(|i| row(i).collect()).collect(),
                    )
                }
            };
            self.push(Step::Kraus {
                qubits,
                operators: vec![operator],
            });
        }
        for channel in noise {
            self.apply(channel, qubits);
        }
    }

    /// A measurement with readout error [p01, p10].
    pub fn measure(&mut self, qubit: usize, bit: usize, flip: [f64; 2]) {
        if flip != [0.0, 0.0] {
            self.line(&format!("@noise readout-flip({}, {})", flip[0], flip[1]));
        }
        self.line(&format!("c[{bit}] = measure q[{qubit}];"));
        self.push(Step::Measure { qubit, bit, flip });
    }

    /// Every qubit into the bit of its number.
    pub fn measure_all(&mut self) {
        for qubit in 0..self.qubits {
            self.measure(qubit, qubit, [0.0, 0.0]);
        }
    }

    /// Reset to |0⟩.
    pub fn reset(&mut self, qubit: usize) {
        self.line(&format!("reset q[{qubit}];"));
        let operators = vec![
            real([[1.0, 0.0], [0.0, 0.0]]),
            real([[0.0, 1.0], [0.0, 0.0]]),
        ];
        self.push(Step::Kraus {
            qubits: vec![qubit],
            operators,
        });
    }

    /// A classical assignment.
    pub fn assign(&mut self, bit: usize, text: &str, value: impl Fn(u64) -> bool + 'static) {
        self.line(&format!("c[{bit}] = {text};"));
        self.push(Step::Assign {
            bit,
            value: Box::new(value),
        });
    }

    /// if … else ….
    pub fn when(
        &mut self,
        text: &str,
        condition: impl Fn(u64) -> bool + 'static,
        then: impl FnOnce(&mut Self),
        otherwise: impl FnOnce(&mut Self),
    ) {
        self.line(&format!("if ({text}) {{"));
        let then = self.block(then);
        self.line("} else {");
        let otherwise = self.block(otherwise);
        self.line("}");
        self.push(Step::If {
            condition: Box::new(condition),
            then,
            otherwise,
        });
    }

    fn block(&mut self, fill: impl FnOnce(&mut Self)) -> Vec<Step> {
        self.blocks.push(Vec::new());
        fill(self);
        self.blocks.pop().expect("the block just opened")
    }

    /// Probability of every value of the bits, bit 0 least significant.
    pub fn law(&self) -> Vec<f64> {
        let size = 1 << self.qubits;
        let mut start = vec![vec![complex(0.0, 0.0); size]; size];
        start[0][0] = complex(1.0, 0.0);
        let branches = run(&self.blocks[0], BTreeMap::from([(0, start)]));
        let mut law = vec![0.0; 1 << self.bits];
        for (bits, density) in branches {
            law[bits as usize] += trace(&density);
        }
        law
    }
}

type Branches = BTreeMap<u64, Matrix>;

fn trace(density: &Matrix) -> f64 {
    (0..density.len()).map(|i| density[i][i].re).sum()
}

fn add(branches: &mut Branches, bits: u64, density: Matrix) {
    if trace(&density) < 1e-15 {
        return;
    }
    match branches.get_mut(&bits) {
        None => {
            branches.insert(bits, density);
        }
        Some(sum) => {
            for (row, other) in sum.iter_mut().zip(&density) {
                for (value, extra) in row.iter_mut().zip(other) {
                    *value += extra;
                }
            }
        }
    }
}

fn set(bits: u64, bit: usize, value: bool) -> u64 {
    bits & !(1 << bit) | u64::from(value) << bit
}

fn run(steps: &[Step], mut branches: Branches) -> Branches {
    for step in steps {
        let mut next = Branches::new();
        for (bits, density) in branches {
            match step {
                Step::Kraus { qubits, operators } => {
                    for operator in operators {
                        add(&mut next, bits, sandwich(operator, qubits, &density));
                    }
                }
                Step::Measure { qubit, bit, flip } => {
                    for outcome in [false, true] {
                        let projected = project(&density, *qubit, outcome);
                        let wrong = flip[usize::from(outcome)];
                        let right = scaled(&projected, 1.0 - wrong);
                        add(&mut next, set(bits, *bit, outcome), right);
                        add(
                            &mut next,
                            set(bits, *bit, !outcome),
                            scaled(&projected, wrong),
                        );
                    }
                }
                Step::Assign { bit, value } => {
                    add(&mut next, set(bits, *bit, value(bits)), density)
                }
                Step::If {
                    condition,
                    then,
                    otherwise,
                } => {
                    let block = if condition(bits) { then } else { otherwise };
                    for (bits, density) in run(block, Branches::from([(bits, density)])) {
                        add(&mut next, bits, density);
                    }
                }
            }
        }
        branches = next;
    }
    branches
}

fn project(density: &Matrix, qubit: usize, outcome: bool) -> Matrix {
    let keep = |i: usize| (i >> qubit & 1 == 1) == outcome;
    let kept = |i: usize, j: usize, v: Complex64| if keep(i) && keep(j) { v } else { v * 0.0 };
    let row = |(i, row): (usize, &Vec<Complex64>)| {
        row.iter()
            .enumerate()
            .map(|(j, &v)| kept(i, j, v))
            .collect()
    };
    density.iter().enumerate().map(row).collect()
}

/// K ρ K† with K on the listed qubits.
fn sandwich(operator: &Matrix, qubits: &[usize], density: &Matrix) -> Matrix {
    let left = from_left(operator, qubits, density);
    dagger(&from_left(operator, qubits, &dagger(&left)))
}

fn dagger(matrix: &Matrix) -> Matrix {
    let n = matrix.len();
    (0..n)
        .map(|i| (0..n).map(|j| matrix[j][i].conj()).collect())
        .collect()
}

fn from_left(operator: &Matrix, qubits: &[usize], density: &Matrix) -> Matrix {
    let inner = |i: usize| {
        qubits
            .iter()
            .enumerate()
            .fold(0, |sum, (place, &q)| sum | (i >> q & 1) << place)
    };
    let outer = |i: usize, value: usize| {
        qubits.iter().enumerate().fold(i, |sum, (place, &q)| {
            sum & !(1 << q) | (value >> place & 1) << q
        })
    };
    let row = |i: usize| {
        let mut row = vec![complex(0.0, 0.0); density.len()];
        for (value, factor) in operator[inner(i)].iter().enumerate() {
            if factor.norm_sqr() > 0.0 {
                for (sum, entry) in row.iter_mut().zip(&density[outer(i, value)]) {
                    *sum += factor * entry;
                }
            }
        }
        row
    };
    (0..density.len()).map(row).collect()
}
