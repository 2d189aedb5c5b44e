//! From what was measured to the time and memory of any run of a circuit.

use crate::magic::mixing::{mixing_weight, terms_for_average};
use crate::program::Program;
use crate::readout::choice::{self, Choice, ChoiceError, Readout, TermCount, Wish};
use crate::readout::probe::{MIN_PROBES, probes_for};

use crate::sampler::batch::most_in_flight;

use super::bare::Bare;
use super::probe::ProbeCost;
use super::profile::Profile;
use super::survey::WalkSurvey;
use super::table::Estimate;
use super::walk::Predicted;

/// What is asked for, δ aside.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Request {
    /// The read-out, or none for the cheapest one.
    pub readout: Option<Readout>,
    /// Number of shots.
    pub shots: u64,
    /// Number of companion shots, or none for the usual one.
    pub companion: Option<u64>,
    /// Threads at work.
    pub threads: usize,
    /// Most bytes the process may have in memory.
    pub memory: u64,
}

/// What a run costs besides drawing shots.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Overhead {
    /// Seconds until the first shot.
    pub start: f64,
    /// Seconds after the last one, whatever the number of shots.
    pub end: f64,
    /// Seconds for writing a shot and counting it at the end.
    pub shot: f64,
    /// The same for a companion shot.
    pub companion: f64,
    /// Bytes of the process without any register and with few shots.
    pub memory: f64,
    /// Bytes of a finished shot that waits to be written.
    pub waiting: f64,
    /// Bytes for counting outcomes at the end, when the registers are gone.
    pub counting: f64,
    /// Bytes that reading back a shot or companion shot takes, and all of them
    /// together at most.
    pub reading: (f64, f64),
}

/// Costs of a circuit by read-out.
pub struct Model<'p> {
    /// The program, unless it could not be compiled.
    pub program: Option<&'p Program>,
    /// log ξ.
    pub log_extent: f64,
    /// log of the bound on the companion's trace where entangled qubits are
    /// damped, else 0: the number of terms is that of ξ times the trace.
    pub log_damping: f64,
    /// What is asked for.
    pub request: Request,
    /// Active qubits, if the program could be compiled.
    pub profile: Option<Profile>,
    /// The walk; none if it was not measured.
    pub walk: Option<WalkSurvey>,
    /// The probe; none if it was not measured.
    pub probe: Option<ProbeCost>,
    /// A dense shot; none if it was not measured.
    pub dense: Option<Predicted>,
    /// Seconds a companion shot; none if there can be none.
    pub companion: Option<f64>,
    /// What else a run costs.
    pub overhead: Overhead,
    /// The least costs of a circuit that cannot be compiled: its sites, and one
    /// pass over a term.
    pub bare: Option<(usize, Bare)>,
    /// Why the circuit cannot run at all.
    pub blocked: Option<String>,
}

/// What a row stands for.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Accuracy {
    /// Trace-norm error δ.
    Delta(f64),
    /// The number of terms for corrected averages.
    Average,
}

impl Model<'_> {
    /// Companion shots of a run with a read-out.
    pub fn companion_shots(&self, readout: Readout) -> u64 {
        match self.request.companion {
            Some(count) => count,
            None if readout == Readout::Dense => 0,
            None => self.request.shots,
        }
    }

    /// Number of terms k as a real number, whatever its size, and its log₁₀.
    pub fn terms(&self, accuracy: Accuracy, readout: Readout) -> (f64, f64) {
        let log_extent = self.log_extent + self.log_damping;
        let delta = match accuracy {
            Accuracy::Delta(delta) if readout == Readout::Probe => delta / 2.0,
            Accuracy::Delta(delta) => delta,
            Accuracy::Average => {
                let terms = terms_for_average(log_extent).map(|terms| terms as f64);
                // Without bound k is ξ + 3.
                let log10 = terms.map_or(log_extent / std::f64::consts::LN_10, f64::log10);
                return (terms.unwrap_or(log_extent.exp()), log10);
            }
        };
        if log_extent <= 0.0 || delta >= 2.0 {
            return (1.0, 0.0);
        }
        let log = log_extent + (2.0 / delta - 1.0).ln();
        let terms = 1.0 + log.exp().ceil();
        let log10 = if terms.is_finite() {
            terms.log10()
        } else {
            log / std::f64::consts::LN_10
        };
        (terms, log10)
    }

    /// λ of a row.
    pub fn mixing_weight(&self, accuracy: Accuracy) -> f64 {
        let (terms, _) = self.terms(accuracy, Readout::Walk);
        mixing_weight(self.log_extent, terms.min(1e18) as u64)
    }

    /// The exact choice a run would make, without a limit of memory.
    fn choice(&self, readout: Readout, accuracy: Accuracy) -> Result<Choice, String> {
        let Some(program) = self.program else {
            return Err(self.blocked.clone().unwrap_or_default());
        };
        choice::choose(
            program,
            self.log_extent,
            &self.wish(Some(readout), accuracy),
        )
        .map_err(|error: ChoiceError| error.to_string())
    }

    fn wish(&self, readout: Option<Readout>, accuracy: Accuracy) -> Wish {
        let (delta, terms) = match accuracy {
            Accuracy::Delta(delta) => (delta, TermCount::FromDelta),
            Accuracy::Average => (0.1, TermCount::Average),
        };
        Wish {
            readout,
            delta,
            terms,
            threads: self.request.threads,
            memory: u64::MAX,
        }
    }

    /// What a run with a read-out of terms would take.
    pub fn sampled(&self, readout: Readout, accuracy: Accuracy) -> Estimate {
        let (terms, log10_terms) = self.terms(accuracy, readout);
        let choice = self.choice(readout, accuracy);
        let random_states = match (readout, accuracy) {
            (Readout::Probe, Accuracy::Delta(delta)) => {
                let measurements = self.program.map_or(0, Program::inner_measurements);
                Some(probes_for(measurements, delta / 2.0))
            }
            (Readout::Probe, Accuracy::Average) => {
                let measurements = self.program.map_or(0, Program::inner_measurements);
                Some(probes_for(measurements, 0.05))
            }
            _ => None,
        };
        let predicted = match (readout, &self.walk, &self.probe, self.bare) {
            (Readout::Walk, Some(walk), _, _) => Some(walk.cost.predict(terms)),
            (Readout::Probe, _, Some(probe), _) => Some(Predicted {
                seconds: probe.predict(terms, random_states.unwrap_or(MIN_PROBES)),
                extrapolated: true,
            }),
            (Readout::Walk, _, _, Some((sites, bare))) => Some(Predicted {
                seconds: terms * sites as f64 * bare.seconds,
                extrapolated: true,
            }),
            _ => None,
        };
        let registers = terms * self.request.threads as f64 * self.bytes_per_term(readout);
        let mut estimate = Estimate {
            terms: (terms < 9.0e15).then_some(terms as u64),
            log10_terms: Some(log10_terms),
            probes: random_states.map(|count| count as u64),
            ..self.estimate(readout, predicted, registers)
        };
        estimate.refused = match choice {
            Err(reason) => Some(reason),
            Ok(_) => self.too_much_memory(estimate.memory_bytes),
        };
        estimate
    }

    /// What a run with exact amplitudes would take.
    pub fn dense(&self) -> Estimate {
        let choice = self.choice(Readout::Dense, Accuracy::Delta(0.1));
        let active = self.profile.as_ref().map(|profile| {
            let followed = profile.steps.len().saturating_sub(1);
            if profile.exact {
                profile.peak
            } else {
                followed
            }
        });
        let registers = active.map_or(f64::INFINITY, |active| {
            self.request.threads as f64 * 16.0 * (active.min(1000) as f64).exp2()
        });
        let mut estimate = self.estimate(Readout::Dense, self.dense, registers);
        estimate.refused = match choice {
            Err(reason) => Some(reason),
            Ok(_) => self.too_much_memory(estimate.memory_bytes),
        };
        estimate
    }

    fn too_much_memory(&self, memory: f64) -> Option<String> {
        (memory > self.request.memory as f64).then(|| {
            format!(
                "takes {} of memory, the limit is {}",
                choice::bytes(memory.min(1e38) as u128),
                choice::bytes(u128::from(self.request.memory))
            )
        })
    }

    fn estimate(&self, readout: Readout, predicted: Option<Predicted>, registers: f64) -> Estimate {
        let companion = self.companion_shots(readout);
        // Companion shots are the faster ones.
        let waiting = predicted.map_or(0.0, |predicted| {
            in_flight(self.request.shots, predicted.seconds, self.request.threads).max(in_flight(
                companion,
                self.companion.unwrap_or(1.0),
                self.request.threads,
            ))
        });
        let drawing = registers + waiting * self.overhead.waiting;
        let (reading, most) = self.overhead.reading;
        let read = (reading * (self.request.shots as f64 + companion as f64)).min(most);
        let memory_bytes = self.overhead.memory + drawing.max(self.overhead.counting + read);
        let seconds = predicted.map(|predicted| {
            // Shots go to threads whole.
            let threads = self.request.threads as u64;
            let shots = match self.request.shots {
                0 => 0,
                shots => shots.max(threads),
            };
            let companion = companion as f64;
            let Overhead {
                start, end, shot, ..
            } = self.overhead;
            start
                + end
                + shots as f64 * predicted.seconds
                + self.request.shots as f64 * shot
                + companion * (self.companion.unwrap_or(0.0) + self.overhead.companion)
        });
        Estimate {
            terms: None,
            log10_terms: None,
            probes: None,
            seconds_a_shot: predicted.map(|predicted| predicted.seconds),
            seconds,
            memory_bytes,
            extrapolated: predicted.is_some_and(|predicted| predicted.extrapolated),
            refused: None,
        }
    }

    /// Bytes of one term of one thread, as measured or counted.
    pub fn bytes_per_term(&self, readout: Readout) -> f64 {
        let counted = self.program.map_or_else(
            || self.bare.map_or(0.0, |(_, bare)| bare.bytes),
            counted_bytes,
        );
        let measured = self.walk.as_ref().and_then(|walk| walk.bytes_per_term);
        match (readout, measured) {
            (Readout::Walk, Some(measured)) => measured.max(counted),
            _ => counted,
        }
    }
}

/// Shots that wait to be written at once.
fn in_flight(shots: u64, seconds_a_shot: f64, threads: usize) -> f64 {
    most_in_flight(seconds_a_shot * threads as f64, threads).min(shots as f64)
}

/// Bytes of one term as counted from its fields.
pub fn counted_bytes(program: &Program) -> f64 {
    let wish = Wish {
        readout: Some(Readout::Walk),
        delta: 0.1,
        terms: TermCount::Fixed(1),
        threads: 1,
        memory: u64::MAX,
    };
    // ξ does not matter for one term.
    choice::choose(program, 0.0, &wish).map_or(0.0, |choice| choice.memory as f64)
}
