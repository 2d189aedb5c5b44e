//! How many qubits are active, step by step.

use std::sync::Arc;

use serde::Serialize;

use crate::program::{End, Program, Segment, Step};

/// Most segments that are followed where the structure depends on outcomes.
const MAX_SEGMENTS: usize = 256;

/// The kinds of steps that cost a pass over the register.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Pass {
    /// A qubit becomes active.
    Join,
    /// (1 + i^a·Q)/√2.
    Primitive,
    /// CNOT.
    ControlledNot,
    /// A rotation or quarter turn.
    Phase,
    /// A CCZ or what is left of one.
    Sign,
    /// A measurement or damping.
    Measure,
}

/// Active qubits along a shot.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Profile {
    /// Most active qubits at once; where `exact` is false an upper bound.
    pub peak: usize,
    /// Whether every shot has these steps. Otherwise the steps are those of the
    /// course of events in which no condition holds.
    pub exact: bool,
    /// Number of steps on the register while so many qubits are active; entry r
    /// is for r qubits.
    pub steps: Vec<u64>,
    /// Active qubits during each step on the register, in order.
    #[serde(skip)]
    pub course: Vec<u16>,
    #[serde(skip)]
    pub(super) passes: Vec<(Pass, u16)>,
}

impl Profile {
    /// Follows a program.
    pub fn new(program: &Program) -> Self {
        let mut passes = Vec::new();
        let mut active = 0u16;
        let mut segment: Arc<Segment> = program.first().clone();
        for _ in 0..MAX_SEGMENTS {
            for step in &segment.steps {
                follow(step, &mut active, &mut passes);
            }
            let End::Branch(branch) = &segment.end else {
                break;
            };
            // A segment that cannot be compiled ends what can be told here.
            let Ok(next) = program.next(branch, false) else {
                break;
            };
            segment = next;
        }
        let course: Vec<u16> = passes.iter().map(|&(_, active)| active).collect();
        let mut steps = Vec::new();
        for &active in &course {
            let active = usize::from(active);
            if steps.len() <= active {
                steps.resize(active + 1, 0);
            }
            steps[active] += 1;
        }
        Profile {
            peak: program.peak_active(),
            exact: !program.branches(),
            steps,
            course,
            passes,
        }
    }
}

/// Notes what a step does; during a step the qubit it adds or removes counts.
fn follow(step: &Step, active: &mut u16, passes: &mut Vec<(Pass, u16)>) {
    let pass = match step {
        Step::Activate { .. } | Step::Prepare { .. } => {
            *active += 1;
            Pass::Join
        }
        Step::Primitive(_) => Pass::Primitive,
        Step::ControlledNot { .. } => Pass::ControlledNot,
        Step::Rotate { .. } | Step::QuarterTurn { .. } => Pass::Phase,
        Step::Ccz { .. } | Step::Quadratic { .. } => Pass::Sign,
        Step::Measure { .. } => {
            passes.push((Pass::Measure, *active));
            *active = active.saturating_sub(1);
            return;
        }
        Step::Damp { .. } => Pass::Measure,
        _ => return,
    };
    passes.push((pass, *active));
}
