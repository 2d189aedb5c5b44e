//! Texts that are refused: place, what was found, what to do.

use super::super::{ParseOptions, parse};
use super::{listed, read};

/// Each text with the beginning `line:column message` of its only error, and a
/// part of its advice (empty if none is asked for).
const CORPUS: &[(&str, &str, &str)] = &[
    // Words and punctuation.
    (
        "qubit q; x q",
        "1:13 expected `;` here, before the end of the text",
        "",
    ),
    (
        "qubit q;\nx q\ny q;",
        "2:4 expected `;` here, before `y`",
        "",
    ),
    ("qubit q; x q;;", "1:14 a `;` without a statement", "remove"),
    (
        "qubit q; { x q; }",
        "1:10 a block without `if`, `for` or `gate`",
        "",
    ),
    ("qubit q; }", "1:10 this `}` closes nothing", ""),
    (
        "bit c; qubit q; if (c) { x q;",
        "1:24 this `{` is never closed",
        "add a `}`",
    ),
    (
        "qubit q; x → q;",
        "1:12 expected the qubits of `x`, found a character that OpenQASM",
        "",
    ),
    (
        "/* open",
        "1:1 expected a statement, found a comment that is never closed",
        "",
    ),
    (
        "include \"stdgates.inc;",
        "1:9 expected a file name in quotes, found a quoted text that",
        "",
    ),
    (
        "qubit q; rx(0x) q;",
        "1:13 expected an expression, found a number without digits",
        "",
    ),
    (
        "qubit q; rx(12abc) q;",
        "1:13 expected an expression, found a number with letters",
        "",
    ),
    (
        "qubit q; rx(2im) q;",
        "1:13 complex numbers are not supported",
        "",
    ),
    (
        "qubit q; rx(1e999) q;",
        "1:13 `1e999` is too large for a number",
        "",
    ),
    (
        "qubit q; rx(1 + ) q;",
        "1:17 expected an expression, found `)`",
        "",
    ),
    ("qubit q; rx((1) q;", "1:17 expected `)`, found `q`", ""),
    ("qubit q; rx(1, 2;", "1:17 expected `)`, found `;`", ""),
    (
        "3 + 4;",
        "1:1 expected a statement, found the number `3`",
        "",
    ),
    (
        "qubit in;",
        "1:7 `in` is a word of OpenQASM, expected a name",
        "another name",
    ),
    ("const float pi = 3;", "1:13 `pi` is a word of OpenQASM", ""),
    // Header and files.
    (
        "OPENQASM 4.0;",
        "1:10 OpenQASM 4.0 is not supported",
        "3.1, 3.0 or 2.0",
    ),
    (
        "qubit q; OPENQASM 3.0;",
        "1:10 the `OPENQASM` header must be the first",
        "",
    ),
    (
        "include \"my.inc\";",
        "1:9 the file `my.inc` is not known",
        "stdgates.inc",
    ),
    // Names.
    (
        "qubit[2] data; x dta;",
        "1:18 `dta` is not declared",
        "did you mean `data`?",
    ),
    (
        "qubit q; bell q;",
        "1:10 there is no gate `bell`",
        "define it with `gate`",
    ),
    (
        "qubit[2] q; CZ q[0], q[1];",
        "1:13 there is no gate `CZ`",
        "did you mean `cz`?",
    ),
    ("qubit q;\nbit q;", "2:5 `q` is declared twice", "on line 1"),
    (
        "gate g a { x a; }\nqubit g;",
        "2:7 `g` is declared twice",
        "",
    ),
    (
        "include \"stdgates.inc\"; gate h a { x a; }",
        "1:30 the gate `h` is declared twice",
        "\"stdgates.inc\"",
    ),
    (
        "qubit q; bit c; x c;",
        "1:19 expected qubits here, but `c` is made of bits",
        "",
    ),
    (
        "qubit q; bit c; c = measure c;",
        "1:29 expected qubits here, but `c` is made of",
        "",
    ),
    (
        "qubit q; q q;",
        "1:10 `q` is made of qubits and not a gate",
        "",
    ),
    (
        "qubit q; bit c = q;",
        "1:18 `q` is made of qubits, it has no classical value",
        "measure it",
    ),
    (
        "qubit q; rx(x) q;",
        "1:13 `x` is not declared",
        "`x` is a gate",
    ),
    // Numbers of things.
    (
        "qubit[2] q; cx q[0];",
        "1:13 `cx` takes 2 qubits, found 1",
        "",
    ),
    ("qubit q; x q, q;", "1:10 `x` takes 1 qubit, found 2", ""),
    ("qubit q; rx q;", "1:10 `rx` takes 1 angle, found 0", ""),
    ("qubit q; h(0.5) q;", "1:10 `h` takes 0 angles, found 1", ""),
    (
        "qubit[3] q; ctrl(2) @ x q[0], q[1];",
        "1:13 `x` with 2 controls takes 3 qubits, found 2",
        "",
    ),
    (
        "qubit[2] q; cx q[0], q[0];",
        "1:13 the qubit `q[0]` comes twice in one call",
        "must differ",
    ),
    (
        "qubit[2] q; cx q, q[1];",
        "1:13 the qubit `q[1]` comes twice",
        "",
    ),
    (
        "qubit[2] a; qubit[3] b; cx a, b;",
        "1:25 registers of 2 and 3 qubits in one call",
        "same length",
    ),
    (
        "qubit[2] q; bit c; c = measure q;",
        "1:20 a measurement of 2 qubits into 1 bit",
        "",
    ),
    (
        "qubit[2] q; bit[3] c; measure q -> c;",
        "1:23 a measurement of 2 qubits into 3 bits",
        "",
    ),
    (
        "bit[2] a; bit[3] b; a = b;",
        "1:25 `a`: expected 2 bits, found 3",
        "",
    ),
    (
        "bit[2] a; bit[3] b; a ^= b;",
        "1:21 `^` needs registers of the same width",
        "",
    ),
    (
        "bit[2] a; a = 4;",
        "1:15 `a`: 4 does not fit into 2 bits",
        "",
    ),
    (
        "bit[2] a; a = \"011\";",
        "1:15 `a`: expected 2 bits, found 3",
        "",
    ),
    (
        "qubit[0] q;",
        "1:7 the number of qubits must be at least 1, found 0",
        "",
    ),
    (
        "bit[-2] c;",
        "1:5 the number of bits must be at least 1, found -2",
        "",
    ),
    (
        "qubit[1.5] q;",
        "1:7 the number of qubits must be a constant integer",
        "",
    ),
    // Indices.
    (
        "qubit[4] q; x q[4];",
        "1:17 index 4 is out of range for `q`",
        "indices 0 to 3",
    ),
    ("qubit[4] q; x q[-5];", "1:17 index -5 is out of range", ""),
    (
        "qubit[4] q; x q[2:1];",
        "1:16 this picks nothing from `q`",
        "both ends",
    ),
    ("qubit[4] q; x q[0:0:3];", "1:16 a range with step 0", ""),
    (
        "qubit[4] q; x q[{1, 1}];",
        "1:21 element 1 of `q` is picked twice",
        "",
    ),
    (
        "qubit[4] q; x q[0, 1];",
        "1:18 registers have one dimension",
        "`q[{0, 2}]`",
    ),
    (
        "qubit q; x q[0];",
        "1:13 `q` is a single one and takes no index",
        "",
    ),
    (
        "bit c; qubit[2] q; x q[c];",
        "1:24 an index must be a constant integer, found a measured",
        "",
    ),
    (
        "qubit[2] q; let a = q ++ q;",
        "1:26 an alias in which a qubit or bit comes twice",
        "",
    ),
    (
        "qubit q; bit c; let a = q ++ c;",
        "1:30 an alias is made of qubits or of bits",
        "",
    ),
    (
        "const int n = 1; let a = n;",
        "1:26 an alias is made of qubits or bits",
        "",
    ),
    // Writing.
    (
        "const int n = 3; n = 4;",
        "1:18 `n` is a constant or a loop variable",
        "`bit` register",
    ),
    (
        "qubit q; q = 1;",
        "1:10 expected bits here, but `q` is made of qubits",
        "",
    ),
    (
        "bit c; c += 1;",
        "1:10 `+=` is not supported on bits",
        "`^=`",
    ),
    (
        "qubit q; for int i in [0:1] { i = 2; }",
        "1:31 `i` is a constant or a loop variable",
        "",
    ),
    // Values.
    (
        "const int n = 2.5;",
        "1:15 expected a whole number for `int`",
        "",
    ),
    (
        "const uint n = -1;",
        "1:16 -1 does not fit into `uint[64]`",
        "",
    ),
    (
        "const int[4] n = 8;",
        "1:18 8 does not fit into `int[4]`, which holds -8 to 7",
        "",
    ),
    ("const int n = 1 / 0;", "1:15 division by zero", ""),
    (
        "const int n = 2 ** 200;",
        "1:15 this integer has more than 127 bits",
        "",
    ),
    (
        "const float f = 10.0 ** 400;",
        "1:17 this value is not a finite number",
        "",
    ),
    (
        "const float f = sqrt(-1);",
        "1:17 this value is not a finite number",
        "",
    ),
    (
        "const float f = sin(1, 2);",
        "1:17 `sin` takes 1 operand, found 2",
        "",
    ),
    (
        "const float f = sinh(1);",
        "1:17 `sinh` is no function of constants",
        "arcsin",
    ),
    (
        "bit c; const int n = c;",
        "1:22 the value of a constant depends on bits",
        "",
    ),
    (
        "const int n = 6 & 3 == 3;",
        "1:15 `&` does not apply to an integer and true or false",
        "",
    ),
    (
        "bit[2] c; bit d; d = c + 1;",
        "1:22 `+` does not apply to a register of 2 bits",
        "",
    ),
    (
        "bit[2] c; qubit q; if (c) x q;",
        "1:24 a register of 2 bits is neither true nor",
        "",
    ),
    (
        "bit[2] c; qubit q; if (!c) x q;",
        "1:24 `!` takes one bit, found a register",
        "~",
    ),
    (
        "bit[65] c; qubit q; if (c < 3) x q;",
        "1:25 a register of 65 bits cannot be ordered",
        "",
    ),
    (
        "bit[2] c; bit[2] d; bit e; e = c < d;",
        "1:32 `<` compares a register with a constant",
        "",
    ),
    (
        "qubit q; bit c; if (measure q) x q;",
        "1:21 a measurement inside an expression",
        "",
    ),
    (
        "bit[2] c; c = \"0x\";",
        "1:15 expected a bit string of 0 and 1",
        "",
    ),
    // Inputs.
    (
        "input float theta;",
        "1:13 the input `theta` has no value",
        "--set theta=VALUE",
    ),
    (
        "output int n;",
        "1:8 only bits can be declared `output`",
        "",
    ),
    // Time.
    (
        "qubit q; delay[100dt] q;",
        "1:16 a duration in `dt`",
        "ns, us, ms or s",
    ),
    (
        "qubit q; delay[100] q;",
        "1:16 expected a duration, found an integer",
        "100ns",
    ),
    (
        "qubit q; delay[-1ns] q;",
        "1:16 a delay that is negative",
        "",
    ),
    (
        "qubit q; delay q;",
        "1:16 expected a duration in brackets",
        "",
    ),
    // Gates.
    ("gate g a { y b; }", "1:14 `b` is not declared", "head only"),
    (
        "qubit q; gate g a { y q; }",
        "1:23 `q` is not a qubit of this gate",
        "",
    ),
    (
        "gate g a { y a[0]; }",
        "1:15 `a` is a single qubit of the gate",
        "",
    ),
    (
        "gate g a, b { cx a, a; }",
        "1:21 the qubit `a` comes twice",
        "",
    ),
    (
        "gate g a, a { x a; }",
        "1:11 `a` comes twice in the head",
        "",
    ),
    ("gate g(t) a { rz(s0) a; }", "1:18 `s0` is not declared", ""),
    (
        "gate g(t) a { rz(a) a; }",
        "1:18 `a` is a qubit, it has no value",
        "",
    ),
    (
        "gate g a { measure a; }",
        "1:12 a measurement inside of a gate",
        "",
    ),
    ("gate g a { reset a; }", "1:12 a reset inside of a gate", ""),
    (
        "gate g a { bit c; }",
        "1:12 a declaration inside of a gate",
        "",
    ),
    ("gate g a { g a; }", "1:12 there is no gate `g`", ""),
    (
        "gate g a { cx a; }",
        "1:12 `cx` takes 2 qubits, found 1",
        "",
    ),
    (
        "gate g a[2] { x a; }",
        "1:9 the qubits of a gate are single qubits",
        "",
    ),
    (
        "gate g { }",
        "1:8 expected a name for a qubit of the gate, found `{`",
        "",
    ),
    (
        "bit c; qubit q; if (c) { gate g a { x a; } }",
        "1:26 a gate definition inside of a block",
        "",
    ),
    (
        "qubit q; gate g(a) b { rz(1 / a) b; } g(0) q;",
        "1:27 division by zero",
        "`g` on line 1",
    ),
    // Modifiers.
    (
        "qubit[3] q; ctrl @ h q[0];",
        "1:13 `h` with 1 control takes 2 qubits, found 1",
        "",
    ),
    (
        "qubit[3] q; ctrl(2) @ h q[0], q[1], q[2];",
        "1:13 `h` with 2 controls is not a gate",
        "",
    ),
    (
        "qubit[3] q; ctrl @ rzz(1) q[0], q[1], q[2];",
        "1:13 `rzz` with a control is not a gate",
        "",
    ),
    (
        "gate g a, b { cp(1) a, b; } qubit[3] q; ctrl @ g q[0], q[1], q[2];",
        "1:15 `cp` with a",
        "`g`",
    ),
    (
        "qubit q; pow(1/2) @ x q;",
        "1:14 `pow` takes a constant integer",
        "`sx`",
    ),
    (
        "qubit q; pow @ x q;",
        "1:14 expected an integer in parentheses after `pow`",
        "",
    ),
    (
        "qubit q; ctrl(0) @ x q;",
        "1:15 the number of controls must be at least 1",
        "",
    ),
    (
        "qubit q; ctrl(1000000000) @ x q;",
        "1:10 more controls than the 1 qubits",
        "",
    ),
    ("qubit q; inv x q;", "1:14 expected `@`, found `x`", ""),
    (
        "gate g(n) a, b { ctrl(n) @ x a, b; }",
        "1:23 the number of controls must not depend",
        "",
    ),
    // Loops and conditions.
    (
        "qubit q; for i in [0:1] x q;",
        "1:14 the loop variable `i` has no type",
        "`for int i in",
    ),
    (
        "qubit q; for int i in q x q;",
        "1:23 expected the values of the loop variable",
        "[0:3]",
    ),
    (
        "qubit q; for int i in [0:] x q;",
        "1:23 the range of a loop needs both ends",
        "",
    ),
    (
        "qubit q; for int i in [0:0:5] x q;",
        "1:23 a range with step 0",
        "",
    ),
    (
        "bit c; qubit q; for int i in [0:c] x q;",
        "1:33 the end of a range must be a constant",
        "",
    ),
    (
        "qubit q; for bit b in {0, 1} x q;",
        "1:14 a loop variable of type `bit`",
        "",
    ),
    (
        "qubit q; for uint i in [-1:1] x q;",
        "1:19 -1 does not fit into `uint[64]`",
        "",
    ),
    (
        "bit c; qubit q; if c x q;",
        "1:20 expected `(`, found `c`",
        "",
    ),
    ("qubit q; else x q;", "1:10 an `else` without an `if`", ""),
    (
        "bit c; if (c) { bit d; }",
        "1:17 a declaration of bits inside of a block",
        "top of the file",
    ),
    // Not supported.
    (
        "def f(qubit a) -> bit { return measure a; }",
        "1:1 subroutines (`def`) are not",
        "`gate`",
    ),
    (
        "bit c; while (c) { c = false; }",
        "1:8 `while` loops are not supported",
        "`for`",
    ),
    (
        "extern f(int) -> int;",
        "1:1 `extern` functions are not supported",
        "",
    ),
    (
        "cal { play(drive(0), wave); }",
        "1:1 calibration blocks are not supported",
        "",
    ),
    (
        "defcal x $0 { play(drive(0), wave); }",
        "1:1 calibration blocks",
        "",
    ),
    ("defcalgrammar \"pulse\";", "1:1 calibration blocks", ""),
    (
        "array[int[8], 3] a;",
        "1:1 arrays are not supported",
        "`bit[n]`",
    ),
    (
        "qubit q; box[100ns] { x q; }",
        "1:10 timing boxes (`box`) are not supported",
        "",
    ),
    ("stretch a;", "1:1 the type `stretch` is not supported", ""),
    (
        "duration a = 100ns;",
        "1:1 variables of type `duration`",
        "",
    ),
    (
        "complex[float] z;",
        "1:1 complex numbers are not supported",
        "",
    ),
    (
        "const complex z = 1;",
        "1:7 complex numbers are not supported",
        "",
    ),
    (
        "bit[2] c; switch (c) { case 0 { } default { } }",
        "1:11 `switch` is not supported",
        "",
    ),
    ("return;", "1:1 `return` is not supported", ""),
    (
        "qubit q; for int i in [0:1] { x q; break; }",
        "1:36 leaving a loop early",
        "",
    ),
    ("end;", "1:1 `end` is not supported", ""),
    (
        "opaque g a;",
        "1:1 `opaque` gates have no definition",
        "`gate`",
    ),
    (
        "int n = 3;",
        "1:1 variables of type `int` are not supported",
        "`const int n = …;`",
    ),
    (
        "int[32] n;",
        "1:1 variables of type `int` are not supported",
        "`const int n = …;`",
    ),
    ("bool b = true;", "1:1 variables of type `bool`", ""),
    (
        "x $0;",
        "1:3 expected a qubit or a register, found the physical qubit `$0`",
        "`qubit[n] q;`",
    ),
    (
        "bit c; c = measure $3;",
        "1:20 expected the qubits to measure, found the physical",
        "declare",
    ),
    (
        "creg[3] c;",
        "1:5 the size of a `creg` stands behind its name",
        "`bit[n] name;`",
    ),
    (
        "bit c[3];",
        "1:6 the size of a `bit` register stands before its name",
        "`bit[n] c;`",
    ),
    (
        "qubit q[3];",
        "1:8 the size of a `qubit` register stands before",
        "`qubit[n] q;`",
    ),
    (
        "qubit q; x[100ns] q;",
        "1:10 a gate call with something in brackets",
        "",
    ),
    ("qubit q; f(q);", "1:10 there is no gate `f`", ""),
    (
        "bit c; c = f(1);",
        "1:12 `f` is no function of constants",
        "subroutines are not",
    ),
    ("const bit b = 1;", "1:15 constants of type `bit`", "`uint`"),
    (
        "const float f = durationof(1);",
        "1:17 the function `durationof` is not supported",
        "",
    ),
];

#[test]
fn every_text_has_its_one_error() {
    assert!(CORPUS.len() > 140);
    let mut wrong = Vec::new();
    for (source, expected, advice) in CORPUS {
        let Err(errors) = read(source) else {
            wrong.push(format!("accepted: {source}"));
            continue;
        };
        let shown = listed(source, &errors);
        if shown.len() != 1 || !shown[0].starts_with(expected) || !shown[0].contains(advice) {
            wrong.push(format!(
                "{source}\n  wanted {expected} … {advice}\n  found {shown:#?}"
            ));
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

#[test]
fn several_errors_are_found_in_one_run() {
    let source = "qubit[2] q;
        x q[2];
        bit[2] c = measure r;
        c = 1 +;
        if (c == 1) { y q[0]; foo q[1]; rx(0.1 q[1]; z q[5]; } else { h w; }
        gate g(a) x { rz(a) x; bar x; }
        g(1) q[0];
        def f(int n) -> int { return n; }
        f(3);
        h q[-3];";
    let found = listed(source, &read(source).unwrap_err());
    let places: Vec<&str> = found
        .iter()
        .map(|error| error.split(' ').next().unwrap_or_default())
        .collect();
    // The name `g` and the register `c`, whose declarations are wrong, are not
    // reported again; nor is what a broken statement leaves out.
    assert_eq!(
        places,
        ["2:13", "3:28", "4:16", "5:48", "6:32", "8:9", "10:13"],
        "{found:#?}"
    );
}

#[test]
fn reading_stops_after_many_errors() {
    let source = "x q;\n".repeat(1000);
    assert!(read(&source).unwrap_err().len() <= 20);
    let source = "; ".repeat(1000);
    assert_eq!(read(&source).unwrap_err().len(), 20);
    let block = format!("bit c; if (c) {{ {} }}", "; ".repeat(1000));
    assert!(read(&block).unwrap_err().len() <= 21);
}

#[test]
fn errors_in_a_loop_are_reported_once() {
    let source = "qubit[2] q; for int i in [0:100000] { x q[i]; y r; }";
    let found = listed(source, &read(source).unwrap_err());
    assert_eq!(
        found
            .iter()
            .filter(|error| error.contains("`r` is not declared"))
            .count(),
        1,
        "{found:#?}"
    );
    assert!(found.len() <= 2, "{found:#?}");
}

#[test]
fn values_for_inputs_that_do_not_exist() {
    let mut options = ParseOptions::default();
    options.set.insert("thta".into(), 0.25);
    options.set.insert("theta".into(), 0.25);
    options.set.insert("n".into(), 0.25);
    let source = "input float theta; const int n = 3; qubit q; rx(theta) q;";
    let errors = listed(source, &parse("t", source, &options).unwrap_err());
    assert_eq!(
        errors,
        [
            "--set n: the circuit has no input `n` (`n` is declared, but not as an `input`)",
            "--set thta: the circuit has no input `thta` (did you mean `theta`?)",
        ]
    );
}

#[test]
fn values_of_the_wrong_type() {
    let mut options = ParseOptions::default();
    options.set.insert("n".into(), 2.5);
    let errors = parse("t", "input int n;", &options).unwrap_err();
    assert!(errors[0].message.contains("expected a whole number"));
    assert!(
        errors[0]
            .help
            .as_ref()
            .is_some_and(|help| help.contains("2.5"))
    );
    options.set.insert("n".into(), f64::NAN);
    let errors = parse("t", "input float n;", &options).unwrap_err();
    assert!(errors[0].message.contains("no finite value"));
}
