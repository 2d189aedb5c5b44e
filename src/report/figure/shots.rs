//! Frequencies of the likeliest outcomes with their standard errors.

use super::super::estimate::Estimate;
use super::super::summary::{Quantity, RegisterSummary, Summary};
use super::axis::Scale;
use super::svg::{Anchor, Shape, Svg, shortened, width_of};

const WIDTH: f64 = 680.0;
const RIGHT: f64 = 652.0;
/// Height of one outcome.
const ROW: f64 = 38.0;
/// Space above the first panel.
const HEAD: f64 = 74.0;
/// Space around the rows of a panel: its title, and its axis.
const ABOVE: f64 = 30.0;
const BELOW: f64 = 62.0;
/// Most panels.
const MOST_PANELS: usize = 4;
/// Most bits shown of a register without counted words.
const MOST_BITS: usize = 16;
/// Most characters of an outcome.
const MOST_LETTERS: usize = 26;

/// A series of estimates.
struct Series {
    name: &'static str,
    class: &'static str,
    shape: Shape,
    get: fn(&Quantity) -> Option<Estimate>,
}

const SERIES: [Series; 3] = [
    Series {
        name: "as drawn",
        class: "a",
        shape: Shape::Circle,
        get: |quantity| quantity.raw,
    },
    Series {
        name: "corrected",
        class: "b",
        shape: Shape::Square,
        get: |quantity| quantity.corrected,
    },
    Series {
        name: "companion",
        class: "c",
        shape: Shape::Diamond,
        get: |quantity| quantity.companion,
    },
];

/// One panel: labels and what was found.
struct Panel {
    title: String,
    rows: Vec<(String, Quantity)>,
}

/// Draws the logical registers, or where there are none all registers as far as
/// they have room, with the frequencies as drawn, corrected and of the companion
/// circuit.
pub fn shots_figure(summary: &Summary) -> String {
    let panels = panels(summary);
    let rows: usize = panels.iter().map(|panel| panel.rows.len()).sum();
    let height = HEAD + panels.len() as f64 * (ABOVE + BELOW) + rows as f64 * ROW;
    let mut svg = Svg::new(
        WIDTH,
        height.max(140.0),
        &format!("Frequencies of outcomes of {}", summary.circuit),
        &format!(
            "Frequencies in {} shots with standard errors.",
            summary.shots
        ),
    );
    svg.text(
        "title",
        (24.0, 26.0),
        Anchor::Start,
        &shortened(&format!("{}: {} shots", summary.circuit, summary.shots), 72),
    );
    let present: Vec<&Series> = SERIES
        .iter()
        .filter(|series| {
            let mut rows = panels.iter().flat_map(|panel| &panel.rows);
            rows.any(|(_, quantity)| (series.get)(quantity).is_some())
        })
        .collect();
    if present.is_empty() {
        svg.text("", (24.0, 80.0), Anchor::Start, "no shots in this file");
        return svg.finish();
    }
    legend(&present, &mut svg);
    let mut top = HEAD;
    for panel in &panels {
        draw_panel(panel, &present, top, &mut svg);
        top += ABOVE + BELOW + panel.rows.len() as f64 * ROW;
    }
    svg.finish()
}

fn panels(summary: &Summary) -> Vec<Panel> {
    let logical = |register: &&RegisterSummary| register.role == "logical";
    let any = summary.registers.iter().any(|register| logical(&register));
    summary
        .registers
        .iter()
        .filter(|register| !any || logical(register))
        .filter_map(panel)
        .take(MOST_PANELS)
        .collect()
}

fn panel(register: &RegisterSummary) -> Option<Panel> {
    let RegisterSummary {
        name, role, width, ..
    } = register;
    let plural = if *width == 1 { "" } else { "s" };
    let head = format!("{name} ({role}, {width} bit{plural})");
    // One bit needs no two rows that add up to 1.
    let (title, rows) = match &register.outcomes {
        Some(outcomes) if *width > 1 => (
            format!("{head}: likeliest outcomes, bit 0 on the right"),
            outcomes
                .iter()
                .map(|outcome| (shortened(&outcome.bits, MOST_LETTERS), outcome.frequency))
                .collect::<Vec<_>>(),
        ),
        _ => (
            match *width > MOST_BITS {
                true => format!("{head}: frequency of 1, first {MOST_BITS} bits"),
                false => format!("{head}: frequency of 1"),
            },
            register
                .bits
                .iter()
                .take(MOST_BITS)
                .enumerate()
                .map(|(bit, quantity)| (format!("bit {bit}"), *quantity))
                .collect(),
        ),
    };
    (!rows.is_empty()).then_some(Panel { title, rows })
}

fn legend(series: &[&Series], svg: &mut Svg) {
    let mut at = 24.0;
    for series in series {
        let y = 47.5;
        svg.line(&format!("{} bar", series.class), (at, y), (at + 28.0, y));
        svg.mark(series.class, series.shape, (at + 14.0, y), 4.0);
        svg.text("", (at + 36.0, 52.0), Anchor::Start, series.name);
        at += 36.0 + width_of(series.name) + 20.0;
    }
    svg.text(
        "small",
        (RIGHT, 52.0),
        Anchor::End,
        "bars: one standard error",
    );
}

/// From where to where the bar of an estimate reaches.
fn reach(estimate: &Estimate) -> (f64, f64) {
    match estimate.limit_95 {
        Some(limit) if estimate.value < 0.5 => (0.0, limit),
        Some(limit) => (limit, 1.0),
        None => (
            estimate.value - estimate.standard_error,
            estimate.value + estimate.standard_error,
        ),
    }
}

fn draw_panel(panel: &Panel, series: &[&Series], top: f64, svg: &mut Svg) {
    let letters = panel.rows.iter().map(|(label, _)| label.chars().count());
    let left = 40.0 + 7.6 * letters.max().unwrap_or(0) as f64;
    let (first, last) = (top + ABOVE, top + ABOVE + panel.rows.len() as f64 * ROW);
    let reaches = panel.rows.iter().flat_map(|(_, quantity)| {
        series
            .iter()
            .filter_map(|series| (series.get)(quantity).map(|estimate| reach(&estimate)))
    });
    let (low, high) = reaches.fold((0.0f64, 0.0f64), |(low, high), (from, to)| {
        (low.min(from), high.max(to))
    });
    let x = Scale::linear(low, if high > 0.0 { 1.04 * high } else { 1.0 }, left, RIGHT);
    svg.text("", (24.0, top + 16.0), Anchor::Start, &panel.title);
    for (value, label) in x.linear_ticks() {
        let at = x.at(value);
        svg.line("grid", (at, first), (at, last));
        svg.text("small", (at, last + 18.0), Anchor::Middle, &label);
    }
    svg.text(
        "small",
        ((left + RIGHT) / 2.0, last + 36.0),
        Anchor::Middle,
        "frequency",
    );
    svg.polyline("axis", &[(left, first), (left, last), (RIGHT, last)]);
    for (index, (label, quantity)) in panel.rows.iter().enumerate() {
        let middle = first + (index as f64 + 0.5) * ROW;
        svg.text("code", (left - 10.0, middle + 4.0), Anchor::End, label);
        for (position, series) in series.iter().enumerate() {
            let Some(estimate) = (series.get)(quantity) else {
                continue;
            };
            let y = middle + (position as f64 - (SERIES.len() - 1) as f64 / 2.0) * 9.0;
            let (from, to) = reach(&estimate);
            let class = format!("{} bar", series.class);
            svg.line(&class, (x.at(from), y), (x.at(to), y));
            for end in [from, to] {
                svg.line(&class, (x.at(end), y - 3.0), (x.at(end), y + 3.0));
            }
            svg.mark(series.class, series.shape, (x.at(estimate.value), y), 3.4);
        }
    }
}
