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

mod settings;

use num_complex::Complex64;
use rand::RngExt;

use crate::clifford::terms::{QuadraticPhase, Terms};
use crate::magic::{CczSite, Draw, Site, SiteKind};
use crate::program::Primitive;

use super::{Diagnostics, I_POWERS, Register, ShotRng, wide};
use settings::{CAP_DEVIATIONS, Meeting, meeting};

pub use settings::Settings;

/// Most times the components of one site are drawn anew.
const MAX_REDRAWS: usize = 10_000;

/// Terms on up to 64·W slots with a sample.
pub struct Walk<'p, const W: usize> {
    sites: &'p [Site],
    settings: Settings,
    terms: Terms<W>,
    /// The sample, one bit a slot.
    sample: [u64; W],
    /// Input bits: bit i of entry s belongs to axis i of site s.
    input: Vec<u8>,
    /// By label: what multiplies a term because of sites still to come. The
    /// second number counts factors that are 0.
    pending: Vec<(Complex64, u32)>,
    /// By label: ⟨x|term⟩ times its pending factor.
    amplitudes: Vec<Complex64>,
    /// By label: the same at the other candidate of a step.
    others: Vec<Complex64>,
    redrawn: Vec<u8>,
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
            input: Vec::new(),
            pending: Vec::new(),
            amplitudes: Vec::new(),
            others: Vec::new(),
            redrawn: Vec::new(),
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

    /// Multiplies every amplitude at the sample by a common factor.
    fn factor(&mut self, factor: Complex64) {
        if factor != Complex64::ONE {
            self.amplitudes
                .iter_mut()
                .for_each(|amplitude| *amplitude *= factor);
        }
    }

    /// Draws the input bits; false if they are to be drawn anew with the terms.
    fn draw_input(&mut self, draw: &Draw, rng: &mut ShotRng) -> bool {
        let from_term = rng.random::<f64>() < self.settings.mixing_weight;
        let term = if from_term {
            rng.random_range(0..draw.terms)
        } else {
            0
        };
        self.input.clear();
        for (index, site) in self.sites.iter().enumerate() {
            let bits = match &site.kind {
                SiteKind::Prepared(prepared) => {
                    let member = &prepared.members[draw.member(index as u32)];
                    let state = if from_term {
                        let component = draw.row(index)[term];
                        member.components[usize::from(component)].0.amplitudes()
                    } else {
                        member.state
                    };
                    u8::from(rng.random::<f64>() < state[1].norm_sqr())
                }
                _ => rng.random::<u8>() & 7,
            };
            self.input.push(bits);
        }
        self.fill_pending(draw);
        let sum: Complex64 = self.amplitudes.iter().sum();
        let ratio = sum.norm_sqr() / (self.density(draw) * self.settings.start_cap);
        self.diagnostics.clipped |= ratio > 1.0 + 1e-9;
        rng.random::<f64>() < ratio
    }

    /// q at the input bits, but for the factor of the uniform ones.
    fn density(&self, draw: &Draw) -> f64 {
        let mut ideal = 1.0;
        for (index, site) in self.sites.iter().enumerate() {
            if let SiteKind::Prepared(prepared) = &site.kind {
                let member = &prepared.members[draw.member(index as u32)];
                ideal *= member.state[usize::from(self.input[index])].norm_sqr();
            }
        }
        // Pending factors of gate sites have modulus 1.
        let mixed: f64 = self
            .pending
            .iter()
            .map(|&(factor, zeros)| if zeros == 0 { factor.norm_sqr() } else { 0.0 })
            .sum();
        let weight = self.settings.mixing_weight;
        (1.0 - weight) * ideal + weight * mixed / draw.terms as f64
    }

    /// Pending factors and amplitudes at the start, where every slot is idle.
    fn fill_pending(&mut self, draw: &Draw) {
        self.pending.clear();
        self.pending.resize(draw.terms, (Complex64::ONE, 0));
        for (index, site) in self.sites.iter().enumerate() {
            if meeting(site) != Meeting::Input {
                continue;
            }
            let factors = self.factors(index, draw);
            for (pending, &component) in self.pending.iter_mut().zip(draw.row(index)) {
                let factor = factors[usize::from(component)];
                if factor == Complex64::ZERO {
                    pending.1 += 1;
                } else {
                    pending.0 *= factor;
                }
            }
        }
        self.amplitudes.clear();
        self.amplitudes.extend(
            self.pending
                .iter()
                .enumerate()
                .map(|(term, &(factor, zeros))| {
                    if zeros == 0 {
                        factor * self.terms.amplitude(term, &[0; W])
                    } else {
                        Complex64::ZERO
                    }
                }),
        );
    }

    /// The pending factor of each component of a site with input bits.
    fn factors(&self, site: usize, draw: &Draw) -> [Complex64; 8] {
        let input = self.input[site];
        match &self.sites[site].kind {
            SiteKind::Rotation(_) => {
                std::array::from_fn(|b| I_POWERS[(b * usize::from(input & 1)) & 3])
            }
            SiteKind::Ccz(_) => std::array::from_fn(|b| {
                let negative = CczSite::component(b as u8).is_negative_at(input);
                Complex64::new(if negative { -1.0 } else { 1.0 }, 0.0)
            }),
            SiteKind::Prepared(prepared) => {
                let member = &prepared.members[draw.member(site as u32)];
                std::array::from_fn(|b| {
                    let component = member.components.get(b);
                    component.map_or(Complex64::ZERO, |&(state, _)| {
                        state.amplitudes()[usize::from(input)]
                    })
                })
            }
        }
    }

    /// Takes a site's factor out of what is pending.
    fn spend(&mut self, site: u32, draw: &Draw) {
        let factors = self.factors(site as usize, draw);
        for (pending, &component) in self.pending.iter_mut().zip(draw.row(site as usize)) {
            let factor = factors[usize::from(component)];
            if factor == Complex64::ZERO {
                pending.1 -= 1;
            } else {
                pending.0 /= factor;
            }
        }
    }

    /// Weight of every term: (1/k)·∏ √Ξ·phase over the sites with input bits.
    fn start_weights(&self, draw: &Draw) -> Vec<Complex64> {
        let mut weights = vec![Complex64::new(1.0 / draw.terms as f64, 0.0); draw.terms];
        for (index, site) in self.sites.iter().enumerate() {
            if meeting(site) == Meeting::Input {
                let factors = site.factors(draw.member(index as u32));
                for (weight, &component) in weights.iter_mut().zip(draw.row(index)) {
                    *weight *= factors[usize::from(component)];
                }
            }
        }
        weights
    }

    /// A rotation with an input bit.
    fn inject(&mut self, slot: u16, site: u32, flipped: bool, draw: &Draw) {
        let value = self.bit(slot) ^ flipped;
        let input = self.input[site as usize] & 1 == 1;
        let moved = value ^ input;
        self.spend(site, draw);
        if moved && value {
            self.factor(Complex64::I);
        }
        let components = draw.row(site as usize);
        // Component b⊕m on the value z = x ⊕ flipped: i^(c·z) is, flipped,
        // i^c·i^(−c·x).
        let power = |label: u32| components[label as usize] ^ u8::from(moved);
        self.terms.diagonal(usize::from(slot), |label| {
            if flipped {
                (4 - power(label)) & 3
            } else {
                power(label)
            }
        });
        self.terms.scale(|label| {
            let mut phase = if flipped { power(label) } else { 0 };
            if moved && components[label as usize] == 1 {
                phase += 1;
            }
            I_POWERS[usize::from(phase & 3)]
        });
    }

    /// A rotation whose components are drawn anew, on a slot whose sign may be
    /// flipped, or not executed.
    fn meet_by_redraw(
        &mut self,
        place: Option<(u16, bool)>,
        site: u32,
        draw: &Draw,
        rng: &mut ShotRng,
    ) {
        let found = &self.sites[site as usize];
        let SiteKind::Rotation(rotation) = &found.kind else {
            return;
        };
        let weights = rotation.members[draw.member(site)].weights;
        let chance = weights[1].norm() / (weights[0].norm() + weights[1].norm());
        let factors = found.factors(draw.member(site));
        let value = place.is_some_and(|(slot, flipped)| self.bit(slot) ^ flipped);
        // What a component multiplies an amplitude at the sample with.
        let gates = [factors[0], factors[1] * I_POWERS[usize::from(value)]];
        if !self.redraw(gates, chance, found.extent, rng) {
            self.failed = true;
            return;
        }
        let redrawn = &self.redrawn;
        for (amplitude, &b) in self.amplitudes.iter_mut().zip(redrawn) {
            *amplitude *= gates[usize::from(b)];
        }
        let Some((slot, flipped)) = place else {
            self.terms
                .scale(|label| factors[usize::from(redrawn[label as usize])]);
            return;
        };
        // diag(1, i) on the value z = x ⊕ flipped is, flipped, i·diag(1, −i).
        let power = if flipped { 3 } else { 1 };
        let phase = if flipped {
            Complex64::I
        } else {
            Complex64::ONE
        };
        self.terms
            .diagonal(usize::from(slot), |label| power * redrawn[label as usize]);
        self.terms.scale(|label| match redrawn[label as usize] {
            0 => factors[0],
            _ => factors[1] * phase,
        });
    }

    /// Draws a component for every term until accepted in proportion to the
    /// square of the new sum of amplitudes. False: given up.
    fn redraw(
        &mut self,
        gates: [Complex64; 2],
        chance: f64,
        extent: f64,
        rng: &mut ShotRng,
    ) -> bool {
        let sum: Complex64 = self.amplitudes.iter().sum();
        let (mut squares, mut moduli, mut largest) = (0.0, 0.0, 0.0f64);
        for amplitude in &self.amplitudes {
            let modulus = amplitude.norm();
            squares += modulus * modulus;
            moduli += modulus;
            largest = largest.max(modulus);
        }
        let noise = (extent - 1.0) * squares / sum.norm_sqr();
        self.weight *= 1.0 + noise;
        // A rare component moves the sum by a jump, so the normal law is no
        // guide for few terms: room for two jumps of the largest term, and never
        // more than all moduli together.
        let jump = (gates[0] - gates[1]).norm() * largest;
        let root = sum.norm() * (1.0 + CAP_DEVIATIONS * noise.sqrt()) + 2.0 * jump;
        let cap = root.min(extent.sqrt() * moduli).powi(2);
        for _ in 0..MAX_REDRAWS {
            self.redrawn.clear();
            let mut drawn = Complex64::ZERO;
            for amplitude in &self.amplitudes {
                let b = u8::from(rng.random::<f64>() < chance);
                drawn += amplitude * gates[usize::from(b)];
                self.redrawn.push(b);
            }
            let ratio = drawn.norm_sqr() / cap;
            self.diagnostics.clipped |= ratio > 1.0 + 1e-9;
            if rng.random::<f64>() < ratio {
                return true;
            }
        }
        false
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
        self.terms.reset(&self.start_weights(draw));
        self.sample = [0; W];
        self.weight = 1.0;
        self.failed = false;
        self.diagnostics = Diagnostics::default();
        self.draw_input(draw, rng)
    }

    fn plus(&mut self, slot: u16, rng: &mut ShotRng) {
        self.terms.plus(usize::from(slot));
        if rng.random() {
            self.flip_bit(slot);
        }
        self.factor(Complex64::new(std::f64::consts::FRAC_1_SQRT_2, 0.0));
    }

    fn prepare(&mut self, slot: u16, site: u32, draw: &Draw) {
        let SiteKind::Prepared(prepared) = &self.sites[site as usize].kind else {
            return;
        };
        let member = &prepared.members[draw.member(site)];
        let components = draw.row(site as usize);
        self.spend(site, draw);
        if self.input[site as usize] == 1 {
            self.flip_bit(slot);
        }
        self.terms.prepare(usize::from(slot), |label| {
            member.components[usize::from(components[label as usize])].0
        });
    }

    fn primitive(&mut self, primitive: &Primitive, rng: &mut ShotRng) {
        let (x, z) = (wide::<W>(&primitive.x), wide::<W>(&primitive.z));
        let scale = std::f64::consts::FRAC_1_SQRT_2;
        let power = |at: &[u64; W]| {
            I_POWERS[(usize::from(primitive.phase) + 2 * usize::from(odd(&z, at))) & 3]
        };
        if x == [0; W] {
            let factor = (power(&self.sample) + 1.0) * scale;
            self.factor(factor);
            self.terms.primitive(primitive.phase, &x, &z);
            return;
        }
        let other: [u64; W] = std::array::from_fn(|word| self.sample[word] ^ x[word]);
        self.others.clear();
        self.others.resize(self.amplitudes.len(), Complex64::ZERO);
        for index in 0..self.terms.len() {
            let label = self.terms.label(index) as usize;
            let (factor, zeros) = self.pending[label];
            if zeros == 0 {
                self.others[label] = factor * self.terms.amplitude(index, &other);
            }
        }
        let here: Complex64 = self.amplitudes.iter().sum();
        let there: Complex64 = self.others.iter().sum();
        let (to_here, to_there) = (power(&other), power(&self.sample));
        let stay = (here + to_here * there).norm_sqr();
        let go = (there + to_there * here).norm_sqr();
        if stay + go <= 0.0 {
            self.failed = true;
        }
        if rng.random::<f64>() * (stay + go) < go {
            self.sample = other;
            for (amplitude, other) in self.amplitudes.iter_mut().zip(&self.others) {
                *amplitude = (other + to_there * *amplitude) * scale;
            }
        } else {
            for (amplitude, other) in self.amplitudes.iter_mut().zip(&self.others) {
                *amplitude = (*amplitude + to_here * other) * scale;
            }
        }
        self.terms.primitive(primitive.phase, &x, &z);
    }

    fn controlled_not(&mut self, control: u16, target: u16) {
        self.terms
            .controlled_not(usize::from(control), usize::from(target));
        if self.bit(control) {
            self.flip_bit(target);
        }
    }

    fn rotate(&mut self, slot: u16, site: u32, flipped: bool, draw: &Draw, rng: &mut ShotRng) {
        let found = &self.sites[site as usize];
        match meeting(found) {
            Meeting::Input => self.inject(slot, site, flipped, draw),
            Meeting::Redraw => self.meet_by_redraw(Some((slot, flipped)), site, draw, rng),
            Meeting::Clifford => {
                // One component for all terms; a phase common to all does not
                // matter, but sample and terms must agree on it.
                let b = draw.row(site as usize)[0];
                let power = if flipped { (4 - b) & 3 } else { b };
                self.terms.diagonal(usize::from(slot), |_| power);
                if self.bit(slot) {
                    self.factor(I_POWERS[usize::from(power)]);
                }
            }
        }
    }

    fn quarter_turn(&mut self, slot: u16, flipped: bool) {
        let power = if flipped { 3 } else { 1 };
        self.terms.diagonal(usize::from(slot), |_| power);
        if self.bit(slot) {
            self.factor(I_POWERS[usize::from(power)]);
        }
    }

    fn ccz(&mut self, slots: [u16; 3], flipped: [bool; 3], site: u32, draw: &Draw) {
        let value = (0..3).fold(0u8, |value, axis| {
            value | u8::from(self.bit(slots[axis]) ^ flipped[axis]) << axis
        });
        let moved = value ^ self.input[site as usize];
        self.spend(site, draw);
        if CczSite::component(moved).is_negative_at(value) {
            self.factor(Complex64::new(-1.0, 0.0));
        }
        let components = draw.row(site as usize);
        let table: [QuadraticPhase; 8] = std::array::from_fn(|b| {
            QuadraticPhase::from(CczSite::component(b as u8 ^ moved)).flipped(flipped)
        });
        self.terms.quadratic(slots.map(usize::from), |label| {
            table[usize::from(components[label as usize])]
        });
    }

    fn skip(&mut self, site: u32, draw: &Draw, rng: &mut ShotRng) {
        // The pending factor of a site with an input bit stays for good.
        if meeting(&self.sites[site as usize]) == Meeting::Redraw {
            self.meet_by_redraw(None, site, draw, rng);
        }
    }

    fn controlled_z(&mut self, a: u16, b: u16) {
        self.terms.controlled_z(usize::from(a), usize::from(b));
        if self.bit(a) && self.bit(b) {
            self.factor(Complex64::new(-1.0, 0.0));
        }
    }

    fn z(&mut self, slot: u16) {
        self.terms.diagonal(usize::from(slot), |_| 2);
        if self.bit(slot) {
            self.factor(Complex64::new(-1.0, 0.0));
        }
    }

    fn measure(&mut self, slot: u16, _rng: &mut ShotRng) -> Option<bool> {
        if self.failed {
            return None;
        }
        let value = self.bit(slot);
        self.terms.measured(usize::from(slot), value);
        if value {
            self.flip_bit(slot);
        }
        // Keep the numbers in range over long runs.
        let sum: Complex64 = self.amplitudes.iter().sum();
        let scale = Complex64::new(sum.norm().recip(), 0.0);
        if scale.re.is_finite() && !(0.1..10.0).contains(&scale.re) {
            self.factor(scale);
            self.terms.scale(|_| scale);
        }
        Some(value)
    }

    fn damp(
        &mut self,
        _slot: u16,
        _flipped: bool,
        _gamma: f64,
        _rng: &mut ShotRng,
    ) -> Option<bool> {
        unreachable!("circuits with damping of entangled qubits are given to another register")
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
