//! Components drawn where they are met: generic rotations and damping.

use num_complex::Complex64;
use rand::RngExt;

use crate::clifford::terms::{Chosen, Operation, Turn};
use crate::magic::{Draw, SiteKind, draw_plane};

use super::settings::CAP_DEVIATIONS;
use super::{I_POWERS, ShotRng, Walk};

/// Most times the components of one site are drawn anew.
const MAX_REDRAWS: usize = 10_000;

/// Two ways for each term, b = 0 or 1.
struct Ways {
    /// What each multiplies the amplitude at the sample by.
    gates: [Complex64; 2],
    /// Chance of b = 0, in units of 2^−64.
    threshold: u64,
    /// |mean of a gate|.
    mean: f64,
    /// Variance of a gate over |mean|².
    variance: f64,
}

/// Sums over the amplitudes a_j at the sample.
#[derive(Debug, Clone, Copy, Default)]
struct Sizes {
    /// Σ a_j.
    sum: Complex64,
    /// Σ |a_j|².
    squares: f64,
    /// Σ |a_j|.
    moduli: f64,
    /// The largest |a_j|.
    largest: f64,
}

impl<const W: usize> Walk<'_, W> {
    /// A rotation whose components are drawn anew, on a slot whose sign may be
    /// flipped, or not executed.
    pub(super) fn meet_by_redraw(
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
        let share = weights[0].norm() / (weights[0].norm() + weights[1].norm());
        let factors = found.factors(draw.member(site));
        let value = place.is_some_and(|(slot, flipped)| self.bit(slot) ^ flipped);
        let ways = Ways {
            gates: [factors[0], factors[1] * I_POWERS[usize::from(value)]],
            threshold: threshold(share),
            // The mean of the gates is e^{i·angle·value}.
            mean: 1.0,
            variance: found.extent - 1.0,
        };
        self.flush();
        let sizes = self.sizes();
        self.weight *= 1.0 + ways.variance * sizes.squares / sizes.sum.norm_sqr();
        let (plane, _) = self.components.planes(site as usize);
        self.redraw(&ways, &sizes, plane, rng);
        // c_S/c_I has the phase e^{−iπ/4}; what is common to all terms does not
        // matter. diag(1, i) on x ⊕ value is, where value is 1, i·diag(1, −i).
        let eighths = if value { 1 } else { 7 };
        let operation = match place {
            None => Operation::Phase {
                eighths: self.by_component(site, |b| if b == 1 { 7 } else { 0 }),
            },
            Some((slot, _)) => Operation::Diagonal {
                slot: slot.into(),
                turn: self.by_component(site, |b| {
                    if b == 1 {
                        let power = if value { 3 } else { 1 };
                        Turn { power, eighths }
                    } else {
                        Turn::default()
                    }
                }),
            },
        };
        self.operations.push(operation);
    }

    /// Damping about a slot's axis with value 1 at the sample: whether it decays.
    ///
    /// A decay has the weight γ, K0 has s²·(1 + ((1−s)/s)·R) with R = Σ|a_j|²/|Σ a_j|²:
    /// one of them is drawn, and G gets their sum, 1 + s(1−s)·R.
    pub(super) fn damp_excited(&mut self, slot: u16, gamma: f64, rng: &mut ShotRng) -> bool {
        let s = (1.0 - gamma).sqrt();
        self.flush();
        let sizes = self.sizes();
        let total = 1.0 + s * (1.0 - s) * sizes.squares / sizes.sum.norm_sqr();
        self.weight *= total;
        if rng.random::<f64>() * total < gamma {
            // Relative to the sample the value is 0.
            self.operations.push(Operation::Project {
                slot: slot.into(),
                value: false,
                when: Chosen::Same(true),
            });
            return true;
        }
        // The projector on the value 0 takes the sample's amplitude away.
        let ways = Ways {
            gates: [Complex64::ONE, Complex64::ZERO],
            threshold: threshold(s),
            mean: s,
            variance: (1.0 - s) / s,
        };
        let plane = self.components.add_plane();
        self.redraw(&ways, &sizes, plane, rng);
        self.project_some(slot, true, plane);
        false
    }

    /// K0 = s·1 + (1−s)·|0⟩⟨0| where the sample has 0: both leave its amplitude.
    pub(super) fn damp_ground(&mut self, slot: u16, gamma: f64, rng: &mut ShotRng) {
        let plane = self.components.add_plane();
        let threshold = threshold((1.0 - gamma).sqrt());
        draw_plane(threshold, rng, self.components.plane_mut(plane));
        self.project_some(slot, false, plane);
    }

    fn project_some(&mut self, slot: u16, value: bool, plane: usize) {
        self.operations.push(Operation::Project {
            slot: slot.into(),
            value,
            when: Chosen::By {
                first: plane as u32,
                planes: 1,
                table: [false, true],
            },
        });
    }

    /// Does what is not done yet, if anything.
    fn flush(&mut self) {
        if self.resolved.is_some() || !self.operations.is_empty() {
            self.sweep(None);
        }
    }

    /// The amplitudes at the sample, by label, and their sums.
    fn sizes(&mut self) -> Sizes {
        self.amplitudes
            .resize(64 * self.components.words(), Complex64::ZERO);
        self.terms.amplitudes_at_zero(&mut self.amplitudes);
        let mut sizes = Sizes::default();
        for amplitude in &self.amplitudes {
            let square = amplitude.norm_sqr();
            let modulus = square.sqrt();
            sizes.sum += amplitude;
            sizes.squares += square;
            sizes.moduli += modulus;
            sizes.largest = sizes.largest.max(modulus);
        }
        sizes
    }

    /// Draws a way for every term into a plane until accepted in proportion to
    /// the square of the new sum of amplitudes.
    fn redraw(&mut self, ways: &Ways, sizes: &Sizes, plane: usize, rng: &mut ShotRng) {
        let sum = sizes.sum;
        let [zero, one] = ways.gates;
        let noise = ways.variance * sizes.squares / sum.norm_sqr();
        // A rare way moves the sum by a jump, so the normal law is no guide for few
        // terms: room for two jumps of the largest term, and never more than all
        // moduli together.
        let jump = (zero - one).norm() * sizes.largest;
        let root = ways.mean * sum.norm() * (1.0 + CAP_DEVIATIONS * noise.sqrt()) + 2.0 * jump;
        let bound = zero.norm().max(one.norm()) * sizes.moduli;
        let cap = root.min(bound).powi(2);
        for _ in 0..MAX_REDRAWS {
            draw_plane(ways.threshold, rng, self.components.plane_mut(plane));
            let ones = ones_of(&self.amplitudes, self.components.plane(plane));
            let drawn = zero * sum + (one - zero) * ones;
            let ratio = drawn.norm_sqr() / cap;
            self.diagnostics.clipped |= ratio > 1.0 + 1e-9;
            if rng.random::<f64>() < ratio {
                return;
            }
        }
        self.failed = true;
    }
}

/// Σ of the amplitudes whose bit is set.
fn ones_of(amplitudes: &[Complex64], plane: &[u64]) -> Complex64 {
    let mut sum = Complex64::ZERO;
    for (amplitudes, &word) in amplitudes.chunks(64).zip(plane) {
        for (bit, amplitude) in amplitudes.iter().enumerate() {
            let factor = (word >> bit & 1) as f64;
            sum += amplitude * factor;
        }
    }
    sum
}

/// A chance in units of 2^−64.
fn threshold(chance: f64) -> u64 {
    (chance * 2f64.powi(64)) as u64
}
