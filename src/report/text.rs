//! The summary as text for a terminal of 80 columns.

use std::fmt::{self, Display, Formatter};

use super::Estimate;
use super::number::{format_estimate, format_extent, format_plain};
use super::summary::{NormCheck, Outcome, Quantity, Reduction, RegisterSummary, Summary};

/// Most bits of a register that are listed one by one.
const MOST_BITS: usize = 16;
/// Outcomes of wider registers are printed in hexadecimal.
const MOST_BINARY_DIGITS: usize = 28;
/// Width of a column of numbers.
const COLUMN: usize = 17;
/// Least width of the column of names.
const LEAST_LABEL: usize = 22;

impl Display for Summary {
    fn fmt(&self, out: &mut Formatter<'_>) -> fmt::Result {
        line(out, "result", &self.result())?;
        line(out, "circuit", &self.circuit_line())?;
        if let Some(noise) = &self.noise {
            let title = self.title.as_ref().map(|title| format!(" ({title})"));
            line(
                out,
                "noise file",
                &format!("{noise}{}", title.unwrap_or_default()),
            )?;
        }
        line(out, "sites", &self.sites_line())?;
        if let Some(reduced) = self.reduced_line() {
            line(out, "reduced", &reduced)?;
        }
        line(out, "extent ξ", &self.extent_line())?;
        line(out, "precision", &self.precision())?;
        line(out, "shots", &self.shots_line())?;
        line(out, "seed", &self.seed.to_string())?;
        if !self.settings.is_empty() {
            let settings: Vec<String> = self
                .settings
                .iter()
                .map(|(name, value)| format!("{name}={value}"))
                .collect();
            line(out, "settings", &settings.join("  "))?;
        }
        if let Some(draws) = &self.draws {
            let mut text = match draws.peak_active {
                1 => "at most 1 active qubit".to_owned(),
                active => format!("at most {active} active qubits"),
            };
            // Exact read-outs accept every draw.
            if self.terms.is_some() {
                text += &format!(", {} draws a shot", format_plain(draws.mean_attempts));
            }
            if self.clipped > 0 {
                text += &format!(", {} shots clipped", self.clipped);
            }
            line(out, "sampling", &text)?;
        }
        if let Some(norm) = &self.norm {
            line(out, "norm check", &norm.to_string())?;
        }
        let labels = self
            .registers
            .iter()
            .map(|register| self.label_width(register));
        let label = labels.fold(LEAST_LABEL, usize::max);
        for register in &self.registers {
            self.register(out, register, label)?;
        }
        self.notes(out)
    }
}

impl Display for NormCheck {
    fn fmt(&self, out: &mut Formatter<'_>) -> fmt::Result {
        let mean = Estimate {
            value: self.mean,
            standard_error: self.standard_error.unwrap_or(0.0),
            limit_95: None,
        };
        let draws = match self.estimates {
            1 => "1 draw".to_owned(),
            estimates => format!("{estimates} draws"),
        };
        write!(
            out,
            "mean {} of {draws}, {} expected: ",
            format_estimate(&mean),
            format_plain(self.expected)
        )?;
        match (self.accepted, self.deviation) {
            (None, _) => write!(out, "too few to tell"),
            (Some(true), _) => write!(out, "as it should be"),
            (Some(false), deviation) => {
                let far = match deviation {
                    Some(deviation) => format!("{:.1} standard errors", deviation.abs()),
                    None => "more than rounding".to_owned(),
                };
                write!(
                    out,
                    "WRONG\n            by {far}: the shots do not follow their law, do not use them"
                )
            }
        }
    }
}

impl Summary {
    fn result(&self) -> String {
        match self.part.count {
            1 => self.file.clone(),
            count => format!("{}, part {} of {count}", self.file, self.part.index),
        }
    }

    fn circuit_line(&self) -> String {
        match self.qubits {
            Some(1) => format!("{}, 1 qubit", self.circuit),
            Some(qubits) => format!("{}, {qubits} qubits", self.circuit),
            None => self.circuit.clone(),
        }
    }

    fn sites_line(&self) -> String {
        if let Some(reduction) = &self.sites.reduction {
            let gates = reduction.as_written;
            let noun = if gates == 1 { "gate" } else { "gates" };
            return format!("{} left of {gates} non-Clifford {noun}", self.sites.kept);
        }
        let count = self.sites.count;
        let places = if count == 1 { "place" } else { "places" };
        match count - self.sites.kept {
            0 => format!("{count} non-Clifford {places}"),
            idle => format!("{count} non-Clifford {places}, {idle} of them without effect"),
        }
    }

    /// How sites went, if any did.
    fn reduced_line(&self) -> Option<String> {
        let Reduction {
            merged,
            deterministic,
            unobservable,
            ..
        } = self.sites.reduction.as_ref()?;
        let ways = [
            (merged, "merged"),
            (deterministic, "on a known axis"),
            (unobservable, "unobservable"),
        ];
        let ways: Vec<String> = ways
            .iter()
            .filter(|(count, _)| **count > 0)
            .map(|(count, way)| format!("{count} {way}"))
            .collect();
        (!ways.is_empty()).then(|| ways.join(", "))
    }

    fn extent_line(&self) -> String {
        let extent = |log10: f64| format_extent(log10 * std::f64::consts::LN_10);
        if let Some(reduction) = &self.sites.reduction {
            return format!(
                "{} as written, {} with noise merged, {} in this run",
                extent(reduction.log10_extent_as_written),
                extent(reduction.log10_extent_after_noise),
                extent(self.sites.log10_extent)
            );
        }
        format!(
            "{} without noise, {} in this run",
            extent(self.sites.log10_extent_without_noise),
            extent(self.sites.log10_extent)
        )
    }

    fn precision(&self) -> String {
        let Some(terms) = self.terms else {
            return format!("exact (read-out {})", self.readout);
        };
        let delta = self
            .delta
            .map(|delta| format!("δ = {}, ", format_plain(delta)));
        format!(
            "{}k = {terms} terms, λ = {} (read-out {})",
            delta.unwrap_or_default(),
            format_plain(self.mixing_weight),
            self.readout
        )
    }

    fn shots_line(&self) -> String {
        let mut text = self.shots.to_string();
        if let Some(companion) = self.companion_shots {
            text += &format!(", {companion} companion shots");
        }
        if !self.complete {
            text += &format!("; interrupted, {} were planned", self.shots_planned);
        } else if self.part.count > 1 {
            text += &format!("; {} in the whole run", self.shots_total);
        }
        text
    }

    /// Whether any number has a corrected twin.
    fn has_correction(&self) -> bool {
        let corrected = |register: &RegisterSummary| register.any_nonzero.corrected.is_some();
        self.registers.iter().any(corrected)
    }

    /// Columns that the first column of a register takes.
    fn label_width(&self, register: &RegisterSummary) -> usize {
        let rows = rows_of(register, self.shots);
        let labels = rows.iter().map(|(label, _)| label.chars().count() + 2);
        labels.fold(title(register).chars().count(), usize::max)
    }

    fn register(
        &self,
        out: &mut Formatter<'_>,
        register: &RegisterSummary,
        label: usize,
    ) -> fmt::Result {
        let title = title(register);
        writeln!(out)?;
        if self.shots == 0 || register.width == 0 {
            return writeln!(out, "{title}");
        }
        let headings = match self.has_correction() {
            true => ["companion", "corrected"],
            false => ["", ""],
        };
        let heading = format!(
            "{title:label$}  {:COLUMN$}  {:COLUMN$}  {}",
            "as drawn", headings[0], headings[1]
        );
        writeln!(out, "{}", heading.trim_end())?;
        for (name, quantity) in rows_of(register, self.shots) {
            let show =
                |estimate| Option::as_ref(estimate).map_or_else(String::new, format_estimate);
            let companion = match quantity.corrected {
                Some(_) => show(&quantity.companion),
                None => String::new(),
            };
            let text = format!(
                "  {name:indent$}  {:COLUMN$}  {companion:COLUMN$}  {}",
                show(&quantity.raw),
                show(&quantity.corrected),
                indent = label - 2
            );
            writeln!(out, "{}", text.trim_end())?;
        }
        if let Some(rest) = what_is_left_out(register, self.shots) {
            writeln!(out, "  … {rest}")?;
        }
        Ok(())
    }

    fn notes(&self, out: &mut Formatter<'_>) -> fmt::Result {
        if self.shots == 0 || self.registers.is_empty() {
            return Ok(());
        }
        writeln!(out)?;
        writeln!(out, "± is one standard error; (< or >) is a 95 % limit.")?;
        let has_outcomes = |register| listed_outcomes(register, self.shots).is_some();
        if self.registers.iter().any(has_outcomes) {
            writeln!(out, "Outcomes are written with bit 0 on the right.")?;
        }
        if self.has_correction() {
            writeln!(
                out,
                "Corrected: (as drawn - λ·companion)/(1 - λ), errors of both propagated."
            )?;
        } else if self.terms == Some(1) {
            writeln!(
                out,
                "With k = 1 the shots are companion shots; nothing can be corrected."
            )?;
        } else if self.terms.is_some() && self.companion_shots.unwrap_or(0) == 0 {
            writeln!(
                out,
                "For corrected numbers draw companion shots (--companion)."
            )?;
        }
        Ok(())
    }
}

/// Name, role and width of a register.
fn title(register: &RegisterSummary) -> String {
    let bits = if register.width == 1 { "bit" } else { "bits" };
    let RegisterSummary {
        name, role, width, ..
    } = register;
    format!("{name} ({role}, {width} {bits})")
}

/// One line of the head.
fn line(out: &mut Formatter<'_>, name: &str, value: &str) -> fmt::Result {
    writeln!(out, "{name:11} {value}")
}

/// The lines of a register: checks and logical readouts of more than one bit as
/// a whole, then bit by bit; records by their outcomes where any was seen twice,
/// else bit by bit.
fn rows_of(register: &RegisterSummary, shots: u64) -> Vec<(String, &Quantity)> {
    if let Some(outcomes) = listed_outcomes(register, shots) {
        return outcomes
            .iter()
            .map(|outcome| (label(outcome), &outcome.frequency))
            .collect();
    }
    let mut rows = Vec::new();
    if register.role != "record" && register.width > 1 {
        rows.push(("any nonzero".to_owned(), &register.any_nonzero));
    }
    if register.role == "check" && register.width > 1 {
        rows.push(("mean weight".to_owned(), &register.mean_weight));
    }
    let bits = register.bits.iter().take(MOST_BITS).enumerate();
    rows.extend(bits.map(|(index, quantity)| (format!("bit {index} is 1"), quantity)));
    rows
}

fn listed_outcomes(register: &RegisterSummary, shots: u64) -> Option<&[Outcome]> {
    let outcomes = register.outcomes.as_deref()?;
    // Where every word was seen once the bits say more.
    let most = outcomes.first()?.frequency.raw?.value;
    let repeated = most * shots as f64 > 1.5;
    (repeated || outcomes.len() as u64 == register.distinct_outcomes?).then_some(outcomes)
}

fn label(outcome: &Outcome) -> String {
    match u64::from_str_radix(&outcome.bits, 2) {
        Ok(word) if outcome.bits.len() > MOST_BINARY_DIGITS => {
            format!(
                "0x{word:0digits$x}",
                digits = outcome.bits.len().div_ceil(4)
            )
        }
        _ => outcome.bits.clone(),
    }
}

fn what_is_left_out(register: &RegisterSummary, shots: u64) -> Option<String> {
    match listed_outcomes(register, shots) {
        Some(outcomes) => {
            let more = register.distinct_outcomes? - outcomes.len() as u64;
            (more > 0).then(|| format!("{more} more outcomes"))
        }
        None => {
            let more = register.width.saturating_sub(MOST_BITS);
            (more > 0).then(|| format!("{more} more bits (all with --json)"))
        }
    }
}
