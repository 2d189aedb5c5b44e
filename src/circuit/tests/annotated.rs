//! Annotations: noise on statements, and the roles of registers.

use super::super::{ChannelValue, Role, parse_channel};
use super::{channel, check, circuit, listed, read};

#[test]
fn noise_before_and_after_stacks_in_order() {
    check(
        "qubit[2] q; bit[2] c;
         @noise depolarizing(0.01)
         @noise.before dephasing(1/1000) // why not
         @noise over-rotation(x, pi/100)
         cx q[0], q[1];
         @noise.before bit-flip(1e-3)
         h q;
         @noise readout-flip(0.01, 0.02)
         c = measure q;
         @noise relaxation(80us, 0.1 ms, 35 ns)
         reset q[0];
         @noise relaxation(80us, 100us)
         delay[100ns] q;
         @noise pauli(XX=0.1, IZ=0.2)
         barrier q;",
        &format!(
            "cx 0 1 {{before dephasing(0.001); after depolarizing(0.01); after over-rotation(x, {})}}
             h 0 {{before bit-flip(0.001)}}
             h 1 {{before bit-flip(0.001)}}
             measure 0 -> b0 {{after readout-flip(0.01, 0.02)}}
             measure 1 -> b1 {{after readout-flip(0.01, 0.02)}}
             reset 0 {{after relaxation(8e-5s, 1e-4s, 3.5e-8s)}}
             delay 1e-7 0 {{after relaxation(8e-5s, 1e-4s)}}
             delay 1e-7 1 {{after relaxation(8e-5s, 1e-4s)}}
             barrier 0 1 {{after pauli(XX=0.1, IZ=0.2)}}",
            std::f64::consts::PI / 100.0
        ),
    );
}

#[test]
fn arguments_are_evaluated_for_each_instance() {
    check(
        "const float base = 0.01;
         gate g(a) x { @noise dephasing(base * a)
                       t x; }
         qubit[2] q;
         for int i in [1:2] {
             @noise depolarizing(base * i)
             x q[0];
             g(i) q[1];
         }",
        "x 0 {after depolarizing(0.01)}
         start g 1
         t 1 {after dephasing(0.01)}
         end g 1
         x 0 {after depolarizing(0.02)}
         start g 1
         t 1 {after dephasing(0.02)}
         end g 1",
    );
}

#[test]
fn noise_on_a_definition_call_sits_at_its_edges() {
    check(
        "gate g a, b { cz a, b; }
         qubit[2] q;
         @noise depolarizing(0.1)
         @noise.before dephasing(0.2)
         g q[1], q[0];
         @noise depolarizing(0.1)
         @noise.before dephasing(0.2)
         pow(2) @ g q[0], q[1];
         @noise depolarizing(0.3)
         @noise.before dephasing(0.4)
         pow(3) @ t q[0];
         @noise depolarizing(0.5)
         pow(0) @ t q[0];",
        "start g 1 0 {before dephasing(0.2)}
         cz 1 0
         end g 1 0 {after depolarizing(0.1)}
         start g 0 1 {before dephasing(0.2)}
         cz 0 1
         end g 0 1
         start g 0 1
         cz 0 1
         end g 0 1 {after depolarizing(0.1)}
         t 0 {before dephasing(0.4)}
         t 0
         t 0 {after depolarizing(0.3)}
         barrier 0 {after depolarizing(0.5)}",
    );
}

#[test]
fn noise_of_a_body_stays_after_its_calls_in_the_inverse() {
    check(
        "gate g a {
             @noise dephasing(0.1)
             s a;
             @noise.before bit-flip(0.2)
             h a;
         }
         qubit q;
         inv @ g q;",
        "start g 0
         h 0 {before bit-flip(0.2)}
         sdg 0 {after dephasing(0.1)}
         end g 0",
    );
}

#[test]
fn noise_under_a_condition_and_on_a_declaration_that_measures() {
    check(
        "qubit q;
         @noise readout-flip(0.1)
         bit c = measure q;
         if (c) {
             @noise depolarizing(0.2)
             x q;
         }",
        "measure 0 -> b0 {after readout-flip(0.1)}
         b1 = b0
         [b1] x 0 {after depolarizing(0.2)}",
    );
}

#[test]
fn roles() {
    let found = circuit(
        "@check
         output bit[2] syndrome;
         @logical
         output bit parity;
         output bit[3] raw;
         @check
         creg old[1];",
    );
    let roles: Vec<Role> = found.registers.iter().map(|r| r.role).collect();
    assert_eq!(
        roles,
        [Role::Check, Role::Logical, Role::Record, Role::Check]
    );
}

#[test]
fn a_constant_named_like_a_word_counts_as_a_number() {
    check(
        "qubit[2] x;
         @noise over-rotation(x, 0.1)
         h x[0];
         gate g(y) a {
             @noise over-rotation(z, y)
             h a;
         }
         g(0.5) x[1];",
        "h 0 {after over-rotation(x, 0.1)}
         start g 1
         h 1 {after over-rotation(z, 0.5)}
         end g 1",
    );
}

#[test]
fn annotations_that_cannot_be() {
    for (source, expected) in [
        (
            "@noise dephasing(0.1)\nqubit q;",
            "1:1 a noise annotation on a declaration",
        ),
        (
            "bit c;\n@noise dephasing(0.1)\nc = true;",
            "2:1 a noise annotation on an assignment",
        ),
        (
            "bit c; qubit q;\n@noise dephasing(0.1)\nif (c) x q;",
            "2:1 a noise annotation on an `if`",
        ),
        (
            "qubit q;\n@noise dephasing(0.1)\nfor int i in [0:1] x q;",
            "2:1 a noise annotation on a `for` loop",
        ),
        (
            "@noise dephasing(0.1)\ngate g a { x a; }",
            "1:1 a noise annotation on a gate definition",
        ),
        (
            "qubit q;\n@check\nx q;",
            "2:1 `@check` and `@logical` belong to the declaration",
        ),
        ("@check\nqubit q;", "1:1 `@check` and `@logical` belong"),
        ("@check\n@logical\nbit c;", "2:1 a register is either"),
        ("@check c\nbit c;", "1:8 this annotation takes no arguments"),
        (
            "qubit q; x q;\n@noise dephasing(0.1)",
            "2:1 an annotation with no statement",
        ),
        (
            "qubit q; bit c; if (c) { x q;\n@noise dephasing(0.1)\n}",
            "2:1 an annotation with no",
        ),
        (
            "qubit q;\n@noise dephasing\nx q;",
            "2:17 expected `(` after the channel `dephasing`",
        ),
        (
            "qubit q;\n@noise 3(0.1)\nx q;",
            "2:8 expected the name of a channel",
        ),
        (
            "qubit q;\n@noise dephasing(0.1) x q;\ny q;",
            "2:23 expected nothing more on the line",
        ),
        (
            "qubit q;\n@noise dephasing(0.1\nx q;",
            "2:21 expected `)`, found the end",
        ),
        (
            "qubit q; bit c;\n@noise dephasing(c + 1)\nx q;",
            "2:18 `+` does not apply",
        ),
        (
            "qubit q;\n@noise dephasing(1/0)\nx q;",
            "2:18 division by zero",
        ),
        ("qubit q;\n@\nx q;", "2:1 an annotation without a name"),
        (
            "qubit q;\n@noise dephasing(0.1)\ngphase(0.1);",
            "3:1 noise on a statement that acts on no",
        ),
        (
            "gate g a {\n@noise dephasing(0.1)\nx a; }\nqubit[2] q; ctrl @ g q[0], q[1];",
            "4:13 `ctrl` on `g`, whose body carries noise",
        ),
        (
            "gate g a {\n@noise dephasing(0.1)\nx a; }\ngate h2 a, b {\nctrl @ g a, b; }",
            "5:1 `ctrl` on `g`, whose body carries noise",
        ),
    ] {
        let errors = listed(source, &read(source).unwrap_err());
        assert!(errors[0].starts_with(expected), "{source}\n{errors:?}");
        assert_eq!(errors.len(), 1, "{source}\n{errors:?}");
    }
}

#[test]
fn channels_of_the_noise_file() {
    let text = "over-rotation(axis=x, pi / 4 + 2**-1)";
    let call = parse_channel(text).unwrap();
    let angle = std::f64::consts::FRAC_PI_4 + 0.5;
    assert_eq!(channel(&call), format!("over-rotation(axis=x, {angle})"));
    assert_eq!(call.arguments[1].span.start, 22);
    let call = parse_channel(" relaxation(80us, 1.5e2 us) ").unwrap();
    assert_eq!(call.name, "relaxation");
    assert_eq!(call.span.start, 1);
    assert_eq!(call.arguments[1].value, ChannelValue::Duration(1.5e2 / 1e6));
    assert_eq!(channel(&parse_channel("a-b-c()").unwrap()), "a-b-c()");
    assert_eq!(channel(&parse_channel("x(y)").unwrap()), "x(y)");
    for (text, expected) in [
        (
            "",
            "1:1 expected the name of a channel, found the end of the text",
        ),
        ("dephasing(0.1) y", "1:16 expected nothing more"),
        ("dephasing(0.1", "1:14 expected `)`"),
        ("dephasing(p + 1)", "1:11 `p` is not declared"),
        ("dephasing(10dt)", "1:11 a duration in `dt`"),
        ("dephasing(1 +)", "1:14 expected an expression, found `)`"),
        ("deph asing(1)", "1:6 expected `(`"),
        ("dephasing(true)", "1:11 an argument of a channel"),
    ] {
        let error = parse_channel(text).unwrap_err();
        let shown = listed(text, &[error]);
        assert!(shown[0].starts_with(expected), "{text}\n{shown:?}");
    }
}
