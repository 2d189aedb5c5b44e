//! `plan`: tell what a circuit costs before it is run.

use std::collections::BTreeMap;
use std::time::Instant;

use crate::circuit::Circuit;
use crate::magic::mixing::log_extent;
use crate::magic::{Site, Sparsifier};
use crate::plan::{
    self, Costly, DELTAS, Limits, LimitsRow, Model, Overhead, Plan, PlanSites, Refusal, Request,
    Solved, measure_bare,
};
use crate::program::Program;
use crate::readout::choice::Readout;
use crate::report::figure::plan_figure;
use crate::report::plan_text;

use super::CommandError;
use super::input::{self, Input, Reading, Reduction, Scheduled, Texts};
use super::machine::{STOPPING, available_memory, catch_interrupts, start_threads};
use super::options::{Plan as PlanOptions, Switch};
use super::picture;
use super::places::{Places, kind_word};
use super::progress::Stage;
use super::rehearse::{self, Question};

/// Most kinds of costly sites that are listed.
const MOST_COSTLY: usize = 5;

/// Most source lines of one kind.
const MOST_LINES: usize = 32;

/// Tells what a circuit costs.
pub(super) fn plan(options: &PlanOptions) -> Result<(), CommandError> {
    let started = Instant::now();
    // A picture that cannot be written is found out before any work.
    let figure = picture::figure_file(options.figure.as_deref(), options.force)?;
    let Scheduled {
        texts,
        circuit,
        title,
        schedule,
        reduction,
    } = input::schedule(&Reading {
        circuit: &options.circuit,
        noise: options.noise.as_deref(),
        set: &options.set,
        max_operations: options.max_ops,
        absorb: options.absorb == Switch::On,
    })?;
    let threads = start_threads(options.threads)?;
    catch_interrupts(STOPPING)?;
    // Kept aside, for circuits that cannot be compiled.
    let left = schedule.sites.clone();
    let told = reduction.clone();
    let compiled = Program::compile(schedule, circuit.qubits.len(), circuit.bits);
    let available = available_memory();
    let request = Request {
        readout: options.readout.wanted(),
        shots: options.shots,
        companion: options.companion,
        threads,
        memory: options.memory.unwrap_or(available).min(available),
    };
    let deltas = match options.delta.as_slice() {
        [] => DELTAS.to_vec(),
        given => given.to_vec(),
    };
    let limited = options.budget.is_some() || options.memory.is_some();
    let stage = Stage::new("measuring shots of this circuit on this machine");
    let asked = Asked {
        options,
        request,
        deltas: &deltas,
        limited,
        started,
        left: &left,
        reduction: &told,
    };
    let made = match compiled {
        Ok(program) => {
            let input = Input {
                texts,
                circuit,
                title,
                program,
                reduction,
            };
            let sparsifier = Sparsifier::new(input.program.sites());
            let log_extent = log_extent(input.program.sites());
            let most = deltas.iter().copied().fold(1.0, f64::max);
            let least = deltas.iter().copied().fold(2.0, f64::min);
            let range = match limited {
                true => (
                    least.min(plan::CHOICE_RANGE.0),
                    most.max(plan::CHOICE_RANGE.1),
                ),
                false => (least, most),
            };
            let question = Question {
                request,
                deltas: range,
                rows: &deltas,
                all: true,
                seed: options.seed,
                log_extent,
                started,
                circuit: &options.circuit,
            };
            let model = rehearse::model(&input, &sparsifier, &question)?;
            asked.plan(&model, &input.circuit, &input.texts, input.title.as_deref())
        }
        Err(error) => {
            let log_extent = log_extent(&left);
            let model = Model {
                program: None,
                log_extent,
                log_damping: 0.0,
                request,
                profile: None,
                walk: None,
                probe: None,
                dense: None,
                companion: None,
                overhead: Overhead {
                    start: started.elapsed().as_secs_f64(),
                    memory: plan::peak_memory().unwrap_or(0.0),
                    ..Overhead::default()
                },
                bare: Some((left.len(), measure_bare())),
                blocked: Some(error.to_string()),
            };
            asked.plan(&model, &circuit, &texts, title.as_deref())
        }
    };
    stage.finish();
    rehearse::stopped()?;
    let text = if options.json {
        made.to_json()
    } else {
        plan_text::text(&made)
    };
    super::print(&text)?;
    if let Some(figure) = figure {
        figure.write(&plan_figure(&made))?;
    }
    match made.refused {
        None => Ok(()),
        Some(reason) => Err(CommandError::Usage(reason)),
    }
}

/// What a plan is made for.
struct Asked<'a> {
    options: &'a PlanOptions,
    request: Request,
    deltas: &'a [f64],
    limited: bool,
    started: Instant,
    /// Sites of the schedule.
    left: &'a [Site],
    reduction: &'a Reduction,
}

impl Asked<'_> {
    fn plan(
        &self,
        model: &Model<'_>,
        circuit: &Circuit,
        texts: &Texts,
        title: Option<&str>,
    ) -> Plan {
        let rows = model.rows(self.deltas);
        let kept: Vec<&Site> = match model.program {
            Some(program) => program.sites().iter().collect(),
            None => self.left.iter().collect(),
        };
        let costliest = costliest(&Places::new(circuit), &kept);
        let limits = Limits {
            seconds: self.options.budget,
            memory: self.request.memory,
        };
        let solved = self.limited.then(|| model.solve(&limits));
        let (choice, refused) = match solved {
            None => (None, None),
            Some(Ok(solved)) => (Some(solved), None),
            Some(Err(refusal)) => (
                None,
                Some(plan_text::refusal(&refusal, &costliest, self.request.shots)),
            ),
        };
        let Reduction {
            written,
            log_extent_after_noise,
            counts,
        } = self.reduction;
        let idle = self.left.len() - kept.len();
        let extent = model.log_extent.exp();
        Plan {
            program_version: env!("CARGO_PKG_VERSION").to_owned(),
            circuit: texts.circuit_name.clone(),
            noise: self
                .options
                .noise
                .is_some()
                .then(|| texts.noise_name.clone()),
            title: title.map(str::to_owned),
            qubits: circuit.qubits.len() as u64,
            shots: self.request.shots,
            companion_shots: match model.companion {
                Some(_) => model.companion_shots(Readout::Walk),
                None => 0,
            },
            threads: self.request.threads as u64,
            sites: PlanSites {
                as_written: written.gates as u64,
                merged: counts.merged as u64,
                deterministic: (counts.deterministic + idle) as u64,
                unobservable: counts.unobservable as u64,
                kept: kept.len() as u64,
                log10_extent_as_written: written.log_extent / std::f64::consts::LN_10,
                log10_extent_after_noise: log_extent_after_noise / std::f64::consts::LN_10,
                log10_extent: model.log_extent / std::f64::consts::LN_10,
                extent: extent.is_finite().then_some(extent),
            },
            costliest,
            active: model.profile.clone(),
            inner_measurements: model
                .program
                .map(|program| program.inner_measurements() as u64),
            measured: model.measured(self.started.elapsed().as_secs_f64() - model.overhead.start),
            limits: LimitsRow {
                seconds: limits.seconds,
                memory_bytes: limits.memory,
            },
            dense: model.dense(),
            curve: model.curve(&rows),
            rows,
            choice,
            refused,
            blocked: model.blocked.clone(),
        }
    }
}

/// Sites by kind and extent, to three decimals, those of the largest share of ξ
/// first.
fn costliest(places: &Places<'_>, sites: &[&Site]) -> Vec<Costly> {
    let mut groups: BTreeMap<(&str, u64), Costly> = BTreeMap::new();
    for site in sites {
        if site.extent <= 1.0 {
            continue;
        }
        let (line, kind) = (places.line(site.operation), kind_word(site));
        let group = groups
            .entry((kind, (site.extent * 1e3).round() as u64))
            .or_insert_with(|| Costly {
                lines: Vec::new(),
                kind: kind.to_owned(),
                count: 0,
                extent: site.extent,
                log10_share: 0.0,
            });
        group.count += 1;
        group.extent = group.extent.max(site.extent);
        group.log10_share += site.extent.log10();
        if group.lines.len() < MOST_LINES && group.lines.last() != Some(&line) {
            group.lines.push(line);
        }
    }
    let mut groups: Vec<Costly> = groups.into_values().collect();
    groups.sort_by(|a, b| b.log10_share.total_cmp(&a.log10_share));
    groups.truncate(MOST_COSTLY);
    groups
}

/// Why a run within limits is refused, with what would help.
pub(super) fn explain(refusal: &Refusal, model: &Model<'_>, input: &Input) -> String {
    let sites: Vec<&Site> = input.program.sites().iter().collect();
    let costliest = costliest(&Places::new(&input.circuit), &sites);
    plan_text::refusal(refusal, &costliest, model.request.shots)
}

/// What a limit of time or memory chose.
pub(super) fn chosen_text(solved: &Solved) -> String {
    plan_text::chosen(solved)
}
