//! `probe`: stabiliser terms, measured by fast norm estimation.
//!
//! For a random equatorial state θ on r qubits E[2^r·|⟨θ|Φ⟩|²] = ‖Φ‖² (Phys.
//! Rev. Lett. 116, 250501 (2016); Quantum 3, 181 (2019)). An inner measurement
//! estimates N_m = ‖Π_mΩ‖² for both values m from the same L states and draws
//! from N_1/(N_0 + N_1). Fresh states for every measurement of every shot make
//! the noise of the estimates average out: what is left of one bit's bias is
//! near p(1−p)(1−2p)/L, so that L = ⌈0.2·h/δ⌉ keeps the trace norm of the bias
//! of h measurements below δ. Below L = 8 that expansion fails (a branch that
//! is one stabiliser state has an estimate of 0 a third of the time), hence
//! the floor.
//!
//! The first inner measurement also accepts the shot, with a probability
//! proportional to the unbiased estimate of ‖Ω‖², which makes the shots follow
//! the norm-weighted ensemble and so the mixing law. A site's √Ξ and phase enter
//! the terms when the site is met, so that the mean of ‖Ω‖² is 1 + (ξ−1)/k with
//! ξ the extent met so far. With sites after the first inner measurement the law
//! holds up to a few per cent of λ.
//!
//! A single term needs no estimate: its outcomes are certain or fair. That is
//! how companion shots run.

use num_complex::Complex64;
use rand::RngExt;

use crate::clifford::equatorial::EquatorialForm;
use crate::clifford::terms::{QuadraticPhase, Terms};
use crate::magic::mixing::{mean_norm, mixing_weight};
use crate::magic::{CczSite, Draw, Site, SiteKind};
use crate::program::Primitive;

use super::{Diagnostics, I_POWERS, Interrupt, Register, ShotRng, wide};

/// Fewest random states an estimate is made of.
pub const MIN_PROBES: f64 = 8.0;

/// Random states an estimate needs so that `measurements` inner measurements
/// are biased by at most `delta` in trace norm together.
pub fn probes_for(measurements: usize, delta: f64) -> f64 {
    (0.2 * measurements as f64 / delta).ceil().max(MIN_PROBES)
}

/// Upper end of the acceptance ratio: a bound on ‖Ω‖² estimates over their
/// mean that about one in a million exceeds.
///
/// Two factors: the norm itself, at most ξ and within 3.8 standard deviations
/// (1 + 3.8·√(λ/(1−λ)))²·(1−λ) of its mean; and the mean of `probes` values
/// with the exponential law, whose upper quantile is given by the
/// Wilson–Hilferty approximation of the gamma law (Proc. Natl. Acad. Sci. USA
/// 17, 684 (1931), from memory).
pub fn acceptance_cap(log_extent: f64, terms: u64, probes: usize) -> f64 {
    if terms == 1 {
        // One term has ‖Ω‖² = ξ, exactly.
        return 1.0;
    }
    let mean = mean_norm(log_extent, terms);
    let mixing = mixing_weight(log_extent, terms);
    let spread = if mixing < 1.0 {
        let root = 1.0 + 3.8 * (mixing / (1.0 - mixing)).sqrt();
        root * root * (1.0 - mixing)
    } else {
        f64::INFINITY
    };
    let norm = spread.min((log_extent - mean.ln()).exp()).max(1.0);
    let probes = probes as f64;
    let gamma = (1.0 - 1.0 / (9.0 * probes) + 4.75 / (3.0 * probes.sqrt())).powi(3);
    norm * gamma
}

/// Settings of the read-out, the same for all shots of a run.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Settings {
    /// Random states an estimate is made of.
    pub probes: usize,
    /// The largest acceptance ratio, an estimate of ‖Ω‖² over its mean.
    pub cap: f64,
    /// Whether shots may differ in whether they measure the register at all.
    pub branches: bool,
}

impl Settings {
    /// For single terms, which need no estimate.
    pub fn single() -> Self {
        Settings {
            probes: 1,
            cap: 1.0,
            branches: false,
        }
    }
}

/// Terms on up to 64·W slots.
pub struct Probe<'p, const W: usize> {
    sites: &'p [Site],
    terms: Terms<W>,
    form: EquatorialForm<W>,
    settings: Settings,
    interrupt: &'p Interrupt,
    active: [u64; W],
    weights: Vec<Complex64>,
    /// log of the extent of the sites met so far.
    log_extent: f64,
    accepted: bool,
    diagnostics: Diagnostics,
}

impl<'p, const W: usize> Probe<'p, W> {
    /// A register of `slots` slots for these sites.
    pub fn new(
        sites: &'p [Site],
        slots: usize,
        settings: Settings,
        interrupt: &'p Interrupt,
    ) -> Self {
        Probe {
            sites,
            terms: Terms::new(slots),
            form: EquatorialForm::new(slots),
            settings,
            interrupt,
            active: [0; W],
            weights: Vec::new(),
            log_extent: 0.0,
            accepted: false,
            diagnostics: Diagnostics::default(),
        }
    }

    fn set_active(&mut self, slot: u16) {
        self.active[usize::from(slot) / 64] |= 1 << (slot % 64);
    }

    /// Estimates of ‖Π_0Ω‖² and ‖Π_1Ω‖², not both 0.
    fn estimate(&mut self, slot: u16, rng: &mut ShotRng) -> Option<[f64; 2]> {
        if self.terms.is_empty() {
            return None;
        }
        if self.terms.len() == 1 {
            let norm = self.terms.norm_squared(0);
            return Some(match self.terms.certain(0, usize::from(slot)) {
                Some(false) => [norm, 0.0],
                Some(true) => [0.0, norm],
                None => [norm / 2.0; 2],
            });
        }
        let active: u32 = self.active.iter().map(|word| word.count_ones()).sum();
        let scale = (f64::from(active)).exp2() / self.settings.probes as f64;
        // Where the exact sum is zero every estimate is; a bound on the number
        // of repeats keeps such a shot from running for ever.
        for _ in 0..1000 {
            let mut sums = [0.0; 2];
            for _ in 0..self.settings.probes {
                if self.interrupt.raised() {
                    return None;
                }
                self.form.randomise(&self.active, rng);
                let overlaps = self.terms.overlaps(&self.form, usize::from(slot));
                for (sum, overlap) in sums.iter_mut().zip(overlaps) {
                    *sum += overlap.norm_sqr();
                }
            }
            let sums = sums.map(|sum| sum * scale);
            if sums[0] + sums[1] > 0.0 || !self.accepted {
                return Some(sums);
            }
        }
        None
    }

    /// Estimate of ‖Ω‖², from the two projections of `slot` or of any active slot;
    /// none if interrupted. Nothing is accepted and nothing changes.
    pub(super) fn norm(&mut self, slot: Option<u16>, rng: &mut ShotRng) -> Option<f64> {
        if self.terms.is_empty() {
            return Some(0.0);
        }
        let active = (0..).zip(self.active).find(|&(_, word)| word != 0);
        let first = active.map(|(word, bits)| 64 * word + bits.trailing_zeros() as u16);
        match slot.or(first) {
            Some(slot) => self.estimate(slot, rng).map(|[zero, one]| zero + one),
            None => Some(self.terms.total_amplitude(&[0; W]).norm_sqr()),
        }
    }

    /// Keeps the shot with probability norm/(mean·cap).
    fn accept(&mut self, norm: f64, rng: &mut ShotRng) -> bool {
        self.accepted = true;
        let relative = norm / mean_norm(self.log_extent, self.weights.len() as u64);
        self.diagnostics.clipped = relative > self.settings.cap * (1.0 + 1e-9);
        rng.random::<f64>() * self.settings.cap < relative
    }

    /// Brings in √Ξ and the phases of a site's components.
    fn meet(&mut self, site: u32, draw: &Draw) {
        let found = &self.sites[site as usize];
        self.log_extent += found.extent.ln();
        let factors = found.factors(draw.member(site));
        self.terms
            .scale(|label| factors[component(draw, site, label)]);
    }
}

/// The component of a site in the term of this label.
fn component(draw: &Draw, site: u32, label: u32) -> usize {
    usize::from(draw.component(site as usize, label as usize))
}

impl<const W: usize> Register for Probe<'_, W> {
    fn start(&mut self, draw: &Draw, _rng: &mut ShotRng) -> bool {
        let weight = Complex64::new(1.0 / draw.terms as f64, 0.0);
        self.weights.clear();
        self.weights.resize(draw.terms, weight);
        self.terms.reset(&self.weights);
        self.log_extent = 0.0;
        self.active = [0; W];
        self.accepted = false;
        self.diagnostics = Diagnostics::default();
        true
    }

    fn plus(&mut self, slot: u16, _rng: &mut ShotRng) {
        self.set_active(slot);
        self.terms.plus(usize::from(slot));
    }

    fn prepare(&mut self, slot: u16, site: u32, draw: &Draw) {
        let SiteKind::Prepared(prepared) = &self.sites[site as usize].kind else {
            return;
        };
        self.set_active(slot);
        let member = &prepared.members[draw.member(site)];
        self.terms.prepare(usize::from(slot), |label| {
            member.components[component(draw, site, label)].0
        });
        self.meet(site, draw);
    }

    fn primitive(&mut self, primitive: &Primitive, _rng: &mut ShotRng) {
        self.terms
            .primitive(primitive.phase, &wide(&primitive.x), &wide(&primitive.z));
    }

    fn controlled_not(&mut self, control: u16, target: u16) {
        self.terms
            .controlled_not(usize::from(control), usize::from(target));
    }

    fn rotate(&mut self, slot: u16, site: u32, flipped: bool, draw: &Draw, _rng: &mut ShotRng) {
        self.meet(site, draw);
        if !flipped {
            self.terms.diagonal(usize::from(slot), |label| {
                component(draw, site, label) as u8
            });
            return;
        }
        // diag(1, i^b) on x⊕1 is i^b·diag(1, i^−b).
        self.terms.diagonal(usize::from(slot), |label| {
            (4 - component(draw, site, label) as u8) & 3
        });
        self.terms
            .scale(|label| I_POWERS[component(draw, site, label)]);
    }

    fn quarter_turn(&mut self, slot: u16, flipped: bool) {
        // The factor i of the flipped gate is common to all terms.
        let power = if flipped { 3 } else { 1 };
        self.terms.diagonal(usize::from(slot), |_| power);
    }

    fn ccz(&mut self, slots: [u16; 3], flipped: [bool; 3], site: u32, draw: &Draw) {
        self.meet(site, draw);
        let table: [QuadraticPhase; 8] = std::array::from_fn(|b| {
            QuadraticPhase::from(CczSite::component(b as u8)).flipped(flipped)
        });
        self.terms.quadratic(slots.map(usize::from), |label| {
            table[component(draw, site, label)]
        });
    }

    fn skip(&mut self, site: u32, draw: &Draw, _rng: &mut ShotRng) {
        self.meet(site, draw);
        if let SiteKind::Ccz(_) = self.sites[site as usize].kind {
            // Σ weight·D_b(0) = 1 needs the sign; diag(1, i^b) is 1 there.
            self.terms.scale(|label| {
                let b = component(draw, site, label);
                let negative = CczSite::component(b as u8).is_negative_at(0);
                Complex64::new(if negative { -1.0 } else { 1.0 }, 0.0)
            });
        }
    }

    fn controlled_z(&mut self, a: u16, b: u16) {
        self.terms.controlled_z(usize::from(a), usize::from(b));
    }

    fn z(&mut self, slot: u16) {
        self.terms.diagonal(usize::from(slot), |_| 2);
    }

    fn measure(&mut self, slot: u16, rng: &mut ShotRng) -> Option<bool> {
        let [zero, one] = self.estimate(slot, rng)?;
        if !self.accepted && !self.accept(zero + one, rng) {
            return None;
        }
        let value = rng.random::<f64>() * (zero + one) < one;
        self.terms.measured(usize::from(slot), value);
        // Norms matter up to here; keep the numbers in range over long runs.
        let scale = Complex64::new(if value { one } else { zero }.sqrt().recip(), 0.0);
        self.terms.scale(|_| scale);
        self.active[usize::from(slot) / 64] &= !(1 << (slot % 64));
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
        // A path that never measured the register keeps its shots as often, on
        // the mean, as one that did.
        self.accepted || !self.settings.branches || rng.random::<f64>() * self.settings.cap < 1.0
    }

    fn diagnostics(&self) -> Diagnostics {
        Diagnostics {
            terms_left: self.terms.len() as u32,
            ..self.diagnostics
        }
    }
}
