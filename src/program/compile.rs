//! The forward walk: one segment of a schedule to steps.

use std::collections::HashMap;
use std::sync::Arc;

use smallvec::smallvec;

use crate::circuit::{Clifford, Pauli, PauliProduct, Qubits};
use crate::clifford::frame::Frame;
use crate::clifford::pauli::{ones, toggle, words_for};
use crate::magic::{Instruction, Kind, Schedule, SiteKind};
use crate::noise::{PauliChannel, PauliChoices, PauliWord, ReadoutFlip};

use super::axis::{Gathered, ones_and};
use super::faults::{ChoiceTable, FaultGroup, FaultPlace};
use super::flips::{self, Event, SetId};
use super::step::{AffineInput, Outcome, Primitive, Reading, Step};
use super::turns::quarter_turns_of;
use super::{Branch, CompileError, End, Layout, Segment, Start};

/// What every segment of a program is compiled from.
pub(super) struct Context<'a> {
    pub schedule: &'a Schedule,
    pub location_of: &'a HashMap<usize, u32>,
    /// New index of every site that may be used.
    pub kept: &'a [Option<u32>],
}

/// State of the forward walk.
pub(super) struct Compiler<'a> {
    context: &'a Context<'a>,
    pub(super) frame: Frame,
    pub(super) slots: Vec<Option<u16>>,
    pub(super) used_slots: Vec<bool>,
    /// Columns that are active, and those that are not.
    pub(super) active: Vec<u64>,
    pub(super) inactive: Vec<u64>,
    /// The last reading of ±Z of each inactive column.
    pub(super) last_reading: Vec<Option<Reading>>,
    pub(super) steps: Vec<Step>,
    pub(super) primitives: Vec<Primitive>,
    pub(super) peak_active: usize,
    /// Circuit operation being compiled, for messages.
    pub(super) operation: u32,
    reference: Vec<bool>,
    previous: Vec<Option<Reading>>,
    events: Vec<Event>,
    triggers: u32,
    places: Vec<(u32, Arc<ChoiceTable>)>,
    unconditional: Vec<u32>,
    /// Tables shared by equal channels.
    tables: HashMap<TableKey, Arc<ChoiceTable>>,
    /// Sites met, and those of them with a step.
    met: Vec<u32>,
    stepped: Vec<bool>,
    end: Option<Box<Branch>>,
    /// Whether this is not the first segment.
    later: bool,
}

/// Compiles the segment that starts at `start` in `layout`. Also says of every
/// site whether it was met here and had no effect.
pub(super) fn segment(
    context: &Context<'_>,
    start: Start,
    layout: Layout,
) -> Result<(Segment, Vec<bool>), CompileError> {
    let mut compiler = Compiler::new(context, layout, start != Start::default());
    let instructions = &context.schedule.instructions;
    for (index, instruction) in instructions.iter().enumerate().skip(start.instruction) {
        let forced = start.taken && index == start.instruction;
        let condition = if forced { None } else { instruction.condition };
        if let Some(condition) = condition
            && changes_structure(&instruction.kind)
        {
            compiler.branch(condition, index);
            break;
        }
        compiler.operation = instruction.operation;
        compiler.instruction(index, instruction, condition)?;
    }
    compiler.finish()
}

/// What makes two channels' tables equal: the number of qubits, and words with
/// the bits of their probabilities.
type TableKey = (usize, Vec<(PauliWord, u64)>);

fn table_key(channel: &PauliChannel) -> TableKey {
    let list = match &channel.choices {
        PauliChoices::Uniform(chance) => vec![(PauliWord::default(), chance.to_bits())],
        PauliChoices::Listed(list) => list
            .iter()
            .map(|&(word, chance)| (word, chance.to_bits()))
            .collect(),
    };
    (channel.qubits.len(), list)
}

/// Whether the steps that follow depend on whether this happens.
fn changes_structure(kind: &Kind) -> bool {
    matches!(
        kind,
        Kind::Measure { .. } | Kind::Reset { .. } | Kind::Damping { .. } | Kind::Prepare { .. }
    )
}

impl<'a> Compiler<'a> {
    fn new(context: &'a Context<'a>, layout: Layout, later: bool) -> Self {
        let qubits = layout.frame.qubits();
        let words = words_for(qubits);
        let (mut active, mut inactive) = (vec![0; words], vec![0; words]);
        let mut used_slots = Vec::new();
        for (column, slot) in layout.slots.iter().enumerate() {
            match slot {
                None => toggle(&mut inactive, column),
                Some(slot) => {
                    toggle(&mut active, column);
                    let slot = usize::from(*slot);
                    if used_slots.len() <= slot {
                        used_slots.resize(slot + 1, false);
                    }
                    used_slots[slot] = true;
                }
            }
        }
        let peak_active = used_slots.iter().filter(|&&used| used).count();
        Compiler {
            context,
            frame: layout.frame,
            slots: layout.slots,
            used_slots,
            active,
            inactive,
            last_reading: vec![None; qubits],
            steps: Vec::new(),
            primitives: Vec::new(),
            peak_active,
            operation: 0,
            reference: Vec::new(),
            previous: Vec::new(),
            events: Vec::new(),
            triggers: 0,
            places: Vec::new(),
            unconditional: Vec::new(),
            tables: HashMap::new(),
            met: Vec::new(),
            stepped: vec![false; context.kept.len()],
            end: None,
            later,
        }
    }

    fn instruction(
        &mut self,
        index: usize,
        instruction: &Instruction,
        condition: Option<u32>,
    ) -> Result<(), CompileError> {
        match &instruction.kind {
            Kind::Clifford(gate) => match condition {
                None => self.apply(gate.clone()),
                Some(condition) => self.conditional_gate(gate, condition)?,
            },
            Kind::Gate { site, axes } => self.site(*site, axes, condition)?,
            Kind::Prepare { site, qubit } => {
                self.met.push(*site);
                self.stepped[*site as usize] = true;
                // A Pauli on the fresh qubit before this can only be Z, which does
                // nothing to |0⟩; it must not reach the state that comes now.
                self.events.push(Event::Clear(*qubit));
                let slot = self.place_fresh(*qubit)?;
                if let Some(site) = self.context.kept[*site as usize] {
                    self.steps.push(Step::Prepare { slot, site });
                }
            }
            Kind::Measure { qubit, bit, flip } => {
                let location = self.context.location_of.get(&index).copied();
                let flip = if bit.is_some() {
                    *flip
                } else {
                    ReadoutFlip::default()
                };
                self.measure(
                    *qubit,
                    Outcome {
                        bit: *bit,
                        flip,
                        location,
                    },
                )?;
            }
            Kind::Reset { qubit } => self.reset(*qubit)?,
            Kind::Assign { bit, value } => {
                self.steps.push(Step::Assign {
                    bit: *bit,
                    value: value.clone(),
                    condition,
                });
            }
            Kind::Pauli(channel) => self.fault(index, channel, condition),
            Kind::Damping { qubit, gamma } => self.damping(index, *qubit, *gamma)?,
        }
        Ok(())
    }

    /// C ← G·C outside any condition.
    pub(super) fn apply(&mut self, gate: Clifford) {
        self.frame.apply(&gate);
        self.events.push(Event::Gate(gate));
    }

    /// A new reading of a product of letters.
    fn read(&mut self, axis: &PauliProduct, negative: bool) -> Reading {
        let reading = self.reference.len() as Reading;
        self.reference.push(negative);
        self.previous.push(None);
        self.events.push(Event::Read(axis.clone(), reading));
        reading
    }

    /// A Pauli that may happen here; the index becomes its set at the end.
    fn trigger(&mut self, product: PauliProduct) -> SetId {
        let trigger = self.triggers;
        self.triggers += 1;
        self.events.push(Event::Trigger(product, trigger));
        SetId::pending(trigger)
    }

    fn site(
        &mut self,
        site: u32,
        axes: &[PauliProduct],
        condition: Option<u32>,
    ) -> Result<(), CompileError> {
        self.met.push(site);
        match self.context.schedule.sites[site as usize].kind {
            SiteKind::Ccz(_) => self.ccz(site, axes, condition),
            _ => self.rotation(site, &axes[0], condition),
        }
    }

    fn rotation(
        &mut self,
        site: u32,
        axis: &PauliProduct,
        condition: Option<u32>,
    ) -> Result<(), CompileError> {
        // A rotation about an axis of known value is a global phase.
        let Gathered::Column { column, negative } = self.gather(axis, &[])? else {
            self.skip(site);
            return Ok(());
        };
        let Some(kept) = self.context.kept[site as usize] else {
            return Ok(());
        };
        self.stepped[site as usize] = true;
        let (slot, reading) = (self.slot(column), self.read(axis, negative));
        self.steps.push(Step::Rotate {
            slot,
            site: kept,
            reading,
            condition,
        });
        Ok(())
    }

    fn ccz(
        &mut self,
        site: u32,
        axes: &[PauliProduct],
        condition: Option<u32>,
    ) -> Result<(), CompileError> {
        let mut reserved: Vec<usize> = Vec::new();
        let mut gathered = Vec::new();
        for axis in axes {
            let place = self.gather(axis, &reserved)?;
            if let Gathered::Column { column, .. } = place {
                reserved.push(column);
            }
            gathered.push(place);
        }
        let readings: Vec<Reading> = axes
            .iter()
            .zip(&gathered)
            .map(|(axis, place)| self.read(axis, place.negative()))
            .collect();
        if let ([a, b, c], Some(kept)) = (reserved[..].as_ref(), self.context.kept[site as usize]) {
            self.stepped[site as usize] = true;
            self.steps.push(Step::Ccz {
                slots: [self.slot(*a), self.slot(*b), self.slot(*c)],
                readings: [readings[0], readings[1], readings[2]],
                site: kept,
                condition,
            });
            return Ok(());
        }
        self.skip(site);
        let position = |column: &usize| {
            reserved
                .iter()
                .position(|other| other == column)
                .map_or(0, |position| 1u8 << position)
        };
        let input = |index: usize| {
            let slots = match &gathered[index] {
                Gathered::Known { .. } => 0,
                Gathered::Column { column, .. } => position(column),
                Gathered::Reserved { columns, .. } => {
                    columns.iter().map(position).fold(0, |sum, bit| sum ^ bit)
                }
            };
            AffineInput {
                slots,
                reading: readings[index],
            }
        };
        self.steps.push(Step::Quadratic {
            slots: [0, 1].map(|index| reserved.get(index).map(|&column| self.slot(column))),
            inputs: [input(0), input(1), input(2)],
            condition,
        });
        Ok(())
    }

    /// A site without effect here. In the first segment it is without effect in
    /// every shot and is left out of the program; later it has to be counted.
    fn skip(&mut self, site: u32) {
        if self.later
            && let Some(site) = self.context.kept[site as usize]
        {
            self.steps.push(Step::Skip { site });
        }
    }

    /// A Clifford gate under a condition: register steps and a flip.
    fn conditional_gate(&mut self, gate: &Clifford, condition: u32) -> Result<(), CompileError> {
        let (turns, pauli) = quarter_turns_of(gate);
        for axis in turns {
            if let Gathered::Column { column, negative } = self.gather(&axis, &[])? {
                let (slot, reading) = (self.slot(column), self.read(&axis, negative));
                self.steps.push(Step::QuarterTurn {
                    slot,
                    reading,
                    condition,
                });
            }
        }
        if !pauli.is_empty() {
            let flips = self.trigger(pauli);
            self.steps.push(Step::Flip { condition, flips });
        }
        Ok(())
    }

    fn measure(&mut self, qubit: u32, outcome: Outcome) -> Result<(), CompileError> {
        let axis: PauliProduct = smallvec![(qubit, Pauli::Z)];
        let pulled = self.frame.pull_back(&axis);
        let fair = ones_and(&pulled.x, &self.inactive).next();
        if let Some(column) = fair {
            for other in ones_and(&pulled.x, &self.inactive) {
                self.last_reading[other] = None;
            }
            let (negative, partner) = self.collapse(pulled, column);
            let reading = self.read(&axis, negative);
            let flips = self.trigger(partner);
            self.last_reading[column] = Some(reading);
            self.steps.push(Step::Coin {
                reading: Some(reading),
                flips,
                outcome,
            });
            return Ok(());
        }
        match self.gather(&axis, &[])? {
            Gathered::Column { column, negative } => {
                let reading = self.read(&axis, negative);
                let slot = self.slot(column);
                let flips = self.drop_column(column, None);
                self.last_reading[column] = Some(reading);
                self.steps.push(Step::Measure {
                    slot,
                    reading: Some(reading),
                    flips,
                    outcome,
                });
            }
            known => {
                // A discarded outcome that is known leaves no trace.
                if outcome.bit.is_some() {
                    let reading = self.read(&axis, known.negative());
                    self.relate(&pulled.z, reading);
                    self.steps.push(Step::Known { reading, outcome });
                }
            }
        }
        Ok(())
    }

    /// Stores a known reading of Z of a single column relative to the one
    /// before it.
    fn relate(&mut self, columns: &[u64], reading: Reading) {
        let mut list = ones(columns);
        if let (Some(column), None) = (list.next(), list.next()) {
            self.previous[reading as usize] = self.last_reading[column];
            self.last_reading[column] = Some(reading);
        }
    }

    /// Takes a measured column out of the register; the set of the Pauli that
    /// leads to the outcome 1, without its part on `without`.
    fn drop_column(&mut self, column: usize, without: Option<u32>) -> SetId {
        let mut partner = self.frame.push_forward(column, Pauli::X);
        partner.retain(|&mut (qubit, _)| Some(qubit) != without);
        self.drop_slot(column);
        self.trigger(partner)
    }

    fn reset(&mut self, qubit: u32) -> Result<(), CompileError> {
        let axis: PauliProduct = smallvec![(qubit, Pauli::Z)];
        let outcome = Outcome {
            bit: None,
            flip: ReadoutFlip::default(),
            location: None,
        };
        self.events.push(Event::Clear(qubit));
        let pulled = self.frame.pull_back(&axis);
        let fair = ones_and(&pulled.x, &self.inactive).next();
        let negative = if let Some(column) = fair {
            for other in ones_and(&pulled.x, &self.inactive) {
                self.last_reading[other] = None;
            }
            let (negative, mut partner) = self.collapse(pulled, column);
            partner.retain(|&mut (other, _)| other != qubit);
            let flips = self.trigger(partner);
            self.steps.push(Step::Coin {
                reading: None,
                flips,
                outcome,
            });
            negative
        } else {
            let gathered = self.gather(&axis, &[])?;
            if let Gathered::Column { column, .. } = gathered {
                let slot = self.slot(column);
                let flips = self.drop_column(column, Some(qubit));
                self.steps.push(Step::Measure {
                    slot,
                    reading: None,
                    flips,
                    outcome,
                });
            }
            gathered.negative()
        };
        if negative {
            self.apply(Clifford::X(qubit));
        }
        Ok(())
    }

    fn fault(&mut self, index: usize, channel: &PauliChannel, condition: Option<u32>) {
        let location = self.context.location_of[&index];
        let table = self
            .tables
            .entry(table_key(channel))
            .or_insert_with(|| Arc::new(ChoiceTable::new(channel)))
            .clone();
        let place = self.place(location, table, channel.qubits.clone());
        match condition {
            None => self.unconditional.push(place),
            Some(condition) => self.steps.push(Step::Fault { condition, place }),
        }
    }

    fn place(&mut self, location: u32, table: Arc<ChoiceTable>, qubits: Qubits) -> u32 {
        let place = self.places.len() as u32;
        self.places.push((location, table));
        self.events.push(Event::Place(place, qubits));
        place
    }

    fn damping(&mut self, index: usize, qubit: u32, gamma: f64) -> Result<(), CompileError> {
        let axis: PauliProduct = smallvec![(qubit, Pauli::Z)];
        let location = self.context.location_of[&index];
        let gathered = self.gather(&axis, &[])?;
        let reading = self.read(&axis, gathered.negative());
        let flips = self.trigger(smallvec![(qubit, Pauli::X)]);
        self.steps.push(match gathered {
            Gathered::Column { column, .. } => Step::Damp {
                slot: self.slot(column),
                reading,
                gamma,
                flips,
                location,
            },
            _ => Step::DampKnown {
                reading,
                gamma,
                flips,
                location,
            },
        });
        Ok(())
    }

    /// Ends the segment before an instruction that changes the structure.
    fn branch(&mut self, condition: u32, instruction: usize) {
        let mut frame = self.frame.clone();
        let carried = frame.take_signs();
        self.end = Some(Box::new(Branch {
            condition,
            carried,
            instruction,
            layout: Arc::new(Layout {
                frame,
                slots: self.slots.clone(),
            }),
            next: Default::default(),
        }));
    }

    fn finish(self) -> Result<(Segment, Vec<bool>), CompileError> {
        let exit = self.end.is_some().then_some(self.reference.len() as u32);
        let flips = flips::backward(
            self.frame.qubits(),
            &self.events,
            &self.previous,
            self.triggers as usize,
            self.places.len(),
            exit,
        )
        .ok_or(CompileError::TooManyFlips {
            places: self.places.len(),
            outcomes: self.triggers as usize,
        })?;
        let mut steps = self.steps;
        for step in &mut steps {
            if let Some(set) = step.flips_mut() {
                *set = flips.triggers[set.pending_index()];
            }
        }
        let places: Vec<FaultPlace> = self
            .places
            .into_iter()
            .zip(flips.places)
            .map(|((location, table), sets)| FaultPlace {
                location,
                sets,
                table,
            })
            .collect();
        let groups = FaultGroup::collect(&places, &self.unconditional);
        let mut idle = vec![false; self.stepped.len()];
        for site in self.met {
            idle[site as usize] = !self.stepped[site as usize];
        }
        let segment = Segment {
            steps,
            primitives: self.primitives,
            reference: self.reference,
            previous: self.previous,
            sets: flips.sets,
            groups,
            places,
            entry: flips.entry,
            slots: self.used_slots.len(),
            peak_active: self.peak_active,
            end: self.end.map_or(End::Finished, End::Branch),
        };
        Ok((segment, idle))
    }
}
