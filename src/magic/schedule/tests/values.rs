//! Extents and probabilities of single places against published formulas, and
//! which places merge at all.

use std::f64::consts::{FRAC_1_SQRT_2, FRAC_PI_4, FRAC_PI_8};

use crate::circuit::Clifford;
use crate::magic::{Kind as Scheduled, Schedule, ScheduleOptions, Site, SiteKind, schedule};
use crate::noise::{Kind, NoisyCircuit, PauliChoices, ReadoutFlip};

use super::{channel, circuit, depolarizing, rotation};

/// Extent of a T gate, 1/cos²(π/8). Quantum 3, 181 (2019).
const T_EXTENT: f64 = 1.17157287525381;

fn close(found: f64, expected: f64) {
    assert!(
        (found - expected).abs() <= 1e-9 * expected.abs(),
        "{found} is not {expected}"
    );
}

/// Two qubits in |++⟩ and entangled, so that nothing that follows is about a
/// fresh qubit.
fn entangled(rest: impl IntoIterator<Item = Kind>) -> NoisyCircuit {
    let start = [Clifford::H(0), Clifford::H(1), Clifford::Cz(0, 1)];
    circuit(start.into_iter().map(Kind::Clifford).chain(rest))
}

fn scheduled(circuit: &NoisyCircuit) -> Schedule {
    schedule(circuit, 3, &ScheduleOptions::default())
}

fn only_site(schedule: &Schedule) -> &Site {
    assert_eq!(schedule.sites.len(), 1, "{schedule:#?}");
    &schedule.sites[0]
}

fn dephasing_of(site: &Site) -> f64 {
    match &site.kind {
        SiteKind::Rotation(rotation) => rotation.dephasing,
        other => panic!("expected a rotation, found {other:?}"),
    }
}

fn channels(schedule: &Schedule) -> usize {
    let kinds = schedule.instructions.iter();
    kinds
        .filter(|instruction| matches!(instruction.kind, Scheduled::Pauli(_)))
        .count()
}

fn t_with_dephasing(p: f64, before: bool) -> NoisyCircuit {
    let mut kinds = vec![rotation("Z", FRAC_PI_4), channel(&[0], &[("Z", p)])];
    if before {
        kinds.reverse();
    }
    entangled(kinds)
}

/// max(1, (1−p)/cos²(π/8)). PRX Quantum 2, 010345 (2021); recomputed with a
/// primal and a dual witness.
#[test]
fn extent_of_a_dephased_t() {
    for (p, extent) in [
        (0.01, 1.159857146501),
        (0.05, 1.112994231491),
        (0.1, 1.054415587728),
        (0.14, 1.007552672718),
    ] {
        for before in [false, true] {
            let schedule = scheduled(&t_with_dephasing(p, before));
            let site = only_site(&schedule);
            close(site.extent, extent);
            close(site.extent_without_noise, T_EXTENT);
            assert_eq!(channels(&schedule), 0);
        }
    }
}

/// At p = (1 − 1/√2)/2 = sin²(π/8) the dephased T is a mixture of Clifford
/// gates. PRX Quantum 2, 010345 (2021).
#[test]
fn a_strongly_dephased_t_is_a_clifford_mixture() {
    let threshold = FRAC_PI_8.sin().powi(2);
    for p in [threshold, threshold + 1e-9, 0.3, 0.5] {
        let schedule = scheduled(&t_with_dephasing(p, false));
        let site = only_site(&schedule);
        assert_eq!(site.extent, 1.0, "p = {p}");
        let SiteKind::Rotation(rotation) = &site.kind else {
            panic!("expected a rotation");
        };
        for member in &rotation.members {
            let used = member.weights.iter().filter(|weight| weight.norm() > 0.0);
            assert_eq!(used.count(), 1, "one Clifford component a member");
        }
    }
    let below = scheduled(&t_with_dephasing(threshold - 1e-6, false));
    assert!(only_site(&below).extent > 1.0);
}

/// Two dephasings about one axis compose: p + q − 2pq (textbook).
#[test]
fn dephasings_before_and_after_add_up() {
    let schedule = scheduled(&entangled([
        channel(&[0], &[("Z", 0.03)]),
        rotation("Z", FRAC_PI_4),
        channel(&[0], &[("Z", 0.05)]),
    ]));
    close(dephasing_of(only_site(&schedule)), 0.077);
    close(only_site(&schedule).extent, (1.0 - 0.077) * T_EXTENT);
}

/// Depolarizing p on a T gate is, with probability 1 − 2p/3, a dephasing by
/// (p/3)/(1 − 2p/3), and with 2p/3 an X after a full dephasing: an identity of
/// superoperators.
#[test]
fn depolarizing_on_a_t_gate() {
    for p in [0.01, 0.1, 0.3] {
        let schedule = scheduled(&entangled([rotation("Z", FRAC_PI_4), depolarizing(0, p)]));
        close(
            dephasing_of(only_site(&schedule)),
            (p / 3.0) / (1.0 - 2.0 * p / 3.0),
        );
        let left = schedule.instructions.iter().find_map(|it| match &it.kind {
            Scheduled::Pauli(channel) => Some(channel),
            _ => None,
        });
        let PauliChoices::Listed(words) = &left.unwrap().choices else {
            panic!("a list stays a list");
        };
        assert!(words.iter().all(|(word, _)| word.x == 1));
        close(words.iter().map(|(_, p)| p).sum(), 2.0 * p / 3.0);
    }
}

/// T-type state: max(1, (1 − 2p/3)/cos²(π/8)), 1 from p = (3/4)(1 − 1/√2) on.
/// PRX Quantum 2, 010345 (2021).
#[test]
fn extent_of_a_depolarized_t_state() {
    let state = |p| {
        let start = Kind::Clifford(Clifford::H(0));
        circuit([start, rotation("Z", FRAC_PI_4), depolarizing(0, p)])
    };
    for (p, extent) in [
        (0.02, 1.155951903584),
        (0.1, 1.093468016904),
        (0.2, 1.015363158553),
        (0.219669914111, 1.0),
        (0.5, 1.0),
    ] {
        let schedule = scheduled(&state(p));
        let site = only_site(&schedule);
        assert!(matches!(site.kind, SiteKind::Prepared(_)));
        close(site.extent, extent);
        close(site.extent_without_noise, T_EXTENT);
        assert_eq!(channels(&schedule), 0);
    }
}

/// Face-type state: max(1, (1 − 2p/3)(3 − √3)), 1 from p = (3/4)(1 − 1/√3) on.
/// Phys. Rev. A 71, 022316 (2005) for the state.
#[test]
fn extent_of_a_depolarized_face_state() {
    let angle = (1.0 / 3f64.sqrt()).acos();
    for (p, extent) in [
        (0.0, 1.267949192431),
        (0.02, 1.251043203199),
        (0.1, 1.183419246269),
        (0.3, 1.014359353945),
        (0.316987298109, 1.0),
    ] {
        let mut kinds = vec![rotation("Y", angle), rotation("Z", FRAC_PI_4)];
        if p > 0.0 {
            kinds.push(depolarizing(0, p));
        }
        let schedule = scheduled(&circuit(kinds));
        close(only_site(&schedule).extent, extent);
    }
}

/// Rotations about one axis add up (definition); extent of the sum from
/// Quantum 3, 181 (2019).
#[test]
fn rotations_about_one_axis_add_up() {
    for (a, b, extent) in [
        (0.2, 0.3, 1.1478775971),
        (1.0, 0.1, 1.1428222784),
        (1.6, -0.1, 1.0282626978),
    ] {
        let schedule = scheduled(&entangled([
            rotation("Z", a),
            channel(&[0], &[("Z", 0.0)]),
            Kind::Clifford(Clifford::Cx(0, 1)),
            rotation("Z", b),
        ]));
        close(only_site(&schedule).extent, extent);
    }
    let schedule = scheduled(&entangled([
        rotation("Z", FRAC_PI_4),
        rotation("Z", FRAC_PI_4),
        rotation("XY", 0.3),
        rotation("XY", -0.3),
    ]));
    assert!(schedule.sites.is_empty());
    let last = &schedule.instructions.last().unwrap().kind;
    assert!(matches!(last, Scheduled::Clifford(Clifford::S(0))));
}

#[test]
fn what_does_not_commute_keeps_rotations_apart() {
    for between in [
        Kind::Clifford(Clifford::X(0)),
        Kind::Clifford(Clifford::H(0)),
        Kind::Clifford(Clifford::Cx(1, 0)),
        channel(&[0], &[("X", 0.1)]),
        rotation("X", 0.2),
    ] {
        let schedule = scheduled(&entangled([
            rotation("Z", 0.2),
            between.clone(),
            rotation("Z", 0.3),
        ]));
        assert!(schedule.sites.len() >= 2, "{between:?}");
    }
}

fn under(bit: u32, mut circuit: NoisyCircuit, indices: &[usize]) -> NoisyCircuit {
    for &index in indices {
        circuit.instructions[index].condition = Some(bit);
    }
    circuit
}

fn measured(bit: u32) -> Kind {
    Kind::Measure {
        qubit: 1,
        bit: Some(bit),
        flip: ReadoutFlip::default(),
    }
}

#[test]
fn conditions_have_to_agree() {
    let kinds = || {
        let noise = channel(&[0], &[("Z", 0.1)]);
        entangled([measured(0), rotation("Z", FRAC_PI_4), noise])
    };
    let dephasing = |circuit: &NoisyCircuit| dephasing_of(only_site(&scheduled(circuit)));
    close(dephasing(&kinds()), 0.1);
    close(dephasing(&under(0, kinds(), &[4, 5])), 0.1);
    assert_eq!(dephasing(&under(0, kinds(), &[4])), 0.0);
    assert_eq!(dephasing(&under(0, kinds(), &[5])), 0.0);

    let rotations = || entangled([measured(0), rotation("Z", 0.2), rotation("Z", 0.3)]);
    let sites = |circuit: &NoisyCircuit| scheduled(circuit).sites.len();
    assert_eq!(sites(&under(0, rotations(), &[4, 5])), 1);
    assert_eq!(sites(&under(0, rotations(), &[5])), 2);
    // The bit is written once more in between.
    let rewritten = entangled([
        measured(0),
        rotation("Z", 0.2),
        measured(0),
        rotation("Z", 0.3),
    ]);
    assert_eq!(sites(&under(0, rewritten, &[4, 6])), 2);
}

#[test]
fn noise_reaches_its_site_through_clifford_gates() {
    let noise = || depolarizing(0, 0.03);
    for gates in [
        vec![Clifford::H(0)],
        vec![Clifford::S(0), Clifford::X(0)],
        vec![Clifford::Cx(0, 1)],
        vec![Clifford::Swap(0, 1), Clifford::H(1), Clifford::Swap(0, 1)],
    ] {
        let kinds: Vec<Kind> = gates.into_iter().map(Kind::Clifford).collect();
        let after = [rotation("Z", FRAC_PI_4)].into_iter();
        let after = entangled(after.chain(kinds.clone()).chain([noise()]));
        assert!(dephasing_of(only_site(&scheduled(&after))) > 0.009);
        let mut before = vec![noise()];
        before.extend(kinds.into_iter().rev());
        before.push(rotation("Z", FRAC_PI_4));
        assert!(dephasing_of(only_site(&scheduled(&entangled(before)))) > 0.009);
    }
    // Z on the target of a cx becomes ZZ, which one-qubit noise does not hold.
    let spread = entangled([
        rotation("Z", FRAC_PI_4),
        Kind::Clifford(Clifford::Cx(1, 0)),
        noise(),
    ]);
    assert_eq!(dephasing_of(only_site(&scheduled(&spread))), 0.0);
}

#[test]
fn noise_goes_to_its_own_statement_first() {
    // Two T gates in a row about anticommuting axes would not share; here a
    // second T further on must not get the noise of the first.
    let mut circuit = entangled([
        rotation("Z", FRAC_PI_4),
        channel(&[0], &[("Z", 0.05)]),
        rotation("ZZ", FRAC_PI_4),
    ]);
    circuit.instructions[4].operation = 3;
    circuit.instructions[5].operation = 4;
    let schedule = scheduled(&circuit);
    close(dephasing_of(&schedule.sites[0]), 0.05);
    assert_eq!(dephasing_of(&schedule.sites[1]), 0.0);
}

#[test]
fn two_qubit_axes_take_two_qubit_noise() {
    let p = 0.03;
    let words = [
        "X", "Y", "Z", "IX", "XX", "YX", "ZX", "IY", "XY", "YY", "ZY", "IZ", "XZ", "YZ", "ZZ",
    ];
    let words: Vec<(&str, f64)> = words.iter().map(|word| (*word, p / 15.0)).collect();
    let schedule = scheduled(&entangled([rotation("ZZ", 0.4), channel(&[0, 1], &words)]));
    // The identity's pair: weight 1 − 14p/15, of which ZZ has p/15.
    close(
        dephasing_of(only_site(&schedule)),
        (p / 15.0) / (1.0 - 14.0 * p / 15.0),
    );
}

#[test]
fn without_absorption_noise_stays_where_it_is() {
    let options = ScheduleOptions { absorb: false };
    let schedule = schedule(&t_with_dephasing(0.1, false), 2, &options);
    assert_eq!(dephasing_of(only_site(&schedule)), 0.0);
    assert_eq!(channels(&schedule), 1);
}

#[test]
fn damping_of_a_fresh_zero_does_nothing() {
    // Its Pauli twirl would flip it.
    let damping = Kind::Damping {
        qubit: 0,
        gamma: 0.2,
    };
    let schedule = scheduled(&circuit([damping, measured(0)]));
    assert!(schedule.sites.is_empty());
    assert_eq!(schedule.instructions.len(), 1);
}

#[test]
fn damping_of_an_excited_qubit_is_a_flip() {
    let excited = Kind::Clifford(Clifford::X(0));
    let damping = Kind::Damping {
        qubit: 0,
        gamma: 0.2,
    };
    let schedule = scheduled(&circuit([excited, damping]));
    assert!(schedule.sites.is_empty());
    let [gate, noise] = &schedule.instructions[..] else {
        panic!("expected X and a flip, found {schedule:#?}");
    };
    assert!(matches!(gate.kind, Scheduled::Clifford(Clifford::X(0))));
    let Scheduled::Pauli(channel) = &noise.kind else {
        panic!("expected a flip");
    };
    // 1 decays to 0 with probability 0.2.
    let PauliChoices::Listed(words) = &channel.choices else {
        panic!("expected a list");
    };
    assert_eq!((words[0].0.x, words[0].0.z), (1, 0));
    close(words[0].1, 0.2);
}

#[test]
fn a_damped_plus_state_keeps_its_bloch_vector() {
    // (x, y, z) → (√(1−γ)x, √(1−γ)y, γ + (1−γ)z), textbook.
    let damping = Kind::Damping {
        qubit: 0,
        gamma: 0.2,
    };
    let schedule = scheduled(&circuit([Kind::Clifford(Clifford::H(0)), damping]));
    let SiteKind::Prepared(state) = &only_site(&schedule).kind else {
        panic!("expected a prepared state");
    };
    close(state.bloch[0], 0.8f64.sqrt());
    assert!(state.bloch[1].abs() < 1e-15);
    close(state.bloch[2], 0.2);
}

#[test]
fn damping_of_an_entangled_qubit_stays() {
    let damping = Kind::Damping {
        qubit: 0,
        gamma: 0.2,
    };
    let schedule = scheduled(&entangled([damping]));
    let last = &schedule.instructions.last().unwrap().kind;
    assert!(matches!(last, Scheduled::Damping { qubit: 0, gamma } if *gamma == 0.2));
}

#[test]
fn a_stretch_that_is_reset_vanishes() {
    let reset = Kind::Reset { qubit: 0 };
    let h = Kind::Clifford(Clifford::H(0));
    let t = rotation("Z", FRAC_PI_4);
    let schedule = scheduled(&circuit([
        h.clone(),
        t.clone(),
        depolarizing(0, 0.1),
        reset,
        h,
        t,
    ]));
    close(only_site(&schedule).extent, T_EXTENT);
    assert_eq!(only_site(&schedule).operation, 5);
    assert_eq!(schedule.instructions.len(), 2);
}

#[test]
fn clifford_stretches_with_pauli_noise_stay() {
    let kinds = [
        Kind::Clifford(Clifford::H(0)),
        depolarizing(0, 0.1),
        Kind::Clifford(Clifford::S(0)),
    ];
    let schedule = scheduled(&circuit(kinds));
    assert!(schedule.sites.is_empty());
    assert_eq!(schedule.instructions.len(), 3);
}

/// A dephasing passes sites it commutes with, over a long way and through wide
/// axes, and not those it does not commute with.
#[test]
fn noise_passes_sites_it_commutes_with() {
    let chain = |gates: usize| {
        (0..gates).map(|step| {
            let pair = [(0, 1), (1, 2), (2, 0)][step % 3];
            Kind::Clifford(Clifford::Cz(pair.0, pair.1))
        })
    };
    for (between, reaches) in [("ZZ", true), ("IZ", true), ("XX", false)] {
        let kinds = [rotation("Z", FRAC_PI_4), rotation(between, 0.3)]
            .into_iter()
            .chain(chain(600))
            .chain([channel(&[0], &[("Z", 0.05)])]);
        let schedule = scheduled(&entangled(kinds));
        assert_eq!(schedule.sites.len(), 2);
        let found = dephasing_of(&schedule.sites[0]);
        close(found, if reaches { 0.05 } else { 0.0 });
        assert_eq!(channels(&schedule), usize::from(!reaches));
    }
}

#[test]
fn later_dephasing_reaches_a_prepared_state() {
    let schedule = scheduled(&circuit([
        Kind::Clifford(Clifford::H(0)),
        rotation("Z", FRAC_PI_4),
        Kind::Clifford(Clifford::Cx(0, 1)),
        channel(&[0], &[("Z", 0.1)]),
    ]));
    let site = only_site(&schedule);
    close(site.extent, 0.9 * T_EXTENT);
    let SiteKind::Prepared(state) = &site.kind else {
        panic!("expected a prepared state");
    };
    close(state.bloch[0], 0.8 * FRAC_1_SQRT_2);
}

#[test]
fn a_ccz_stays_whole() {
    let schedule = scheduled(&entangled([Kind::Ccz([0, 1, 2])]));
    // 16/9: Quantum 3, 181 (2019).
    close(only_site(&schedule).extent, 1.777777777778);
    assert_eq!(only_site(&schedule).qubits, [0, 1, 2]);
}

#[test]
fn long_circuits_take_time_in_proportion() {
    // Every rewrite at work on each of 100,000 instructions; quadratic time
    // would be minutes.
    let kinds = (0..100_000).map(|step| match step % 5 {
        0 => rotation("Z", FRAC_PI_4),
        1 => channel(&[0], &[("Z", 0.01)]),
        2 => rotation("Z", 0.1),
        3 => Kind::Clifford(Clifford::Cx(0, 1)),
        _ => channel(&[0, 1], &[("ZX", 0.01), ("X", 0.1)]),
    });
    let start = std::time::Instant::now();
    let schedule = scheduled(&entangled(kinds));
    assert!(!schedule.sites.is_empty());
    assert!(start.elapsed().as_secs() < 20, "{:?}", start.elapsed());
}
