//! Random texts: whatever comes in, the answer is a circuit or errors with places
//! inside the text, and a circuit has only qubits and bits that exist.

use proptest::prelude::*;

use super::super::{Action, Circuit, Diagnostic, ParseOptions, parse, parse_channel};

/// Pieces that programs are made of.
const PIECES: &[&str] = &[
    "OPENQASM 3.0;",
    "OPENQASM 2.0;",
    "include \"stdgates.inc\";",
    "qubit",
    "bit",
    "qreg",
    "creg",
    "q",
    "c",
    "r",
    "a",
    "i",
    "n",
    "[3]",
    "[0]",
    "[i]",
    "[-1]",
    "[0:2]",
    "[0:2:4]",
    "[{0, 2}]",
    "[",
    "]",
    "(",
    ")",
    "{",
    "}",
    ";",
    ";\n",
    ",",
    ":",
    "=",
    "==",
    "!=",
    "<",
    ">=",
    "^=",
    "&=",
    "|=",
    "+=",
    "+",
    "-",
    "*",
    "/",
    "%",
    "**",
    "^",
    "&",
    "|",
    "!",
    "~",
    "&&",
    "||",
    "<<",
    ">>",
    "++",
    "->",
    "@",
    "x",
    "h",
    "t",
    "cx",
    "ccx",
    "rz",
    "U",
    "gphase",
    "cu",
    "swap",
    "g",
    "gate",
    "inv @",
    "pow(2) @",
    "pow(-1) @",
    "ctrl @",
    "negctrl @",
    "ctrl(2) @",
    "measure",
    "reset",
    "barrier",
    "delay[100ns]",
    "delay",
    "if",
    "else",
    "for",
    "int",
    "uint",
    "float",
    "bool",
    "angle",
    "in",
    "let",
    "const",
    "input",
    "output",
    "pi",
    "τ",
    "sin(",
    "true",
    "0",
    "1",
    "2",
    "7",
    "0.5",
    "1e3",
    "100ns",
    "\"01\"",
    "0x1F",
    "$0",
    "def",
    "while",
    "box",
    "array",
    "return",
    "//",
    "/*",
    "*/",
    "\n@noise dephasing(0.1)\n",
    "\n@noise.before pauli(X=0.1)\n",
    "\n@check\n",
    "\n@foo bar\n",
    "pragma foo\n",
    "\n",
    " ",
    "\"",
    "é",
    "→",
    "\u{0}",
    "99999999999999999999999999999999999999999",
];

/// Whole statements that mostly fit together.
const STATEMENTS: &[&str] = &[
    "qubit[3] q;\n",
    "qubit r;\n",
    "bit[3] c;\n",
    "bit d;\n",
    "const int n = 2;\n",
    "gate g(a) x, y { rz(a) x; cx x, y; }\n",
    "gate w a, b, e { ccx a, b, e; g(0.1) a, b; }\n",
    "x q;\n",
    "cx q[0], q[1];\n",
    "h q[n];\n",
    "ctrl @ g(pi) q[0], q[1], q[2];\n",
    "inv @ pow(2) @ w q[0], q[1], q[2];\n",
    "negctrl @ x q[0], r;\n",
    "c = measure q;\n",
    "measure q[0] -> c[1];\n",
    "d = c[0] ^ c[1];\n",
    "c ^= measure q;\n",
    "c = c[{2, 1, 0}];\n",
    "if (c == 3) { x q[0]; } else { h r; }\n",
    "if (d) if (c[0]) y q[1];\n",
    "for int i in [0:n] { t q[i]; if (c[i]) z q[i]; }\n",
    "let a = q[0:1] ++ r;\n",
    "s a;\n",
    "@noise depolarizing(0.01)\ncx q[0], q[1];\n",
    "@noise readout-flip(0.1)\nc = measure q;\n",
    "@check\noutput bit[2] e;\n",
    "reset q;\n",
    "delay[100ns] q;\n",
    "barrier;\n",
    "@noise.before pauli(X=0.1, Y=0.1)\nbarrier q;\n",
    "gphase(0.1);\n",
    "}\n",
    "{\n",
];

/// Limits small enough for many runs.
fn read(source: &str) -> Result<Circuit, Vec<Diagnostic>> {
    let options = ParseOptions {
        max_operations: 2_000,
        ..ParseOptions::default()
    };
    parse("random", source, &options)
}

fn check_diagnostic(diagnostic: &Diagnostic, source: &str) {
    let span = diagnostic
        .span
        .expect("no --set is given, so there is a place");
    assert!(span.start <= span.end, "{diagnostic:?}");
    assert!(span.end as usize <= source.len(), "{diagnostic:?}");
    assert!(
        source.is_char_boundary(span.start as usize),
        "{diagnostic:?}"
    );
    assert!(source.is_char_boundary(span.end as usize), "{diagnostic:?}");
    assert!(!diagnostic.message.is_empty());
}

fn check(source: &str) {
    match read(source) {
        Err(errors) => {
            assert!(!errors.is_empty());
            for error in &errors {
                check_diagnostic(error, source);
            }
        }
        Ok(circuit) => check_circuit(&circuit, source),
    }
    if let Err(error) = parse_channel(source) {
        check_diagnostic(&error, source);
    }
}

fn check_circuit(circuit: &Circuit, source: &str) {
    for warning in &circuit.warnings {
        check_diagnostic(warning, source);
    }
    let qubits = circuit.qubits.len() as u32;
    let bits = circuit.bits as u32;
    let in_circuit = |places: &[u32]| {
        let mut sorted = places.to_vec();
        sorted.sort_unstable();
        sorted.dedup();
        assert_eq!(sorted.len(), places.len(), "{source}");
        assert!(places.iter().all(|&qubit| qubit < qubits), "{source}");
    };
    for operation in &circuit.operations {
        assert!(operation.condition.is_none_or(|bit| bit < bits), "{source}");
        assert!(operation.span.end as usize <= source.len());
        match &operation.action {
            Action::Gate {
                gate,
                parameters,
                qubits,
            } => {
                in_circuit(qubits);
                assert_eq!(qubits.len(), gate.qubits());
                assert_eq!(parameters.len(), gate.parameters());
                assert!(parameters.iter().all(|angle| angle.is_finite()));
                assert!(!gate.expand(parameters).is_empty() || gate.name() == "id");
            }
            Action::Call { qubits, .. } | Action::Barrier { qubits } => in_circuit(qubits),
            Action::Measure { qubit, bit } => {
                in_circuit(&[*qubit]);
                assert!(bit.is_none_or(|bit| bit < bits), "{source}");
            }
            Action::Reset { qubit } => in_circuit(&[*qubit]),
            Action::Delay { qubit, seconds } => {
                in_circuit(&[*qubit]);
                assert!(*seconds >= 0.0 && seconds.is_finite());
            }
            Action::Assign { bit, value } => {
                assert!(*bit < bits, "{source}");
                value.evaluate(&|bit| {
                    assert!(bit < bits, "{source}");
                    bit % 2 == 0
                });
            }
        }
    }
}

/// A program without mistakes, to be spoiled.
const PROGRAM: &str = "OPENQASM 3.0;
include \"stdgates.inc\";
const int n = 3; /* data qubits */
const float p = 1e-3;
qubit[n] data; qubit[2] anc;
@check
output bit[2] syn;
@logical
output bit log;
bit[n] m;
gate enc(a) x, y, z { rz(a / 2) x; cx x, y; inv @ t y; pow(2) @ ctrl @ s x, z; }
@noise depolarizing(p)
enc(pi / 4) data[0], data[1], data[2];
let pair = data[0:1] ++ anc[{1}];
for int i in [0:n - 2] {
    @noise.before dephasing(p * i)
    cx data[i], anc[i]; cx data[i + 1], anc[i];
    @noise readout-flip(0.01, 0.02)
    syn[i] = measure anc[i];
    if (syn[i]) { x anc[i]; } else if (syn == 2) z pair[-1]; else { barrier; }
}
delay[2 * 50ns] data;
m = measure data;
log = m[0] ^ m[1] ^ m[2];
";

#[test]
fn the_program_to_be_spoiled_is_right() {
    read(PROGRAM).unwrap();
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 512, ..ProptestConfig::default() })]

    #[test]
    fn random_bytes(bytes in prop::collection::vec(any::<u8>(), 0..200)) {
        check(&String::from_utf8_lossy(&bytes));
    }

    #[test]
    fn random_text(text in "\\PC{0,120}") {
        check(&text);
    }

    #[test]
    fn random_pieces(picks in prop::collection::vec((0..PIECES.len(), any::<bool>()), 0..80)) {
        let text: String = picks
            .into_iter()
            .map(|(piece, space)| format!("{}{}", PIECES[piece], if space { " " } else { "" }))
            .collect();
        check(&text);
    }

    #[test]
    fn random_statements(picks in prop::collection::vec(0..STATEMENTS.len(), 0..60)) {
        let text: String = picks.into_iter().map(|pick| STATEMENTS[pick]).collect();
        check(&format!("qubit[3] q; qubit r; bit[3] c; bit d; {text}"));
        check(&text);
    }

    #[test]
    fn spoiled_programs(
        cuts in prop::collection::vec((any::<prop::sample::Index>(), 0..12usize, 0..PIECES.len()), 1..6),
    ) {
        let mut text: Vec<char> = PROGRAM.chars().collect();
        for (place, length, piece) in cuts {
            let start = place.index(text.len().max(1)).min(text.len());
            let end = (start + length).min(text.len());
            text.splice(start..end, PIECES[piece].chars());
        }
        check(&text.into_iter().collect::<String>());
    }

    #[test]
    fn moved_pieces_of_programs(
        moves in prop::collection::vec((any::<prop::sample::Index>(), any::<prop::sample::Index>()), 1..8),
    ) {
        let mut words: Vec<&str> = PROGRAM.split_inclusive([' ', ';', '(', ')', ',']).collect();
        for (from, to) in moves {
            let word = words.remove(from.index(words.len()));
            let to = to.index(words.len());
            words.insert(to, word);
        }
        check(&words.concat());
    }
}
