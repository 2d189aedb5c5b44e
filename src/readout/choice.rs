//! Which read-out a run takes, with which settings.

use num_complex::Complex64;

use crate::clifford::terms::Terms;
use crate::magic::mixing::{mixing_weight, terms_for_average, terms_for_delta};
use crate::program::{MAX_SLOTS, Program, Step};

use super::{dense, probe};

/// The read-outs there are.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum Readout {
    /// Exact amplitudes.
    Dense,
    /// Terms with fast norm estimation.
    Probe,
    /// Terms with a sample that walks with the circuit.
    Walk,
}

impl Readout {
    /// The word used in options and files.
    pub fn word(self) -> &'static str {
        match self {
            Readout::Dense => "dense",
            Readout::Probe => "probe",
            Readout::Walk => "walk",
        }
    }
}

/// What a person asked for.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Wish {
    /// The read-out, or none for the cheaper one.
    pub readout: Option<Readout>,
    /// Trace-norm error of the averaged output state.
    pub delta: f64,
    /// Number of terms.
    pub terms: TermCount,
    /// Threads that hold a register each.
    pub threads: usize,
    /// Bytes that may be used.
    pub memory: u64,
}

/// How the number of terms is chosen.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum TermCount {
    /// From δ.
    FromDelta,
    /// The number that makes companion-corrected averages cheapest.
    Average,
    /// By hand.
    Fixed(u64),
}

/// A read-out with all its settings.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Choice {
    /// Which one.
    pub readout: Readout,
    /// Number of terms k; none for dense.
    pub terms: Option<u64>,
    /// λ = ξ/(k − 1 + ξ); 0 for dense.
    pub mixing_weight: f64,
    /// Settings of `probe`.
    pub probe: Option<probe::Settings>,
    /// Bytes all registers take; for a branching program at least.
    pub memory: u128,
    /// Most active qubits a register may hold.
    pub room: usize,
}

/// Why a wish cannot be granted.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum ChoiceError {
    /// Too many active qubits for exact amplitudes.
    #[error(
        "read-out dense takes at most {} active qubits, this circuit needs {found}: choose \
         --readout walk",
        dense::MAX_ACTIVE
    )]
    TooManyActive {
        /// What the circuit needs.
        found: usize,
    },
    /// Too little memory.
    #[error("{}", memory_message(.readout, *.needed, *.available, .advice))]
    Memory {
        /// The read-out.
        readout: Readout,
        /// Bytes needed.
        needed: u128,
        /// Bytes there are.
        available: u64,
        /// What would fit.
        advice: String,
    },
    /// Damping of an entangled qubit with `probe`.
    #[error(
        "amplitude damping or relaxation acts on a qubit after it was entangled or measured: \
         read-out probe draws its outcomes from norms, which the two ways a damping can go \
         would have to share; choose --readout walk or dense"
    )]
    Damping,
    /// Too many random states an estimate.
    #[error(
        "read-out probe would need {probes:.1e} random states an estimate for δ = {delta}: raise \
         --delta or choose --readout walk"
    )]
    TooManyProbes {
        /// What δ asks for.
        probes: f64,
        /// δ.
        delta: f64,
    },
    /// More terms than can be counted.
    #[error(
        "extent 10^{log10_extent:.1} with δ = {delta} asks for more than 4·10^9 terms, the most \
         there can be: raise --delta, or use fewer or noisier non-Clifford gates"
    )]
    TooManyTerms {
        /// log10 ξ.
        log10_extent: f64,
        /// δ.
        delta: f64,
    },
}

fn memory_message(readout: &Readout, needed: u128, available: u64, advice: &str) -> String {
    format!(
        "read-out {} would take {} of memory, {} are available: {advice}",
        readout.word(),
        bytes(needed),
        bytes(u128::from(available)),
    )
}

/// A number of bytes as text.
pub fn bytes(count: u128) -> String {
    let units = ["B", "KiB", "MiB", "GiB", "TiB", "PiB"];
    let mut value = count as f64;
    let mut unit = 0;
    while value >= 1024.0 && unit + 1 < units.len() {
        value /= 1024.0;
        unit += 1;
    }
    if unit == 0 {
        format!("{count} B")
    } else {
        format!("{value:.1} {}", units[unit])
    }
}

/// Chooses a read-out for a program.
pub fn choose(program: &Program, log_extent: f64, wish: &Wish) -> Result<Choice, ChoiceError> {
    match wish.readout {
        Some(Readout::Dense) => dense_choice(program, wish),
        Some(Readout::Probe) => probe_choice(program, log_extent, wish),
        Some(Readout::Walk) => walk_choice(program, log_extent, wish),
        // Probe costs more than walk at any size, so it is taken on request only.
        None => match (
            dense_choice(program, wish),
            walk_choice(program, log_extent, wish),
        ) {
            (Ok(dense), Ok(walk)) => {
                let cheaper = dense_cost(program) <= walk_cost(program, &walk);
                Ok(if cheaper { dense } else { walk })
            }
            (Ok(dense), Err(_)) => Ok(dense),
            (Err(_), Ok(walk)) => Ok(walk),
            (Err(_), Err(error)) => Err(error),
        },
    }
}

fn dense_choice(program: &Program, wish: &Wish) -> Result<Choice, ChoiceError> {
    let found = program.peak_active();
    // The bound of a branching program may be far above what its shots need;
    // then the register grows as it must, and a branch that needs more stops
    // with an error.
    if found > dense::MAX_ACTIVE && !program.branches() {
        return Err(ChoiceError::TooManyActive { found });
    }
    let certain = program.first().peak_active;
    if certain > dense::MAX_ACTIVE {
        return Err(ChoiceError::TooManyActive { found: certain });
    }
    let needed = dense::memory(certain) * wish.threads as u128;
    if needed > u128::from(wish.memory) {
        let threads = u128::from(wish.memory) / dense::memory(certain);
        let advice = if threads > 0 {
            format!("--threads {threads} would fit")
        } else {
            "choose --readout walk".to_owned()
        };
        return Err(ChoiceError::Memory {
            readout: Readout::Dense,
            needed,
            available: wish.memory,
            advice,
        });
    }
    // Registers of a branching program grow as its shots need.
    let share = u128::from(wish.memory) / wish.threads as u128;
    let room = (certain..dense::MAX_ACTIVE)
        .take_while(|&active| dense::memory(active + 1) <= share)
        .last()
        .map_or(certain, |active| active + 1);
    Ok(Choice {
        readout: Readout::Dense,
        terms: None,
        mixing_weight: 0.0,
        probe: None,
        memory: needed,
        room: room.min(dense::MAX_ACTIVE),
    })
}

/// Most random states an estimate may be made of.
const MAX_PROBES: f64 = 1e7;

/// Largest log ξ at which sums of terms keep within the range of a double.
const MAX_LOG_EXTENT: f64 = 600.0;

/// Terms and their memory for a mixing error of at most `delta`.
fn terms_choice(
    program: &Program,
    log_extent: f64,
    readout: Readout,
    delta: f64,
    wish: &Wish,
) -> Result<(u64, u128), ChoiceError> {
    if readout == Readout::Probe && program.has_damping() {
        return Err(ChoiceError::Damping);
    }
    // λ stays below δ/2 whatever the trace of the companion turns out to be.
    let log_extent = log_extent + program.log_damping_trace();
    let terms = match wish.terms {
        TermCount::Fixed(terms) => Some(terms),
        TermCount::Average => terms_for_average(log_extent),
        TermCount::FromDelta => terms_for_delta(log_extent, delta),
    };
    let most = u64::from(u32::MAX);
    let terms = terms.filter(|&terms| terms <= most && log_extent <= MAX_LOG_EXTENT);
    let terms = terms.ok_or(ChoiceError::TooManyTerms {
        log10_extent: log_extent / std::f64::consts::LN_10,
        delta: wish.delta,
    })?;
    let share = term_memory(program) * wish.threads as u128;
    let needed = share * u128::from(terms);
    if needed <= u128::from(wish.memory) {
        return Ok((terms, needed));
    }
    let fitting = ((u128::from(wish.memory) / share.max(1)) as u64).max(1);
    let reached = 2.0 * mixing_weight(log_extent, fitting) * (wish.delta / delta);
    let advice = if reached < 2.0 {
        format!(
            "--delta {:.2e} (or --terms {fitting}) would fit",
            reached * 1.01
        )
    } else {
        "no useful δ fits: use fewer or noisier non-Clifford gates".to_owned()
    };
    Err(ChoiceError::Memory {
        readout,
        needed,
        available: wish.memory,
        advice,
    })
}

fn probe_choice(program: &Program, log_extent: f64, wish: &Wish) -> Result<Choice, ChoiceError> {
    // Terms and random states cost k·L with k ∝ 1/δ_mixing and L ∝ 1/δ_probe:
    // least at equal halves.
    let half = wish.delta / 2.0;
    let (terms, memory) = terms_choice(program, log_extent, Readout::Probe, half, wish)?;
    let probes = probe::probes_for(program.inner_measurements(), half);
    if terms > 1 && probes > MAX_PROBES {
        return Err(ChoiceError::TooManyProbes {
            probes,
            delta: wish.delta,
        });
    }
    let probes = probes as usize;
    Ok(Choice {
        readout: Readout::Probe,
        terms: Some(terms),
        mixing_weight: mixing_weight(log_extent, terms),
        probe: Some(probe::Settings {
            probes,
            cap: probe::acceptance_cap(log_extent, terms, probes),
            branches: program.branches(),
        }),
        memory,
        room: MAX_SLOTS,
    })
}

fn walk_choice(program: &Program, log_extent: f64, wish: &Wish) -> Result<Choice, ChoiceError> {
    let (terms, memory) = terms_choice(program, log_extent, Readout::Walk, wish.delta, wish)?;
    Ok(Choice {
        readout: Readout::Walk,
        terms: Some(terms),
        mixing_weight: mixing_weight(log_extent, terms),
        probe: None,
        memory,
        room: MAX_SLOTS,
    })
}

/// Bytes of one term, with its drawn components and weight.
fn term_memory(program: &Program) -> u128 {
    let slots = program.slots();
    let state = match slots {
        0..=64 => Terms::<1>::new(slots).bytes_per_term(),
        65..=128 => Terms::<2>::new(slots).bytes_per_term(),
        _ => Terms::<4>::new(slots).bytes_per_term(),
    };
    (state + size_of::<Complex64>() + program.sites().len()) as u128
}

/// Rough seconds a shot takes on one thread, from the number of steps alone: for
/// choices that are plain. Measured costs are the planning's business.
pub fn rough_seconds(program: &Program, choice: &Choice) -> f64 {
    1e-9 * match choice.readout {
        Readout::Dense => dense_cost(program),
        Readout::Walk | Readout::Probe => walk_cost(program, choice),
    }
}

/// Rough nanoseconds a shot.
fn dense_cost(program: &Program) -> f64 {
    let steps = register_steps(program) as f64;
    steps * (20.0 + 1.5 * (program.peak_active().min(60) as f64).exp2())
}

/// Rough nanoseconds a shot: a pass over all terms a step, and about three
/// draws of all components at the start.
fn walk_cost(program: &Program, choice: &Choice) -> f64 {
    let terms = choice.terms.unwrap_or(1) as f64;
    let active = program.peak_active() as f64;
    let steps = register_steps(program) as f64;
    terms * (steps * (30.0 + 2.0 * active) + 30.0 * program.sites().len() as f64)
}

fn register_steps(program: &Program) -> usize {
    let touches = |step: &&Step| {
        !matches!(
            step,
            Step::Coin { .. } | Step::Known { .. } | Step::Assign { .. } | Step::Flip { .. }
        )
    };
    program.first().steps.iter().filter(touches).count()
}
