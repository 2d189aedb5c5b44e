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
}

impl Readout {
    /// The word used in options and files.
    pub fn word(self) -> &'static str {
        match self {
            Readout::Dense => "dense",
            Readout::Probe => "probe",
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
         --readout probe",
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
    /// Damping of an entangled qubit with terms.
    #[error(
        "amplitude damping or relaxation acts on a qubit after it was entangled or measured; \
         read-out probe cannot do that: choose --readout dense (at most {} active qubits, this \
         circuit needs {active})",
        dense::MAX_ACTIVE
    )]
    Damping {
        /// Active qubits of the circuit.
        active: usize,
    },
    /// More terms than can be counted.
    #[error(
        "extent 10^{log10_extent:.1} with δ = {delta} asks for more than 10^18 terms: raise \
         --delta, add noise to the sites, or use fewer non-Clifford gates"
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
        None => {
            let dense = dense_choice(program, wish);
            let probe = probe_choice(program, log_extent, wish);
            match (dense, probe) {
                (Ok(dense), Ok(probe)) => {
                    Ok(if dense_cost(program) <= probe_cost(program, &probe) {
                        dense
                    } else {
                        probe
                    })
                }
                (Ok(dense), Err(_)) => Ok(dense),
                (Err(_), Ok(probe)) => Ok(probe),
                (Err(error), Err(ChoiceError::Damping { .. })) => Err(error),
                (Err(_), Err(error)) => Err(error),
            }
        }
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
            "choose --readout probe".to_owned()
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

fn probe_choice(program: &Program, log_extent: f64, wish: &Wish) -> Result<Choice, ChoiceError> {
    if program.has_damping() {
        return Err(ChoiceError::Damping {
            active: program.peak_active(),
        });
    }
    // Terms and random states cost k·L with k ∝ 1/δ_mixing and L ∝ 1/δ_probe:
    // least at equal halves. Without magic there is one term and no estimate.
    let half = wish.delta / 2.0;
    let terms = match wish.terms {
        TermCount::Fixed(terms) => Some(terms),
        TermCount::Average => terms_for_average(log_extent),
        TermCount::FromDelta => terms_for_delta(log_extent, half),
    };
    let too_many = ChoiceError::TooManyTerms {
        log10_extent: log_extent / std::f64::consts::LN_10,
        delta: wish.delta,
    };
    let terms = terms.ok_or(too_many)?;
    let needed = term_memory(program) * u128::from(terms) * wish.threads as u128;
    if needed > u128::from(wish.memory) {
        let fitting =
            u128::from(wish.memory) / (term_memory(program) * wish.threads as u128).max(1);
        let fitting = (fitting as u64).max(1);
        let delta = 4.0 * mixing_weight(log_extent, fitting);
        let advice = if delta < 2.0 {
            format!(
                "--delta {:.2e} (or --terms {fitting}) would fit",
                delta * 1.01
            )
        } else {
            "no useful δ fits: use fewer or noisier non-Clifford gates".to_owned()
        };
        return Err(ChoiceError::Memory {
            readout: Readout::Probe,
            needed,
            available: wish.memory,
            advice,
        });
    }
    let probes = probe::probes_for(program.inner_measurements(), half);
    Ok(Choice {
        readout: Readout::Probe,
        terms: Some(terms),
        mixing_weight: mixing_weight(log_extent, terms),
        probe: Some(probe::Settings {
            probes,
            cap: probe::acceptance_cap(log_extent, terms, probes),
        }),
        memory: needed,
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

/// Rough nanoseconds a shot.
fn dense_cost(program: &Program) -> f64 {
    let steps = register_steps(program) as f64;
    steps * (20.0 + 1.5 * (program.peak_active().min(60) as f64).exp2())
}

/// Rough nanoseconds a shot.
fn probe_cost(program: &Program, choice: &Choice) -> f64 {
    let (Some(terms), Some(settings)) = (choice.terms, choice.probe) else {
        return f64::INFINITY;
    };
    let active = program.peak_active() as f64;
    let steps = register_steps(program) as f64;
    let estimates = program.inner_measurements() as f64 * settings.probes as f64;
    let one = if terms == 1 {
        0.0
    } else {
        estimates * (50.0 + 2.0 * active * active)
    };
    terms as f64 * (steps * (20.0 + 5.0 * active) + one)
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
