//! What becomes of the sites of a schedule, and the schedule without those that
//! went.
//!
//! Two rotations by a and b about A and sA, s = ±1, dephased with p and q, make
//! one by a + s·b, dephased with p + q − 2pq: everything here is a function of
//! A, or the same for A and −A. Quarter turns of the sum are Clifford; what is
//! left, in (0, π/2), is the site. If nothing is left the dephasing stays, as a
//! channel. A state turned about X, Y or Z of its qubit, and dephased, is a
//! state again.

use std::f64::consts::FRAC_PI_2;

use crate::circuit::{Clifford, Pauli, PauliProduct, Qubits};
use crate::magic::bloch::Bloch;
use crate::magic::{
    Instruction, Kind, PreparedSite, RotationSite, Schedule, Site, SiteKind, extent,
};
use crate::noise::{PauliChannel, PauliChoices, PauliWord};

/// An angle or a component of a Bloch vector this near to that of a Clifford
/// operation is one.
const TOLERANCE: f64 = 1e-12;

/// A dephasing this seldom is rounding.
const ROUNDING: f64 = 1e-15;

/// What becomes of one site.
#[derive(Debug, Clone)]
pub(super) enum Fate {
    /// It stays as it is.
    Kept,
    /// It goes without a trace.
    Gone,
    /// A rotation that took others in.
    Rotation {
        /// Quarter turns, modulo 4.
        quarters: u8,
        /// What is left of the angle, in [0, π/2).
        rest: f64,
        dephasing: f64,
        /// Instruction of the last rotation taken in.
        last: usize,
    },
    /// A prepared state that took rotations in.
    Prepared { bloch: Bloch, ideal: Bloch },
}

/// A rotation to be taken in.
#[derive(Debug, Clone, Copy)]
pub(super) struct Incoming {
    pub angle: f64,
    pub dephasing: f64,
    /// Whether its axis is the negative of that it is merged into.
    pub negative: bool,
    /// Its instruction.
    pub instruction: usize,
}

/// The fate of `site`, a rotation, after taking another in.
pub(super) fn turn_rotation(fate: &mut Fate, site: &Site, incoming: Incoming) {
    let (quarters, rest, dephasing) = match *fate {
        Fate::Rotation {
            quarters,
            rest,
            dephasing,
            ..
        } => (quarters, rest, dephasing),
        _ => match &site.kind {
            SiteKind::Rotation(rotation) => (0, rotation.angle, rotation.dephasing),
            _ => return,
        },
    };
    let signed = if incoming.negative {
        rest - incoming.angle
    } else {
        rest + incoming.angle
    };
    let whole = ((signed + TOLERANCE) / FRAC_PI_2).floor();
    let rest = signed - whole * FRAC_PI_2;
    *fate = Fate::Rotation {
        quarters: (f64::from(quarters) + whole).rem_euclid(4.0) as u8,
        rest: if rest < TOLERANCE { 0.0 } else { rest },
        dephasing: both(dephasing, incoming.dephasing),
        last: incoming.instruction,
    };
}

/// Probability of exactly one of two flips.
fn both(p: f64, q: f64) -> f64 {
    (p + q - 2.0 * p * q).min(0.5)
}

/// The fate of `site`, a prepared state, after a rotation about X, Y or Z
/// (`axis` 0, 1 or 2) of its qubit.
pub(super) fn turn_state(fate: &mut Fate, site: &Site, axis: usize, incoming: Incoming) {
    let Some((bloch, ideal)) = state(fate, site) else {
        return;
    };
    let angle = if incoming.negative {
        -incoming.angle
    } else {
        incoming.angle
    };
    let mut turned = turn(bloch, axis, angle);
    dephase(&mut turned, axis, incoming.dephasing);
    *fate = Fate::Prepared {
        bloch: turned,
        ideal: turn(ideal, axis, angle),
    };
}

/// The fate of a prepared state when nobody can see a rotation of it about an
/// axis: it is turned to where its extent is less, if there is such a place.
/// Returns whether it is an eigenstate of a Pauli now and was none.
pub(super) fn align_state(fate: &mut Fate, site: &Site, axis: usize) -> bool {
    let Some((bloch, ideal)) = state(fate, site) else {
        return false;
    };
    let (a, b) = ((axis + 1) % 3, (axis + 2) % 3);
    let turned = turn(bloch, axis, -bloch[b].atan2(bloch[a]));
    if extent::of_state(turned) > extent::of_state(bloch) - TOLERANCE {
        return false;
    }
    *fate = Fate::Prepared {
        bloch: turned,
        ideal: turn(ideal, axis, -bloch[b].atan2(bloch[a])),
    };
    along(bloch).is_none() && along(turned).is_some()
}

/// The axis of a vector that lies on one; a zero vector counts as lying on x.
fn along(bloch: Bloch) -> Option<usize> {
    (0..3).find(|&axis| {
        let others = [(axis + 1) % 3, (axis + 2) % 3];
        others.iter().all(|&other| bloch[other].abs() < TOLERANCE)
    })
}

fn state(fate: &Fate, site: &Site) -> Option<(Bloch, Bloch)> {
    match (fate, &site.kind) {
        (&Fate::Prepared { bloch, ideal }, _) => Some((bloch, ideal)),
        (Fate::Kept, SiteKind::Prepared(prepared)) => Some((prepared.bloch, prepared.ideal)),
        _ => None,
    }
}

/// exp(−i·angle·P/2) turns a Bloch vector by the angle about P.
fn turn(mut bloch: Bloch, axis: usize, angle: f64) -> Bloch {
    let (a, b) = ((axis + 1) % 3, (axis + 2) % 3);
    let (sin, cos) = angle.sin_cos();
    (bloch[a], bloch[b]) = (
        cos * bloch[a] - sin * bloch[b],
        cos * bloch[b] + sin * bloch[a],
    );
    bloch
}

fn dephase(bloch: &mut Bloch, axis: usize, q: f64) {
    for other in [(axis + 1) % 3, (axis + 2) % 3] {
        bloch[other] *= 1.0 - 2.0 * q;
    }
}

/// The schedule after every site has met its fate. Whether a site is still
/// there, by its old index.
pub(super) fn rewrite(schedule: Schedule, fates: &[Fate]) -> (Schedule, Vec<bool>) {
    let mut writer = Writer {
        fates,
        old: schedule.sites,
        new: vec![None; fates.len()],
        leftover: Vec::new(),
        schedule: Schedule {
            instructions: Vec::with_capacity(schedule.instructions.len()),
            sites: Vec::new(),
        },
    };
    for fate in fates {
        if let Fate::Rotation {
            rest,
            dephasing,
            last,
            ..
        } = *fate
            && rest == 0.0
            && dephasing > ROUNDING
        {
            writer.leftover.push((last, dephasing));
        }
    }
    writer.leftover.sort_by_key(|&(last, _)| last);
    for (index, instruction) in schedule.instructions.into_iter().enumerate() {
        writer.instruction(index, instruction);
    }
    let there = writer.new.iter().map(Option::is_some).collect();
    (writer.schedule, there)
}

struct Writer<'a> {
    fates: &'a [Fate],
    old: Vec<Site>,
    new: Vec<Option<u32>>,
    /// Dephasings that stay, by instruction.
    leftover: Vec<(usize, f64)>,
    schedule: Schedule,
}

impl Writer<'_> {
    fn instruction(&mut self, index: usize, instruction: Instruction) {
        let site = match &instruction.kind {
            Kind::Gate { site, .. } | Kind::Prepare { site, .. } => *site as usize,
            _ => {
                self.schedule.instructions.push(instruction);
                return;
            }
        };
        match (&self.fates[site], &instruction.kind) {
            (Fate::Kept, _) => self.site(site, None, instruction),
            (Fate::Gone, Kind::Gate { axes, .. }) => {
                if let Ok(place) = self
                    .leftover
                    .binary_search_by_key(&index, |&(last, _)| last)
                {
                    let channel = dephasing(&axes[0], self.leftover[place].1);
                    self.push(&instruction, Kind::Pauli(channel));
                }
            }
            (
                &Fate::Rotation {
                    quarters,
                    rest,
                    dephasing,
                    ..
                },
                Kind::Gate { axes, .. },
            ) => {
                for gate in turns(&axes[0], quarters) {
                    self.push(&instruction, Kind::Clifford(gate));
                }
                if rest > 0.0 {
                    let rotation = RotationSite::new(rest, dephasing);
                    let without_noise = rotation.extent_without_noise();
                    let kind = SiteKind::Rotation(rotation);
                    self.site(site, Some((kind, without_noise)), instruction);
                }
            }
            (&Fate::Prepared { bloch, ideal }, &Kind::Prepare { qubit, .. }) => {
                self.prepared(site, bloch, ideal, qubit, instruction);
            }
            (Fate::Gone | Fate::Rotation { .. } | Fate::Prepared { .. }, _) => {}
        }
    }

    fn push(&mut self, like: &Instruction, kind: Kind) {
        self.schedule.instructions.push(Instruction {
            kind,
            condition: like.condition,
            operation: like.operation,
        });
    }

    /// Writes a site that stays, with a new kind and extent without noise if it
    /// changed.
    fn site(&mut self, site: usize, changed: Option<(SiteKind, f64)>, mut at: Instruction) {
        let new = self.schedule.sites.len() as u32;
        self.new[site] = Some(new);
        let mut written = self.old[site].clone();
        if let Some((kind, without_noise)) = changed {
            written = Site::new(kind, written.operation, written.qubits, without_noise);
        }
        self.schedule.sites.push(written);
        if let Kind::Gate { site, .. } | Kind::Prepare { site, .. } = &mut at.kind {
            *site = new;
        }
        self.schedule.instructions.push(at);
    }

    fn prepared(&mut self, site: usize, bloch: Bloch, ideal: Bloch, qubit: u32, at: Instruction) {
        if let Some(axis) = along(bloch) {
            for gate in eigenstate(qubit, axis, bloch[axis] < 0.0) {
                self.push(&at, Kind::Clifford(gate));
            }
            let flip = (1.0 - bloch[axis].abs()) / 2.0;
            if flip >= TOLERANCE {
                let letter = if axis == 2 { Pauli::X } else { Pauli::Z };
                let axis = [(qubit, letter)].into_iter().collect();
                self.push(&at, Kind::Pauli(dephasing(&axis, flip)));
            }
            return;
        }
        let state = PreparedSite::with_ideal(bloch, ideal);
        let without_noise = extent::of_state(ideal);
        let kind = SiteKind::Prepared(state);
        self.site(site, Some((kind, without_noise)), at);
    }
}

/// exp(−iπA/4) so many times, up to a phase. Two of them are A itself.
fn turns(axis: &PauliProduct, quarters: u8) -> Vec<Clifford> {
    if let [(qubit, Pauli::Z)] = axis[..] {
        return match quarters {
            1 => vec![Clifford::S(qubit)],
            2 => vec![Clifford::Z(qubit)],
            3 => vec![Clifford::Sdg(qubit)],
            _ => Vec::new(),
        };
    }
    let mut gates = Vec::new();
    if quarters % 2 == 1 {
        gates.push(Clifford::QuarterTurn(axis.clone()));
    }
    if quarters >= 2 {
        gates.extend(axis.iter().filter_map(|&(qubit, letter)| match letter {
            Pauli::I => None,
            Pauli::X => Some(Clifford::X(qubit)),
            Pauli::Y => Some(Clifford::Y(qubit)),
            Pauli::Z => Some(Clifford::Z(qubit)),
        }));
    }
    gates
}

/// An eigenstate of X, Y or Z (axis 0, 1, 2) from |0⟩.
fn eigenstate(qubit: u32, axis: usize, negative: bool) -> Vec<Clifford> {
    let mut gates = Vec::new();
    if negative {
        gates.push(Clifford::X(qubit));
    }
    if axis < 2 {
        gates.push(Clifford::H(qubit));
    }
    if axis == 1 {
        gates.push(Clifford::S(qubit));
    }
    gates
}

/// Applies a product of letters with probability q.
fn dephasing(axis: &PauliProduct, q: f64) -> PauliChannel {
    let mut word = PauliWord::default();
    for (place, &(_, letter)) in axis.iter().enumerate() {
        word.x |= u32::from(letter.x()) << place;
        word.z |= u32::from(letter.z()) << place;
    }
    PauliChannel {
        qubits: axis.iter().map(|&(qubit, _)| qubit).collect::<Qubits>(),
        choices: PauliChoices::Listed(vec![(word, q)]),
    }
}
