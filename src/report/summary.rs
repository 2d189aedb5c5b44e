//! The summary of one result file.

use serde::Serialize;

use super::estimate::{Estimate, Sample, corrected};
use super::tally::{Tally, Words};
use crate::sampler::{Family, NormAudit};
use crate::store::{Header, Part, ReductionHeader, RegisterHeader, ShotFile, SiteRow, StoreError};

/// Most outcomes of a register that are listed.
pub(super) const MOST_OUTCOMES: usize = 8;

/// What a result file says, in short. See the [module](super) for the JSON form.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Summary {
    /// The result file.
    pub file: String,
    /// Version of the program that wrote it.
    pub program_version: String,
    /// Name of the circuit file.
    pub circuit: String,
    /// Name of the noise file.
    pub noise: Option<String>,
    /// Title of the noise file.
    pub title: Option<String>,
    /// Number of qubits.
    pub qubits: Option<u64>,
    /// Seed of the run.
    pub seed: u64,
    /// Shots in the file.
    pub shots: u64,
    /// Shots of the whole run.
    pub shots_total: u64,
    /// Shots this part of the run was to draw.
    pub shots_planned: u64,
    /// Whether it drew them all.
    pub complete: bool,
    /// Companion shots in the file; absent if none were asked for.
    pub companion_shots: Option<u64>,
    /// Shots whose acceptance ratio was above the cap.
    pub clipped: u64,
    /// Which part of the run.
    pub part: PartSummary,
    /// How outcomes were read out.
    pub readout: String,
    /// Trace-norm error δ.
    pub delta: Option<f64>,
    /// Number of terms k.
    pub terms: Option<u64>,
    /// λ.
    pub mixing_weight: f64,
    /// The non-Clifford places.
    pub sites: Sites,
    /// Averages of the per-shot diagnostics; absent without shots.
    pub draws: Option<Draws>,
    /// The norm audit; absent where no draw was audited.
    pub norm: Option<NormCheck>,
    /// Settings as name and value.
    pub settings: Vec<(String, String)>,
    /// The registers, in file order.
    pub registers: Vec<RegisterSummary>,
}

/// Part `index` of `count`.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
pub struct PartSummary {
    /// Which part, from 1.
    pub index: u64,
    /// Number of parts.
    pub count: u64,
}

/// Non-Clifford places and their extent.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Sites {
    /// All of them.
    pub count: u64,
    /// Those that matter for the outcome.
    pub kept: u64,
    /// What came of the non-Clifford gates before the run; absent where the file
    /// does not tell.
    pub reduction: Option<Reduction>,
    /// log₁₀ of the product of all extents as if there were no noise.
    pub log10_extent_without_noise: f64,
    /// log₁₀ ξ of the run.
    pub log10_extent: f64,
    /// ξ; absent where it is too large for a double.
    pub extent: Option<f64>,
}

/// What came of the non-Clifford gates of the circuit.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Reduction {
    /// Non-Clifford gates of the circuit as written.
    pub as_written: u64,
    /// Sites that merged into earlier ones, or became Clifford by that.
    pub merged: u64,
    /// Sites on an axis whose value is known, up to a sign.
    pub deterministic: u64,
    /// Sites that no recorded bit depends on.
    pub unobservable: u64,
    /// log₁₀ of the extent of the circuit as written, without noise.
    pub log10_extent_as_written: f64,
    /// log₁₀ of the extent once noise was merged, before sites were reduced.
    pub log10_extent_after_noise: f64,
}

/// Averages of the per-shot diagnostics.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Draws {
    /// Draws until a shot was accepted.
    pub mean_attempts: f64,
    /// Most qubits active at once, over all shots.
    pub peak_active: u16,
    /// Terms left at the end of a shot.
    pub mean_terms_left: f64,
}

/// One register.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct RegisterSummary {
    /// Name in the circuit file.
    pub name: String,
    /// record, check or logical.
    pub role: String,
    /// Number of bits.
    pub width: usize,
    /// Rate of shots with any bit 1.
    pub any_nonzero: Quantity,
    /// Mean number of bits that are 1.
    pub mean_weight: Quantity,
    /// Frequency of 1, bit by bit.
    pub bits: Vec<Quantity>,
    /// Number of different words seen.
    pub distinct_outcomes: Option<u64>,
    /// The words seen most often.
    pub outcomes: Option<Vec<Outcome>>,
}

/// A word of a register and how often it was seen.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Outcome {
    /// The bits as characters 0 and 1, bit 0 on the right.
    pub bits: String,
    /// Its frequency.
    pub frequency: Quantity,
}

/// An average: as drawn, of the companion circuit, and corrected.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Quantity {
    /// Over the shots.
    pub raw: Option<Estimate>,
    /// Over the companion shots.
    pub companion: Option<Estimate>,
    /// For the ideal distribution.
    pub corrected: Option<Estimate>,
}

impl Summary {
    /// Reads a result file once and counts.
    pub fn from_file(file: &ShotFile) -> Result<Self, StoreError> {
        let header = file.header();
        let shots = file.rows(Family::Shots).unwrap_or(0) as u64;
        let planned = header.part.shots(header.shots_total);
        let shots_planned = planned.end - planned.start;
        Ok(Summary {
            file: file.path().display().to_string(),
            program_version: file.program_version().to_owned(),
            circuit: header.circuit_name.clone(),
            noise: header.noise_name.clone(),
            title: header.title.clone(),
            qubits: header.qubits,
            seed: header.seed,
            shots,
            shots_total: header.shots_total,
            shots_planned,
            complete: shots >= shots_planned,
            companion_shots: file.rows(Family::Companion).map(|rows| rows as u64),
            clipped: file.clipped(),
            part: PartSummary::from(header.part),
            readout: header.readout.clone(),
            delta: header.delta,
            terms: header.terms,
            mixing_weight: header.mixing_weight,
            sites: Sites::of(header),
            draws: Draws::of(file)?,
            norm: file.norm_audit()?.as_ref().and_then(NormCheck::of),
            settings: header.settings.clone(),
            registers: registers(file)?,
        })
    }

    /// The summary as one JSON document.
    pub fn to_json(&self) -> String {
        // Names and numbers always have a JSON form.
        serde_json::to_string_pretty(self).unwrap_or_default()
    }
}

impl From<Part> for PartSummary {
    fn from(part: Part) -> Self {
        PartSummary {
            index: part.index,
            count: part.count,
        }
    }
}

impl Sites {
    fn of(header: &Header) -> Self {
        let sum = |extent: fn(&SiteRow) -> f64| -> f64 {
            header.sites.iter().map(|site| extent(site).log10()).sum()
        };
        let extent = header.log_extent.exp();
        Sites {
            count: header.sites.len() as u64,
            kept: header.sites.iter().filter(|site| site.kept).count() as u64,
            reduction: header.reduction.map(Reduction::from),
            log10_extent_without_noise: sum(|site| site.extent_without_noise),
            log10_extent: header.log_extent / std::f64::consts::LN_10,
            extent: extent.is_finite().then_some(extent),
        }
    }
}

impl From<ReductionHeader> for Reduction {
    fn from(header: ReductionHeader) -> Self {
        let log10 = |log: f64| log / std::f64::consts::LN_10;
        Reduction {
            as_written: header.sites_as_written,
            merged: header.sites_merged,
            deterministic: header.sites_deterministic,
            unobservable: header.sites_unobservable,
            log10_extent_as_written: log10(header.log_extent_as_written),
            log10_extent_after_noise: log10(header.log_extent_after_noise),
        }
    }
}

impl Draws {
    fn of(file: &ShotFile) -> Result<Option<Self>, StoreError> {
        const STEP: usize = 1 << 16;
        let (mut attempts, mut terms, mut peak, mut shots) = (0u64, 0u64, 0, 0);
        loop {
            let audit = file.audit(shots..shots + STEP)?;
            let count = audit.attempts.len();
            attempts += audit
                .attempts
                .iter()
                .map(|&value| u64::from(value))
                .sum::<u64>();
            terms += audit
                .terms_left
                .iter()
                .map(|&value| u64::from(value))
                .sum::<u64>();
            peak = audit
                .peak_active
                .iter()
                .fold(peak, |peak, &value| peak.max(value));
            shots += count;
            if count < STEP {
                break;
            }
        }
        Ok((shots > 0).then(|| Draws {
            mean_attempts: attempts as f64 / shots as f64,
            peak_active: peak,
            mean_terms_left: terms as f64 / shots as f64,
        }))
    }
}

/// Standard errors from which on a norm is not as expected. With 32 estimates or
/// more that happens by chance about once in 50,000 runs (t-distribution of 31
/// degrees of freedom, two-sided: 2.1e-5).
const MOST_DEVIATION: f64 = 5.0;

/// Fewest estimates whose own spread is good enough for a verdict.
const FEWEST_ESTIMATES: usize = 32;

/// The mean of the audited norms against 1 + (ξ − 1)/k.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct NormCheck {
    /// Number of audited draws.
    pub estimates: u64,
    /// Mean of their estimates of ‖Ω‖².
    pub mean: f64,
    /// Its standard error; absent with a single estimate.
    pub standard_error: Option<f64>,
    /// What it should be.
    pub expected: f64,
    /// (mean − expected) in standard errors; absent where there is no spread.
    pub deviation: Option<f64>,
    /// Whether the mean is as expected; absent where there are too few
    /// estimates to say.
    pub accepted: Option<bool>,
}

impl NormCheck {
    /// `None` without estimates.
    fn of(audit: &NormAudit) -> Option<Self> {
        let count = audit.estimates.len();
        if count == 0 {
            return None;
        }
        let number = count as f64;
        let mean = audit.estimates.iter().sum::<f64>() / number;
        let squares: f64 = audit.estimates.iter().map(|x| (x - mean).powi(2)).sum();
        let standard_error = (count > 1).then(|| (squares / (number - 1.0) / number).sqrt());
        let expected = audit.expected();
        // One term has the same norm in every draw, but for rounding.
        let rounding = 1e-9 * expected;
        let deviation = standard_error
            .filter(|&error| error > rounding)
            .map(|error| (mean - expected) / error);
        let close = match deviation {
            Some(deviation) => deviation.abs() <= MOST_DEVIATION,
            None => (mean - expected).abs() <= rounding,
        };
        Some(NormCheck {
            estimates: count as u64,
            mean,
            standard_error,
            expected,
            deviation,
            accepted: (count >= FEWEST_ESTIMATES).then_some(close),
        })
    }
}

fn registers(file: &ShotFile) -> Result<Vec<RegisterSummary>, StoreError> {
    let header = file.header();
    let shots = Tally::of(file, Family::Shots, Words::All)?;
    let frequent: Vec<Vec<u64>> = shots
        .iter()
        .map(|tally| tally.most_frequent(MOST_OUTCOMES))
        .collect();
    let companion = Tally::of(file, Family::Companion, Words::Listed(&frequent))?;
    let summaries = header.registers.iter().zip(&shots).zip(&companion);
    Ok(summaries
        .zip(&frequent)
        .map(|(((register, shots), companion), words)| {
            summarise(register, shots, companion, words, header.mixing_weight)
        })
        .collect())
}

fn summarise(
    register: &RegisterHeader,
    shots: &Tally,
    companion: &Tally,
    words: &[u64],
    mixing_weight: f64,
) -> RegisterSummary {
    let quantity = |shots: Sample, companion: Sample| Quantity {
        raw: shots.estimate(),
        companion: companion.estimate(),
        corrected: corrected(&shots, &companion, mixing_weight),
    };
    let width = register.width;
    RegisterSummary {
        name: register.name.clone(),
        role: register.role.clone(),
        width,
        any_nonzero: quantity(shots.any(), companion.any()),
        mean_weight: quantity(shots.weight(), companion.weight()),
        bits: (0..width)
            .map(|bit| quantity(shots.bit(bit), companion.bit(bit)))
            .collect(),
        distinct_outcomes: shots.words.as_ref().map(|words| words.len() as u64),
        outcomes: shots.words.as_ref().map(|_| {
            words
                .iter()
                .map(|&word| Outcome {
                    bits: format!("{word:0width$b}"),
                    frequency: quantity(shots.word(word), companion.word(word)),
                })
                .collect()
        }),
    }
}
