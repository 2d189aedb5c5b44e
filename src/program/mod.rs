//! The compiled program: a circuit walked once, so that a shot costs little.
//!
//! From shot to shot the Clifford frame changes only by Paulis, that is by
//! signs. Which rule applies to a site or a measurement never depends on a
//! sign, so the frame is walked once with noise off and every free outcome 0,
//! and emits a short list of [`Step`]s on the active register. Everything that
//! varies is a Pauli of the circuit that *flips* a set of later readings; a
//! backward pass finds all these sets.
//!
//! Measurement, reset or damping under a condition does change the structure:
//! it ends a [`Segment`]. The next one is compiled when a shot first needs it
//! and kept by its frame without signs.
//!
//! This module knows schedules and the frame, and nothing of how a register
//! holds its state.

mod axis;
mod compile;
mod faults;
mod flips;
mod reduce;
mod step;
mod turns;

use std::collections::HashMap;
use std::hash::{DefaultHasher, Hash, Hasher};
use std::sync::{Arc, Mutex, OnceLock};

use crate::clifford::frame::Frame;
use crate::magic::{Kind, Schedule, Site, SiteKind};

pub use faults::{ChoiceTable, FaultGroup, FaultPlace, Location, LocationKind};
pub use flips::{SetArena, SetId};
pub use reduce::{Reduced, SiteCounts, reduce};
pub use step::{AffineInput, Outcome, Primitive, Reading, Step};

/// Slots a register may have at most.
pub const MAX_SLOTS: usize = 256;

/// Bytes of segments that are kept for reuse; past that they are compiled anew.
const MAX_KEPT_BYTES: usize = 1 << 30;

/// Why a schedule cannot be compiled.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum CompileError {
    /// Too many active qubits at once.
    #[error(
        "the circuit needs more than {MAX_SLOTS} active qubits at once; found at operation \
         {operation}: use fewer non-Clifford gates before qubits are measured"
    )]
    TooManyActive {
        /// Index of the circuit operation.
        operation: u32,
    },
    /// The flip sets take too much memory.
    #[error(
        "which readings each of the {places} noisy places and {outcomes} random outcomes can flip \
         takes more than 4 GiB or too long to find: use fewer measurements whose outcomes depend \
         on one another, or split the circuit"
    )]
    TooManyFlips {
        /// Number of places where a fault may fire.
        places: usize,
        /// Number of outcomes and events that flip later readings.
        outcomes: usize,
    },
}

/// A compiled circuit.
#[derive(Debug)]
pub struct Program {
    schedule: Arc<Schedule>,
    qubits: usize,
    bits: usize,
    /// Sites that matter, in order; steps index this list.
    sites: Vec<Site>,
    /// For every site of the schedule its index in `sites`, if it matters.
    kept: Vec<Option<u32>>,
    locations: Vec<Location>,
    /// Index into `locations` of each instruction that has one.
    location_of: HashMap<usize, u32>,
    first: Arc<Segment>,
    segments: Mutex<Kept>,
}

/// Segments kept for reuse.
#[derive(Debug, Default)]
struct Kept {
    by_start: HashMap<SegmentKey, Arc<Segment>>,
    bytes: usize,
}

/// Where a segment starts: everything its compilation depends on.
#[derive(Debug, Clone, PartialEq, Eq)]
struct SegmentKey {
    /// Hash of the rest, made before the table is locked.
    hash: u64,
    start: Start,
    layout: Arc<Layout>,
}

impl std::hash::Hash for SegmentKey {
    fn hash<H: Hasher>(&self, state: &mut H) {
        state.write_u64(self.hash);
    }
}

impl SegmentKey {
    fn new(start: Start, layout: &Arc<Layout>) -> Self {
        let mut hasher = DefaultHasher::new();
        (start, layout).hash(&mut hasher);
        SegmentKey {
            hash: hasher.finish(),
            start,
            layout: layout.clone(),
        }
    }
}

/// First instruction of a segment.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Default)]
struct Start {
    /// Index of the instruction.
    instruction: usize,
    /// Whether its condition is known to hold.
    taken: bool,
}

/// Frame without signs, and which columns are active in which slot.
#[derive(Debug, Clone, PartialEq, Eq, Hash)]
struct Layout {
    frame: Frame,
    /// Slot of each column, if it is active.
    slots: Vec<Option<u16>>,
}

/// A stretch of the program without structural choices.
#[derive(Debug)]
pub struct Segment {
    /// What the register does, in order.
    pub steps: Vec<Step>,
    /// The primitives that steps refer to.
    pub primitives: Vec<Primitive>,
    /// Reference value of each reading.
    pub reference: Vec<bool>,
    /// The earlier reading of the same Pauli each reading is relative to.
    pub previous: Vec<Option<u32>>,
    /// Flip sets. Entries below the number of readings are readings; past
    /// them, two an exit qubit: X part, Z part of the Pauli at the end.
    pub sets: SetArena,
    /// Places where a fault may fire unconditionally, grouped by probability.
    pub groups: Vec<FaultGroup>,
    /// Every place where a fault may fire; groups and steps refer to it.
    pub places: Vec<FaultPlace>,
    /// For each qubit the sets its X and Z flip when present at the start.
    pub entry: Vec<[SetId; 2]>,
    /// Number of slots used.
    pub slots: usize,
    /// Most slots active at once.
    pub peak_active: usize,
    /// What comes after.
    pub end: End,
}

/// What comes after a segment.
#[derive(Debug)]
pub enum End {
    /// The circuit is done.
    Finished,
    /// An operation under this condition changes the structure.
    Branch(Box<Branch>),
}

/// The end of a segment at an operation that changes the structure.
#[derive(Debug)]
pub struct Branch {
    /// The classical bit that decides.
    pub condition: u32,
    /// Pauli of the reference frame at the end, by qubit (X part, Z part).
    pub carried: Vec<(bool, bool)>,
    instruction: usize,
    layout: Arc<Layout>,
    next: [OnceLock<Arc<Segment>>; 2],
}

impl Program {
    /// Compiles a schedule for a circuit of so many qubits and classical bits.
    pub fn compile(
        schedule: Schedule,
        qubits: usize,
        bits: usize,
    ) -> Result<Program, CompileError> {
        let (locations, location_of) = faults::locations(&schedule);
        let schedule = Arc::new(schedule);
        let all: Vec<Option<u32>> = (0..schedule.sites.len() as u32).map(Some).collect();
        let start = Start {
            instruction: 0,
            taken: false,
        };
        let layout = Layout {
            frame: Frame::identity(qubits),
            slots: vec![None; qubits],
        };
        let context = compile::Context {
            schedule: &schedule,
            location_of: &location_of,
            kept: &all,
        };
        let (mut first, idle) = compile::segment(&context, start, layout)?;
        let mut kept = Vec::with_capacity(all.len());
        let mut sites = Vec::new();
        for (site, idle) in schedule.sites.iter().zip(idle) {
            if idle {
                kept.push(None);
            } else {
                kept.push(Some(sites.len() as u32));
                sites.push(site.clone());
            }
        }
        first.renumber_sites(&kept);
        Ok(Program {
            schedule,
            qubits,
            bits,
            sites,
            kept,
            locations,
            location_of,
            first: Arc::new(first),
            segments: Mutex::new(Kept::default()),
        })
    }

    /// Number of circuit qubits.
    pub fn qubits(&self) -> usize {
        self.qubits
    }

    /// Number of classical bits, hidden ones included.
    pub fn bits(&self) -> usize {
        self.bits
    }

    /// The sites that matter.
    pub fn sites(&self) -> &[Site] {
        &self.sites
    }

    /// Every site of the schedule, and whether it matters.
    pub fn all_sites(&self) -> impl Iterator<Item = (&Site, bool)> {
        self.schedule
            .sites
            .iter()
            .zip(self.kept.iter().map(Option::is_some))
    }

    /// The schedule it was compiled from.
    pub fn schedule(&self) -> &Schedule {
        &self.schedule
    }

    /// Index of the first instruction of the schedule that changes the
    /// structure under a condition, if there is one.
    pub fn first_branch(&self) -> Option<usize> {
        match &self.first.end {
            End::Finished => None,
            End::Branch(branch) => Some(branch.instruction),
        }
    }

    /// Instructions of the schedule that damp the register in the first
    /// segment, in order of their index.
    pub fn damped_instructions(&self) -> Vec<usize> {
        let damped: Vec<u32> = self
            .first
            .steps
            .iter()
            .filter_map(|step| match step {
                Step::Damp { location, .. } => Some(*location),
                _ => None,
            })
            .collect();
        let mut instructions: Vec<usize> = self
            .location_of
            .iter()
            .filter(|(_, location)| damped.contains(location))
            .map(|(&instruction, _)| instruction)
            .collect();
        instructions.sort_unstable();
        instructions
    }

    /// Sites met in the first segment before anything of the register is
    /// measured or damped, in order; indices into [`Program::sites`].
    pub fn early_sites(&self) -> Vec<u32> {
        let reads = |step: &&Step| matches!(step, Step::Measure { .. } | Step::Damp { .. });
        let steps = self.first.steps.iter().take_while(|step| !reads(step));
        steps
            .filter_map(|step| match step {
                Step::Prepare { site, .. }
                | Step::Rotate { site, .. }
                | Step::Ccz { site, .. }
                | Step::Skip { site } => Some(*site),
                _ => None,
            })
            .collect()
    }

    /// Places where a fault may happen, in circuit order.
    pub fn locations(&self) -> &[Location] {
        &self.locations
    }

    /// The first segment.
    pub fn first(&self) -> &Arc<Segment> {
        &self.first
    }

    /// Whether an operation under a condition changes the structure, so that
    /// the steps of a shot depend on its outcomes.
    pub fn branches(&self) -> bool {
        matches!(self.first.end, End::Branch(_))
    }

    /// Whether amplitude damping may meet an entangled qubit.
    pub fn has_damping(&self) -> bool {
        self.log_damping_trace() > 0.0
    }

    /// log of a bound on the trace of the companion circuit, in which damping of
    /// an entangled qubit is the map sρ + (1−s)·|0⟩⟨0|ρ|0⟩⟨0| + K1ρK1†, s = √(1−γ):
    /// the sum of ln(1 + s(1−s)). Without branches over the dampings that meet an
    /// entangled qubit, else over all.
    pub fn log_damping_trace(&self) -> f64 {
        let log_trace = |gamma: f64| {
            let s = (1.0 - gamma).sqrt();
            // 1 at the axis value 0, s + γ at the value 1.
            (s * (1.0 - s)).ln_1p()
        };
        if self.branches() {
            let damping = |instruction: &crate::magic::Instruction| match instruction.kind {
                Kind::Damping { gamma, .. } => log_trace(gamma),
                _ => 0.0,
            };
            return self.schedule.instructions.iter().map(damping).sum();
        }
        let damping = |step: &Step| match *step {
            Step::Damp { gamma, .. } => log_trace(gamma),
            _ => 0.0,
        };
        self.first.steps.iter().map(damping).sum()
    }

    /// Slots a register needs: exact without branches, else an upper bound.
    pub fn slots(&self) -> usize {
        if self.branches() {
            self.active_bound()
        } else {
            self.first.slots
        }
    }

    /// Most active qubits at once: exact without branches, else an upper bound.
    pub fn peak_active(&self) -> usize {
        if self.branches() {
            self.active_bound()
        } else {
            self.first.peak_active
        }
    }

    /// Every step that can make a qubit active, or the qubits if they are fewer.
    fn active_bound(&self) -> usize {
        let site_qubits: usize = self
            .schedule
            .sites
            .iter()
            .map(|site| {
                if matches!(site.kind, SiteKind::Ccz(_)) {
                    3
                } else {
                    1
                }
            })
            .sum();
        let others: usize = self
            .schedule
            .instructions
            .iter()
            .map(
                |instruction| match (&instruction.kind, instruction.condition) {
                    (Kind::Damping { .. }, _) => 1,
                    (Kind::Clifford(gate), Some(_)) => turns::quarter_turns_of(gate).0.len(),
                    _ => 0,
                },
            )
            .sum();
        (site_qubits + others).min(self.qubits).min(MAX_SLOTS)
    }

    /// Inner measurements of a shot: exact without branches, else those of the
    /// first segment plus every later measurement and reset.
    pub fn inner_measurements(&self) -> usize {
        let inner = |step: &&Step| matches!(step, Step::Measure { .. });
        let first = self.first.steps.iter().filter(inner).count();
        let End::Branch(branch) = &self.first.end else {
            return first;
        };
        let later = &self.schedule.instructions[branch.instruction..];
        let measures = |kind: &Kind| matches!(kind, Kind::Measure { .. } | Kind::Reset { .. });
        first
            + later
                .iter()
                .filter(|instruction| measures(&instruction.kind))
                .count()
    }

    /// The segment after `branch`, compiled on first use.
    pub fn next(&self, branch: &Branch, taken: bool) -> Result<Arc<Segment>, CompileError> {
        if let Some(segment) = branch.next[usize::from(taken)].get() {
            return Ok(segment.clone());
        }
        let instruction = branch.instruction + usize::from(!taken);
        let key = SegmentKey::new(Start { instruction, taken }, &branch.layout);
        let known = self.lock().by_start.get(&key).cloned();
        let segment = match known {
            Some(segment) => segment,
            None => {
                let context = compile::Context {
                    schedule: &self.schedule,
                    location_of: &self.location_of,
                    kept: &self.kept,
                };
                let layout = Layout::clone(&key.layout);
                let (segment, _) = compile::segment(&context, key.start, layout)?;
                let segment = Arc::new(segment);
                let bytes = segment.bytes();
                let mut kept = self.lock();
                if kept.bytes + bytes > MAX_KEPT_BYTES {
                    return Ok(segment);
                }
                kept.bytes += bytes;
                kept.by_start.entry(key).or_insert(segment).clone()
            }
        };
        Ok(branch.next[usize::from(taken)]
            .get_or_init(|| segment)
            .clone())
    }

    fn lock(&self) -> std::sync::MutexGuard<'_, Kept> {
        self.segments
            .lock()
            .unwrap_or_else(|poisoned| poisoned.into_inner())
    }
}

impl Segment {
    /// Roughly the bytes it takes, the frame at its end included.
    fn bytes(&self) -> usize {
        let frame = match &self.end {
            End::Finished => 0,
            End::Branch(branch) => branch.layout.frame.bytes(),
        };
        let places: usize = self
            .places
            .iter()
            .map(|place| 64 + 8 * place.sets.len())
            .sum();
        frame
            + places
            + self.sets.bytes()
            + self.steps.len() * size_of::<Step>()
            + self.primitives.len() * size_of::<Primitive>()
            + self.entry.len() * size_of::<[SetId; 2]>()
            + 16 * self.reference.len()
    }

    /// Replaces schedule indices of sites by indices of kept sites.
    fn renumber_sites(&mut self, kept: &[Option<u32>]) {
        for step in &mut self.steps {
            if let Some(site) = step.site_mut() {
                *site = kept[*site as usize].expect("a site with a step is kept");
            }
        }
    }
}
