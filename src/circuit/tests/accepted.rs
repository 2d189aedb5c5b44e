//! Programs that are accepted, and the flat operations they become.

use super::super::{ParseOptions, Severity, parse};
use super::{check, circuit, flat};

#[test]
fn bell_pair() {
    check(
        "OPENQASM 3.0;
         include \"stdgates.inc\";
         qubit[2] q;
         bit[2] c;
         h q[0];
         cx q[0], q[1];
         c = measure q;",
        "h 0
         cx 0 1
         measure 0 -> b0
         measure 1 -> b1",
    );
}

#[test]
fn openqasm_2_program() {
    check(
        "OPENQASM 2.0;
         include \"qelib1.inc\";
         qreg q[2]; creg c[2];
         u3(pi/2, 0, 2^3) q[0];
         CX q[0],q[1];
         u1(1/2) q[1];
         barrier q;
         measure q[0] -> c[0];
         if(c==3) x q[0];
         measure q -> c;
         rz(ln(1)) q[0];",
        "u3(1.5707963267948966, 0, 8) 0
         CX 0 1
         u1(0.5) 1
         measure 0 -> b0
         b2 = (b0&b1)
         [b2] x 0
         measure 0 -> b0
         measure 1 -> b1
         rz(0) 0",
    );
}

#[test]
fn header_and_include_are_optional() {
    check("qubit q; h q;", "h 0");
    check("OPENQASM 3; qubit q; U(0, 1, 2) q;", "U(0, 1, 2) 0");
    check("OPENQASM 3.1; qubit q; x q;", "x 0");
}

#[test]
fn registers_and_names() {
    let found = circuit(
        "qubit a; qubit[2] q; qreg r[1];
         bit c; creg d[2]; bit[3] e;",
    );
    assert_eq!(found.qubits, ["a", "q[0]", "q[1]", "r[0]"]);
    let registers: Vec<_> = found
        .registers
        .iter()
        .map(|register| (register.name.as_str(), register.first, register.width))
        .collect();
    assert_eq!(registers, [("c", 0, 1), ("d", 1, 2), ("e", 3, 3)]);
    assert_eq!(found.bits, 6);
    assert!(found.registers.iter().all(|register| register.recorded));
}

#[test]
fn output_registers_alone_are_recorded() {
    let found = circuit("bit[2] a; output bit[2] b; output creg c[1]; bit d;");
    let recorded: Vec<bool> = found.registers.iter().map(|r| r.recorded).collect();
    assert_eq!(recorded, [false, true, true, false]);
}

#[test]
fn constants_and_arithmetic() {
    check(
        "const int n = 7 % 4;
         const float x = 2 ** 3 ** 2 / 4.0;
         const angle a = -pi / 2 ** 2;
         const uint[8] u = 0xFF & 0b1100_0011 | 0o7;
         const bool b = n == 3 && !(x < 1);
         qubit[4] q;
         rz(x) q[n];
         rz(a) q[0];
         rz(u) q[0];
         rz(b) q[0];
         rz(sin(pi / 6) + mod(7, 4) + pow(2, 3) + popcount(7)) q[0];
         rz(floor(2.7) + ceiling(2.1) + sqrt(16.0)) q[0];
         rz(int(2.9) + float(1) + uint(true)) q[0];
         rz(τ - tau + 1_000.5e-1 + .5) q[0];
         rz(1 << 4 >> 1) q[0];
         rz(arccos(1) + arcsin(0) + arctan(0) + cos(0) + tan(0) + exp(0) + log(euler)) q[0];",
        &format!(
            "rz(128) 3
             rz({}) 0
             rz(199) 0
             rz(1) 0
             rz({}) 0
             rz(9) 0
             rz(4) 0
             rz(100.55) 0
             rz(8) 0
             rz(3) 0",
            -std::f64::consts::PI / 4.0,
            (std::f64::consts::PI / 6.0).sin() + 14.0,
        ),
    );
}

#[test]
fn precedence_is_that_of_the_specification() {
    check(
        "qubit q;
         rz(-2 ** 2) q;
         rz(2 ** -1) q;
         rz(1 | 2 ^ 3 & 1) q;
         rz(7 - 2 - 1) q;
         rz(100 / 10 / 5) q;
         rz(1 + 2 << 1) q;
         rz((1 < 2) == (3 > 2)) q;",
        "rz(-4) 0
         rz(0.5) 0
         rz(3) 0
         rz(4) 0
         rz(2) 0
         rz(6) 0
         rz(1) 0",
    );
}

#[test]
fn inputs_take_their_values() {
    let mut options = ParseOptions::default();
    options.set.insert("theta".into(), 0.25);
    options.set.insert("n".into(), 2.0);
    let text = "input float theta; input int n; qubit[3] q; rx(theta) q[n];";
    let found = parse("inputs", text, &options).unwrap();
    assert_eq!(super::line(&found.operations[0]), "rx(0.25) 2");
}

#[test]
fn indices_ranges_and_sets() {
    check(
        "qubit[5] q;
         x q[-1];
         y q[1:2];
         z q[0:2:4];
         h q[{4, 0}];
         s q[:1];
         t q[3:];
         x q[-2:-1];
         y q[3:-2:0];
         z q[1:4][2];",
        "x 4
         y 1
         y 2
         z 0
         z 2
         z 4
         h 4
         h 0
         s 0
         s 1
         t 3
         t 4
         x 3
         x 4
         y 3
         y 1
         z 3",
    );
}

#[test]
fn aliases_and_concatenation() {
    check(
        "qubit[3] q; qubit r;
         bit[2] c; bit d;
         let a = q[0:1] ++ r;
         let b = a[-1];
         let e = c ++ d;
         x a;
         h b;
         e = measure q;
         cx q[2], a;",
        "x 0
         x 1
         x 3
         h 3
         measure 0 -> b0
         measure 1 -> b1
         measure 2 -> b2
         cx 2 0
         cx 2 1
         cx 2 3",
    );
}

#[test]
fn broadcast() {
    check(
        "qubit[2] a; qubit[2] b; qubit c; bit[2] m;
         cx a, b;
         cx c, b;
         ccx a, b, c;
         reset a;
         delay[1.5us] b;
         m = measure b;
         measure a;",
        "cx 0 2
         cx 1 3
         cx 4 2
         cx 4 3
         ccx 0 2 4
         ccx 1 3 4
         reset 0
         reset 1
         delay 1.5e-6 2
         delay 1.5e-6 3
         measure 2 -> b0
         measure 3 -> b1
         measure 0
         measure 1",
    );
}

#[test]
fn durations() {
    check(
        "qubit q;
         delay[100ns] q;
         delay[2 * 1.5 us] q;
         delay[3µs + 1ms] q;
         delay[1s / 4] q;
         delay[2ns];",
        "delay 1e-7 0
         delay 3e-6 0
         delay 1.003e-3 0
         delay 2.5e-1 0
         delay 2e-9 0",
    );
}

#[test]
fn loops_are_unrolled() {
    check(
        "qubit[6] q;
         for int i in [0:2] { x q[i]; }
         for uint[8] i in [5:-2:1] y q[i];
         for int i in {0, 2, 5} { for int j in [0:i - 4] { cz q[i], q[j]; } }
         for float a in {0.5, 1} rz(a) q[0];
         for int i in [3:2] { z q[0]; }",
        "x 0
         x 1
         x 2
         y 5
         y 3
         y 1
         cz 5 0
         cz 5 1
         rz(0.5) 0
         rz(1) 0",
    );
}

#[test]
fn names_of_a_block_end_with_it() {
    check(
        "qubit[4] q;
         const int n = 1;
         for int i in [0:1] { const int n = i + 2; let a = q[n]; x a; }
         x q[n];",
        "x 2
         x 3
         x 1",
    );
}

#[test]
fn constant_conditions_pick_a_branch() {
    check(
        "qubit[3] q;
         for int i in [0:3] { if (i < 3) { x q[i]; } else { y q[0]; } }
         if (true) z q[1]; else z q[7];",
        "x 0
         x 1
         x 2
         y 0
         z 1",
    );
}

#[test]
fn barriers_without_noise_leave_no_trace() {
    check(
        "qubit[2] q; barrier; barrier q; barrier q[0], q[1]; x q;",
        "x 0\nx 1",
    );
}

#[test]
fn comments_and_unknown_words_for_other_programs() {
    let found = circuit(
        "// a comment
         /* another
            one */
         pragma some tool: anything; at all
         #pragma more
         @unknown anything ( at all
         qubit q; // the qubit
         x q;",
    );
    assert_eq!(found.operations.len(), 1);
    let places: Vec<_> = found
        .warnings
        .iter()
        .map(|warning| {
            assert_eq!(warning.severity, Severity::Warning);
            warning.span.unwrap().line_and_column(&found.source)
        })
        .collect();
    assert_eq!(places, [(4, 10), (5, 10), (6, 10)]);
}

#[test]
fn integer_division_is_warned_of() {
    let found = circuit("qubit q; rz(7 / 2) q; rz(6 / 2) q;");
    assert_eq!(super::line(&found.operations[0]), "rz(3) 0");
    assert_eq!(found.warnings.len(), 1);
    assert!(found.warnings[0].message.contains("gives 3"));
}

#[test]
fn library_names_can_name_other_things() {
    check(
        "const float p = 0.5; qubit t; bit s;
         rz(p) t; t t; s = measure t;
         gate g(p) x { p(p) x; }
         g(1.5) t;",
        "rz(0.5) 0
         t 0
         measure 0 -> b0
         start g 0
         p(1.5) 0
         end g 0",
    );
}

#[test]
fn windows_and_old_line_ends() {
    check("qubit q;\r\n@unknown word\r\nx q;\r\n// end\r\n", "x 0");
    assert_eq!(flat("\u{feff}qubit q;\rx q;").len(), 1);
    assert!(flat("").is_empty());
}
