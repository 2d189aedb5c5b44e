//! One walk through a schedule with open axes carried along.
//!
//! **What a row says.** Let R be the row of a site with axis A, O any Kraus
//! operator of what happened since, for one choice of faults, decays and
//! outcomes. Carried means O·U_A(θ) = U_{±R}(θ)·O up to a phase, for every θ;
//! signed means that the sign is the same for every O. Then a rotation by b
//! about R here equals one by ±b about A there: the two merge. At the end of
//! the circuit a row still carried leaves a unitary that the trace does not
//! see, for each O by itself: the site goes, whatever the signs. A prepared state
//! with a row still carried may be turned about that axis at will; it is, if that
//! makes it cheaper, such as T|+⟩ back to |+⟩. (It might be dephased as well, and
//! would then always be a mixture of stabiliser states. That is left out: it
//! would only serve qubits that are read as they were made, one rotated qubit
//! read at once, where the cost is small and the sites are what is looked at.)
//!
//! **What happens to a row**, for O' ranging over the Kraus operators of the
//! next instruction:
//! - a Clifford gate G: GU_RG† = U_{GRG†};
//! - under a condition, nothing if R commutes with all quarter turns of G and its
//!   Pauli; if R anticommutes with the Pauli only, the sign is lost;
//! - a rotation, or the axes of a CCZ: nothing if R commutes with it, else R is
//!   given up;
//! - a Pauli: the sign is lost where R anticommutes with a word that may happen;
//! - a measurement of Z_q: its projectors commute with R unless R has X_q or Y_q;
//! - a reset, operators |0⟩⟨0| and |0⟩⟨1|: with Z_q in R = Z_q·R', the result is
//!   U_{R'} and U_{−R'}: the sign is lost and the letter with it. With X_q or Y_q
//!   R is given up. Under a condition R may have no letter there;
//! - damping, K0 = diag(1, √(1−γ)), K1 = √γ|0⟩⟨1|: K1·Z = −K1 and Z·K1 = K1, so
//!   R = Z_q·R' loses its sign, but Z_q alone passes: K1·U_Z is U_Z·K1 up to a
//!   phase;
//! - a prepared state takes up R with a letter on its qubit.
//!
//! **The same axis for the state.** If g·ρ = ρ for a certain stabiliser g (see
//! [`known`](super::known)), P = ±gR gives U_P·ρ = U_{±R}·ρ, so it is enough
//! that P is ±R up to certain stabilisers, and a rotation about a certain
//! stabiliser is a phase.
//!
//! **Conditions.** A site under a condition merges only with one under the same
//! bit at the same stage, assigned equally often: where the bit is 0 neither
//! happens.
//!
//! A site that merged or is a phase does nothing where it stood, so it takes up
//! no row.

use smallvec::smallvec;

use crate::circuit::{Pauli, PauliProduct};
use crate::magic::{Kind, Schedule, Site, SiteKind};
use crate::noise::{PauliChannel, PauliChoices};

use super::known::{Known, Relation};
use super::merged::{Fate, Incoming, align_state, turn_rotation, turn_state};
use super::rows::{MAX_ROWS, Mask, Rows};
use crate::program::turns::quarter_turns_of;

/// A bit that decides, and how often it has been assigned.
type Condition = Option<(u32, u32)>;

/// What an open row belongs to.
#[derive(Debug, Clone, Copy)]
struct Owner {
    site: u32,
    /// Which axis of a prepared state, 0 to 2; `None` for a rotation.
    axis: Option<usize>,
    condition: Condition,
}

/// What a walk found.
pub(super) struct Found {
    /// By site.
    pub fates: Vec<Fate>,
    /// Sites that are a phase, sites nobody can see, sites taken in.
    pub phases: usize,
    pub unobservable: usize,
    pub taken_in: usize,
    /// Whether anything is different from before.
    pub changed: bool,
}

struct Pass<'a> {
    sites: &'a [Site],
    known: Known,
    rows: Rows,
    owners: Vec<Option<Owner>>,
    /// How often each bit has been assigned.
    stages: Vec<u32>,
    found: Found,
}

/// Walks through a schedule on so many qubits.
pub(super) fn walk(schedule: &Schedule, qubits: usize) -> Found {
    let mut pass = Pass {
        sites: &schedule.sites,
        known: Known::new(qubits),
        rows: Rows::new(qubits),
        owners: vec![None; MAX_ROWS],
        stages: Vec::new(),
        found: Found {
            fates: vec![Fate::Kept; schedule.sites.len()],
            phases: 0,
            unobservable: 0,
            taken_in: 0,
            changed: false,
        },
    };
    for (index, instruction) in schedule.instructions.iter().enumerate() {
        let condition = instruction.condition.map(|bit| (bit, pass.stage(bit)));
        pass.instruction(index, &instruction.kind, condition);
    }
    pass.finish()
}

fn z(qubit: u32) -> PauliProduct {
    smallvec![(qubit, Pauli::Z)]
}

impl Pass<'_> {
    fn stage(&self, bit: u32) -> u32 {
        self.stages.get(bit as usize).copied().unwrap_or(0)
    }

    fn assign(&mut self, bit: u32) {
        let bit = bit as usize;
        if bit >= self.stages.len() {
            self.stages.resize(bit + 1, 0);
        }
        self.stages[bit] += 1;
    }

    fn instruction(&mut self, index: usize, kind: &Kind, condition: Condition) {
        match kind {
            Kind::Clifford(gate) if condition.is_none() => {
                self.rows.apply(gate);
                self.known.apply(gate);
            }
            Kind::Clifford(gate) => {
                let (turns, pauli) = quarter_turns_of(gate);
                for axis in &turns {
                    self.act_about(axis);
                }
                self.taint(self.rows.anticommuting(&pauli));
                self.known.keep_commuting(&pauli);
            }
            Kind::Gate { site, axes } => match &self.sites[*site as usize].kind {
                SiteKind::Ccz(_) => axes.iter().for_each(|axis| self.act_about(axis)),
                _ => self.rotation(index, *site, &axes[0], condition),
            },
            Kind::Prepare { site, qubit } => self.prepare(*site, *qubit),
            Kind::Measure { qubit, bit, .. } => {
                self.act_about(&z(*qubit));
                if let Some(bit) = bit {
                    self.assign(*bit);
                }
            }
            Kind::Reset { qubit } => self.reset(*qubit, condition),
            Kind::Assign { bit, .. } => self.assign(*bit),
            Kind::Pauli(channel) => self.pauli(channel),
            Kind::Damping { qubit, .. } => self.damping(*qubit),
        }
    }

    fn close(&mut self, rows: Mask) {
        self.taint(rows);
        self.rows.close(&rows);
    }

    fn taint(&mut self, rows: Mask) {
        for row in rows.and(self.rows.signed()).rows() {
            self.known.forget(row);
        }
        self.rows.taint(&rows);
    }

    /// Something that is a function of the axis, and may be anything of it.
    fn act_about(&mut self, axis: &PauliProduct) {
        self.close(self.rows.anticommuting(axis));
        self.known.keep_commuting(axis);
    }

    fn open(&mut self, axis: &PauliProduct, owner: Owner) {
        let before = *self.rows.signed();
        let row = self.rows.open(axis);
        // Opening may have given up others.
        for lost in before.without(self.rows.signed()).rows() {
            self.known.forget(lost);
        }
        self.known.follow(row, axis);
        self.owners[row] = Some(owner);
    }

    fn rotation(&mut self, index: usize, site: u32, axis: &PauliProduct, condition: Condition) {
        let SiteKind::Rotation(rotation) = &self.sites[site as usize].kind else {
            return;
        };
        let owners = &self.owners;
        let may = |row: usize| owners[row].is_some_and(|owner| owner.condition == condition);
        // What is left of a merged dephasing must fit into one channel.
        let fits = rotation.dephasing == 0.0 || axis.len() <= PauliChannel::MAX_QUBITS;
        match self.known.relation(axis, may) {
            Relation::Known => {
                self.found.fates[site as usize] = Fate::Gone;
                self.found.phases += 1;
                self.found.changed = true;
            }
            Relation::Row { row, negative } if fits && owners[row].is_some() => {
                let incoming = Incoming {
                    angle: rotation.angle,
                    dephasing: rotation.dephasing,
                    negative,
                    instruction: index,
                };
                self.take_in(row, incoming);
                self.found.fates[site as usize] = Fate::Gone;
                self.found.taken_in += 1;
                self.found.changed = true;
            }
            _ => {
                self.act_about(axis);
                let owner = Owner {
                    site,
                    axis: None,
                    condition,
                };
                self.open(axis, owner);
            }
        }
    }

    fn take_in(&mut self, row: usize, incoming: Incoming) {
        let Some(owner) = self.owners[row] else {
            return;
        };
        let site = &self.sites[owner.site as usize];
        let fate = &mut self.found.fates[owner.site as usize];
        match owner.axis {
            None => turn_rotation(fate, site, incoming),
            Some(axis) => turn_state(fate, site, axis, incoming),
        }
    }

    fn prepare(&mut self, site: u32, qubit: u32) {
        self.close(self.rows.on(qubit));
        self.known.forget_qubit(qubit);
        for (axis, letter) in [Pauli::X, Pauli::Y, Pauli::Z].into_iter().enumerate() {
            let owner = Owner {
                site,
                axis: Some(axis),
                condition: None,
            };
            self.open(&smallvec![(qubit, letter)], owner);
        }
    }

    fn reset(&mut self, qubit: u32, condition: Condition) {
        if condition.is_some() {
            self.close(self.rows.on(qubit));
            self.known.forget_qubit(qubit);
            return;
        }
        let (flipped, phased) = self.rows.letters(qubit);
        self.close(flipped);
        self.taint(phased);
        self.rows.erase(qubit);
        self.known.reset(qubit);
    }

    fn damping(&mut self, qubit: u32) {
        let (flipped, phased) = self.rows.letters(qubit);
        self.close(flipped);
        self.taint(self.rows.wide(&phased));
        // |0⟩ does not decay.
        if !self.known.is_zero(qubit) {
            self.known.forget_qubit(qubit);
        }
    }

    fn pauli(&mut self, channel: &PauliChannel) {
        let letter = |place: usize, x: u32, z: u32| {
            Pauli::from_parts(x >> place & 1 == 1, z >> place & 1 == 1)
        };
        let touched = channel
            .qubits
            .iter()
            .fold(Mask::EMPTY, |rows, &qubit| rows.or(&self.rows.on(qubit)));
        let rows = !touched.and(self.rows.signed()).is_empty();
        let known = !self.known.is_empty()
            && channel.qubits.iter().any(|&qubit| {
                let [x, z] = [Pauli::X, Pauli::Z].map(|letter| smallvec![(qubit, letter)]);
                !self.known.commutes(&x) || !self.known.commutes(&z)
            });
        if !rows && !known {
            return;
        }
        match &channel.choices {
            PauliChoices::Uniform(_) => {
                self.taint(touched);
                for &qubit in &channel.qubits {
                    self.known.forget_qubit(qubit);
                }
            }
            PauliChoices::Listed(words) => {
                let mut flipped = Mask::EMPTY;
                for (word, _) in words {
                    let letters: PauliProduct = channel
                        .qubits
                        .iter()
                        .enumerate()
                        .map(|(place, &qubit)| (qubit, letter(place, word.x, word.z)))
                        .filter(|&(_, letter)| letter != Pauli::I)
                        .collect();
                    if rows {
                        flipped = flipped.or(&self.rows.anticommuting(&letters));
                    }
                    if known {
                        self.known.keep_commuting(&letters);
                    }
                }
                self.taint(flipped);
            }
        }
    }

    /// Sites nobody can see.
    fn finish(mut self) -> Found {
        for row in self.rows.carried().rows() {
            let Some(owner) = self.owners[row] else {
                continue;
            };
            let index = owner.site as usize;
            let fate = &mut self.found.fates[index];
            match owner.axis {
                None => {
                    *fate = Fate::Gone;
                    self.found.unobservable += 1;
                    self.found.changed = true;
                }
                Some(axis) => {
                    if align_state(fate, &self.sites[index], axis) {
                        self.found.unobservable += 1;
                        self.found.changed = true;
                    }
                }
            }
        }
        self.found
    }
}
