//! What a user sees at the command line: exit status, messages, files,
//! reproducibility and interruption. Common practice of well-behaved command-line
//! programs, no source.

use std::time::{Duration, Instant};

use super::program::{Folder, call, command, fail, stderr, succeed, tables};

const CIRCUIT: &str = "\
OPENQASM 3.0;
include \"stdgates.inc\";
qubit[4] q;
bit[4] c;
@check
bit[1] parity;
h q;
ccx q[0], q[1], q[2];
@noise depolarizing(0.05)
t q[2];
cx q[2], q[3];
@noise depolarizing(0.1)
t q[3];
h q;
c = measure q;
parity[0] = c[0] ^ c[1];
";

/// A folder with the circuit; path of the circuit and of the output.
fn prepared() -> (Folder, String, String) {
    let folder = Folder::new();
    let circuit = folder.write("circuit.qasm", CIRCUIT);
    let out = folder.text("out.h5");
    (folder, circuit, out)
}

/// Draws the circuit into a file of the folder; returns all datasets with bits.
fn drawn(folder: &Folder, out: &str, options: &[&str]) -> Vec<(String, usize, Vec<bool>)> {
    let (circuit, path) = (folder.text("circuit.qasm"), folder.text(out));
    let mut arguments = vec!["run", &circuit, "--out", &path, "--quiet"];
    arguments.extend(options);
    succeed(&arguments);
    let mut all = tables(&folder.path(out), "shots");
    all.extend(tables(&folder.path(out), "companion"));
    all
}

#[test]
fn a_run_succeeds_and_can_be_shown() {
    let (folder, circuit, out) = prepared();
    let summary = succeed(&[
        "run", &circuit, "--shots", "500", "--seed", "3", "--out", &out,
    ]);
    assert!(summary.contains("500"), "{summary}");
    let shots = tables(&folder.path("out.h5"), "shots");
    let shapes: Vec<_> = shots
        .iter()
        .map(|(n, rows, b)| (n.as_str(), *rows, b.len()))
        .collect();
    assert_eq!(shapes, [("c", 500, 2000), ("parity", 500, 500)]);
    let shown = succeed(&["show", &out]);
    assert!(shown.contains("500") && shown.contains("parity"), "{shown}");
}

#[test]
fn json_can_be_parsed() {
    let (_folder, circuit, out) = prepared();
    let run = [
        "run", &circuit, "--shots", "200", "--seed", "3", "--out", &out, "--json",
    ];
    for text in [succeed(&run), succeed(&["show", &out, "--json"])] {
        let value: serde_json::Value = serde_json::from_str(&text).expect("one JSON value");
        assert_eq!(value["seed"], 3, "{text}");
        assert_eq!(value["shots"], 200, "{text}");
    }
}

#[test]
fn help_and_version_succeed() {
    for arguments in [
        vec!["--help"],
        vec!["--version"],
        vec!["run", "--help"],
        vec!["show", "--help"],
    ] {
        assert!(!succeed(&arguments).is_empty());
    }
}

#[test]
fn wrong_options_exit_with_2_and_write_nothing() {
    let (folder, circuit, out) = prepared();
    for (options, named) in [
        (vec!["--shots", "many"], "--shots"),
        (vec!["--shots", "-5"], "-5"),
        (vec!["--shots", "10", "--delta", "0"], "--delta"),
        (vec!["--shots", "10", "--delta", "nan"], "--delta"),
        (vec!["--shots", "10", "--terms", "0"], "--terms"),
        (vec!["--shots", "10", "--readout", "magic"], "--readout"),
        (vec!["--shots", "10", "--part", "3/2"], "--part"),
        (vec!["--shots", "10", "--set", "angle=1"], "angle"),
        (vec!["--shots", "10", "--unknown"], "--unknown"),
    ] {
        let mut arguments = vec!["run", &circuit, "--out", &out];
        arguments.extend(&options);
        let message = fail(2, &arguments);
        assert!(message.contains(named), "{message}");
        assert!(!folder.path("out.h5").exists());
    }
    fail(2, &[]);
    fail(2, &["run"]);
}

#[test]
fn a_missing_file_is_named() {
    let (folder, circuit, out) = prepared();
    let missing = folder.text("absent.qasm");
    let message = fail(2, &["run", &missing, "--shots", "10", "--out", &out]);
    assert!(message.contains("absent.qasm"), "{message}");
    let noise = folder.text("absent.toml");
    let message = fail(
        2,
        &[
            "run", &circuit, "--noise", &noise, "--shots", "10", "--out", &out,
        ],
    );
    assert!(message.contains("absent.toml"), "{message}");
    let message = fail(2, &["show", &folder.text("absent.h5")]);
    assert!(message.contains("absent.h5"), "{message}");
    assert!(!folder.path("out.h5").exists());
}

#[test]
fn a_broken_circuit_is_shown_with_line_and_caret() {
    let (folder, _, out) = prepared();
    let broken = CIRCUIT.replace("cx q[2], q[3];", "cx q[2], q[9];");
    let file = folder.write("broken.qasm", &broken);
    let message = fail(2, &["run", &file, "--shots", "10", "--out", &out]);
    assert!(message.contains("broken.qasm:11:"), "{message}");
    assert!(
        message.contains("cx q[2], q[9];"),
        "the line itself: {message}"
    );
    assert!(
        message.contains('^') || message.contains('─') || message.contains('┬'),
        "{message}"
    );
    assert!(!folder.path("out.h5").exists());
}

#[test]
fn a_broken_noise_file_is_shown_with_its_position() {
    let (folder, circuit, out) = prepared();
    for (line, rule) in [
        (3, "[[rule]]\non = [\"t\"]\nchannel = \"dephasing(1.5)\"\n"),
        (3, "[[rule]]\non = [\"t\"]\nchannel = \"fading(0.1)\"\n"),
        (
            4,
            "[[rule]]\non = [\"t\"]\nchannel = \"dephasing(0.1)\"\ncolour = \"blue\"\n",
        ),
        (2, "[[rule]]\non = [\"t\"\nchannel = 3\n"),
    ] {
        let noise = folder.write("noise.toml", rule);
        let arguments = [
            "run", &circuit, "--noise", &noise, "--shots", "10", "--out", &out,
        ];
        let message = fail(2, &arguments);
        // A TOML error may be noticed one line later.
        let found = (line..line + 2).any(|l| message.contains(&format!("noise.toml:{l}:")));
        assert!(found, "line {line}: {message}");
        assert!(!folder.path("out.h5").exists());
    }
}

#[test]
fn an_existing_output_is_kept_without_force() {
    let (folder, circuit, out) = prepared();
    std::fs::write(&out, "precious").expect("a file");
    let message = fail(2, &["run", &circuit, "--shots", "10", "--out", &out]);
    assert!(message.contains("--force"), "{message}");
    assert_eq!(std::fs::read(&out).expect("the file"), b"precious");
    drawn(&folder, "out.h5", &["--shots", "10", "--force"]);
}

#[test]
fn an_output_that_cannot_be_written_is_named() {
    let (_folder, circuit, out) = prepared();
    let nowhere = out.replace("out.h5", "absent-directory/out.h5");
    let output = call(&["run", &circuit, "--shots", "10", "--out", &nowhere]);
    assert!(
        matches!(output.status.code(), Some(1 | 2)),
        "{}",
        stderr(&output)
    );
    assert!(
        stderr(&output).contains("absent-directory"),
        "{}",
        stderr(&output)
    );
}

#[test]
fn hostile_input_fails_soon_and_in_order() {
    let (folder, _, out) = prepared();
    let nested = format!(
        "qubit q;\nrx({}1{}) q;\n",
        "(".repeat(100_000),
        ")".repeat(100_000)
    );
    let minus = format!("qubit q;\nrx({}1) q;\n", "-".repeat(100_000));
    let blocks = format!(
        "bit c;\n{}{}",
        "if (c) {".repeat(50_000),
        "}".repeat(50_000)
    );
    let powers = "gate a q { x q; x q; }\n".to_owned()
        + &(0..60)
            .map(|i| {
                format!(
                    "gate a{i} q {{ {p} q; {p} q; }}\n",
                    p = if i == 0 {
                        "a".to_owned()
                    } else {
                        format!("a{}", i - 1)
                    }
                )
            })
            .collect::<String>()
        + "qubit q;\na59 q;\n";
    let loops = "qubit q;\nfor int i in [0:1000000000000] { x q; }\n".to_owned();
    let wide = "qubit[1000000000000] q;\n".to_owned();
    for (name, text) in [
        ("nested", nested),
        ("minus", minus),
        ("blocks", blocks),
        ("powers", powers),
        ("loops", loops),
        ("wide", wide),
    ] {
        let file = folder.write(&format!("{name}.qasm"), &text);
        let start = Instant::now();
        fail(2, &["run", &file, "--shots", "10", "--out", &out]);
        let time = start.elapsed();
        // Most of this is unrolling to the limit in an unoptimised build.
        assert!(
            time < Duration::from_secs(if name == "nested" { 1 } else { 10 }),
            "{name}: {time:?}"
        );
    }
}

#[test]
fn a_torn_circuit_never_panics() {
    let folder = Folder::new();
    let out = folder.text("out.h5");
    for length in (0..CIRCUIT.len()).step_by(7) {
        let file = folder.write("torn.qasm", &CIRCUIT[..length]);
        let output = call(&[
            "run", &file, "--shots", "1", "--out", &out, "--force", "--quiet",
        ]);
        assert!(
            matches!(output.status.code(), Some(0 | 2)),
            "{length}: {}",
            stderr(&output)
        );
    }
    std::fs::write(folder.path("torn.qasm"), b"qubit q;\n// \xff\xfe\0\n").expect("a file");
    fail(
        2,
        &[
            "run",
            &folder.text("torn.qasm"),
            "--shots",
            "1",
            "--out",
            &out,
            "--force",
        ],
    );
}

#[test]
fn terms_that_do_not_fit_are_refused() {
    let (folder, circuit, out) = prepared();
    let terms = "4000000000000000";
    let message = fail(
        2,
        &[
            "run",
            &circuit,
            "--shots",
            "10",
            "--out",
            &out,
            "--readout",
            "probe",
            "--terms",
            terms,
        ],
    );
    assert!(message.contains("terms"), "{message}");
    assert!(!folder.path("out.h5").exists());
}

#[test]
fn the_same_seed_gives_the_same_bits() {
    let (folder, ..) = prepared();
    for readout in ["dense", "probe"] {
        let common = [
            "--shots",
            "3000",
            "--readout",
            readout,
            "--terms",
            "6",
            "--companion",
            "2000",
        ];
        let with = |out: &str, more: &[&str]| drawn(&folder, out, &[&common, more].concat());
        let one = with("one.h5", &["--seed", "5", "--threads", "1", "--force"]);
        let two = with("two.h5", &["--seed", "5", "--threads", "2", "--force"]);
        let other = with("other.h5", &["--seed", "6", "--force"]);
        assert_eq!(one.len(), 4);
        assert_eq!(one, two, "{readout}");
        assert_ne!(one, other, "{readout}");
    }
}

#[test]
fn parts_add_up_to_the_whole() {
    let (folder, ..) = prepared();
    for readout in ["dense", "probe"] {
        let part = |out: &str, more: &[&str]| {
            let mut options = vec![
                "--shots",
                "2001",
                "--seed",
                "8",
                "--readout",
                readout,
                "--force",
            ];
            options.extend(["--terms", "6", "--companion", "1000"]);
            options.extend(more);
            drawn(&folder, out, &options)
        };
        let whole = part("whole.h5", &[]);
        let pieces: Vec<_> = ["1/3", "2/3", "3/3"]
            .iter()
            .map(|p| part("part.h5", &["--part", p]))
            .collect();
        for (index, (name, rows, bits)) in whole.iter().enumerate() {
            let joined: Vec<bool> = pieces.iter().flat_map(|p| p[index].2.clone()).collect();
            assert_eq!(pieces.iter().map(|p| p[index].1).sum::<usize>(), *rows);
            assert!(joined == *bits, "{readout} {name}");
        }
    }
}

/// Ctrl-C keeps what is finished: a file of fewer shots, the same ones a run of
/// that length would draw.
#[cfg(unix)]
#[test]
fn an_interrupted_run_keeps_its_finished_shots() {
    let (folder, circuit, out) = prepared();
    let arguments = [
        "run",
        &circuit,
        "--out",
        &out,
        "--seed",
        "9",
        "--readout",
        "dense",
        "--shots",
        "3000000000",
    ];
    let child = command(&arguments)
        .stdout(std::process::Stdio::null())
        .stderr(std::process::Stdio::piped())
        .spawn()
        .expect("the binary starts");
    std::thread::sleep(Duration::from_secs(3));
    let sent = std::process::Command::new("kill")
        .args(["-INT", &child.id().to_string()])
        .status()
        .expect("kill is there");
    assert!(sent.success());
    let start = Instant::now();
    let output = child.wait_with_output().expect("the end");
    assert_eq!(output.status.code(), Some(130), "{}", stderr(&output));
    assert!(
        start.elapsed() < Duration::from_secs(10),
        "{:?}",
        start.elapsed()
    );
    let kept = tables(&folder.path("out.h5"), "shots");
    assert_eq!(folder.names(), ["circuit.qasm", "out.h5"]);
    let rows = kept[0].1;
    assert!(rows > 0 && rows < 3_000_000_000, "{rows} shots");
    assert!(
        stderr(&output).contains(&rows.to_string()),
        "{rows}: {}",
        stderr(&output)
    );
    let same = drawn(
        &folder,
        "again.h5",
        &[
            "--seed",
            "9",
            "--readout",
            "dense",
            "--shots",
            &rows.to_string(),
        ],
    );
    assert!(kept == same[..kept.len()], "not the first {rows} shots");
}
