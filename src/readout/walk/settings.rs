//! How sites meet the sample, and what is decided once a run.

use crate::magic::mixing::{mean_norm, mixing_weight};
use crate::magic::{Site, SiteKind};

/// Standard deviations that a cap leaves room for: about one value in a million
/// of a complex normal law lies beyond.
pub(super) const CAP_DEVIATIONS: f64 = 3.8;

/// How a site meets the sample.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum Meeting {
    /// With an input bit: T-like and CCZ gates, prepared qubits.
    Input,
    /// By drawing its components anew.
    Redraw,
    /// As a Clifford gate.
    Clifford,
}

pub(super) fn meeting(site: &Site) -> Meeting {
    match &site.kind {
        SiteKind::Ccz(_) | SiteKind::Prepared(_) => Meeting::Input,
        SiteKind::Rotation(_) if site.extent == 1.0 => Meeting::Clifford,
        SiteKind::Rotation(rotation)
            if (rotation.angle - std::f64::consts::FRAC_PI_4).abs() < 1e-9 =>
        {
            Meeting::Input
        }
        SiteKind::Rotation(_) => Meeting::Redraw,
    }
}

/// Settings of the read-out, the same for all shots of a run.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Settings {
    /// λ of the sites with input bits.
    pub(super) mixing_weight: f64,
    /// Largest |Ω(z)|²/q(z) at the start.
    pub(super) start_cap: f64,
    /// Largest G at the end.
    pub(super) end_cap: f64,
    /// Mean of G without damping.
    growth: f64,
    /// Modulus of every term's weight: √ξ/k, ξ that of the sites with input bits.
    pub(super) modulus: f64,
    /// Whether there are prepared qubits.
    pub(super) prepared: bool,
}

impl Settings {
    /// Settings for these sites and so many terms. `log_trace` bounds the
    /// logarithm of the companion's trace, 0 where no entangled qubit is damped.
    pub fn new(sites: &[Site], terms: u64, log_trace: f64) -> Self {
        let log_extent = |wanted: &dyn Fn(Meeting) -> bool| -> f64 {
            sites
                .iter()
                .filter(|site| wanted(meeting(site)))
                .map(|site| site.extent.ln())
                .sum()
        };
        let input = log_extent(&|meeting| meeting == Meeting::Input);
        let all = log_extent(&|_| true) + log_trace;
        let weight = mixing_weight(input, terms);
        let mean = mean_norm(input, terms);
        let tail = if weight < 1.0 {
            let root = 1.0 + CAP_DEVIATIONS * (weight / (1.0 - weight)).sqrt();
            root * root * (1.0 - weight)
        } else {
            f64::INFINITY
        };
        // |Ω(z)|² ≤ ξ·(1/k)Σ|φ_j(z)|² always; that mean is q itself where all
        // bits are uniform, and at most q/λ with prepared qubits.
        let prepared = sites
            .iter()
            .any(|site| matches!(site.kind, SiteKind::Prepared(_)));
        let share = if prepared { weight } else { 1.0 };
        let bound = (input - mean.ln()).exp() / share;
        let relative = tail.min(bound).max(1.0);
        // G is a product of means, far less spread than one amplitude: room for
        // three times its mean excess and more where λ is large.
        let growth = mean_norm(all, terms) / mean;
        let spread = if terms == 1 {
            // R = 1 everywhere: G is at most the bound of its mean.
            1.0
        } else if all > input {
            let weight = mixing_weight(all, terms).min(1.0 - 1e-12);
            1.0 + 3.0 * weight / (1.0 - weight)
        } else {
            1.0
        };
        Settings {
            mixing_weight: weight,
            start_cap: mean * relative,
            end_cap: growth * spread,
            growth: growth / log_trace.exp(),
            modulus: (0.5 * input).exp() / terms as f64,
            prepared,
        }
    }
    /// The same, but every shot is kept whose sum is not 0: for timing alone.
    #[must_use]
    pub fn accepting_all(self) -> Self {
        Settings {
            start_cap: f64::MIN_POSITIVE,
            end_cap: f64::MIN_POSITIVE,
            ..self
        }
    }

    /// The companion's trace, from how many of the attempts at a single term were
    /// kept: every one is kept with the chance G/cap.
    pub fn trace(&self, shots: u64, attempts: u64) -> f64 {
        let kept = shots as f64 / attempts.max(1) as f64;
        kept * self.end_cap / self.growth
    }
}
