//! Whether drawn shots follow the law they should: the report of `verify`.
//!
//! The law is P_out = (1 − λ)·P + λ·P_comp, with P and P_comp exact. Its test
//! is Pearson's χ² ([`crate::exact::fit`]); companion shots are tested against
//! P_comp, and the corrected frequencies against P with their covariance.
//!
//! The read-out `probe` has a small bias of its own, at most δ/2 in trace norm
//! (δ/4 in total variation) and, where a qubit is read before the last
//! non-Clifford place, a few per cent of λ. There the law is rejected only where
//! the distance is not explained by that bias b and by chance either: the
//! distance of the frequencies of N shots with d values to a law at distance b
//! has a mean of at most b + √((d−1)/N)/2 and exceeds that by t with
//! probability at most e^{−2Nt²} (bounded differences; textbook, from memory).
//!
//! # The JSON document
//!
//! ```text
//! { "circuit", "noise", "readout",                       texts
//!   "seed", "shots", "companion_shots", "terms", "outcomes",
//!   "delta", "extent", "mixing_weight",
//!   "distance": { "to_ideal", "predicted", "statistical", "to_law",
//!                 "allowed_bias" },
//!   "law": TEST, "companion": DRAWN, "corrected": CORRECTED,
//!   "accepted": bool }
//! TEST = { "statistic", "degrees_of_freedom", "p_value", "impossible",
//!          "accepted" }
//! DRAWN = { "distance", "statistical", "test": TEST }
//! CORRECTED = { "distance", "statistical", "largest_deviation", "test": TEST }
//! ```
//!
//! An absent part is `null`.

use std::fmt::{self, Display, Formatter};

use serde::Serialize;

use super::number::{format_extent, format_plain};
use crate::exact::Law;
use crate::exact::fit::{self, Counts, Fit};

/// A law is rejected where its p-value is below this.
pub const LIMIT: f64 = 1e-6;

/// What was run.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Setting {
    /// Name of the circuit file.
    pub circuit: String,
    /// Name of the noise file.
    pub noise: Option<String>,
    /// How outcomes were read out.
    pub readout: String,
    /// Seed of the run.
    pub seed: u64,
    /// Number of terms k; none for dense.
    pub terms: Option<u64>,
    /// Trace-norm error δ.
    pub delta: f64,
    /// Natural logarithm of ξ.
    #[serde(skip)]
    pub log_extent: f64,
    /// ξ.
    pub extent: f64,
    /// λ, the companion's share in the law.
    pub mixing_weight: f64,
}

/// The report.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Verification {
    /// What was run.
    #[serde(flatten)]
    pub setting: Setting,
    /// Number of shots.
    pub shots: u64,
    /// Number of companion shots.
    pub companion_shots: u64,
    /// Number of outcomes the law allows.
    pub outcomes: usize,
    /// Distances of the drawn frequencies.
    pub distance: Distances,
    /// The test of the law.
    pub law: LawTest,
    /// The companion shots.
    pub companion: Option<Drawn>,
    /// The corrected frequencies.
    pub corrected: Option<Corrected>,
    /// Whether everything was accepted.
    pub accepted: bool,
}

/// Total variation distances.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Distances {
    /// Of the drawn frequencies to the ideal distribution.
    pub to_ideal: f64,
    /// Of the law to the ideal distribution; at most λ.
    pub predicted: f64,
    /// Of the drawn frequencies to the law, on the mean, if the law holds.
    pub statistical: f64,
    /// Of the drawn frequencies to the law.
    pub to_law: f64,
    /// What the read-out may be off by.
    pub allowed_bias: f64,
}

/// A test of fit, and what comes of it.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct LawTest {
    /// χ².
    pub statistic: f64,
    /// Its degrees of freedom.
    pub degrees_of_freedom: usize,
    /// Chance of a statistic at least as large under the law.
    pub p_value: f64,
    /// Shots with an outcome of probability 0.
    pub impossible: u64,
    /// Whether the law is kept.
    pub accepted: bool,
}

/// Companion shots against their law.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Drawn {
    /// Total variation distance of their frequencies to the law.
    pub distance: f64,
    /// Its mean if the law holds.
    pub statistical: f64,
    /// The test.
    pub test: LawTest,
}

/// Corrected frequencies against the ideal distribution.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Corrected {
    /// Total variation distance.
    pub distance: f64,
    /// Its mean, about, if the laws hold.
    pub statistical: f64,
    /// Largest deviation of a frequency in standard errors.
    pub largest_deviation: f64,
    /// The test.
    pub test: LawTest,
}

/// The bias of `probe` in total variation at trace-norm error `delta`: a quarter
/// of it, and 4 % of λ if sites come after the first inner measurement.
pub fn allowed_bias(delta: f64, mixing_weight: f64, late_sites: bool) -> f64 {
    let late = if late_sites {
        0.04 * mixing_weight
    } else {
        0.0
    };
    0.25 * delta + late
}

impl Verification {
    /// Compares drawn values with the exact laws. `companion` is normalised; it
    /// may be absent where λ = 0. `bias` is what the read-out may be off by, 0
    /// for an exact one.
    pub fn new(
        setting: Setting,
        ideal: &Law,
        companion: Option<&Law>,
        shots: &Counts,
        companion_shots: &Counts,
        bias: f64,
    ) -> Self {
        let lambda = setting.mixing_weight;
        let law = match companion {
            Some(companion) => ideal.mixed(companion, lambda),
            None => ideal.clone(),
        };
        let frequencies = shots.frequencies();
        let distance = Distances {
            to_ideal: frequencies.distance(ideal),
            predicted: law.distance(ideal),
            statistical: fit::expected_distance(&law, shots.shots()),
            to_law: frequencies.distance(&law),
            allowed_bias: bias,
        };
        let found = fit::fit(shots, &law);
        let explained = bias > 0.0
            && chance_of_distance(distance.to_law - bias, law.len(), shots.shots()) >= LIMIT;
        let test = LawTest::new(&found, explained);
        let drawn = companion
            .filter(|_| companion_shots.shots() > 0)
            .map(|companion| Drawn {
                distance: companion_shots.frequencies().distance(companion),
                statistical: fit::expected_distance(companion, companion_shots.shots()),
                test: LawTest::new(&fit::fit(companion_shots, companion), false),
            });
        let corrected = companion
            .and_then(|companion| {
                fit::corrected_fit(shots, companion_shots, ideal, companion, lambda)
            })
            .map(|found| Corrected {
                distance: found.distance,
                statistical: found.statistical,
                largest_deviation: found.largest_deviation,
                test: LawTest::new(&found.fit, explained),
            });
        let accepted = test.accepted
            && drawn.is_none_or(|drawn| drawn.test.accepted)
            && corrected.is_none_or(|corrected| corrected.test.accepted);
        Verification {
            setting,
            shots: shots.shots(),
            companion_shots: companion_shots.shots(),
            outcomes: law.len(),
            distance,
            law: test,
            companion: drawn,
            corrected,
            accepted,
        }
    }

    /// The report as one JSON document.
    pub fn to_json(&self) -> String {
        // Names and finite numbers always have a JSON form.
        serde_json::to_string_pretty(self).unwrap_or_default()
    }

    /// What was rejected, in words; none if nothing was.
    pub fn rejected(&self) -> Option<&'static str> {
        if !self.law.accepted {
            Some("the shots do not follow the mixing law")
        } else if self.companion.is_some_and(|drawn| !drawn.test.accepted) {
            Some("the companion shots do not follow the companion's distribution")
        } else if self.corrected.is_some_and(|found| !found.test.accepted) {
            Some("the corrected frequencies are not those of the exact distribution")
        } else {
            None
        }
    }
}

/// Bound on the chance that the frequencies of `shots` draws with `outcomes`
/// values are at least this far from their law.
fn chance_of_distance(distance: f64, outcomes: usize, shots: u64) -> f64 {
    let shots = shots as f64;
    let mean = 0.5 * (outcomes.saturating_sub(1) as f64 / shots).sqrt();
    let beyond = (distance - mean).max(0.0);
    (-2.0 * shots * beyond * beyond).exp()
}

impl LawTest {
    fn new(found: &Fit, explained: bool) -> Self {
        LawTest {
            statistic: found.statistic,
            degrees_of_freedom: found.degrees_of_freedom,
            p_value: found.p_value,
            impossible: found.impossible,
            accepted: found.p_value >= LIMIT || (explained && found.impossible == 0),
        }
    }
}

impl Display for Verification {
    fn fmt(&self, out: &mut Formatter<'_>) -> fmt::Result {
        let setting = &self.setting;
        let mut line = |name: &str, value: &str| writeln!(out, "{name:11} {value}");
        line("circuit", &setting.circuit)?;
        if let Some(noise) = &setting.noise {
            line("noise file", noise)?;
        }
        line("extent ξ", &format_extent(setting.log_extent))?;
        let precision = match setting.terms {
            None => format!("exact (read-out {})", setting.readout),
            Some(terms) => format!(
                "k = {terms} terms, λ = {} (read-out {})",
                format_plain(setting.mixing_weight),
                setting.readout
            ),
        };
        line("precision", &precision)?;
        let shots = match self.companion_shots {
            0 => self.shots.to_string(),
            others => format!("{}, {others} companion shots", self.shots),
        };
        line("shots", &shots)?;
        line("seed", &setting.seed.to_string())?;
        line("outcomes", &format!("{} possible", self.outcomes))?;
        self.distances(out)?;
        self.tests(out)
    }
}

impl Verification {
    fn distances(&self, out: &mut Formatter<'_>) -> fmt::Result {
        let mut rows = vec![
            ("drawn to ideal", self.distance.to_ideal),
            ("law to ideal", self.distance.predicted),
            ("drawn to law", self.distance.to_law),
            ("  from chance alone", self.distance.statistical),
        ];
        if self.distance.allowed_bias > 0.0 {
            rows.push(("  from bias, at most", self.distance.allowed_bias));
        }
        if let Some(drawn) = &self.companion {
            rows.push(("companion drawn to exact", drawn.distance));
            rows.push(("  from chance alone", drawn.statistical));
        }
        if let Some(corrected) = &self.corrected {
            rows.push(("corrected to ideal", corrected.distance));
            rows.push(("  from chance alone", corrected.statistical));
        }
        writeln!(out, "\ntotal variation distance")?;
        for (name, value) in rows {
            writeln!(out, "  {name:26} {}", format_plain(value))?;
        }
        Ok(())
    }

    fn tests(&self, out: &mut Formatter<'_>) -> fmt::Result {
        let mut rows = vec![("mixing law", &self.law)];
        if let Some(drawn) = &self.companion {
            rows.push(("companion", &drawn.test));
        }
        if let Some(corrected) = &self.corrected {
            rows.push(("corrected", &corrected.test));
        }
        writeln!(
            out,
            "\n{:12} {:>10} {:>8}  {:10} result",
            "test", "χ²", "df", "p"
        )?;
        for (name, test) in rows {
            let result = match (test.accepted, test.p_value >= LIMIT) {
                (true, true) => "accepted".to_owned(),
                (true, false) => "accepted: within the bias of the read-out".to_owned(),
                _ if test.impossible > 0 => {
                    format!("rejected: {} shots are impossible", test.impossible)
                }
                _ => "rejected".to_owned(),
            };
            writeln!(
                out,
                "{name:12} {:>10} {:>8}  {:10} {result}",
                format_plain(test.statistic),
                test.degrees_of_freedom,
                format_plain(test.p_value),
            )?;
        }
        Ok(())
    }
}
