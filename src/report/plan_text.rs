//! A plan as a person reads it, in 80 columns.

use std::fmt::Write;

use crate::plan::units::format_seconds;
use crate::plan::{Costly, Estimate, Plan, Profile, Refusal, Row, Solved};
use crate::readout::choice::bytes;

use super::number::{format_extent, format_plain};

/// Characters of a sparkline, low to high.
const BARS: [char; 8] = ['▁', '▂', '▃', '▄', '▅', '▆', '▇', '█'];

/// Most characters of a sparkline.
const SPARK_WIDTH: usize = 48;

/// The whole text.
pub fn text(plan: &Plan) -> String {
    let mut text = String::new();
    // Writing to a string cannot fail.
    let _ = head(plan, &mut text).and_then(|()| table(plan, &mut text));
    if let Some(solved) = &plan.choice {
        let _ = writeln!(text, "\n{}", chosen(solved));
    }
    text
}

fn head(plan: &Plan, out: &mut String) -> std::fmt::Result {
    writeln!(out, "circuit     {}, {} qubits", plan.circuit, plan.qubits)?;
    if let Some(noise) = &plan.noise {
        let title = plan.title.as_ref();
        let title = title.map(|title| format!(" ({title})")).unwrap_or_default();
        writeln!(out, "noise file  {noise}{title}")?;
    }
    let sites = &plan.sites;
    let places = match sites.count {
        1 => "place",
        _ => "places",
    };
    let kept = match sites.count - sites.kept {
        0 => String::new(),
        without => format!(", {without} of them without effect"),
    };
    writeln!(
        out,
        "sites       {} non-Clifford {places}{kept}",
        sites.count
    )?;
    let extent = |log10: f64| format_extent(log10 * std::f64::consts::LN_10);
    writeln!(
        out,
        "extent ξ    {} as written, {} with noise merged, {} in a run",
        extent(sites.log10_extent_without_noise),
        extent(sites.log10_extent_merged),
        extent(sites.log10_extent)
    )?;
    for (index, costly) in plan.costliest.iter().take(3).enumerate() {
        let label = if index == 0 { "costliest" } else { "" };
        writeln!(out, "{label:<12}{}", costly_text(costly))?;
    }
    if let Some(active) = &plan.active {
        profile(active, out)?;
    }
    if let Some(count) = plan.inner_measurements {
        let most = match plan.active.as_ref().is_some_and(|active| active.exact) {
            true => "",
            false => "at most ",
        };
        writeln!(
            out,
            "inner       {most}{count} measurements touch active qubits"
        )?;
    }
    if let Some(blocked) = &plan.blocked {
        writeln!(out, "cannot run  {blocked}")?;
        writeln!(
            out,
            "            the numbers below are lower bounds: one pass over the terms a site"
        )?;
    }
    let threads = match plan.threads {
        1 => "1 thread".to_owned(),
        count => format!("{count} threads"),
    };
    writeln!(
        out,
        "measured    in {} with {threads} on this machine",
        format_seconds(plan.measured.seconds)
    )
}

fn profile(active: &Profile, out: &mut String) -> std::fmt::Result {
    let most = if active.exact { "" } else { "up to " };
    writeln!(
        out,
        "active      {most}{} qubits at once{}",
        active.peak,
        if active.exact {
            ""
        } else {
            "; below, the course without conditions holding"
        }
    )?;
    let spark = sparkline(&active.course);
    if !spark.is_empty() {
        writeln!(
            out,
            "            {spark}  {} register steps",
            active.course.len()
        )?;
    }
    Ok(())
}

/// Largest values of equal stretches as bars.
fn sparkline(values: &[u16]) -> String {
    let highest = values.iter().copied().max().unwrap_or(0).max(1);
    let width = values.len().min(SPARK_WIDTH);
    (0..width)
        .map(|cell| {
            let from = cell * values.len() / width;
            let to = ((cell + 1) * values.len() / width).max(from + 1);
            let value = values[from..to].iter().copied().max().unwrap_or(0);
            let level = (usize::from(value) * (BARS.len() - 1)).div_ceil(usize::from(highest));
            BARS[level.min(BARS.len() - 1)]
        })
        .collect()
}

fn table(plan: &Plan, out: &mut String) -> std::fmt::Result {
    let companion = match plan.companion_shots {
        0 => String::new(),
        count if count == plan.shots => ", with terms as many companion shots".to_owned(),
        count => format!(", with terms {count} companion shots"),
    };
    writeln!(out, "for         {} shots{companion}\n", plan.shots)?;
    writeln!(
        out,
        "{:<9}{:>10}{:>11}{:>11}{:>11}  {:<9}{:>10}",
        "δ", "terms k", "memory", "a shot", "in all", "read-out", "dense"
    )?;
    let mut notes = Notes::default();
    for row in &plan.rows {
        table_row(plan, row, &mut notes, out)?;
    }
    writeln!(out)?;
    notes.write(plan, out)
}

#[derive(Default)]
struct Notes {
    extrapolated: bool,
    refused: Vec<String>,
}

fn table_row(plan: &Plan, row: &Row, notes: &mut Notes, out: &mut String) -> std::fmt::Result {
    // Where nothing can run, the numbers of the terms say how far it is off.
    let terms = match row.readout {
        Some("probe") => &row.probe,
        _ => &row.walk,
    };
    let chosen = row.chosen(&plan.dense).unwrap_or(terms);
    notes.extrapolated |= chosen.extrapolated;
    let delta = match row.delta {
        Some(delta) => format_plain(delta),
        None => "average".to_owned(),
    };
    let (count, memory) = (terms_text(terms), bytes_text(chosen.memory_bytes));
    let readout = match row.readout {
        Some(word) => word.to_owned(),
        None => {
            if let Some(reason) = &chosen.refused
                && !notes.refused.contains(reason)
            {
                notes.refused.push(reason.clone());
            }
            "none".to_owned()
        }
    };
    let mark = if chosen.extrapolated { "*" } else { "" };
    writeln!(
        out,
        "{delta:<9}{count:>10}{memory:>11}{:>11}{:>11}  {readout:<9}{:>10}",
        format!("{}{mark}", optional(chosen.seconds_a_shot)),
        optional(chosen.seconds),
        dense_text(&plan.dense),
    )
}

impl Notes {
    fn write(&self, plan: &Plan, out: &mut String) -> std::fmt::Result {
        for reason in &self.refused {
            writeln!(out, "none: {reason}")?;
        }
        if let Some(reason) = &plan.dense.refused
            && !self.refused.contains(reason)
        {
            writeln!(out, "dense is not possible: {reason}")?;
        }
        if self.extrapolated {
            writeln!(out, "* beyond what was measured, by extrapolation")?;
        }
        if plan
            .rows
            .iter()
            .any(|row| row.readout == Some("dense") && row.delta.is_some())
        {
            writeln!(
                out,
                "dense is exact: λ = 0, no terms; k is what walk would take"
            )?;
        }
        writeln!(
            out,
            "average: --terms average, for averages corrected with companion shots; no δ"
        )
    }
}

fn terms_text(estimate: &Estimate) -> String {
    match (estimate.terms, estimate.log10_terms) {
        (Some(terms), _) if terms < 1_000_000 => terms.to_string(),
        (_, Some(log10)) if log10 < 9.0 => format!("{:.2e}", 10f64.powf(log10)),
        (_, Some(log10)) => format!("10^{log10:.1}"),
        _ => "-".to_owned(),
    }
}

fn bytes_text(count: f64) -> String {
    if count < 1e21 {
        bytes(count as u128)
    } else if count.is_finite() {
        format!("10^{:.0} B", count.log10())
    } else {
        "no end".to_owned()
    }
}

fn optional(seconds: Option<f64>) -> String {
    seconds.map_or("-".to_owned(), format_seconds)
}

fn dense_text(dense: &Estimate) -> String {
    match (dense.refused.is_some(), dense.seconds) {
        (false, Some(seconds)) => format_seconds(seconds),
        (true, Some(seconds)) => format!("({})", format_seconds(seconds)),
        (_, None) => "-".to_owned(),
    }
}

fn costly_text(costly: &Costly) -> String {
    let Costly {
        line,
        kind,
        count,
        extent,
        log10_share,
    } = costly;
    let share = format_extent(log10_share * std::f64::consts::LN_10);
    match count {
        1 => format!("line {line}: {kind}, extent {extent:.4}"),
        _ => format!("line {line}: {count} × {kind} of extent {extent:.4}, together {share}"),
    }
}

/// What a limit of time or memory chose, in one line.
pub fn chosen(solved: &Solved) -> String {
    let terms = match solved.terms {
        Some(terms) => format!(", k = {terms}"),
        None => String::new(),
    };
    let error = match solved.delta {
        Some(delta) => format!("δ = {}", format_plain(delta)),
        None => "no error".to_owned(),
    };
    format!(
        "within the limits: {error} (read-out {}{terms}), about {} and {}",
        solved.readout.word(),
        format_seconds(solved.seconds),
        bytes(solved.memory_bytes.min(1e38) as u128)
    )
}

/// Why nothing is within the limits, which sites cost most, and what helps.
pub fn refusal(refusal: &Refusal, costliest: &[Costly], shots: u64) -> String {
    let mut text = format!("nothing fits: {}", refusal.reason);
    for costly in costliest.iter().take(3) {
        text.push_str("\n  costly: ");
        text.push_str(&costly_text(costly));
    }
    if let Some(log10) = refusal.log10_extent {
        let extent = format_extent(log10 * std::f64::consts::LN_10);
        let _ = write!(text, "\n  it would fit with ξ up to {extent}");
        if let Some(costly) = costliest.first() {
            let all: f64 = costliest.iter().map(|costly| costly.log10_share).sum();
            let fewer = ((all - log10) / costly.extent.log10()).ceil();
            if fewer >= 1.0 {
                let _ = write!(text, ", that is with at least {fewer:.0} such places fewer");
            }
        }
    }
    if let Some(count) = refusal.shots
        && count < shots
    {
        let _ = write!(
            text,
            "\n  fewer shots help: there is time for about {count} with δ = 1"
        );
    }
    if !costliest.is_empty() && refusal.log10_extent.is_some() {
        text.push_str(
            "\n  noise on a gate lowers its extent (1 % dephasing takes a t from 1.1716 to 1.1599, \
             5 % to 1.1130); a ccx or ccz as one gate has extent 1.78, as 7 t gates 3.03",
        );
    }
    text
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn sparklines_show_the_course() {
        assert_eq!(sparkline(&[]), "");
        assert_eq!(sparkline(&[0, 1, 2, 4, 7]), "▁▂▃▅█");
        assert_eq!(
            sparkline(&(0..1000).collect::<Vec<_>>()).chars().count(),
            48
        );
    }

    /// Extents of a t with 1 % and 5 % dephasing: (1 − q)/cos²(π/8); of 7 t gates:
    /// the seventh power. Both are quoted in the help.
    #[test]
    fn quoted_extents_are_right() {
        let t = (std::f64::consts::FRAC_PI_8).cos().powi(-2);
        for (found, quoted) in [
            (t, 1.1716),
            (0.99 * t, 1.1599),
            (0.95 * t, 1.1130),
            (t.powi(7), 3.03),
            (16.0 / 9.0, 1.78),
        ] {
            assert!((found - quoted).abs() < 0.003, "{found} is not {quoted}");
        }
    }
}
