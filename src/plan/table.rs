//! The plan as data: see the [module](super) for the JSON form.

use serde::Serialize;

use crate::readout::choice::Readout;

use super::model::{Accuracy, Model};
use super::profile::Profile;
use super::solve::{Limits, Refusal, Solved, smallest_delta};
use super::{CHOICE_RANGE, walk};

/// What a circuit costs, by δ.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Plan {
    /// Version of the program.
    pub program_version: String,
    /// Name of the circuit file.
    pub circuit: String,
    /// Name of the noise file.
    pub noise: Option<String>,
    /// Title of the noise file.
    pub title: Option<String>,
    /// Number of qubits.
    pub qubits: u64,
    /// Number of shots.
    pub shots: u64,
    /// Number of companion shots with a read-out of terms.
    pub companion_shots: u64,
    /// Number of threads.
    pub threads: u64,
    /// The non-Clifford places.
    pub sites: PlanSites,
    /// Kinds of sites that cost most, the costliest first.
    pub costliest: Vec<Costly>,
    /// Active qubits; absent if the circuit cannot be compiled.
    pub active: Option<Profile>,
    /// Measurements that touch the active register; an upper bound where the
    /// structure depends on outcomes.
    pub inner_measurements: Option<u64>,
    /// What was measured.
    pub measured: Measured,
    /// The limits that were given.
    pub limits: LimitsRow,
    /// The exact read-out.
    pub dense: Estimate,
    /// By δ.
    pub rows: Vec<Row>,
    /// δ against cost, for drawing.
    pub curve: Vec<CurvePoint>,
    /// The smallest δ within the limits, if limits were given.
    pub choice: Option<Solved>,
    /// Why no δ is within the limits.
    pub refused: Option<String>,
    /// Why the circuit cannot run at all.
    pub blocked: Option<String>,
}

/// Sites and their extents.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct PlanSites {
    /// Non-Clifford gates as written.
    pub as_written: u64,
    /// Sites that merged into earlier ones, or became Clifford by that.
    pub merged: u64,
    /// Sites on an axis whose value is known, up to a sign.
    pub deterministic: u64,
    /// Sites that no recorded bit depends on.
    pub unobservable: u64,
    /// Sites that are left and matter.
    pub kept: u64,
    /// log₁₀ of the extent as written: every gate by itself, noise left out.
    pub log10_extent_as_written: f64,
    /// log₁₀ of the extent with noise merged, before sites were reduced.
    pub log10_extent_after_noise: f64,
    /// log₁₀ ξ of a run.
    pub log10_extent: f64,
    /// ξ; absent where it is too large for a double.
    pub extent: Option<f64>,
}

/// Sites of one kind and nearly one extent.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Costly {
    /// The first source lines they stand on, from 1.
    pub lines: Vec<u32>,
    /// rotation, ccz or prepared.
    pub kind: String,
    /// How many.
    pub count: u64,
    /// Largest extent among them; all are within a thousandth.
    pub extent: f64,
    /// log₁₀ of their product.
    pub log10_share: f64,
}

/// What was measured.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Measured {
    /// Seconds it took.
    pub seconds: f64,
    /// Seconds until the first shot.
    pub start_seconds: f64,
    /// Seconds after the last one.
    pub end_seconds: f64,
    /// Seconds a companion shot.
    pub companion_seconds: Option<f64>,
    /// Seconds for writing a shot.
    pub write_seconds: f64,
    /// Seconds for writing a companion shot.
    pub write_companion_seconds: f64,
    /// Bytes without any register.
    pub memory_base: f64,
    /// Bytes of one term of one thread.
    pub bytes_per_term: f64,
    /// Shots of the walk.
    pub walk: Vec<MeasuredWalk>,
}

/// Shots of the walk with so many terms.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct MeasuredWalk {
    /// k.
    pub terms: u64,
    /// Seconds a shot.
    pub seconds_a_shot: f64,
    /// Draws a shot.
    pub attempts: f64,
    /// Shots timed.
    pub shots: u64,
}

/// Limits of a choice.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct LimitsRow {
    /// Seconds a run may take.
    pub seconds: Option<f64>,
    /// Bytes a run may take.
    pub memory_bytes: u64,
}

/// What a run with one read-out takes.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Estimate {
    /// Number of terms; absent for dense and where it is beyond 9·10^15.
    pub terms: Option<u64>,
    /// Its logarithm, whatever its size.
    pub log10_terms: Option<f64>,
    /// Random states an estimate, for probe.
    pub probes: Option<u64>,
    /// Seconds a shot; absent where it was not measured.
    pub seconds_a_shot: Option<f64>,
    /// Seconds a run.
    pub seconds: Option<f64>,
    /// Bytes of the process.
    pub memory_bytes: f64,
    /// Whether it lies outside what was measured.
    pub extrapolated: bool,
    /// Why it cannot be done.
    pub refused: Option<String>,
}

/// One accuracy.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Row {
    /// δ; absent for averages.
    pub delta: Option<f64>,
    /// Whether the row is for corrected averages.
    pub average: bool,
    /// log₁₀ of the number of terms of the walk.
    pub log10_terms: f64,
    /// λ of the walk.
    pub mixing_weight: f64,
    /// The walk.
    pub walk: Estimate,
    /// The probe.
    pub probe: Estimate,
    /// The read-out a run would take.
    pub readout: Option<&'static str>,
}

/// δ against cost.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct CurvePoint {
    /// δ.
    pub delta: f64,
    /// Seconds a run.
    pub seconds: Option<f64>,
    /// Bytes.
    pub memory_bytes: f64,
}

impl Row {
    /// The estimate of the read-out a run would take.
    pub fn chosen<'a>(&'a self, dense: &'a Estimate) -> Option<&'a Estimate> {
        match self.readout {
            Some("dense") => Some(dense),
            Some("walk") => Some(&self.walk),
            Some("probe") => Some(&self.probe),
            _ => None,
        }
    }
}

impl Plan {
    /// The plan as one JSON document.
    pub fn to_json(&self) -> String {
        // Names and numbers always have a JSON form.
        serde_json::to_string_pretty(self).unwrap_or_default()
    }
}

impl Model<'_> {
    /// The cheapest read-out that can do it, of those asked for.
    pub fn cheapest<'e>(
        &self,
        dense: &'e Estimate,
        walk: &'e Estimate,
        probe: &'e Estimate,
    ) -> Option<(Readout, &'e Estimate)> {
        let all = [
            (Readout::Dense, dense),
            (Readout::Walk, walk),
            (Readout::Probe, probe),
        ];
        all.into_iter()
            .filter(|(readout, estimate)| {
                let asked = match self.request.readout {
                    // As in a run: probe is taken on request only.
                    None => *readout != Readout::Probe,
                    Some(wanted) => wanted == *readout,
                };
                asked && estimate.refused.is_none()
            })
            .min_by(|(_, a), (_, b)| {
                let seconds = |estimate: &Estimate| estimate.seconds.unwrap_or(f64::INFINITY);
                seconds(a).total_cmp(&seconds(b))
            })
    }

    /// The row of one accuracy.
    pub fn row(&self, accuracy: Accuracy) -> Row {
        let walk = self.sampled(Readout::Walk, accuracy);
        let probe = self.sampled(Readout::Probe, accuracy);
        let dense = self.dense();
        let readout = self.cheapest(&dense, &walk, &probe);
        Row {
            delta: match accuracy {
                Accuracy::Delta(delta) => Some(delta),
                Accuracy::Average => None,
            },
            average: accuracy == Accuracy::Average,
            log10_terms: self.terms(accuracy, Readout::Walk).1,
            mixing_weight: self.mixing_weight(accuracy),
            readout: readout.map(|(readout, _)| readout.word()),
            walk,
            probe,
        }
    }

    /// Rows of all accuracies: δ from large to small, averages at the end.
    pub fn rows(&self, deltas: &[f64]) -> Vec<Row> {
        let mut deltas = deltas.to_vec();
        deltas.sort_by(|a, b| b.total_cmp(a));
        deltas.dedup();
        deltas
            .into_iter()
            .map(Accuracy::Delta)
            .chain([Accuracy::Average])
            .map(|accuracy| self.row(accuracy))
            .collect()
    }

    /// Costs over the range of δ that is drawn, with the read-out of terms that
    /// is asked for.
    pub fn curve(&self, rows: &[Row]) -> Vec<CurvePoint> {
        const POINTS: u32 = 48;
        let given = rows.iter().filter_map(|row| row.delta);
        let least = given
            .fold(f64::INFINITY, f64::min)
            .min(0.01)
            .max(CHOICE_RANGE.0);
        let readout = match self.request.readout {
            Some(Readout::Probe) => Readout::Probe,
            _ => Readout::Walk,
        };
        (0..=POINTS)
            .map(|step| {
                let share = f64::from(step) / f64::from(POINTS);
                let delta = least.powf(share);
                let estimate = self.sampled(readout, Accuracy::Delta(delta));
                CurvePoint {
                    delta,
                    seconds: estimate.seconds,
                    memory_bytes: estimate.memory_bytes,
                }
            })
            .collect()
    }

    /// The smallest δ within limits, or why there is none.
    pub fn solve(&self, limits: &Limits) -> Result<Solved, Refusal> {
        smallest_delta(self, limits)
    }

    /// What was measured, for the record.
    pub fn measured(&self, seconds: f64) -> Measured {
        let rungs = self.walk.as_ref().map_or(&[][..], |walk| walk.cost.rungs());
        let row = |rung: &walk::Rung| MeasuredWalk {
            terms: rung.terms,
            seconds_a_shot: rung.timing.seconds,
            attempts: rung.timing.attempts,
            shots: rung.timing.shots,
        };
        Measured {
            seconds,
            start_seconds: self.overhead.start,
            end_seconds: self.overhead.end,
            companion_seconds: self.companion,
            write_seconds: self.overhead.shot,
            write_companion_seconds: self.overhead.companion,
            memory_base: self.overhead.memory,
            bytes_per_term: self.bytes_per_term(Readout::Walk),
            walk: rungs.iter().map(row).collect(),
        }
    }
}
