//! Classical bits: assignments, formulas, comparisons and conditions.

use super::{check, circuit};

#[test]
fn formulas() {
    check(
        "bit[4] m; bit[2] s; bit f;
         s[0] = m[0] ^ m[1] ^ m[2];
         s[1] ^= m[3];
         s &= m[0:1];
         f |= !m[0] && (m[1] || m[2]);
         f = m[0] == m[1];
         f = m[0] != ~m[1];
         s = ~m[2:3];
         m = \"0101\";
         s = 2;
         f = true;
         s = m[0:1] | m[2:3];",
        "b4 = (b0^b1^b2)
         b5 = (b5^b3)
         b4 = (b4&b0)
         b5 = (b5&b1)
         b6 = (b6|(!b0&(b1|b2)))
         b6 = !(b0^b1)
         b6 = !(b0^b1)
         b4 = !b2
         b5 = !b3
         b0 = 1
         b1 = 0
         b2 = 1
         b3 = 0
         b4 = 0
         b5 = 1
         b6 = 1
         b4 = (b0|b2)
         b5 = (b1|b3)",
    );
}

#[test]
fn all_of_the_right_side_is_read_first() {
    check(
        "bit[2] c; bit[2] d; let r = c[{1, 0}];
         c = d;
         c = c ^ d;
         c = r;
         c[0:1] = c[0:1] << 1;",
        "b0 = b2
         b1 = b3
         b0 = (b0^b2)
         b1 = (b1^b3)
         b4 = b1
         b5 = b0
         b0 = b4
         b1 = b5
         b4 = 0
         b5 = b0
         b0 = b4
         b1 = b5",
    );
}

#[test]
fn declarations_with_values() {
    check(
        "qubit[2] q;
         bit[2] c = measure q;
         bit d = c[0] ^ c[1];
         bit[3] e = \"110\";",
        "measure 0 -> b0
         measure 1 -> b1
         b2 = (b0^b1)
         b3 = 0
         b4 = 1
         b5 = 1",
    );
}

#[test]
fn measurement_into_a_parity() {
    check(
        "qubit[2] q; bit[2] c; bit d;
         c ^= measure q;
         d |= measure q[0];",
        "measure 0 -> b3
         measure 1 -> b4
         b0 = (b0^b3)
         b1 = (b1^b4)
         measure 0 -> b3
         b2 = (b2|b3)",
    );
}

#[test]
fn conditions_are_kept_in_hidden_bits() {
    check(
        "qubit[2] q; bit[2] c;
         if (c[0]) { c[0] = measure q[0]; x q[0]; if (c == 1) y q[0]; else z q[0]; }
         else x q[1];
         if (c[1]) h q[0];",
        "b2 = b0
         [b2] measure 0 -> b0
         [b2] x 0
         b3 = (b2&b0&!b1)
         [b3] y 0
         b3 = (b2&!b3)
         [b3] z 0
         b2 = !b2
         [b2] x 1
         b2 = b1
         [b2] h 0",
    );
    assert_eq!(circuit("qubit q; bit c; if (c) x q;").bits, 2);
    assert_eq!(
        circuit("qubit q; bit c; if (c) x q; bit d; if (d) x q;").bits,
        3
    );
}

#[test]
fn else_if_chains() {
    check(
        "qubit q; bit a; bit b;
         if (a) x q; else if (b) y q; else z q;",
        "b2 = b0
         [b2] x 0
         b2 = !b2
         b3 = (b2&b1)
         [b3] y 0
         b3 = (b2&!b3)
         [b3] z 0",
    );
}

/// Value of the condition of the only gate when the register of `width` bits
/// holds `value`.
fn holds(condition: &str, width: usize, value: u32) -> bool {
    let text = format!("qubit q; bit[{width}] c; if ({condition}) x q;");
    let circuit = circuit(&text);
    match circuit.operations.as_slice() {
        [] => false,
        [only] => only.condition.is_none(),
        [assign, gated] => {
            let super::Action::Assign {
                bit,
                value: formula,
            } = &assign.action
            else {
                panic!("{condition}");
            };
            assert_eq!(gated.condition, Some(*bit));
            formula.evaluate(&|bit| value >> bit & 1 == 1)
        }
        _ => panic!("{condition}"),
    }
}

#[test]
fn comparisons_of_a_register_are_those_of_numbers() {
    for value in 0..8u32 {
        for number in [0i64, 1, 3, 4, 7, 8, -1] {
            let register = i64::from(value);
            for (condition, expected) in [
                (format!("c == {number}"), register == number),
                (format!("c != {number}"), register != number),
                (format!("c < {number}"), register < number),
                (format!("c <= {number}"), register <= number),
                (format!("c > {number}"), register > number),
                (format!("c >= {number}"), register >= number),
                (format!("{number} < c"), number < register),
                (format!("{number} >= c"), number >= register),
                (format!("uint[8](c) == {number}"), register == number),
                (format!("!(c > {number})"), register <= number),
            ] {
                assert_eq!(
                    holds(&condition, 3, value),
                    expected,
                    "{condition} at {value}"
                );
            }
        }
    }
}

#[test]
fn formulas_over_registers_are_bitwise() {
    for value in 0..16u32 {
        let (a, b) = (value & 3, value >> 2);
        for (condition, expected) in [
            ("c[0:1] == c[2:3]", a == b),
            ("c[0:1] != c[2:3]", a != b),
            ("(c[0:1] ^ c[2:3]) == 2", a ^ b == 2),
            ("(c & 6) == 4", value & 6 == 4),
            ("(c | \"0011\") == 7", value | 3 == 7),
            ("(c << 1) == 6", value << 1 & 15 == 6),
            ("c >> 2 == 1", value >> 2 == 1),
            ("~c == 5", !value & 15 == 5),
            (
                "c[0] && (c[1] || !c[2])",
                value & 1 == 1 && (value & 2 == 2 || value & 4 == 0),
            ),
            ("bool(c[3]) == true", value & 8 == 8),
            ("c[{3, 0}] == 1", value & 8 == 8 && value & 1 == 0),
            ("c == \"1010\"", value == 10),
        ] {
            assert_eq!(
                holds(condition, 4, value),
                expected,
                "{condition} at {value}"
            );
        }
    }
}

#[test]
fn a_comparison_that_cannot_hold_is_warned_of() {
    let found = circuit("qubit q; bit[2] c; if (c == 4) x q;");
    assert!(found.operations.is_empty());
    assert!(found.warnings[0].message.contains("never 4"));
}
