//! Circuits whose reduction can be told by hand.

use std::f64::consts::{FRAC_PI_4, FRAC_PI_8};

use super::super::{Reduced, SiteCounts, reduce};
use super::{circuit, clifford, flip, measure, product, rotation};
use crate::circuit::{Clifford, Qubits};
use crate::magic::schedule::tests::dense;
use crate::magic::{Kind as Scheduled, ScheduleOptions, SiteKind, schedule};
use crate::noise::{Kind, PauliChannel, PauliChoices, PauliWord};

/// Extent of a T gate, 1/cos²(π/8). Quantum 3, 181 (2019).
const T_EXTENT: f64 = 1.17157287525381;

fn t(letters: &str) -> Kind {
    rotation(letters, FRAC_PI_4)
}

fn tdg(letters: &str) -> Kind {
    rotation(letters, -FRAC_PI_4)
}

/// Reduces, on three qubits with every bit recorded, and checks the law.
#[track_caller]
fn reduced(kinds: Vec<(Kind, Option<u32>)>) -> Reduced {
    let schedule = schedule(&circuit(kinds), 3, &ScheduleOptions::default());
    let reduced = reduce(schedule.clone(), 3, &[true; 8]);
    let [expected, found] =
        [&schedule, &reduced.schedule].map(|schedule| dense::of_schedule(schedule, 3).law(0xff));
    for bits in expected.keys().chain(found.keys()) {
        let [a, b] = [&expected, &found].map(|law| law.get(bits).copied().unwrap_or(0.0));
        assert!((a - b).abs() < 1e-12, "{bits:b}: {b} is not {a}");
    }
    reduced
}

/// Three qubits, not fresh and in a state with no certain stabiliser that
/// helps: entangled, each turned by a noisy angle that nothing merges with.
fn start() -> Vec<(Kind, Option<u32>)> {
    let h = (0..3).map(|q| clifford(Clifford::H(q)));
    let cz = [(0, 1), (1, 2)].map(|(a, b)| clifford(Clifford::Cz(a, b)));
    let noise = (0..3).flat_map(|q| [flip(q, 0, 1, 0.1), flip(q, 1, 0, 0.1)]);
    h.chain(cz).chain(noise).map(|kind| (kind, None)).collect()
}

/// Measures every qubit in Y, which no product of X or of Z leaves alone.
fn ending() -> Vec<(Kind, Option<u32>)> {
    let turned = |q| [Clifford::Sdg(q), Clifford::H(q)].map(clifford);
    (0..3)
        .flat_map(|q| turned(q).into_iter().chain([measure(q, q)]))
        .map(|kind| (kind, None))
        .collect()
}

#[track_caller]
fn between(kinds: impl IntoIterator<Item = Kind>) -> Reduced {
    let plain = kinds.into_iter().map(|kind| (kind, None));
    reduced([start(), plain.collect(), ending()].concat())
}

fn sites(reduced: &Reduced) -> usize {
    reduced.schedule.sites.len()
}

fn extent(reduced: &Reduced) -> f64 {
    let sites = reduced.schedule.sites.iter();
    sites.map(|site| site.extent).product()
}

fn cx(a: u32, b: u32) -> Kind {
    clifford(Clifford::Cx(a, b))
}

/// T·T = S about the axis at the place of the first; T·T† is nothing
/// (definitions), through chains that carry the axis to three qubits and back.
/// The law, which is compared, tells one from the other.
#[test]
fn rotations_merge_through_clifford_gates() {
    for second in [t("XXX"), tdg("XXX")] {
        let found = between([t("X"), cx(0, 1), cx(0, 2), second, cx(0, 1), cx(0, 2)]);
        assert_eq!(sites(&found), 0, "{found:#?}");
        assert_eq!(found.counts.merged, 2);
    }
}

/// X turns the sign of Z round: T X T X = T T† (textbook).
#[test]
fn the_sign_of_the_axis_counts() {
    let x = || clifford(Clifford::X(0));
    let quarter_turns = |found: &Reduced| {
        let gates = found.schedule.instructions.iter();
        let turned = gates.filter(|instruction| {
            matches!(
                instruction.kind,
                Scheduled::Clifford(Clifford::S(_) | Clifford::QuarterTurn(_))
            )
        });
        turned.count()
    };
    let found = between([t("Z"), cx(1, 0), x(), t("ZZ")]);
    assert_eq!((sites(&found), quarter_turns(&found)), (0, 0), "{found:#?}");
    let found = between([t("Z"), cx(1, 0), x(), x(), t("ZZ")]);
    assert_eq!((sites(&found), quarter_turns(&found)), (0, 1), "{found:#?}");
}

/// Angles add, and so do dephasings: p + q − 2pq (textbook).
#[test]
fn dephasings_add_up_in_merged_sites() {
    let found = between([
        rotation("Z", 0.3),
        flip(0, 0, 1, 0.03),
        cx(0, 1),
        rotation("Z", 0.4),
        flip(0, 0, 1, 0.05),
        cx(0, 1),
        // Keeps the reach of noise out of the way.
        rotation("IZ", 0.2),
    ]);
    assert_eq!(sites(&found), 2, "{found:#?}");
    let SiteKind::Rotation(site) = &found.schedule.sites[0].kind else {
        panic!("a rotation is expected");
    };
    assert!((site.angle - 0.7).abs() < 1e-12);
    // The noise of `start` on the axis, 0.1, has gone in as well.
    let both = |p: f64, q: f64| p + q - 2.0 * p * q;
    let expected = both(both(0.03, 0.05), 0.1);
    assert!((site.dephasing - expected).abs() < 1e-12);
    assert_eq!(found.schedule.sites[0].operation, 11);
}

/// Two dephased T make a dephased S: the dephasing stays, as a channel where
/// the second was.
#[test]
fn a_clifford_sum_leaves_its_dephasing() {
    let found = between([t("ZZ"), cx(2, 0), t("ZZZ"), three_flip(0.1)]);
    assert_eq!(sites(&found), 0, "{found:#?}");
    let left = found.schedule.instructions.iter().filter(|instruction| {
        let Scheduled::Pauli(channel) = &instruction.kind else {
            return false;
        };
        let word = PauliWord { x: 0, z: 0b111 };
        channel.qubits.len() == 3
            && matches!(&channel.choices, PauliChoices::Listed(words)
                if words[..] == [(word, 0.1)])
    });
    assert_eq!(left.count(), 1, "{found:#?}");
}

/// ZZZ with probability p.
fn three_flip(p: f64) -> Kind {
    Kind::Pauli(PauliChannel {
        qubits: Qubits::from_slice(&[0, 1, 2]),
        choices: PauliChoices::Listed(vec![(PauliWord { x: 0, z: 0b111 }, p)]),
    })
}

/// Whatever may turn the sign round forbids merging: T P T P' is T² or T T⁻¹.
#[test]
fn what_may_turn_the_sign_forbids_merging() {
    let x = || clifford(Clifford::X(0));
    let fault = vec![(flip(0, 1, 0, 0.3), None)];
    let decay = vec![(
        Kind::Damping {
            qubit: 0,
            gamma: 0.3,
        },
        None,
    )];
    // The coin of qubit 2 decides.
    let coin = vec![(measure(2, 5), None), (x(), Some(5))];
    let site = vec![(rotation("X", 0.4), None)];
    let read = vec![
        (clifford(Clifford::H(0)), None),
        (measure(0, 6), None),
        (clifford(Clifford::H(0)), None),
    ];
    let reset = vec![(Kind::Reset { qubit: 0 }, None)];
    for (axis, what) in [
        ("Z", fault),
        ("Z", coin),
        ("Z", site),
        ("Z", read),
        ("Z", reset),
        // Z alone passes damping.
        ("ZZ", decay),
    ] {
        let index = what.len();
        let middle = [vec![(t(axis), None)], what, vec![(t(axis), None)]].concat();
        let found = reduced([start(), middle, ending()].concat());
        assert_eq!(found.counts.merged, 0, "{axis}, {index}: {found:#?}");
    }
}

/// What cannot turn it round does not: a fault, a decay, a coin that commute.
#[test]
fn what_commutes_lets_sites_merge() {
    let z = || clifford(Clifford::Z(0));
    let fault = vec![(flip(0, 0, 1, 0.3), None)];
    let decay = vec![(
        Kind::Damping {
            qubit: 0,
            gamma: 0.3,
        },
        None,
    )];
    let coin = vec![(measure(2, 5), None), (z(), Some(5))];
    let site = vec![(rotation("ZZ", 0.4), None)];
    let read = vec![(measure(0, 6), None)];
    for (index, what) in [fault, decay, coin, site, read].into_iter().enumerate() {
        let middle = [
            vec![(t("Z"), None)],
            what,
            vec![(cx(1, 0), None), (t("ZZ"), None)],
        ]
        .concat();
        let found = reduced([start(), middle, ending()].concat());
        assert!(found.counts.merged >= 2, "case {index}: {found:#?}");
    }
}

/// Sites under a condition merge with sites under the same bit while it keeps
/// its value.
#[test]
fn conditions_have_to_be_the_same() {
    let coin = || (measure(2, 5), None);
    let again = || (measure(1, 5), None);
    for (first, second, between, merged) in [
        (Some(5), Some(5), false, 2),
        (Some(5), None, false, 0),
        (None, Some(5), false, 0),
        (Some(5), Some(5), true, 0),
    ] {
        let mut middle = vec![coin(), (t("Z"), first), (cx(1, 0), None)];
        middle.extend(between.then(again));
        middle.push((t("ZZ"), second));
        let found = reduced([start(), middle, ending()].concat());
        assert_eq!(found.counts.merged, merged, "{first:?} {second:?}");
    }
}

/// On a GHZ state Z_0, Z_1 and Z_2 are the same axis: T on each is one rotation
/// by 3π/4, unless a fault may tell them apart.
#[test]
fn axes_are_compared_up_to_certain_stabilisers() {
    let ghz = [clifford(Clifford::H(0)), cx(0, 1), cx(0, 2)];
    let ts = [t("Z"), t("IZ"), t("IIZ")];
    let run = |noise: Option<Kind>| {
        let kinds = ghz.clone().into_iter().chain(noise).chain(ts.clone());
        let kinds = kinds.map(|kind| (kind, None)).collect();
        reduced([kinds, ending()].concat())
    };
    let found = run(None);
    assert!((extent(&found) - T_EXTENT).abs() < 1e-12, "{found:#?}");
    assert_eq!((sites(&found), found.counts.merged), (1, 2));
    // After a fault on one qubit only the two others are the same: T·T = S.
    let found = run(Some(flip(0, 1, 0, 0.1)));
    assert_eq!((sites(&found), found.counts.merged), (1, 2));
    let turns = found
        .schedule
        .instructions
        .iter()
        .filter(|instruction| matches!(instruction.kind, Scheduled::Clifford(Clifford::S(1))));
    assert_eq!(turns.count(), 1, "{found:#?}");
    let found = run(Some(flip(0, 0, 1, 0.1)));
    assert_eq!((sites(&found), found.counts.merged), (1, 2));
}

/// A coin that turns one qubit of a Bell pair tells Z of the two apart, and a
/// measured one does not: its outcome is another in every run, but the same for
/// both.
#[test]
fn coins_that_turn_a_stabiliser_forbid_its_use() {
    let coin = [(clifford(Clifford::H(2)), None), (measure(2, 5), None)];
    let bell = [clifford(Clifford::H(0)), cx(0, 1)].map(|kind| (kind, None));
    let ts = [(t("Z"), None), (t("IZ"), None)];
    for (condition, merged) in [(Some(5), 0), (None, 2)] {
        let turned = [(clifford(Clifford::X(0)), condition)];
        let kinds = [&coin[..], &bell, &turned, &ts, &ending()].concat();
        assert_eq!(reduced(kinds).counts.merged, merged, "{condition:?}");
    }
    // Read in between: Z of qubit 0 is known up to a coin, so it is a phase for
    // the compiler, but Z of both is still the same axis here.
    let read = [(measure(0, 6), None)];
    let kinds = [&bell[..], &ts[..1], &read, &ts[1..], &ending()].concat();
    assert_eq!(reduced(kinds).counts.merged, 2);
}

/// A rotation about a stabiliser of the state is a phase.
#[test]
fn rotations_about_certain_stabilisers_go() {
    let bell = [clifford(Clifford::H(0)), cx(0, 1)];
    let kinds = bell.into_iter().chain([t("XX"), t("ZZ"), t("YY")]);
    let found = reduced([kinds.map(|kind| (kind, None)).collect(), ending()].concat());
    assert_eq!(found.counts.deterministic, 3, "{found:#?}");
    assert_eq!(sites(&found), 0);
}

/// Later rotations about an axis of a prepared state turn the state: h t … t is
/// an eigenstate of Y (textbook).
#[test]
fn rotations_merge_into_prepared_states() {
    let kinds = [
        clifford(Clifford::H(0)),
        t("Z"),
        clifford(Clifford::H(1)),
        flip(1, 0, 1, 0.2),
        cx(1, 0),
        t("ZZ"),
    ];
    let found = reduced([kinds.map(|kind| (kind, None)).to_vec(), ending()].concat());
    assert_eq!((sites(&found), found.counts.merged), (0, 2), "{found:#?}");
}

/// Diagonal just before the end, with readout through Z: no effect, with or
/// without faults that turn its sign.
#[test]
fn what_nobody_sees_goes() {
    for noise in [None, Some(flip(0, 1, 0, 0.2))] {
        let kinds = [t("ZZ"), t("IZZ"), cx(1, 2)].into_iter().chain(noise);
        let kinds = kinds.map(|kind| (kind, None)).collect();
        let reads = (0..3).map(|q| (measure(q, q), None)).collect();
        let found = reduced([start(), kinds, reads].concat());
        assert_eq!((sites(&found), found.counts.unobservable), (0, 2));
    }
    // Qubit 2 is not read, and what acts on it alone goes with its noise.
    let kinds = [t("Z"), t("IIX"), flip(2, 1, 0, 0.1), cx(1, 2)];
    let kinds = kinds.map(|kind| (kind, None)).to_vec();
    let reads = vec![(clifford(Clifford::H(0)), None), (measure(0, 0), None)];
    let found = reduced([start(), kinds, reads].concat());
    assert_eq!((sites(&found), found.counts.unobservable), (1, 1));
    let left = found.schedule.instructions.iter();
    let on_two = left.filter(|instruction| match &instruction.kind {
        Scheduled::Clifford(Clifford::Cx(..)) => true,
        Scheduled::Pauli(channel) => channel.qubits.contains(&2),
        _ => false,
    });
    assert_eq!(on_two.count(), 0, "{found:#?}");
}

/// T|+⟩ of which only Z can be seen is as good as |+⟩, with or without faults
/// that turn the sign; rotated out of the plane it keeps its extent.
#[test]
fn a_prepared_state_turns_where_nobody_sees_it() {
    let rest = || [cx(0, 1), flip(1, 1, 0, 0.2), measure(0, 0), measure(1, 1)];
    let kinds = [clifford(Clifford::H(0)), t("Z")].into_iter().chain(rest());
    let found = reduced(kinds.map(|kind| (kind, None)).collect());
    assert_eq!((sites(&found), found.counts.unobservable), (0, 1));
    let kinds = [rotation("X", FRAC_PI_4)].into_iter().chain(rest());
    let found = reduced(kinds.map(|kind| (kind, None)).collect());
    assert!((extent(&found) - T_EXTENT).abs() < 1e-12, "{found:#?}");
}

/// Time in proportion to the length: a million operations on 200 qubits, noise,
/// resets and rotations among them. Quadratic time would be hours.
#[test]
fn long_circuits_take_time_in_proportion() {
    let kinds = (0..1_000_000u32).map(|step| {
        let q = step * 7 % 199;
        let kind = match step % 10 {
            0 => flip(q, 1, 0, 0.001),
            1 => flip(q, 0, 1, 0.001),
            2 | 3 => clifford(Clifford::H(q)),
            4 if step % 1000 == 4 => rotation("ZZZ", 0.3 + f64::from(step % 7)),
            5 if step % 100 == 5 => measure(q, q),
            6 if step % 100 == 6 => Kind::Reset { qubit: q },
            _ => cx(q, q + 1),
        };
        (kind, None)
    });
    let schedule = schedule(&circuit(kinds), 200, &ScheduleOptions::default());
    let start = std::time::Instant::now();
    let before = schedule.sites.len();
    let found = reduce(schedule, 200, &[true; 200]);
    assert!(start.elapsed().as_secs() < 30, "{:?}", start.elapsed());
    assert!(before > 500 && found.counts != SiteCounts::default());
    assert_eq!(product("ZZZ").len(), 3);
    assert!((FRAC_PI_8.cos().powi(-2) - T_EXTENT).abs() < 1e-12);
}
