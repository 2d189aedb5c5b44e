//! `walk`: stabiliser terms and one sample that walks with the circuit.
//!
//! After Phys. Rev. Lett. 128, 220503 (2022). A sample x of the active bits is
//! carried along, always distributed as |⟨x|Ω⟩|². Gates that are diagonal or
//! permute the basis move it at most; a primitive with X part a draws between
//! x and x⊕a in proportion to the two new amplitudes. A measurement reads a bit
//! of x. Only amplitudes are needed, no norms.
//!
//! To keep the mixing law exact the sites' *input bits* are sampled too. A gate
//! site acts as if its gate came from a resource state D|+⟩ by injection: with
//! input bit y and axis value z of the sample, m = z⊕y, the Clifford correction
//! turns component b into b⊕m, with a phase. Until the site is met a term
//! carries the pending factor D_b(y). A prepared qubit's input bit is its bit
//! of x. All input bits are drawn at the start from
//!
//! q(z) = (1−λ)·|ψ(z)|² + λ·(1/k)·Σ_j |φ_j(z)|²
//!
//! and accepted in proportion to |Ω(z)|²/q(z), whose mean is 1 + (ξ−1)/k and
//! whose tail is short even where ψ(z) is tiny.
//!
//! * CCZ = (1/6) Σ D_b with D_b(z) = CCZ(z)·CCZ(z⊕b). The correction is D_m,
//!   and D_b(z⊕m)·D_m(z) = D_{b⊕m}(z).
//! * A rotation by π/4, dephased or not, has components 1 and S. The correction
//!   is S^m: i^{z·m}·D_b(z⊕m) is D_{b⊕m}, times i for b = m = 1. Its two
//!   members (angles θ and π/2 − θ, equally likely) change places under it, so
//!   that the average over members is exact.
//! * A rotation by another angle has no Clifford correction and no input bit.
//!   At the site, with a_j the terms' amplitudes at x, all components are drawn
//!   anew until accepted in proportion to |Σ_j a_j·√Ξ·phase_b·D_b(x)|², and the
//!   shot's weight G is multiplied by the mean of that over |Σ_j a_j|², which is
//!   1 + (Ξ−1)·Σ|a_j|²/|Σ a_j|². At the end the shot is kept with probability
//!   G/cap.
//! * A site of extent 1 is a Clifford gate, the same for all terms.
//! * Amplitude damping about an axis with value v at the sample: K0 = s·1 +
//!   (1−s)·|0⟩⟨0| with s = √(1−γ), so that each term draws one of the two, anew
//!   until accepted in proportion to the square of the new sum. Where v = 0 all
//!   are accepted. Where v = 1 the chance of K0 is s², and the mean of the square
//!   is 1 + ((1−s)/s)·R times that of K0 itself, R = Σ|a_j|²/|Σ a_j|²; a decay, with
//!   chance γ, projects all terms on v = 1. The companion then has the map P̃ =
//!   sρ + (1−s)·|0⟩⟨0|ρ|0⟩⟨0| + K1ρK1† in place of the damping, whose trace t
//!   enters the law: [(k−1)·P + ξ·P̃]/(k−1+ξ·t).
//!
//! Terms are kept *relative to the sample*: shifted by x, so that the sample is
//! always |0…0⟩ for them and the amplitude there needs no rows. What a step does
//! to the terms is collected and done when the next sum is needed, in one pass
//! ([`Terms::sweep`]).

mod input;
mod redraw;
mod settings;

use num_complex::Complex64;
use rand::RngExt;

use crate::clifford::terms::{
    Candidate, Chosen, Operation, Planes, QuadraticPhase, Release, Resolved, Sums, Terms, Turn,
};
use crate::magic::{CczSite, Components, Draw, Site, SiteKind};
use crate::program::Primitive;

use super::{Diagnostics, I_POWERS, Register, ShotRng, wide};
use settings::{Meeting, meeting};

pub use settings::Settings;

/// Sums within these bounds are left as they are.
const RANGE: std::ops::Range<f64> = 1e-60..1e60;

/// Terms on up to 64·W slots with a sample.
pub struct Walk<'p, const W: usize> {
    sites: &'p [Site],
    settings: Settings,
    /// Relative to the sample, up to what is not done yet.
    terms: Terms<W>,
    /// The sample, one bit a slot.
    sample: [u64; W],
    /// Not yet done: the last primitive, and then these.
    resolved: Option<Resolved<W>>,
    operations: Vec<Operation<W>>,
    /// The drawn components, and past them planes for operations not yet done.
    components: Components,
    /// How many planes are components.
    own_planes: usize,
    /// Input bits: bit i of entry s belongs to axis i of site s.
    input: Vec<u8>,
    /// Phases of the terms at the start, in eighths of a turn: three planes.
    eighths: Vec<u64>,
    /// By label: amplitudes at the sample.
    amplitudes: Vec<Complex64>,
    /// G.
    weight: f64,
    failed: bool,
    diagnostics: Diagnostics,
}

impl<'p, const W: usize> Walk<'p, W> {
    /// A register of `slots` slots for these sites.
    pub fn new(sites: &'p [Site], slots: usize, settings: Settings) -> Self {
        Walk {
            sites,
            settings,
            terms: Terms::new(slots),
            sample: [0; W],
            resolved: None,
            operations: Vec::new(),
            components: Components::default(),
            own_planes: 0,
            input: Vec::new(),
            eighths: Vec::new(),
            amplitudes: Vec::new(),
            weight: 1.0,
            failed: false,
            diagnostics: Diagnostics::default(),
        }
    }

    fn bit(&self, slot: u16) -> bool {
        self.sample[usize::from(slot) / 64] >> (slot % 64) & 1 == 1
    }

    fn flip_bit(&mut self, slot: u16) {
        self.sample[usize::from(slot) / 64] ^= 1 << (slot % 64);
    }

    /// Does what is not done yet, and sums.
    fn sweep(&mut self, candidate: Option<Candidate<W>>) -> Sums {
        let planes = Planes {
            bits: self.components.bits(),
            words: self.components.words(),
        };
        let sums = self
            .terms
            .sweep(self.resolved.take(), &self.operations, planes, candidate);
        self.operations.clear();
        self.components.truncate(self.own_planes);
        sums
    }

    /// A choice by the component of a site.
    fn by_component<T: Copy, const N: usize>(
        &self,
        site: u32,
        table: impl FnMut(usize) -> T,
    ) -> Chosen<T, N> {
        let (first, planes) = self.components.planes(site as usize);
        Chosen::By {
            first: first as u32,
            planes: planes as u8,
            table: std::array::from_fn(table),
        }
    }

    /// diag(1, i^power), the same for all terms, on x⊕`flipped`; up to a phase
    /// common to all.
    fn turn(&mut self, slot: u16, flipped: bool, power: u8) {
        let relative = self.bit(slot) ^ flipped;
        self.operations.push(Operation::Diagonal {
            slot: slot.into(),
            turn: Chosen::Same(Turn {
                power: if relative { (4 - power) & 3 } else { power },
                eighths: 0,
            }),
        });
    }

    /// A rotation with an input bit.
    fn inject(&mut self, slot: u16, site: u32, flipped: bool) {
        let value = self.bit(slot) ^ flipped;
        let input = self.input[site as usize] & 1 == 1;
        let moved = value ^ input;
        // Component b⊕m on z = x ⊕ value: i^(c·z) is i^c·i^(−c·x) where value is 1.
        // An i for b = m = 1, and the pending i^(b·y) is spent.
        let turn = self.by_component(site, |b| {
            let b = b as u8 & 1;
            let component = b ^ u8::from(moved);
            let power = if value {
                (4 - component) & 3
            } else {
                component
            };
            let mut quarters = if value { component } else { 0 };
            quarters += b & u8::from(moved);
            quarters += 4 - (b & u8::from(input));
            Turn {
                power,
                eighths: 2 * (quarters & 3),
            }
        });
        self.operations.push(Operation::Diagonal {
            slot: slot.into(),
            turn,
        });
    }
}

fn odd<const W: usize>(left: &[u64; W], right: &[u64; W]) -> bool {
    left.iter()
        .zip(right)
        .fold(0, |sum, (a, b)| sum ^ (a & b))
        .count_ones()
        & 1
        == 1
}

impl<const W: usize> Register for Walk<'_, W> {
    fn start(&mut self, draw: &Draw, rng: &mut ShotRng) -> bool {
        self.sample = [0; W];
        self.resolved = None;
        self.operations.clear();
        self.weight = 1.0;
        self.failed = false;
        self.diagnostics = Diagnostics::default();
        if !self.draw_input(draw, rng) {
            return false;
        }
        self.components.clone_from(&draw.components);
        self.own_planes = self.components.count();
        true
    }

    fn plus(&mut self, slot: u16, rng: &mut ShotRng) {
        self.operations.push(Operation::Plus { slot: slot.into() });
        // X|+⟩ = |+⟩: the term does not see the bit.
        if rng.random() {
            self.flip_bit(slot);
        }
    }

    fn prepare(&mut self, slot: u16, site: u32, draw: &Draw) {
        let SiteKind::Prepared(prepared) = &self.sites[site as usize].kind else {
            return;
        };
        let member = &prepared.members[draw.member(site)];
        let input = self.input[site as usize] == 1;
        let release = self.by_component(site, |b| {
            // Entries past the last component are never asked for.
            let (state, _) = member.components[b.min(member.components.len() - 1)];
            let pending = state.amplitudes()[usize::from(input)];
            let unblock = pending == Complex64::ZERO;
            Release {
                state,
                factor: if unblock {
                    Complex64::ONE
                } else {
                    pending.inv()
                },
                unblock,
            }
        });
        let slot_index = usize::from(slot);
        self.operations.push(Operation::Prepare {
            slot: slot_index,
            release,
        });
        if input {
            self.flip_bit(slot);
            self.operations.push(Operation::Flip { slot: slot_index });
        }
    }

    fn primitive(&mut self, primitive: &Primitive, rng: &mut ShotRng) {
        let (x, z) = (wide::<W>(&primitive.x), wide::<W>(&primitive.z));
        let phase = (primitive.phase + 2 * u8::from(odd(&z, &self.sample))) & 3;
        if x == [0; W] {
            self.operations.push(Operation::Primitive { phase, x, z });
            return;
        }
        let candidate = Candidate { phase, x, z };
        let Sums { here, there } = self.sweep(Some(candidate));
        // Q|0⟩ = i^phase|x⟩ and Q|x⟩ = i^phase·(−1)^(z·x)|0⟩.
        let to_there = I_POWERS[usize::from(phase)];
        let to_here = I_POWERS[usize::from(phase + 2 * u8::from(odd(&z, &x))) & 3];
        let stay = (here + to_here * there).norm_sqr();
        let go = (there + to_there * here).norm_sqr();
        if stay + go <= 0.0 {
            self.failed = true;
        }
        let moved = rng.random::<f64>() * (stay + go) < go;
        if moved {
            self.sample.iter_mut().zip(x).for_each(|(s, x)| *s ^= x);
        }
        self.resolved = Some(Resolved { candidate, moved });
        // Keep the numbers in range over long runs.
        let size = if moved { go } else { stay }.sqrt();
        if size > 0.0 && !RANGE.contains(&size) {
            self.operations.push(Operation::Scale(size.recip()));
        }
    }

    fn controlled_not(&mut self, control: u16, target: u16) {
        self.operations.push(Operation::ControlledNot {
            control: control.into(),
            target: target.into(),
        });
        if self.bit(control) {
            self.flip_bit(target);
        }
    }

    fn rotate(&mut self, slot: u16, site: u32, flipped: bool, draw: &Draw, rng: &mut ShotRng) {
        match meeting(&self.sites[site as usize]) {
            Meeting::Input => self.inject(slot, site, flipped),
            Meeting::Redraw => self.meet_by_redraw(Some((slot, flipped)), site, draw, rng),
            // One component for all terms.
            Meeting::Clifford => self.turn(slot, flipped, draw.component(site as usize, 0)),
        }
    }

    fn quarter_turn(&mut self, slot: u16, flipped: bool) {
        self.turn(slot, flipped, 1);
    }

    fn ccz(&mut self, slots: [u16; 3], flipped: [bool; 3], site: u32, _draw: &Draw) {
        let relative: [bool; 3] = std::array::from_fn(|i| self.bit(slots[i]) ^ flipped[i]);
        let value = (0..3).fold(0, |value, axis| value | u8::from(relative[axis]) << axis);
        let input = self.input[site as usize];
        let moved = value ^ input;
        let phase = self.by_component(site, |b| {
            let b = b as u8 & 7;
            let mut phase = QuadraticPhase::from(CczSite::component(b ^ moved)).flipped(relative);
            // The pending D_b(y) is spent.
            phase.negative ^= CczSite::component(b).is_negative_at(input);
            phase
        });
        self.operations.push(Operation::Quadratic {
            slots: slots.map(usize::from),
            phase,
        });
    }

    fn skip(&mut self, site: u32, draw: &Draw, rng: &mut ShotRng) {
        // The pending factor of a site with an input bit stays for good.
        if meeting(&self.sites[site as usize]) == Meeting::Redraw {
            self.meet_by_redraw(None, site, draw, rng);
        }
    }

    fn controlled_z(&mut self, a: u16, b: u16) {
        let phase = QuadraticPhase {
            cz: [true, false, false],
            ..QuadraticPhase::default()
        };
        let slots = [a, b, b];
        self.operations.push(Operation::Quadratic {
            slots: slots.map(usize::from),
            phase: Chosen::Same(phase.flipped(slots.map(|slot| self.bit(slot)))),
        });
    }

    fn z(&mut self, slot: u16) {
        self.turn(slot, false, 2);
    }

    fn measure(&mut self, slot: u16, _rng: &mut ShotRng) -> Option<bool> {
        if self.failed {
            return None;
        }
        let value = self.bit(slot);
        // Relative to the sample the outcome is 0.
        self.operations.push(Operation::Measured {
            slot: slot.into(),
            value: false,
        });
        if value {
            self.flip_bit(slot);
        }
        Some(value)
    }

    fn damp(&mut self, slot: u16, flipped: bool, gamma: f64, rng: &mut ShotRng) -> Option<bool> {
        if self.bit(slot) ^ flipped {
            let decayed = self.damp_excited(slot, gamma, rng);
            return (!self.failed).then_some(decayed);
        }
        self.damp_ground(slot, gamma, rng);
        Some(false)
    }

    fn finish(&mut self, rng: &mut ShotRng) -> bool {
        if self.failed {
            return false;
        }
        let ratio = self.weight / self.settings.end_cap;
        self.diagnostics.clipped |= ratio > 1.0 + 1e-9;
        rng.random::<f64>() < ratio
    }

    fn diagnostics(&self) -> Diagnostics {
        Diagnostics {
            terms_left: self.terms.len() as u32,
            ..self.diagnostics
        }
    }
}
