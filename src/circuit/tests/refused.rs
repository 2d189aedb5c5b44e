//! Texts that are refused: place, what was found, what to do.

use super::super::{ParseOptions, parse};
use super::{listed, read};

/// Texts with the beginning of their only error and a part of its advice.
const CORPUS: &str = include_str!("refused.txt");

/// Text, beginning of the error, part of the advice.
fn corpus() -> Vec<(String, String, String)> {
    let blocks = CORPUS.split("\n\n").skip(1);
    blocks
        .map(|block| {
            let mut case = (String::new(), String::new(), String::new());
            for line in block.lines() {
                match line.split_at(5) {
                    ("text ", text) => case.0 = text.to_owned(),
                    ("     ", more) => case.0 = format!("{}\n{more}", case.0),
                    ("says ", message) => case.1 = message.to_owned(),
                    ("help ", advice) => case.2 = advice.to_owned(),
                    other => panic!("{other:?}"),
                }
            }
            case
        })
        .collect()
}

#[test]
fn every_text_has_its_one_error() {
    let corpus = corpus();
    assert!(corpus.len() > 140);
    let mut wrong = Vec::new();
    for (source, expected, advice) in &corpus {
        let Err(errors) = read(source) else {
            wrong.push(format!("accepted: {source}"));
            continue;
        };
        let shown = listed(source, &errors);
        if shown.len() != 1
            || !shown[0].starts_with(expected)
            || !shown[0].contains(advice.as_str())
        {
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
fn values_of_inputs_that_could_not_be_read_are_not_reported() {
    let mut options = ParseOptions::default();
    options.set.insert("theta".into(), 0.25);
    let errors = parse("t", "input flot theta; qubit q; rx(theta) q;", &options).unwrap_err();
    assert_eq!(errors.len(), 1, "{errors:?}");
    let source = format!("{} input float theta;", "; ".repeat(50));
    let errors = parse("t", &source, &options).unwrap_err();
    assert!(
        errors.iter().all(|error| error.span.is_some()),
        "{errors:?}"
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
