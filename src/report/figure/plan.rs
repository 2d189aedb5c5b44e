//! δ against the time of a run.

use crate::plan::{Plan, Row};
use crate::readout::choice::bytes;

use super::axis::Scale;
use super::svg::{Anchor, Shape, Svg, shortened, width_of};

const WIDTH: f64 = 680.0;
const HEIGHT: f64 = 440.0;
const LEFT: f64 = 112.0;
const RIGHT: f64 = 656.0;
/// Left end of title and legend.
const MARGIN: f64 = 24.0;
const TOP: f64 = 96.0;
const BOTTOM: f64 = 380.0;

/// Draws a plan: time of a run against δ, both on log axes, with the dense
/// read-out, the limits and the chosen point.
pub fn plan_figure(plan: &Plan) -> String {
    let shots = plan.shots;
    let mut svg = Svg::new(
        WIDTH,
        HEIGHT,
        &format!("Time of a run of {} against δ", plan.circuit),
        &format!(
            "Predicted time of {shots} shots on {} threads against the trace-norm error δ.",
            plan.threads
        ),
    );
    let sampled = sampled_word(plan);
    svg.text(
        "title",
        (MARGIN, 26.0),
        Anchor::Start,
        &shortened(&format!("{}: {shots} shots", plan.circuit), 66),
    );
    let chosen = plan.choice.as_ref().and_then(|choice| choice.delta);
    // The curve reaches to the chosen point.
    let mut curve: Vec<(f64, f64)> = plan
        .curve
        .iter()
        .filter_map(|point| Some((point.delta, point.seconds?)))
        .chain(chosen.zip(plan.choice.as_ref().map(|choice| choice.seconds)))
        .filter(|(_, seconds)| seconds.is_finite() && *seconds > 0.0)
        .collect();
    curve.sort_by(|a, b| a.0.total_cmp(&b.0));
    let dense = plan
        .dense
        .seconds
        .filter(|seconds| seconds.is_finite() && *seconds > 0.0);
    let times: Vec<f64> = curve
        .iter()
        .map(|&(_, seconds)| seconds)
        .chain(dense)
        .chain(plan.limits.seconds)
        .chain(rows(plan).map(|(_, seconds)| seconds))
        .collect();
    if times.is_empty() {
        svg.text(
            "",
            ((LEFT + RIGHT) / 2.0, (TOP + BOTTOM) / 2.0),
            Anchor::Middle,
            "nothing could be measured",
        );
        return svg.finish();
    }
    let low = times.iter().copied().fold(f64::INFINITY, f64::min) / 1.6;
    let high = times.iter().copied().fold(0.0, f64::max) * 1.6;
    let least = plan.curve.iter().map(|point| point.delta);
    // Room for the mark beside the axis.
    let chosen = chosen.map(|delta| delta / 1.4);
    let least = least.chain(chosen).fold(1.0, f64::min);
    let most = rows(plan)
        .filter_map(|(row, _)| row.delta)
        .fold(1.0, f64::max);
    let x = Scale::log(least, most, LEFT, RIGHT);
    let y = Scale::log(low, high, BOTTOM, TOP);
    axes(&x, &y, &mut svg);
    limit_of_memory(plan, &x, &mut svg);
    let mut legend = Legend::new();
    if !curve.is_empty() {
        let points: Vec<(f64, f64)> = curve
            .iter()
            .map(|&(delta, seconds)| (x.at(delta), y.at(seconds)))
            .collect();
        svg.polyline("a line", &points);
        legend.entry(&mut svg, "a line", Some(("a", Shape::Circle)), sampled);
    }
    if let Some(seconds) = dense {
        let class = match plan.dense.refused {
            None => "b line",
            Some(_) => "b line dots",
        };
        let name = match plan.dense.refused {
            None => "dense (exact)",
            Some(_) => "dense (not possible)",
        };
        let height = y.at(seconds);
        svg.line(class, (LEFT, height), (RIGHT, height));
        legend.entry(&mut svg, class, None, name);
    }
    if let Some(seconds) = plan.limits.seconds {
        let height = y.at(seconds);
        svg.line("c line dash", (LEFT, height), (RIGHT, height));
        legend.entry(&mut svg, "c line dash", None, "time allowed");
    }
    for (row, seconds) in rows(plan) {
        if let Some(delta) = row.delta {
            svg.mark("a", Shape::Circle, (x.at(delta), y.at(seconds)), 4.0);
        }
    }
    choice(plan, &x, &y, &mut svg, &mut legend);
    svg.finish()
}

/// Rows of terms with their times, as drawn.
fn rows(plan: &Plan) -> impl Iterator<Item = (&Row, f64)> {
    let probe = sampled_word(plan) == "probe";
    plan.rows
        .iter()
        .filter(|row| row.delta.is_some())
        .filter_map(move |row| {
            let estimate = if probe { &row.probe } else { &row.walk };
            Some((row, estimate.seconds?))
        })
        .filter(|(_, seconds)| seconds.is_finite() && *seconds > 0.0)
}

/// The read-out of the curve.
fn sampled_word(plan: &Plan) -> &'static str {
    match plan.rows.iter().any(|row| row.readout == Some("probe")) {
        true => "probe",
        false => "walk",
    }
}

fn axes(x: &Scale, y: &Scale, svg: &mut Svg) {
    for (value, label) in x.decade_ticks() {
        let at = x.at(value);
        svg.line("grid", (at, TOP), (at, BOTTOM));
        svg.text("", (at, BOTTOM + 20.0), Anchor::Middle, &label);
    }
    for (value, label) in y.duration_ticks() {
        let at = y.at(value);
        svg.line("grid", (LEFT, at), (RIGHT, at));
        svg.text("", (LEFT - 9.0, at + 4.5), Anchor::End, &label);
    }
    svg.polyline("axis", &[(LEFT, TOP), (LEFT, BOTTOM), (RIGHT, BOTTOM)]);
    let middle = (LEFT + RIGHT) / 2.0;
    svg.text(
        "",
        (middle, BOTTOM + 46.0),
        Anchor::Middle,
        "trace-norm error δ",
    );
    svg.upright("", (20.0, (TOP + BOTTOM) / 2.0), "time of the run");
}

/// Shades the δ whose terms do not fit in memory.
fn limit_of_memory(plan: &Plan, x: &Scale, svg: &mut Svg) {
    let limit = plan.limits.memory_bytes as f64;
    // δ falls along the curve.
    let over = plan.curve.iter().find(|point| point.memory_bytes > limit);
    let Some(first) = over else {
        let limit = bytes(u128::from(plan.limits.memory_bytes));
        let text = format!("all within {limit} of memory");
        svg.text(
            "small halo",
            (LEFT + 8.0, BOTTOM - 10.0),
            Anchor::Start,
            &text,
        );
        return;
    };
    let edge = x.at(first.delta);
    svg.rectangle("shade", (LEFT, TOP), (edge, BOTTOM));
    let text = format!(
        "more than {} of memory",
        bytes(u128::from(plan.limits.memory_bytes))
    );
    if edge - LEFT > width_of(&text) + 12.0 {
        svg.text(
            "small halo",
            (LEFT + 8.0, BOTTOM - 10.0),
            Anchor::Start,
            &text,
        );
    } else {
        // No room inside: beside it.
        svg.text(
            "small halo",
            (edge + 8.0, BOTTOM - 10.0),
            Anchor::Start,
            &format!("← {text}"),
        );
    }
}

fn choice(plan: &Plan, x: &Scale, y: &Scale, svg: &mut Svg, legend: &mut Legend) {
    let Some(solved) = &plan.choice else { return };
    let at = match solved.delta {
        Some(delta) => (x.at(delta), y.at(solved.seconds)),
        None => (x.at(0.0), y.at(solved.seconds)),
    };
    svg.mark("d", Shape::Star, at, 7.0);
    let name = match solved.delta {
        Some(delta) => format!("chosen: δ = {delta}"),
        None => "chosen: dense".to_owned(),
    };
    legend.entry(svg, "", Some(("d", Shape::Star)), &name);
}

/// Entries in a row above the axes.
struct Legend {
    at: f64,
    row: f64,
}

impl Legend {
    fn new() -> Self {
        Legend {
            at: MARGIN,
            row: 52.0,
        }
    }

    fn entry(&mut self, svg: &mut Svg, line: &str, mark: Option<(&str, Shape)>, name: &str) {
        let width = 42.0 + width_of(name) + 14.0;
        if self.at + width > WIDTH && self.at > MARGIN {
            self.at = MARGIN;
            self.row += 22.0;
        }
        let middle = self.row - 4.5;
        if !line.is_empty() {
            svg.line(line, (self.at, middle), (self.at + 32.0, middle));
        }
        if let Some((class, shape)) = mark {
            let size = if shape == Shape::Star { 6.0 } else { 4.0 };
            svg.mark(class, shape, (self.at + 16.0, middle), size);
        }
        svg.text("", (self.at + 40.0, self.row), Anchor::Start, name);
        self.at += width;
    }
}
