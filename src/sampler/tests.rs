//! The whole pipeline from instructions to outcomes against density matrices.
//!
//! Random adaptive noisy circuits on few qubits: every Clifford gate, Pauli
//! rotations by any angle, CCZ, Pauli channels, damping, readout error,
//! measurement, reset, assignments, each possibly under a condition. The
//! reference knows nothing of frames, sites or flips: it carries one
//! unnormalised density matrix for every value of the classical bits and acts
//! on it with plain matrices.

mod exact;
mod norms;
mod random_circuits;
mod reference;

use std::collections::BTreeMap;

use rand::SeedableRng;
use rand_pcg::Pcg64;
use smallvec::smallvec;

use crate::circuit::{Clifford, Pauli, Qubits};
use crate::exact::Law;
use crate::exact::fit::{Counts, fit};
use crate::magic::mixing::{log_extent, mixing_weight};
use crate::magic::{ScheduleOptions, Sparsifier, schedule};
use crate::noise::{
    Instruction, Kind, NoisyCircuit, PauliChannel, PauliChoices, PauliWord, ReadoutFlip,
};
use crate::program::{Program, reduce};
use crate::readout::Register;
use crate::readout::dense::Dense;
use crate::readout::probe::{self, Probe, acceptance_cap};
use crate::readout::walk::{self, Walk};

use super::{Block, Drawing, Family, Interrupt, SampleError, Sampler, Silent, audit};
use random_circuits::{Menu, random_circuit, random_clifford};
use reference::reference;

static NEVER: Interrupt = Interrupt::new();

/// Counts of recorded bits.
fn sample<R: Register + Send>(
    program: &Program,
    family: Family,
    drawing: Drawing,
    shots: u64,
    seed: u64,
    make: impl Fn() -> R + Sync,
) -> BTreeMap<u32, f64> {
    sample_counting(
        program,
        family,
        drawing,
        shots,
        seed,
        make,
        &mut Audit::default(),
    )
}

/// What the shots of a call had in common.
#[derive(Default)]
struct Audit {
    clipped: u64,
    attempts: u64,
}

/// Counts of recorded bits; adds to `audit`.
fn sample_counting<R: Register + Send>(
    program: &Program,
    family: Family,
    drawing: Drawing,
    shots: u64,
    seed: u64,
    make: impl Fn() -> R + Sync,
    audit: &mut Audit,
) -> BTreeMap<u32, f64> {
    let sparsifier = Sparsifier::new(program.sites());
    let recorded = (0..program.bits() as u32).collect();
    let sampler = Sampler::new(program, &sparsifier, recorded, seed, 28, false, drawing);
    let mut counts = BTreeMap::new();
    let done = sampler.sample(
        family,
        0..shots,
        make,
        &Interrupt::new(),
        &mut Silent,
        |block: &Block| -> Result<(), SampleError> {
            for shot in &block.audit {
                audit.clipped += u64::from(shot.register.clipped);
                audit.attempts += u64::from(shot.attempts);
            }
            for row in &block.rows.bits {
                *counts.entry(*row as u32).or_insert(0.0) += 1.0;
            }
            Ok(())
        },
    );
    assert_eq!(done, Ok(shots));
    counts
}

/// Pearson's χ² of counts against a law as standard deviations of the normal law
/// by the Wilson–Hilferty approximation (Proc. Natl. Acad. Sci. USA 17, 684
/// (1931), from memory).
fn deviation(counts: &BTreeMap<u32, f64>, law: &BTreeMap<u32, f64>) -> f64 {
    let mut drawn = Counts::default();
    for (bits, count) in counts {
        drawn.add_many(&[u64::from(*bits)], *count as u64);
    }
    let law = law
        .iter()
        .map(|(bits, chance)| (vec![u64::from(*bits)], *chance));
    let found = fit(&drawn, &Law::new(law));
    assert_eq!(found.impossible, 0, "outcomes of probability 0 were drawn");
    if found.degrees_of_freedom == 0 {
        return 0.0;
    }
    let freedom = found.degrees_of_freedom as f64;
    let spread = 2.0 / (9.0 * freedom);
    ((found.statistic / freedom).cbrt() - (1.0 - spread)) / spread.sqrt()
}

fn compile(circuit: &NoisyCircuit, qubits: usize, absorb: bool) -> Program {
    let schedule = schedule(circuit, qubits, &ScheduleOptions { absorb });
    Program::compile(schedule, qubits, qubits + 2).expect("a small circuit compiles")
}

/// The same with its sites reduced first.
fn compile_reduced(circuit: &NoisyCircuit, qubits: usize, absorb: bool) -> Program {
    let schedule = schedule(circuit, qubits, &ScheduleOptions { absorb });
    let recorded = vec![true; qubits + 2];
    let reduced = reduce(schedule, qubits, &recorded).schedule;
    Program::compile(reduced, qubits, qubits + 2).expect("a small circuit compiles")
}

/// Largest deviation that passes: one-sided false-alarm rate 3e-7 a test
/// (normal law).
const LIMIT: f64 = 5.0;

/// `dense` follows the ideal law. 40,000 shots of each circuit: a wrong sign or
/// a lost flip moves some outcome by several per cent, which is ten standard
/// deviations or more.
#[test]
fn dense_shots_follow_the_density_matrix() {
    let mut rng = Pcg64::seed_from_u64(1);
    for round in 0..150 {
        let qubits = 2 + round % 3;
        let menu = Menu {
            damping: round % 2 == 0,
            generic_angles: true,
            branches: round % 3 == 0,
            instructions: 14 + 4 * qubits,
            magic: 6,
        };
        let circuit = random_circuit(&mut rng, qubits as u32, menu);
        let program = if round % 4 < 2 {
            compile(&circuit, qubits, round % 5 != 4)
        } else {
            compile_reduced(&circuit, qubits, round % 5 != 4)
        };
        let law = reference(&circuit, qubits);
        let active = program.peak_active().min(16);
        let counts = sample(
            &program,
            Family::Shots,
            Drawing::Members,
            40_000,
            round as u64,
            || Dense::new(program.sites(), active),
        );
        let found = deviation(&counts, &law);
        assert!(
            found < LIMIT,
            "round {round}: {found} deviations\n{circuit:#?}"
        );
    }
}

/// P_out = [(k − 1)·P + ξ·P_comp]/(k − 1 + ξ), P_comp exact, or from half a
/// million companion shots where it differs from path to path.
fn mixing_law(
    program: &Program,
    ideal: &BTreeMap<u32, f64>,
    terms: u64,
    seed: u64,
) -> BTreeMap<u32, f64> {
    let recorded: Vec<u32> = (0..program.bits() as u32).collect();
    if let Ok(exact) = crate::exact::companion(program, &recorded) {
        let log_extent = log_extent(program.sites()) + exact.total().ln();
        let weight = mixing_weight(log_extent, terms);
        let exact = exact.normalised();
        let mixed = |bits: u32| exact.weight(&[u64::from(bits)]);
        return ideal
            .iter()
            .map(|(&bits, &chance)| (bits, (1.0 - weight) * chance + weight * mixed(bits)))
            .filter(|entry| entry.1 > 1e-9)
            .collect();
    }
    let shots = 500_000;
    let settings = walk::Settings::new(program.sites(), 1, program.log_damping_trace());
    let mut audit = Audit::default();
    let companion = sample_counting(
        program,
        Family::Companion,
        Drawing::Companion,
        shots,
        seed,
        || Walk::<1>::new(program.sites(), program.slots(), settings),
        &mut audit,
    );
    // [(k − 1)·P + ξ·t·P_comp]/(k − 1 + ξ·t), t the trace of the companion.
    let trace = settings.trace(shots, audit.attempts);
    let log_extent = log_extent(program.sites()) + trace.ln();
    let weight = mixing_weight(log_extent, terms);
    let mixed = |bits: u32| companion.get(&bits).copied().unwrap_or(0.0) / shots as f64;
    ideal
        .iter()
        .map(|(&bits, &chance)| (bits, (1.0 - weight) * chance + weight * mixed(bits)))
        .filter(|entry| entry.1 > 1e-9)
        .collect()
}

/// The basis walk follows the mixing law exactly, whatever comes between its
/// sites: measurements, feedback, resets, conditional gates, rotations by any
/// angle, amplitude damping of entangled qubits. Small k on purpose, where the companion's share is large. 40,000
/// shots of each circuit.
#[test]
fn walk_shots_follow_the_mixing_law() {
    let mut rng = Pcg64::seed_from_u64(4);
    let (mut tested, mut audit) = (0, Audit::default());
    for round in 0..80 {
        let qubits = 2 + round % 3;
        let menu = Menu {
            damping: round % 4 < 2,
            generic_angles: round % 2 == 0,
            branches: round % 3 == 0,
            instructions: 14 + 4 * qubits,
            magic: 5,
        };
        let circuit = random_circuit(&mut rng, qubits as u32, menu);
        let program = if round % 4 < 2 {
            compile(&circuit, qubits, round % 5 != 4)
        } else {
            compile_reduced(&circuit, qubits, round % 5 != 4)
        };
        let extent = log_extent(program.sites());
        if extent < 0.05 {
            continue;
        }
        tested += 1;
        let terms = [2, 3, 5, 8][round % 4];
        let settings = walk::Settings::new(program.sites(), terms, program.log_damping_trace());
        let (slots, seed) = (program.slots(), round as u64);
        let drawing = Drawing::Terms(terms as usize);
        let shots = 40_000;
        let counts = sample_counting(
            &program,
            Family::Shots,
            drawing,
            shots,
            seed,
            || Walk::<1>::new(program.sites(), slots, settings),
            &mut audit,
        );
        let law = mixing_law(&program, &reference(&circuit, qubits), terms, seed);
        let found = deviation(&counts, &law);
        assert!(
            found < LIMIT,
            "round {round}: {found} deviations, k = {terms}, log extent {extent}\n{circuit:#?}"
        );
    }
    assert!(tested > 45, "{tested} circuits had magic");
    // Caps are for about one in a million starts, one in a thousand ends.
    assert!(
        audit.clipped < tested * 40,
        "{} shots were clipped",
        audit.clipped
    );
}

/// Terms follow the mixing law P_out = [(k − 1)·P + ξ·P_comp]/(k − 1 + ξ), with
/// P_comp sampled by companion shots: the same circuit with single terms.
/// Circuits measure only at the end, where the law is exact but for the bias
/// of the estimates, which 32 random states keep below the resolution.
#[test]
fn probe_shots_follow_the_mixing_law() {
    let mut rng = Pcg64::seed_from_u64(2);
    let mut tested = 0;
    for round in 0..44 {
        let qubits = 2 + round % 3;
        let menu = Menu {
            damping: false,
            generic_angles: true,
            branches: false,
            instructions: 12 + 3 * qubits,
            magic: 5,
        };
        let mut circuit = random_circuit(&mut rng, qubits as u32, menu);
        let last = circuit.instructions.len() - qubits;
        let mut index = 0;
        circuit.instructions.retain(|instruction| {
            index += 1;
            let reads = matches!(instruction.kind, Kind::Measure { .. } | Kind::Reset { .. });
            index > last || (!reads && instruction.condition.is_none())
        });
        let program = compile(&circuit, qubits, round % 4 != 3);
        let extent = log_extent(program.sites());
        if extent < 0.1 {
            continue;
        }
        tested += 1;
        let terms = [2, 3, 5, 8][round % 4];
        let slots = program.slots();
        let seed = round as u64;
        let settings = probe::Settings {
            probes: 64,
            cap: acceptance_cap(extent, terms, 64),
            branches: program.branches(),
        };
        let counts = sample(
            &program,
            Family::Shots,
            Drawing::Terms(terms as usize),
            15_000,
            seed,
            || Probe::<1>::new(program.sites(), slots, settings, &NEVER),
        );
        let law = mixing_law(&program, &reference(&circuit, qubits), terms, seed);
        let found = deviation(&counts, &law);
        assert!(
            found < LIMIT,
            "round {round}: {found} deviations\n{circuit:#?}"
        );
    }
    assert!(tested > 20, "{tested} circuits had magic");
}

/// E‖Ω‖² = 1 + (ξ − 1)/k at a size no dense reference reaches: 30 dephased T
/// gates on 36 qubits. 400 draws; 5.1 standard errors are a false-alarm rate
/// of 4e-7 (normal law). The first estimate of a shot is made before anything
/// is accepted, so its mean is the mean over all draws.
#[test]
fn mean_norm_is_exact_on_thirty_sites() {
    let mut rng = Pcg64::seed_from_u64(3);
    let qubits = 36;
    let mut instructions = Vec::new();
    let mut push = |kind| {
        instructions.push(Instruction {
            kind,
            condition: None,
            operation: 0,
        });
    };
    for site in 0..30u32 {
        for _ in 0..40 {
            push(Kind::Clifford(random_clifford(&mut rng, qubits)));
        }
        let qubit = site;
        push(Kind::Clifford(Clifford::H(qubit)));
        push(Kind::Rotation {
            axis: smallvec![(qubit, Pauli::Z)],
            angle: std::f64::consts::FRAC_PI_4,
        });
        let word = PauliWord { x: 0, z: 1 };
        let choices = PauliChoices::Listed(vec![(word, 0.01)]);
        push(Kind::Pauli(PauliChannel {
            qubits: Qubits::from_slice(&[qubit]),
            choices,
        }));
    }
    for qubit in 0..qubits {
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
    let extent = log_extent(program.sites()).exp();
    assert!(
        program.peak_active() > 20 && extent > 20.0,
        "{} {extent}",
        program.peak_active()
    );
    let terms = 64;
    let sparsifier = Sparsifier::new(program.sites());
    let draws = 400;
    let indices = audit::Audited {
        count: draws,
        total: draws,
        range: 0..draws,
    };
    let found =
        audit::norm_audit(&program, &sparsifier, 5, terms, indices, &NEVER).expect("enough room");
    assert_eq!(found.estimates.len() as u64, draws);
    assert_eq!(found.log_extent, log_extent(program.sites()));
    let sum: f64 = found.estimates.iter().sum();
    let squares: f64 = found.estimates.iter().map(|norm| norm * norm).sum();
    let mean = sum / draws as f64;
    let error = ((squares / draws as f64 - mean * mean) / draws as f64).sqrt();
    let expected = 1.0 + (extent - 1.0) / terms as f64;
    assert!(
        (mean - expected).abs() < 5.1 * error,
        "{mean} ± {error}, expected {expected}"
    );
    assert!(
        error < 0.1 * expected,
        "the test could not see an error of half the mean"
    );
}

/// A Pauli that comes with an outcome before a qubit was fresh must not reach
/// the state the qubit takes then: resetting qubit 1 and then qubit 0 leaves
/// |00⟩ whatever the first reset read, t and t† cancel on |+⟩ next to a |0⟩, and
/// the qubit always reads 0. On the schedule as it is: a reduced one has no site
/// left.
#[test]
fn what_a_reset_read_does_not_reach_the_state_prepared_next() {
    let gates =
        |gates: &[Clifford]| -> Vec<Kind> { gates.iter().cloned().map(Kind::Clifford).collect() };
    let turn = |sign: f64| Kind::Rotation {
        axis: smallvec![(1, Pauli::Z)],
        angle: sign * std::f64::consts::FRAC_PI_4,
    };
    let kinds = [
        gates(&[Clifford::H(0), Clifford::Cz(0, 1)]),
        vec![Kind::Reset { qubit: 1 }, Kind::Reset { qubit: 0 }],
        gates(&[Clifford::H(1)]),
        vec![turn(1.0)],
        gates(&[Clifford::Cx(0, 1)]),
        vec![turn(-1.0)],
        gates(&[Clifford::H(1)]),
        vec![Kind::Measure {
            qubit: 1,
            bit: Some(1),
            flip: ReadoutFlip::default(),
        }],
    ];
    let instructions = kinds.into_iter().flatten().map(|kind| Instruction {
        kind,
        condition: None,
        operation: 0,
    });
    let circuit = NoisyCircuit {
        instructions: instructions.collect(),
        warnings: Vec::new(),
    };
    let program = compile(&circuit, 2, true);
    assert_eq!(program.sites().len(), 2);
    let active = program.peak_active();
    let counts = sample(&program, Family::Shots, Drawing::Members, 200, 8, || {
        Dense::new(program.sites(), active)
    });
    assert_eq!(counts, BTreeMap::from([(0, 200.0)]));
    assert_eq!(compile_reduced(&circuit, 2, true).sites().len(), 0);
}

/// Paths that differ in what they execute or measure must keep their weights:
/// a coin decides whether a magic qubit is measured, and whether a CCZ acts.
/// Both probe and walk, 60,000 shots: a shot kept too often on one path by 1 %
/// moves the coin by five standard deviations.
#[test]
fn conditional_measurements_and_gates_keep_the_weight_of_paths() {
    let h = |q| Kind::Clifford(Clifford::H(q));
    let t = |q| Kind::Rotation {
        axis: smallvec![(q, Pauli::Z)],
        angle: std::f64::consts::FRAC_PI_4,
    };
    let measure = |qubit, bit| Kind::Measure {
        qubit,
        bit: Some(bit),
        flip: ReadoutFlip::default(),
    };
    let plain = |kind| Instruction {
        kind,
        condition: None,
        operation: 0,
    };
    let conditional = |kind| Instruction {
        kind,
        condition: Some(0),
        operation: 0,
    };
    let mut measured: Vec<Instruction> = [h(0), measure(0, 0), h(1), t(1), h(1)].map(plain).into();
    measured.push(conditional(measure(1, 1)));
    let mut acted: Vec<Instruction> = [h(0), h(1), h(2), h(3), t(1), t(2), t(3), measure(0, 0)]
        .map(plain)
        .into();
    acted.push(conditional(Kind::Ccz([1, 2, 3])));
    acted.extend(
        [
            h(1),
            h(2),
            h(3),
            measure(1, 1),
            measure(2, 2),
            measure(3, 3),
        ]
        .map(plain),
    );
    for (qubits, instructions) in [(2, measured), (4, acted)] {
        let circuit = NoisyCircuit {
            instructions,
            warnings: Vec::new(),
        };
        let program = compile(&circuit, qubits, true);
        let (terms, slots) = (4, program.slots());
        let law = mixing_law(&program, &reference(&circuit, qubits), terms, 9);
        let drawing = Drawing::Terms(terms as usize);
        let settings = probe::Settings {
            probes: 64,
            cap: acceptance_cap(log_extent(program.sites()), terms, 64),
            branches: program.branches(),
        };
        let probed = sample(&program, Family::Shots, drawing, 60_000, 5, || {
            Probe::<1>::new(program.sites(), slots, settings, &NEVER)
        });
        assert!(
            deviation(&probed, &law) < LIMIT,
            "probe: {probed:?} for {law:?}"
        );
        let settings = walk::Settings::new(program.sites(), terms, program.log_damping_trace());
        let walked = sample(&program, Family::Shots, drawing, 60_000, 6, || {
            Walk::<1>::new(program.sites(), slots, settings)
        });
        assert!(
            deviation(&walked, &law) < LIMIT,
            "walk: {walked:?} for {law:?}"
        );
    }
}
