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
//! the norm-weighted ensemble and so the mixing law.
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

use super::{Diagnostics, Register, ShotRng};

/// Fewest random states an estimate is made of.
pub const MIN_PROBES: usize = 8;

/// Random states an estimate needs so that `measurements` inner measurements
/// are biased by at most `delta` in trace norm together.
pub fn probes_for(measurements: usize, delta: f64) -> usize {
    let wanted = (0.2 * measurements as f64 / delta).ceil();
    // A bound keeps a tiny δ from asking for the impossible without a word:
    // the cost estimate of the caller shows it long before.
    (wanted.min(1e12) as usize).max(MIN_PROBES)
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
        return log_extent.exp();
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
    mean * norm * gamma
}

/// Settings of the read-out, the same for all shots of a run.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Settings {
    /// Random states an estimate is made of.
    pub probes: usize,
    /// The largest acceptance ratio.
    pub cap: f64,
}

/// Terms on up to 64·W slots.
pub struct Probe<'p, const W: usize> {
    sites: &'p [Site],
    terms: Terms<W>,
    form: EquatorialForm<W>,
    settings: Settings,
    active: [u64; W],
    accepted: bool,
    diagnostics: Diagnostics,
}

impl<'p, const W: usize> Probe<'p, W> {
    /// A register of `slots` slots for these sites.
    pub fn new(sites: &'p [Site], slots: usize, settings: Settings) -> Self {
        Probe {
            sites,
            terms: Terms::new(slots),
            form: EquatorialForm::new(slots),
            settings,
            active: [0; W],
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

    /// Keeps the shot with probability norm/cap.
    fn accept(&mut self, norm: f64, rng: &mut ShotRng) -> bool {
        self.accepted = true;
        self.diagnostics.norm = Some(norm);
        let ratio = norm / self.settings.cap;
        self.diagnostics.clipped = ratio > 1.0;
        rng.random::<f64>() < ratio
    }
}

fn wide<const W: usize>(mask: &[u64; 4]) -> [u64; W] {
    std::array::from_fn(|word| mask[word])
}

impl<const W: usize> Register for Probe<'_, W> {
    fn start(&mut self, draw: &Draw) {
        self.terms.reset(&draw.weights);
        self.active = [0; W];
        self.accepted = false;
        self.diagnostics = Diagnostics::default();
    }

    fn plus(&mut self, slot: u16) {
        self.set_active(slot);
        self.terms.plus(usize::from(slot));
    }

    fn prepare(&mut self, slot: u16, site: u32, draw: &Draw) {
        let SiteKind::Prepared(prepared) = &self.sites[site as usize].kind else {
            return;
        };
        self.set_active(slot);
        let member = &prepared.members[draw.member(site)];
        let components = draw.row(site as usize);
        self.terms.prepare(usize::from(slot), |label| {
            member.components[usize::from(components[label as usize])].0
        });
    }

    fn primitive(&mut self, primitive: &Primitive) {
        self.terms
            .primitive(primitive.phase, &wide(&primitive.x), &wide(&primitive.z));
    }

    fn controlled_not(&mut self, control: u16, target: u16) {
        self.terms
            .controlled_not(usize::from(control), usize::from(target));
    }

    fn rotate(&mut self, slot: u16, site: u32, flipped: bool, draw: &Draw) {
        let components = draw.row(site as usize);
        if !flipped {
            self.terms
                .diagonal(usize::from(slot), |label| components[label as usize]);
            return;
        }
        // diag(1, i^b) on x⊕1 is i^b·diag(1, i^−b).
        self.terms.diagonal(usize::from(slot), |label| {
            (4 - components[label as usize]) & 3
        });
        const POWERS: [Complex64; 4] = [
            Complex64::new(1.0, 0.0),
            Complex64::new(0.0, 1.0),
            Complex64::new(-1.0, 0.0),
            Complex64::new(0.0, -1.0),
        ];
        self.terms
            .scale(|label| POWERS[usize::from(components[label as usize])]);
    }

    fn quarter_turn(&mut self, slot: u16, flipped: bool) {
        // The factor i of the flipped gate is common to all terms.
        let power = if flipped { 3 } else { 1 };
        self.terms.diagonal(usize::from(slot), |_| power);
    }

    fn ccz(&mut self, slots: [u16; 3], flipped: [bool; 3], site: u32, draw: &Draw) {
        let components = draw.row(site as usize);
        let table: [QuadraticPhase; 8] = std::array::from_fn(|b| {
            QuadraticPhase::from(CczSite::component(b as u8)).flipped(flipped)
        });
        self.terms.quadratic(slots.map(usize::from), |label| {
            table[usize::from(components[label as usize])]
        });
    }

    fn controlled_z(&mut self, a: u16, b: u16) {
        let (a, b) = (usize::from(a), usize::from(b));
        let phase = QuadraticPhase {
            z: [false; 3],
            cz: [true, false, false],
            negative: false,
        };
        self.terms.quadratic([a, b, b], |_| phase);
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

    fn diagnostics(&self) -> Diagnostics {
        Diagnostics {
            terms_left: self.terms.len() as u32,
            ..self.diagnostics
        }
    }
}
