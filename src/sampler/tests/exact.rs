//! The exact distributions against plain matrices and against companion shots.

use super::*;
use crate::exact::{ExactError, companion, ideal};

/// The evaluation with few qubits at a time and merged branches agrees with one
/// that keeps all qubits and all bits, on random adaptive noisy circuits; also
/// where only some bits are recorded, so that others may be forgotten.
#[test]
fn exact_distributions_agree_with_plain_matrices() {
    let mut rng = Pcg64::seed_from_u64(11);
    for round in 0..120 {
        let qubits = 2 + round % 3;
        let menu = Menu {
            damping: round % 2 == 0,
            generic_angles: true,
            branches: round % 3 == 0,
            instructions: 14 + 4 * qubits,
            magic: 6,
        };
        let circuit = random_circuit(&mut rng, qubits as u32, menu);
        let plain = reference(&circuit, qubits);
        let bits = qubits as u32 + 2;
        for recorded in [
            (0..bits).collect::<Vec<u32>>(),
            vec![bits - 1, 0],
            vec![1],
            Vec::new(),
        ] {
            let law = ideal(&circuit, &recorded).expect("a small circuit");
            let mut marginal: BTreeMap<u64, f64> = BTreeMap::new();
            for (value, weight) in &plain {
                let read = (0..).zip(&recorded).fold(0, |read, (place, bit)| {
                    read | u64::from(value >> bit & 1) << place
                });
                *marginal.entry(read).or_insert(0.0) += weight;
            }
            for (value, expected) in marginal {
                let key: &[u64] = if recorded.is_empty() { &[] } else { &[value] };
                let found = law.weight(key);
                assert!(
                    (found - expected).abs() < 1e-11,
                    "round {round}: {found}, not {expected}\n{circuit:#?}"
                );
            }
            assert!((law.total() - 1.0).abs() < 1e-10);
        }
    }
}

/// 40,000 companion shots of each circuit follow the exact companion
/// distribution, whatever was merged into sites and whatever the program left
/// out; with damping of entangled qubits the trace of the companion found by
/// counting attempts is the exact one, within 5 standard errors (false alarm
/// 6e-7, normal law).
#[test]
fn companion_shots_follow_the_exact_companion() {
    let mut rng = Pcg64::seed_from_u64(12);
    let (mut refused, mut damped) = (0, 0);
    for round in 0..90 {
        let qubits = 2 + round % 3;
        let menu = Menu {
            damping: round % 4 < 2,
            generic_angles: round % 2 == 0,
            branches: round % 3 == 0,
            instructions: 14 + 4 * qubits,
            magic: 6,
        };
        let circuit = random_circuit(&mut rng, qubits as u32, menu);
        let program = compile(&circuit, qubits, round % 5 != 4);
        let recorded: Vec<u32> = (0..program.bits() as u32).collect();
        let exact = match companion(&program, &recorded) {
            Err(ExactError::BranchingCcz | ExactError::BranchingDamping) => {
                refused += 1;
                continue;
            }
            law => law.expect("a small circuit"),
        };
        let law: BTreeMap<u32, f64> = exact
            .normalised()
            .iter()
            .map(|(value, weight)| (value[0] as u32, weight))
            .collect();
        let (sites, slots) = (program.sites(), program.slots());
        let settings = walk::Settings::new(sites, 1, program.log_damping_trace());
        let (mut audit, shots) = (Audit::default(), 40_000);
        let counts = sample_counting(
            &program,
            Family::Companion,
            Drawing::Companion,
            shots,
            round as u64,
            || Walk::<1>::new(sites, slots, settings),
            &mut audit,
        );
        let found = deviation(&counts, &law);
        assert!(
            found < LIMIT,
            "round {round}: {found} deviations\n{circuit:#?}"
        );
        damped += u32::from(program.has_damping());
        let trace = settings.trace(shots, audit.attempts);
        let kept = shots as f64 / audit.attempts as f64;
        let error = trace * ((1.0 - kept) / shots as f64).sqrt();
        assert!(
            (trace - exact.total()).abs() <= 5.0 * error + 1e-9,
            "round {round}: {trace} ± {error}, exactly {}",
            exact.total()
        );
    }
    assert!(refused < 30, "{refused} of 90 were refused");
    assert!(damped > 10, "{damped} of 90 damped entangled qubits");
}

/// Ten T gates between random Clifford gates, measured at the end: a histogram
/// of 40,000 shots with k terms is accepted by the law of k terms and rejected
/// by that of 2k, at 1e-6 and with nothing sampled in the law.
#[test]
fn the_law_of_another_number_of_terms_is_rejected() {
    let mut rng = Pcg64::seed_from_u64(13);
    let qubits = 3;
    let mut instructions = Vec::new();
    let mut push = |kind| {
        instructions.push(Instruction {
            kind,
            condition: None,
            operation: 0,
        });
    };
    for site in 0..10u32 {
        for _ in 0..6 {
            push(Kind::Clifford(random_clifford(&mut rng, qubits)));
        }
        push(Kind::Clifford(Clifford::H(site % qubits)));
        push(Kind::Rotation {
            axis: smallvec![(site % qubits, Pauli::Z)],
            angle: std::f64::consts::FRAC_PI_4,
        });
    }
    for qubit in 0..qubits {
        push(Kind::Clifford(Clifford::H(qubit)));
        push(Kind::Measure {
            qubit,
            bit: Some(qubit),
            flip: ReadoutFlip::default(),
        });
    }
    let circuit = NoisyCircuit {
        instructions,
        warnings: Vec::new(),
    };
    let program = compile(&circuit, qubits as usize, true);
    let recorded: Vec<u32> = (0..program.bits() as u32).collect();
    let ideal = ideal(&circuit, &recorded).expect("a small circuit");
    let companion = companion(&program, &recorded).expect("a small circuit");
    let extent = log_extent(program.sites());
    for terms in [2, 4, 8] {
        let settings = walk::Settings::new(program.sites(), terms, 0.0);
        let (sites, slots) = (program.sites(), program.slots());
        let drawn = sample(
            &program,
            Family::Shots,
            Drawing::Terms(terms as usize),
            40_000,
            terms,
            || Walk::<1>::new(sites, slots, settings),
        );
        let mut counts = Counts::default();
        for (bits, count) in drawn {
            counts.add_many(&[u64::from(bits)], count as u64);
        }
        for (law_of, accepted) in [(terms, true), (2 * terms, false)] {
            let law = ideal.mixed(&companion, mixing_weight(extent, law_of));
            let found = fit(&counts, &law);
            assert_eq!(
                found.p_value > 1e-6,
                accepted,
                "{terms} terms, law of {law_of}: {found:?}"
            );
        }
    }
}
