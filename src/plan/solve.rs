//! The smallest δ within a limit of time and memory.

use serde::Serialize;

use crate::readout::choice::{self, Readout};

use super::CHOICE_RANGE;
use super::model::{Accuracy, Model};
use super::table::Estimate;
use super::units::{format_seconds, round_up};

/// What a run may take.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Limits {
    /// Seconds, if they are limited.
    pub seconds: Option<f64>,
    /// Bytes.
    pub memory: u64,
}

/// The smallest error within limits.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Solved {
    /// δ; absent where the exact read-out is within the limits.
    pub delta: Option<f64>,
    /// The read-out.
    #[serde(serialize_with = "word")]
    pub readout: Readout,
    /// Number of terms.
    pub terms: Option<u64>,
    /// Seconds a run is predicted to take.
    pub seconds: f64,
    /// Bytes it is predicted to take.
    pub memory_bytes: f64,
}

fn word<S: serde::Serializer>(readout: &Readout, serializer: S) -> Result<S::Ok, S::Error> {
    serializer.serialize_str(readout.word())
}

/// Why no δ of the range is within the limits.
#[derive(Debug, Clone, PartialEq)]
pub struct Refusal {
    /// What the cheapest way would take, or why there is none.
    pub reason: String,
    /// Whether the read-out is one whose cost grows with ξ.
    pub terms: bool,
    /// log₁₀ of the ξ up to which δ = 1 would be within the limits, if less ξ
    /// helps at all.
    pub log10_extent: Option<f64>,
    /// Shots that δ = 1 has time for, if fewer shots help.
    pub shots: Option<u64>,
}

/// Finds the smallest δ of [`CHOICE_RANGE`], rounded up to two significant
/// digits, whose run keeps within the limits; the exact read-out counts as the
/// smallest of all. Time and memory fall as δ grows, so bisection finds it.
pub(super) fn smallest_delta(model: &Model<'_>, limits: &Limits) -> Result<Solved, Refusal> {
    let within = |estimate: &Estimate| {
        estimate.refused.is_none()
            && estimate.memory_bytes <= limits.memory as f64
            && match (limits.seconds, estimate.seconds) {
                (None, _) => true,
                (Some(limit), Some(seconds)) => seconds <= limit,
                (Some(_), None) => false,
            }
    };
    let asked = model.request.readout;
    if matches!(asked, None | Some(Readout::Dense)) {
        let dense = model.dense();
        if within(&dense) {
            return Ok(solved(None, Readout::Dense, &dense));
        }
        if asked.is_some() {
            return Err(refuse(model, limits, Readout::Dense, &dense));
        }
    }
    let readout = asked.unwrap_or(Readout::Walk);
    let at = |delta: f64| model.sampled(readout, Accuracy::Delta(delta));
    let (least, most) = CHOICE_RANGE;
    if !within(&at(most)) {
        return Err(refuse(model, limits, readout, &at(most)));
    }
    let (mut low, mut high) = (least.ln(), most.ln());
    if within(&at(least)) {
        high = low;
    }
    while high - low > 1e-4 {
        let middle = 0.5 * (low + high);
        if within(&at(middle.exp())) {
            high = middle;
        } else {
            low = middle;
        }
    }
    let delta = round_up(high.exp()).clamp(least, most);
    Ok(solved(Some(delta), readout, &at(delta)))
}

fn solved(delta: Option<f64>, readout: Readout, estimate: &Estimate) -> Solved {
    Solved {
        delta,
        readout,
        terms: estimate.terms,
        seconds: estimate.seconds.unwrap_or(f64::INFINITY),
        memory_bytes: estimate.memory_bytes,
    }
}

fn refuse(model: &Model<'_>, limits: &Limits, readout: Readout, at_most: &Estimate) -> Refusal {
    let what = match readout {
        Readout::Dense => "read-out dense".to_owned(),
        _ => format!("read-out {} with δ = 1", readout.word()),
    };
    let time = at_most.seconds.unwrap_or(f64::INFINITY);
    let over_time = limits.seconds.map(|limit| time / limit);
    let over_memory = at_most.memory_bytes / limits.memory as f64;
    let takes = format!(
        "{what} would take {} and {} of memory",
        format_seconds(time),
        choice::bytes(at_most.memory_bytes.min(1e38) as u128)
    );
    let mut allowed = Vec::new();
    if let Some(limit) = limits.seconds {
        allowed.push(format_seconds(limit));
    }
    allowed.push(choice::bytes(u128::from(limits.memory)));
    let mut reason = format!("{takes}; allowed are {}", allowed.join(" and "));
    if let Some(cause) = &at_most.refused
        && over_memory <= 1.0
        && over_time.is_none_or(|factor| factor <= 1.0)
    {
        reason = format!("{what} is not possible: {cause}");
    }
    let terms = readout != Readout::Dense;
    let factor = over_time.unwrap_or(1.0).max(over_memory);
    let log10_extent = (terms && factor.is_finite() && factor > 1.0)
        .then(|| model.log_extent / std::f64::consts::LN_10 - factor.log10())
        .filter(|&log10| log10 > 0.0);
    // Fewer shots help where time is all that is missing.
    let shots = limits.seconds.and_then(|limit| {
        let each = at_most.seconds_a_shot? + model.overhead.shot;
        let spare = limit - model.overhead.start - model.overhead.end;
        let shots = (spare / each).floor();
        (over_memory <= 1.0 && at_most.refused.is_none() && shots >= 1.0).then_some(shots as u64)
    });
    Refusal {
        reason,
        terms,
        log10_extent,
        shots,
    }
}
