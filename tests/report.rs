//! The summary of a result file, against numbers worked out by hand.

use std::path::Path;

use shottower::report::Summary;
use shottower::sampler::{NormAudit, Rows};
use shottower::store::{
    AuditBlock, Finished, Header, Part, ReductionHeader, RegisterHeader, ShotFile, SiteRow, Writer,
    WriterOptions,
};

fn register(name: &str, role: &str, width: usize) -> RegisterHeader {
    RegisterHeader {
        name: name.into(),
        role: role.into(),
        width,
    }
}

fn site(kept: bool) -> SiteRow {
    SiteRow {
        line: 3,
        qubits: "q[0]".into(),
        kind: "rotation".into(),
        extent_without_noise: 1.171572875254,
        extent: 1.159857146501,
        members: 2,
        kept,
    }
}

/// 100 shots and 50 companion shots at λ = 1/3 of a register of each role:
/// "syndrome" has weight 2 in 30 shots (20 of the companion), "answer" reads 01
/// in 60 (20), "out" reads 101 in 50 (10), 011 in 40 (40), 000 in the rest.
fn write(path: &Path, change: impl FnOnce(&mut Header)) -> ShotFile {
    let mut header = Header {
        circuit_name: "bench.qasm".into(),
        circuit: "qubit[5] q;".into(),
        noise_name: Some("bench.toml".into()),
        title: Some("bench B".into()),
        qubits: Some(5),
        seed: 42,
        delta: Some(0.5),
        readout: "walk".into(),
        log_extent: 3f64.ln(),
        terms: Some(7),
        mixing_weight: 1.0 / 3.0,
        shots_total: 100,
        settings: vec![("absorb".into(), "on".into())],
        registers: vec![
            register("syndrome", "check", 4),
            register("answer", "logical", 2),
            register("out", "record", 3),
        ],
        sites: vec![site(true), site(true), site(false)],
        ..Header::default()
    };
    change(&mut header);
    let block = |shots: usize, check: usize, logical: usize, first: usize, second: usize| {
        let mut block = Rows::zeros(shots, 9);
        for shot in 0..shots {
            let mut set = |on: bool, bits: &[usize]| {
                bits.iter()
                    .filter(|_| on)
                    .for_each(|&bit| block.set(shot, bit));
            };
            set(shot < check, &[1, 3]);
            set(shot < logical, &[4]);
            set(shot < first, &[6, 8]);
            set((first..first + second).contains(&shot), &[6, 7]);
        }
        block
    };
    let options = WriterOptions {
        companion: true,
        ..WriterOptions::default()
    };
    let mut writer = Writer::create(path, &header, options).unwrap();
    writer.append_shots(&block(100, 30, 60, 50, 40)).unwrap();
    writer.append_companion(&block(50, 20, 20, 10, 40)).unwrap();
    let audit = AuditBlock {
        attempts: (0..100).map(|shot| 1 + shot % 2).collect(),
        peak_active: (0..100).map(|shot| shot % 8).collect(),
        terms_left: vec![4; 100],
    };
    writer.append_audit(&audit).unwrap();
    // ξ = 3, k = 7: 1 + 2/7 expected. By hand: 32 times each of 1 and 1.5 have the
    // mean 1.25 and the standard error 0.25·√(64/63)/8 = 0.031497.
    let audit = NormAudit {
        shots: (0..64).collect(),
        estimates: (0..64)
            .map(|shot| 1.0 + 0.5 * f64::from(shot % 2))
            .collect(),
        log_extent: 3f64.ln(),
        terms: 7,
        probes: 16,
    };
    writer.write_norms(&audit).unwrap();
    let finished = Finished {
        clipped: 2,
        damped: None,
    };
    writer.finish(finished).unwrap();
    ShotFile::open(path).unwrap()
}

/// Corrected numbers by hand, (p − p'/3)·3/2: any nonzero (0.3 − 0.4/3)·1.5 = 0.25,
/// its error √(0.21/100 + 0.24/50/9)·1.5 = 0.07697; bit 0 of answer
/// (0.6 − 0.4/3)·1.5 = 0.7; 101: (0.5 − 0.2/3)·1.5 = 0.65; 011: (0.4 − 0.8/3)·1.5 =
/// 0.2; 000: (0.1 − 0)·1.5 = 0.15.
#[test]
fn text_for_a_person() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("bench.h5");
    let file = write(&path, |_| ());
    let text = Summary::from_file(&file).unwrap().to_string();
    let text = text.replace(path.to_str().unwrap(), "bench.h5");
    let expected = "\
result      bench.h5
circuit     bench.qasm, 5 qubits
noise file  bench.toml (bench B)
sites       3 non-Clifford places, 1 of them without effect
extent ξ    1.6081 without noise, 3.0000 in this run
precision   δ = 0.5, k = 7 terms, λ = 0.3333 (read-out walk)
shots       100, 50 companion shots
seed        42
settings    absorb=on
sampling    at most 7 active qubits, 1.5 draws a shot, 2 shots clipped
norm check  mean 1.250 ± 0.031 of 64 draws, 1.286 expected: as it should be

syndrome (check, 4 bits)  as drawn           companion          corrected
  any nonzero             0.300 ± 0.046      0.400 ± 0.069      0.250 ± 0.077
  mean weight             0.600 ± 0.092      0.80 ± 0.14        0.50 ± 0.15
  bit 0 is 1              0 (< 3.0e-2)       0 (< 5.8e-2)       0.000 ± 0.018
  bit 1 is 1              0.300 ± 0.046      0.400 ± 0.069      0.250 ± 0.077
  bit 2 is 1              0 (< 3.0e-2)       0 (< 5.8e-2)       0.000 ± 0.018
  bit 3 is 1              0.300 ± 0.046      0.400 ± 0.069      0.250 ± 0.077

answer (logical, 2 bits)  as drawn           companion          corrected
  any nonzero             0.600 ± 0.049      0.400 ± 0.069      0.700 ± 0.081
  bit 0 is 1              0.600 ± 0.049      0.400 ± 0.069      0.700 ± 0.081
  bit 1 is 1              0 (< 3.0e-2)       0 (< 5.8e-2)       0.000 ± 0.018

out (record, 3 bits)      as drawn           companion          corrected
  101                     0.500 ± 0.050      0.200 ± 0.057      0.650 ± 0.080
  011                     0.400 ± 0.049      0.800 ± 0.057      0.200 ± 0.079
  000                     0.100 ± 0.030      0 (< 5.8e-2)       0.150 ± 0.046

± is one standard error; (< or >) is a 95 % limit.
Outcomes are written with bit 0 on the right.
Corrected: (as drawn - λ·companion)/(1 - λ), errors of both propagated.
";
    assert_eq!(text, expected);
    assert!(text.lines().all(|line| line.chars().count() <= 80));
}

/// What came of the non-Clifford gates, where the file tells.
#[test]
fn what_came_of_the_sites() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("bench.h5");
    let file = write(&path, |header| {
        header.reduction = Some(ReductionHeader {
            log_extent_as_written: 9f64.ln(),
            log_extent_after_noise: 5f64.ln(),
            sites_as_written: 12,
            sites_merged: 4,
            sites_deterministic: 1,
            sites_unobservable: 5,
        });
    });
    let summary = Summary::from_file(&file).unwrap();
    let text = summary.to_string();
    for line in [
        "sites       2 left of 12 non-Clifford gates\n",
        "reduced     4 merged, 1 on a known axis, 5 unobservable\n",
        "extent ξ    9.0000 as written, 5.0000 with noise merged, 3.0000 in this run\n",
    ] {
        assert!(text.contains(line), "{text}");
        assert!(line.chars().count() <= 82, "{line}");
    }
    let json: serde_json::Value = serde_json::from_str(&summary.to_json()).unwrap();
    let reduction = &json["sites"]["reduction"];
    assert_eq!(reduction["as_written"], 12);
    assert_eq!(reduction["merged"], 4);
    assert_eq!(reduction["deterministic"], 1);
    assert_eq!(reduction["unobservable"], 5);
    let log10 = reduction["log10_extent_as_written"].as_f64().unwrap();
    assert!((log10 - 9f64.log10()).abs() < 1e-12);
    let log10 = reduction["log10_extent_after_noise"].as_f64().unwrap();
    assert!((log10 - 5f64.log10()).abs() < 1e-12);
}

#[test]
fn json_for_a_program() {
    let folder = tempfile::tempdir().unwrap();
    let file = write(&folder.path().join("bench.h5"), |_| ());
    let json = Summary::from_file(&file).unwrap().to_json();
    let json: serde_json::Value = serde_json::from_str(&json).unwrap();
    let number = |pointer: &str| json.pointer(pointer).and_then(|value| value.as_f64());
    let close = |pointer: &str, expected: f64| {
        let found = number(pointer).unwrap_or_else(|| panic!("{pointer} is missing"));
        assert!((found - expected).abs() < 1e-9, "{pointer}: {found}");
    };
    close("/shots", 100.0);
    close("/companion_shots", 50.0);
    close("/clipped", 2.0);
    close("/norm/mean", 1.25);
    close("/norm/standard_error", 0.25 * (64.0f64 / 63.0).sqrt() / 8.0);
    close("/norm/expected", 9.0 / 7.0);
    let error = 0.25 * (64.0f64 / 63.0).sqrt() / 8.0;
    close("/norm/deviation", (1.25 - 9.0 / 7.0) / error);
    assert_eq!(json["norm"]["accepted"], true);
    close("/draws/mean_attempts", 1.5);
    close("/draws/peak_active", 7.0);
    close("/draws/mean_terms_left", 4.0);
    close("/sites/count", 3.0);
    close("/sites/kept", 2.0);
    close("/sites/extent", 3.0);
    close("/sites/log10_extent", 3f64.log10());
    close(
        "/sites/log10_extent_without_noise",
        3.0 * 1.171572875254f64.log10(),
    );
    close("/registers/0/any_nonzero/raw/value", 0.3);
    close("/registers/0/any_nonzero/companion/value", 0.4);
    close("/registers/0/any_nonzero/corrected/value", 0.25);
    let error = (0.21 / 100.0 + 0.24 / 50.0 / 9.0f64).sqrt() * 1.5;
    close("/registers/0/any_nonzero/corrected/standard_error", error);
    close("/registers/0/mean_weight/raw/value", 0.6);
    close("/registers/0/mean_weight/corrected/value", 0.5);
    close("/registers/0/bits/3/raw/value", 0.3);
    close("/registers/0/bits/0/raw/limit_95", 1.0 - 0.05f64.powf(0.01));
    close("/registers/1/bits/0/corrected/value", 0.7);
    close("/registers/2/distinct_outcomes", 3.0);
    close("/registers/2/outcomes/0/frequency/corrected/value", 0.65);
    close("/registers/2/outcomes/1/frequency/corrected/value", 0.2);
    close("/registers/2/outcomes/2/frequency/corrected/value", 0.15);
    assert_eq!(json["registers"][2]["outcomes"][0]["bits"], "101");
    assert_eq!(json["registers"][2]["outcomes"][1]["bits"], "011");
    assert_eq!(json["registers"][0]["outcomes"], serde_json::Value::Null);
    assert_eq!(json["complete"], true);
    assert_eq!(json["title"], "bench B");
    assert_eq!(json["settings"][0][1], "on");
}

/// 64 estimates of mean 1.25 ± 0.031 where 9/7 or 2 are expected, and of too few.
#[test]
fn a_wrong_norm_is_told_plainly() {
    let folder = tempfile::tempdir().unwrap();
    let shown = |name: &str, log_extent: f64, count: u32| {
        let path = folder.path().join(name);
        let header = Header {
            terms: Some(7),
            mixing_weight: 0.5,
            ..Header::default()
        };
        let mut writer = Writer::create(&path, &header, WriterOptions::default()).unwrap();
        let estimate = |shot: u32| 1.0 + 0.5 * f64::from(shot % 2);
        let audit = NormAudit {
            shots: (0..u64::from(count)).collect(),
            estimates: (0..count).map(estimate).collect(),
            log_extent,
            terms: 7,
            probes: 16,
        };
        writer.write_norms(&audit).unwrap();
        writer.finish(Finished::default()).unwrap();
        let file = ShotFile::open(&path).unwrap();
        Summary::from_file(&file).unwrap().to_string()
    };
    let right = shown("right.h5", 3f64.ln(), 64);
    assert!(right.contains("1.286 expected: as it should be"), "{right}");
    let wrong = shown("wrong.h5", 8f64.ln(), 64);
    assert!(wrong.contains("2 expected: WRONG"), "{wrong}");
    assert!(wrong.contains("23.8 standard errors"), "{wrong}");
    let few = shown("few.h5", 8f64.ln(), 8);
    assert!(few.contains("too few to tell"), "{few}");
}

#[test]
fn an_interrupted_run_says_so() {
    let folder = tempfile::tempdir().unwrap();
    let file = write(&folder.path().join("bench.h5"), |header| {
        header.shots_total = 1000;
        header.part = Part { index: 2, count: 3 };
    });
    let summary = Summary::from_file(&file).unwrap();
    assert!(!summary.complete);
    // Shots 333 to 666 of 1000.
    assert_eq!(summary.shots_planned, 333);
    let text = summary.to_string();
    assert!(text.contains("interrupted, 333 were planned"), "{text}");
    assert!(text.contains("part 2 of 3"), "{text}");
}

#[test]
fn an_exact_run_needs_no_correction() {
    let folder = tempfile::tempdir().unwrap();
    let file = write(&folder.path().join("bench.h5"), |header| {
        header.terms = None;
        header.delta = None;
        header.mixing_weight = 0.0;
        header.readout = "dense".into();
        header.log_extent = 5000.0;
    });
    let summary = Summary::from_file(&file).unwrap();
    let text = summary.to_string();
    assert!(text.contains("exact"), "{text}");
    assert!(!text.to_lowercase().contains("correct"), "{text}");
    let json: serde_json::Value = serde_json::from_str(&summary.to_json()).unwrap();
    assert_eq!(json["sites"]["extent"], serde_json::Value::Null);
}

#[test]
fn empty_files_have_a_summary() {
    let folder = tempfile::tempdir().unwrap();
    for registers in [vec![], vec![register("wide", "record", 100)]] {
        let path = folder.path().join(format!("{}.h5", registers.len()));
        let header = Header {
            registers,
            terms: Some(1),
            mixing_weight: 1.0,
            ..Header::default()
        };
        let writer = Writer::create(&path, &header, WriterOptions::default()).unwrap();
        writer.finish(Finished::default()).unwrap();
        let summary = Summary::from_file(&ShotFile::open(&path).unwrap()).unwrap();
        assert!(summary.complete);
        assert!(summary.to_string().contains("shots       0\n"));
        assert!(!summary.to_json().is_empty());
    }
}
