//! Noise files that are wrong, with the place and the message of each.

use crate::circuit::{Severity, Source};

use super::*;

/// Line, column and a part of message or help, for every error of the text.
#[track_caller]
fn wrong(text: &str, expected: &[(usize, usize, &str)]) {
    let errors = NoiseFile::parse(text).expect_err("should be refused");
    let places: Vec<(usize, usize)> = errors
        .iter()
        .map(|error| error.span.unwrap().line_and_column(text))
        .collect();
    let expected_places: Vec<(usize, usize)> = expected.iter().map(|e| (e.0, e.1)).collect();
    assert_eq!(places, expected_places, "{text}\n{errors:#?}");
    for (error, (_, _, part)) in errors.iter().zip(expected) {
        assert!(error.to_string().contains(part), "{part}: {error}");
        assert_eq!(error.source, Source::Noise);
        assert_eq!(error.severity, Severity::Error);
        assert!(error.help.is_some(), "{error}");
    }
}

#[test]
fn a_full_file_is_read() {
    let text = r#"
# comment
title = "bench B, cool-down 4"

[[rule]]
on = ["t", "tdg"]
channel = "dephasing(0.01)"
place = "after"
qubits = [0, "q[3]"]

[[rule]]
on = ["measure"]
channel = 'readout-flip(0.01, 0.02)'
"#;
    let file = NoiseFile::parse(text).unwrap();
    assert_eq!(file.title.as_deref(), Some("bench B, cool-down 4"));
    assert_eq!(file.rules.len(), 2);
    assert_eq!(&*file.source, text);
    assert!(NoiseFile::parse("").unwrap().rules.is_empty());
}

#[test]
fn keys_that_do_not_exist() {
    wrong("titel = \"x\"\n", &[(1, 1, "did you mean `title`?")]);
    wrong("[[rules]]\n", &[(1, 3, "did you mean `rule`?")]);
    wrong("colour = 3\n", &[(1, 1, "title, rule")]);
    wrong(
        "[[rule]]\non = [\"t\"]\nchanel = \"dephasing(0.1)\"\n",
        &[(1, 1, "no `channel`"), (3, 1, "did you mean `channel`?")],
    );
    wrong(
        "[[rule]]\non = [\"t\"]\nchannel = \"dephasing(0.1)\"\n\"place \" = \"after\"\n",
        &[(4, 1, "did you mean `place`?")],
    );
}

#[test]
fn values_of_the_wrong_type() {
    wrong(
        "title = 3\n",
        &[(1, 9, "`title` is an integer, expected a string")],
    );
    wrong("rule = 3\n", &[(1, 8, "`rule` is an integer")]);
    wrong("rule = [1.5]\n", &[(1, 9, "`rule` is a float")]);
    wrong(
        "[rule]\non = [\"t\"]\n",
        &[(1, 1, "start every rule with a line [[rule]]")],
    );
    wrong(
        "[[rule]]\non = \"t\"\nchannel = [\"dephasing(0.1)\"]\nplace = true\nqubits = 3\n",
        &[
            (2, 6, "`on` is a string"),
            (3, 11, "`channel` is a list"),
            (4, 9, "`place` is a Boolean"),
            (5, 10, "`qubits` is an integer"),
        ],
    );
    wrong(
        "[[rule]]\non = [\"t\", 5]\nchannel = \"dephasing(0.1)\"\nqubits = [0, 1.0, 1979-05-27]\n",
        &[
            (2, 12, "`on` is an integer"),
            (4, 14, "`qubits` is a float"),
            (4, 19, "`qubits` is a date or time"),
        ],
    );
}

#[test]
fn values_out_of_range() {
    let qubits = |list: &str| rule("[\"t\"]", "dephasing(0.1)", &format!("qubits = {list}"));
    wrong(&qubits("[-1]"), &[(4, 11, "-1 is no qubit index")]);
    wrong(
        &qubits("[0, 99999999999999999999999]"),
        &[(4, 14, "is no qubit index")],
    );
    wrong(
        &rule("[\"t\"]", "dephasing(0.1)", "place = \"During\""),
        &[(4, 9, "\"During\"")],
    );
    wrong(
        &rule("[]", "dephasing(0.1)", ""),
        &[(2, 6, "`on` is empty")],
    );
}

#[test]
fn channels_that_are_wrong() {
    let channel = |text: &str| rule("[\"measure\"]", text, "");
    // The place is inside the string.
    wrong(
        &channel("dephasing(1.5)"),
        &[(3, 22, "from 0 to 1, found the number 1.5")],
    );
    wrong(
        &channel("readout-flip(0.1, -0.25)"),
        &[(3, 30, "found the number -0.25")],
    );
    wrong(
        &channel("depolarising(0.1)"),
        &[(3, 12, "did you mean `depolarizing`?")],
    );
    wrong(
        &channel("relaxation(80us, 200us, 1us)"),
        &[(3, 29, "longer than 2·t1")],
    );
    wrong(&channel("pauli(X=0.5, Y=0.6)"), &[(3, 12, "sum to 1.1")]);
    wrong(
        &channel("over-rotation(q, 0.1)"),
        &[(3, 26, "expected an axis")],
    );
    // A string with an escape is named whole.
    wrong(
        "[[rule]]\non = [\"t\"]\nchannel = \"dephasing\\u0028 1.5)\"\n",
        &[(3, 11, "found the number 1.5")],
    );
    wrong(
        "[[rule]]\non = [\"t\"]\nchannel = '''dephasing(1.5)'''\n",
        &[(3, 24, "found the number 1.5")],
    );
    wrong("[[rule]]\non = [\"t\"]\nchannel = \"\"\n", &[(3, 11, "")]);
}

#[test]
fn channels_that_need_another_statement() {
    wrong(
        &rule("[\"measure\", \"t\"]", "readout-flip(0.1)", ""),
        &[(3, 11, "on `measure` only")],
    );
    wrong(
        &rule("[\"measure\"]", "readout-flip(0.1)", "place = \"before\""),
        &[(3, 11, "cannot come before the measurement")],
    );
    wrong(
        &rule("[\"delay\", \"one-qubit\"]", "relaxation(80us, 60us)", ""),
        &[(3, 11, "on `delay` only")],
    );
    assert!(NoiseFile::parse(&rule("[\"delay\"]", "relaxation(80us, 60us)", "")).is_ok());
    assert!(NoiseFile::parse(&rule("[\"t\"]", "relaxation(80us, 60us, 1us)", "")).is_ok());
}

#[test]
fn text_that_is_no_toml() {
    for (text, line) in [
        ("[[rule]\n", 1),
        ("title = \"open\n", 1),
        ("a = 1\na = 2\n", 2),
        ("title = \n", 1),
        ("[[rule]]\non = [\"t\"\nchannel = 3\n", 3),
        ("\u{0}", 1),
    ] {
        let errors = NoiseFile::parse(text).expect_err(text);
        let first = &errors[0];
        assert!(first.message.starts_with("not valid TOML"), "{first}");
        let place = first.span.unwrap().line_and_column(text);
        assert_eq!(place.0, line, "{text:?}: {first}");
    }
}

#[test]
fn no_text_makes_the_reader_panic() {
    // Every prefix of a good file, every byte of it replaced, and deep nesting.
    let good = "title = \"é\"\n[[rule]]\non = [\"t\", \"two-qubit\"]\nchannel = \"relaxation(80us, 60us, time=1us)\"\nplace = 'before'\nqubits = [0, \"q[3]\"]\n";
    for end in (0..=good.len()).filter(|&end| good.is_char_boundary(end)) {
        let _ = NoiseFile::parse(&good[..end]);
    }
    for (place, letter) in good.char_indices() {
        for other in [
            '"', '(', ')', '[', '=', '\\', ',', '-', '.', 'é', '\u{0}', '9',
        ] {
            let rest = &good[place + letter.len_utf8()..];
            let _ = NoiseFile::parse(&format!("{}{other}{rest}", &good[..place]));
        }
    }
    let nested = format!("rule = {}", "[".repeat(100_000));
    assert!(NoiseFile::parse(&nested).is_err());
    let channel = format!("pauli({})", "(".repeat(100_000));
    assert!(NoiseFile::parse(&rule("[\"t\"]", &channel, "")).is_err());
}
