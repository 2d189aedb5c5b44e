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
    if let Some(verdict) = verdict(plan) {
        let _ = writeln!(text, "\n{verdict}");
    }
    if let Some(solved) = &plan.choice {
        let _ = writeln!(text, "\n{}", chosen(solved));
    }
    text
}

fn head(plan: &Plan, out: &mut String) -> std::fmt::Result {
    let qubits = if plan.qubits == 1 { "qubit" } else { "qubits" };
    writeln!(
        out,
        "circuit     {}, {} {qubits}",
        plan.circuit, plan.qubits
    )?;
    if let Some(noise) = &plan.noise {
        let title = plan.title.as_ref();
        let title = title.map(|title| format!(" ({title})")).unwrap_or_default();
        writeln!(out, "noise file  {noise}{title}")?;
    }
    let sites = &plan.sites;
    let gates = match sites.as_written {
        1 => "gate",
        _ => "gates",
    };
    let left_out: Vec<String> = [
        (sites.merged, "merged"),
        (sites.deterministic, "on known axes"),
        (sites.unobservable, "unseen"),
    ]
    .into_iter()
    .filter(|&(count, _)| count > 0)
    .map(|(count, word)| format!("{count} {word}"))
    .collect();
    let left_out = match left_out.is_empty() {
        true => String::new(),
        false => format!(" ({})", left_out.join(", ")),
    };
    writeln!(
        out,
        "sites       {} non-Clifford {gates} as written, {} sites left{left_out}",
        sites.as_written, sites.kept
    )?;
    let extent = |log10: f64| format_extent(log10 * std::f64::consts::LN_10);
    writeln!(
        out,
        "extent ξ    {} as written, {} with noise merged, {} in a run",
        extent(sites.log10_extent_as_written),
        extent(sites.log10_extent_after_noise),
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
        "active      {most}{} {} at once{}",
        active.peak,
        if active.peak == 1 { "qubit" } else { "qubits" },
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
    writeln!(out, "for         {} shots{companion}", plan.shots)?;
    let sampled = sampled_word(plan);
    if plan.blocked.is_none() {
        let dense = &plan.dense;
        writeln!(
            out,
            "dense       {} a shot, {}; no δ: exact",
            optional(dense.seconds_a_shot),
            bytes_text(dense.memory_bytes)
        )?;
        if let Some(reason) = &dense.refused {
            writeln!(out, "            not possible: {reason}")?;
        }
    }
    writeln!(
        out,
        "\n{:<7} {:>8} {:>10} {:>9} {:>11} {:>11} {:>11} takes",
        "δ",
        "terms k",
        "memory",
        "a shot",
        format!("{sampled}, all"),
        "dense, all",
        match sampled {
            "probe" => "walk, all",
            _ => "probe, all",
        }
    )?;
    let mut notes = Notes::default();
    for row in &plan.rows {
        table_row(plan, row, &mut notes, out)?;
    }
    writeln!(out)?;
    notes.write(out)
}

/// What to say of a circuit that cannot be run at any δ of the table.
fn verdict(plan: &Plan) -> Option<String> {
    if plan.rows.iter().any(|row| row.readout.is_some()) {
        return None;
    }
    let row = plan
        .rows
        .iter()
        .find(|row| row.delta.is_some_and(|delta| delta <= 0.1))
        .or(plan.rows.first())?;
    let least = if plan.blocked.is_some() {
        "at least "
    } else {
        ""
    };
    Some(format!(
        "This circuit cannot be run here as asked: δ = {} would take {} terms, {least}{} and \
         {least}{}.",
        format_plain(row.delta?),
        terms_text(&row.walk),
        row.walk
            .seconds
            .map_or("no known time".to_owned(), format_seconds),
        bytes_text(row.walk.memory_bytes)
    ))
}

/// The read-out of terms that the columns are about.
fn sampled_word(plan: &Plan) -> &'static str {
    match plan.rows.iter().any(|row| row.readout == Some("probe")) {
        true => "probe",
        false => "walk",
    }
}

#[derive(Default)]
struct Notes {
    extrapolated: bool,
    refused: Option<String>,
}

fn table_row(plan: &Plan, row: &Row, notes: &mut Notes, out: &mut String) -> std::fmt::Result {
    let (terms, other) = match sampled_word(plan) {
        "probe" => (&row.probe, &row.walk),
        _ => (&row.walk, &row.probe),
    };
    notes.extrapolated |= terms.extrapolated;
    let delta = match row.delta {
        Some(delta) => format_plain(delta),
        None => "average".to_owned(),
    };
    // Smaller δ only cost more: one reason is enough.
    if notes.refused.is_none() {
        notes.refused = terms.refused.clone();
    }
    let all = |estimate: &Estimate| match estimate.refused {
        None => optional(estimate.seconds),
        // What cannot be done is told in brackets.
        Some(_) => match estimate.seconds {
            Some(_) => format!("({})", optional(estimate.seconds)),
            None => "-".to_owned(),
        },
    };
    let mark = if terms.extrapolated { "*" } else { "" };
    writeln!(
        out,
        "{delta:<7} {:>8} {:>10} {:>9} {:>11} {:>11} {:>11} {}",
        terms_text(terms),
        bytes_text(terms.memory_bytes),
        format!("{}{mark}", optional(terms.seconds_a_shot)),
        all(terms),
        all(&plan.dense),
        all(other),
        row.readout.unwrap_or("none")
    )
}

impl Notes {
    fn write(&self, out: &mut String) -> std::fmt::Result {
        if let Some(reason) = &self.refused {
            writeln!(out, "(in brackets) cannot be done: {reason}")?;
        }
        if self.extrapolated {
            writeln!(out, "* beyond what was measured, by extrapolation")?;
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
    if count < 1e18 {
        bytes(count as u128)
    } else if count.is_finite() {
        format!("10^{:.0} B", count.log10())
    } else {
        "no end".to_owned()
    }
}

fn optional(seconds: Option<f64>) -> String {
    seconds.map_or("-".to_owned(), |seconds| {
        let text = format_seconds(seconds);
        text.replace("years", "y").replace("days", "d")
    })
}

fn costly_text(costly: &Costly) -> String {
    let Costly {
        lines,
        kind,
        count,
        extent,
        log10_share,
    } = costly;
    let shown: Vec<String> = lines.iter().take(4).map(u32::to_string).collect();
    let plural = if lines.len() == 1 { "line" } else { "lines" };
    let more = if lines.len() > 4 { ", …" } else { "" };
    let place = format!("{plural} {}{more}", shown.join(", "));
    match count {
        1 => format!("1 {kind} of extent {extent:.4} ({place})"),
        _ => {
            let share = format_extent(log10_share * std::f64::consts::LN_10);
            format!("{count} × {kind} of extent {extent:.4}, together {share} ({place})")
        }
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
    if !costliest.is_empty() && refusal.terms {
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
