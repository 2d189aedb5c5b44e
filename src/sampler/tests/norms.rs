//! The norm audit on random adaptive circuits.

use super::*;
use crate::magic::mixing::mean_norm;

/// Mean estimates of 600 draws with few terms are 1 + (ξ − 1)/k, ξ that of the
/// sites before the first inner measurement, whatever comes before it: coins,
/// feedback, resets, conditional gates and sites. 6 standard errors, two-sided
/// false alarm 2e-9 a circuit for the normal law, and rather more for the skew
/// law of the estimates.
#[test]
fn norms_are_as_expected_on_adaptive_circuits() {
    let mut rng = Pcg64::seed_from_u64(21);
    let (mut tested, mut partial) = (0, 0);
    for round in 0..80 {
        let qubits = 2 + round % 3;
        let menu = Menu {
            damping: round % 4 == 1,
            generic_angles: round % 2 == 0,
            branches: round % 3 == 0,
            instructions: 14 + 4 * qubits,
            magic: 6,
        };
        let circuit = random_circuit(&mut rng, qubits as u32, menu);
        let program = compile(&circuit, qubits, round % 5 != 4);
        let sparsifier = Sparsifier::new(program.sites());
        let (terms, draws) = ([2, 3, 5, 8][round % 4], 600);
        let indices = audit::Audited {
            count: draws,
            total: draws,
            range: 0..draws,
        };
        let seed = round as u64;
        let found = audit::norm_audit(&program, &sparsifier, seed, terms, indices, &NEVER)
            .expect("enough room");
        if found.log_extent < 0.05 {
            continue;
        }
        tested += 1;
        let all = log_extent(program.sites());
        partial += u32::from(found.log_extent < all - 0.01);
        let number = draws as f64;
        let mean = found.estimates.iter().sum::<f64>() / number;
        let squares = found.estimates.iter().map(|norm| (norm - mean).powi(2));
        let error = (squares.sum::<f64>() / number).sqrt() / number.sqrt();
        assert_eq!(found.expected(), mean_norm(found.log_extent, terms));
        assert!(
            (mean - found.expected()).abs() < 6.0 * error + 1e-9,
            "round {round}: {mean} ± {error}, expected {}",
            found.expected()
        );
        assert!(
            error < 0.05 * mean,
            "an error of a quarter would not be seen"
        );
    }
    assert!(
        tested > 30 && partial > 5,
        "{tested} tested, {partial} in part"
    );
}

/// The audited draws have a generator of their own and do not depend on parts.
#[test]
fn parts_make_the_estimates_of_the_whole_run() {
    let mut rng = Pcg64::seed_from_u64(22);
    let menu = Menu {
        damping: false,
        generic_angles: true,
        branches: false,
        instructions: 30,
        magic: 6,
    };
    let circuit = random_circuit(&mut rng, 3, menu);
    let program = compile(&circuit, 3, true);
    let sparsifier = Sparsifier::new(program.sites());
    let audit = |range| {
        let indices = audit::Audited {
            count: 10,
            total: 1000,
            range,
        };
        audit::norm_audit(&program, &sparsifier, 7, 5, indices, &NEVER).expect("enough room")
    };
    let whole = audit(0..1000);
    let (first, second) = (audit(0..333), audit(333..1000));
    assert_eq!([first.shots, second.shots].concat(), whole.shots);
    assert_eq!(
        [first.estimates, second.estimates].concat(),
        whole.estimates
    );
}
