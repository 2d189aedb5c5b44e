//! Inputs made to run away: each ends with a clear error, soon.

use super::super::limits::{MAX_NESTING, MAX_SOURCE};
use super::super::{Circuit, Diagnostic, ParseOptions, parse};
use super::{circuit, read};

/// Parses with a small limit on operations, so that steps and bytes are few too.
fn read_small(source: &str) -> Result<Circuit, Vec<Diagnostic>> {
    let options = ParseOptions {
        max_operations: 50_000,
        ..ParseOptions::default()
    };
    parse("t", source, &options)
}

/// The message of the only error.
#[track_caller]
fn message(source: &str) -> String {
    only(read(source))
}

#[track_caller]
fn only(result: Result<Circuit, Vec<Diagnostic>>) -> String {
    let errors = result.unwrap_err();
    assert_eq!(errors.len(), 1, "{errors:?}");
    errors[0].message.clone()
}

#[test]
fn operations_are_limited() {
    let limited = |operations, source: &str| {
        let options = ParseOptions {
            max_operations: operations,
            ..ParseOptions::default()
        };
        parse("t", source, &options)
    };
    let source = "qubit q; for int i in [1:10] x q;";
    assert_eq!(limited(10, source).unwrap().operations.len(), 10);
    let errors = limited(9, source).unwrap_err();
    assert_eq!(errors.len(), 1);
    assert!(errors[0].message.contains("more than 9 operations"));
    assert!(errors[0].help.as_ref().unwrap().contains("--max-ops"));
}

#[test]
fn a_million_operations_are_allowed_and_no_more() {
    let source = "qubit q; for int i in [1:1000] { for int j in [1:1000] { x q; } }";
    assert_eq!(circuit(source).operations.len(), 1_000_000);
    let more = format!("{source} x q;");
    assert!(message(&more).contains("more than 1,000,000 operations"));
}

#[test]
fn long_loops_end() {
    for source in [
        "for int i in [0:1000000000000] { }",
        "qubit q; for int i in [0:1000000000000] { barrier q; }",
        "qubit q; for int i in [0:1000000000000] { pow(0) @ x q; }",
        "for int i in [0:100000] { for int j in [0:100000] { if (i > j) { } } }",
        "gate g a { for int i in [0:1000000000000] { } } qubit q; g q;",
        "gate g a { for int i in [0:1000000000000] { barrier a; } } qubit q; g q;",
        "gate g a { gphase(1); } qubit q; for int i in [0:1000000000000] { const int n = i; }",
    ] {
        assert!(only(read_small(source)).contains("steps"), "{source}");
    }
    for source in [
        "qubit q; pow(1000000000) @ x q;",
        "qubit q; pow(-1000000000) @ x q;",
        "qubit q; pow(1000000000) @ pow(1000000000) @ x q;",
        "gate g a { } qubit q; pow(1000000000) @ g q;",
        "qubit[4096] q; for int i in [0:1000000000000] { x q; }",
        "qubit q; bit c; for int i in [0:1000000000000] { if (c) { } }",
    ] {
        assert!(only(read_small(source)).contains("operations"), "{source}");
    }
    let far = "170141183460469231731687303715884105727";
    let source = format!("for int i in [0:{far}] {{ }}");
    assert!(read(&source).is_err());
    let source = format!("for int i in [-{far}:{far}] {{ }}");
    assert!(message(&source).contains("too long"));
    assert!(message("qubit q; pow(100000000000000000000) @ x q;").contains("too large"));
}

#[test]
fn gates_that_double_end() {
    let mut source = String::from("gate g0 a { x a; }\n");
    for level in 1..=100 {
        let before = level - 1;
        source.push_str(&format!(
            "gate g{level} a {{ g{before} a; g{before} a; }}\n"
        ));
    }
    assert!(read(&source).is_ok());
    source.push_str("qubit q; g100 q;");
    assert!(only(read_small(&source)).contains("operations"));
}

#[test]
fn chains_of_gates_are_limited() {
    let mut source = String::from("gate g0 a { x a; }\n");
    for level in 1..=MAX_NESTING {
        source.push_str(&format!("gate g{level} a {{ g{} a; }}\n", level - 1));
    }
    assert!(message(&source).contains("200 levels of gates"));
    let called = source.replace("gate g200 a { g199 a; }\n", "qubit q; g199 q;");
    assert_eq!(circuit(&called).operations.len(), 401);
    let nested = format!(
        "{} for int i in [0:0] {{ g199 q; }}",
        called.replace("g199 q;", "")
    );
    assert!(message(&nested).contains("200 levels of blocks and gate calls"));
}

#[test]
fn nesting_is_limited() {
    let many = 100_000;
    for (open, middle, close) in [
        ("(", "1", ")"),
        ("sin(", "1", ")"),
        ("int(", "1", ")"),
        ("-", "1", ""),
        ("!", "true", ""),
        ("c[", "0", "]"),
        ("int[", "8", "](1)"),
    ] {
        let source = format!(
            "qubit q; bit[2] c; rx({}{middle}{}) q;",
            open.repeat(many),
            close.repeat(many)
        );
        let text = message(&source);
        assert!(text.contains("200"), "{open} {text}");
    }
    for (open, close) in [
        ("if (c) {", "}"),
        ("if (c) ", "x q;"),
        ("if (c) x q; else ", "x q;"),
        ("for int i in [0:0] {", "}"),
        ("for int i in [0:0] ", "x q;"),
    ] {
        let source = format!("qubit q; bit c; {}{close}", open.repeat(many));
        let errors = read(&source).unwrap_err();
        assert!(
            errors[0].message.contains("200 levels"),
            "{open} {errors:?}"
        );
    }
    let braces = "{".repeat(many);
    assert!(read(&braces).is_err());
    assert!(read(&"}".repeat(many)).is_err());
    assert!(read(&"[".repeat(many)).is_err());
}

#[test]
fn nesting_up_to_the_limit_is_accepted() {
    let levels = MAX_NESTING - 1;
    let parentheses = format!(
        "qubit q; rx({}1{}) q;",
        "(1+".repeat(levels),
        ")".repeat(levels)
    );
    assert!(read(&parentheses).is_ok());
    let powers = format!("qubit q; rx({}1) q;", "1 ** ".repeat(10_000));
    assert!(read(&powers).is_ok());
    let blocks = format!(
        "qubit q; bit c; {} x q; {}",
        "if (c) { ".repeat(levels),
        "} ".repeat(levels)
    );
    assert_eq!(circuit(&blocks).operations.len(), levels + 1);
    let bits = format!(
        "bit[2] c; bit d; d = {}c[0]{};",
        "!(c[1] & ".repeat(levels - 1),
        ")".repeat(levels - 1)
    );
    assert_eq!(circuit(&bits).operations.len(), 1);
}

#[test]
fn long_expressions_are_limited() {
    let long = |terms: usize| format!("bit[2] c; bit d; d = c[0]{};", " ^ c[1]".repeat(terms));
    assert_eq!(circuit(&long(40_000)).operations.len(), 1);
    assert!(message(&long(60_000)).contains("more than 100000 operands and operators"));
    // Wide registers in long expressions, and long expressions in loops.
    let wide = format!("bit[500000] c; c = c{};", " ^ c".repeat(40_000));
    assert!(only(read_small(&wide)).contains("steps"));
    let repeated = format!(
        "bit[2] c; bit d; for int i in [1:900000] {{ d = c[0]{}; }}",
        " ^ c[1]".repeat(10_000)
    );
    assert!(only(read_small(&repeated)).contains("steps"));
}

#[test]
fn memory_of_the_unrolled_circuit_is_limited() {
    let barrier = "qubit[4096] q; for int i in [1:900000] {
        @noise depolarizing(0.1)
        barrier q; }";
    assert!(only(read_small(barrier)).contains("steps"));
    let annotations = format!(
        "qubit q; for int i in [1:900000] {{ {} x q; }}",
        "@noise pauli(X=0.1, Y=0.1, Z=0.1)\n".repeat(900)
    );
    assert!(only(read_small(&annotations)).contains("MiB"));
    let compared = "bit[900000] c; bit d; for int i in [1:900000] { d = c == 1; }";
    assert!(only(read_small(compared)).contains("steps"));
    let aliases: String = (0..100_000)
        .map(|index| format!("let a{index} = q;\n"))
        .collect();
    assert!(only(read_small(&format!("qubit[4096] q; {aliases}"))).contains("steps"));
    let blocks = "qubit[4096] q; for int i in [1:3000] { let a = q; }";
    assert!(read(blocks).is_ok());
}

#[test]
fn sizes_are_limited() {
    assert!(message("qubit[4097] q;").contains("more than 4,096 qubits"));
    assert!(message("qubit[4000] q; qubit[97] r;").contains("more than 4,096 qubits"));
    assert!(message("qubit[100000000000000000000] q;").contains("4,096 qubits"));
    assert!(message("bit[1000001] c;").contains("more than 1,000,000 classical bits"));
    assert!(message("bit[600000] c; bit[600000] d;").contains("classical bits"));
    // The copy needs as many hidden bits.
    assert!(message("bit[600000] c; c = c[-1:-1:0];").contains("classical bits"));
    assert_eq!(circuit("qubit[4096] q;").qubits.len(), 4096);
    assert_eq!(circuit("bit[1000000] c;").bits, 1_000_000);
}

#[test]
fn the_text_is_limited() {
    let comment = format!("//{}", " ".repeat(MAX_SOURCE));
    let text = message(&comment);
    assert!(text.contains("more than 16 MiB"), "{text}");
    // The longest text of single statements is read through.
    let statements = ";".repeat(MAX_SOURCE);
    assert_eq!(read(&statements).unwrap_err().len(), 20);
    let body = format!("gate g a {{ {} }}", "x a;".repeat(MAX_SOURCE / 4 - 100));
    assert!(
        read(&body).unwrap_err()[0]
            .message
            .contains("more than 4000000")
    );
    let annotated = "@noise x(1)\n".repeat(MAX_SOURCE / 12);
    assert!(message(&annotated).contains("more than 1000 annotations"));
    let unknown = circuit(&format!("{} qubit q;", "@other\n".repeat(MAX_SOURCE / 8)));
    assert!(unknown.warnings.len() < 100);
}
