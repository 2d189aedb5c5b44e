//! What a shot of `probe` costs.
//!
//! A shot of k terms makes an estimate from L random states at each of its h
//! inner measurements, each a pass over all terms. It is drawn A times until the
//! first measurement accepts it, so
//!
//! seconds = k·(α·A + β·L·(h + A − 1)/h)
//!
//! with A the cap of the acceptance ratio, α the other passes of a shot and β
//! one random state at all its measurements. Two short runs with every shot kept
//! (A = 1), at two L, give α and β; one with its real acceptance puts the sum
//! right.

use crate::readout::probe::acceptance_cap;

/// Random states of the two runs.
pub const FEW: usize = 8;
/// Random states of the longer one.
pub const MANY: usize = 24;

/// Cost of a shot by number of terms and random states.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct ProbeCost {
    log_extent: f64,
    measurements: f64,
    /// α.
    pass: f64,
    /// β.
    state: f64,
    /// What a run with its real acceptance took over what the formula says.
    scale: f64,
}

impl ProbeCost {
    /// From the seconds a shot takes at `terms` terms with [`FEW`] and [`MANY`]
    /// random states.
    pub fn new(log_extent: f64, measurements: usize, terms: u64, few: f64, many: f64) -> Self {
        let terms = terms.max(1) as f64;
        let state = ((many - few) / (MANY - FEW) as f64 / terms).max(0.0);
        ProbeCost {
            log_extent,
            measurements: (measurements as f64).max(1.0),
            pass: (few / terms - state * FEW as f64).max(0.0),
            state,
            scale: 1.0,
        }
    }

    /// The same, put right by shots with their real acceptance, drawn `attempts`
    /// times each.
    pub fn anchored(self, terms: f64, probes: f64, attempts: f64, seconds: f64) -> Self {
        let formula = self.formula(terms, probes, attempts);
        let scale = seconds / formula;
        ProbeCost {
            scale: if scale.is_finite() { scale } else { 1.0 },
            ..self
        }
    }

    /// Seconds a shot with all threads at work.
    pub fn predict(&self, terms: f64, probes: f64) -> f64 {
        let count = terms.min(1e18) as u64;
        let attempts = acceptance_cap(self.log_extent, count, probes as usize).min(1e6);
        self.scale * self.formula(terms, probes, attempts)
    }

    fn formula(&self, terms: f64, probes: f64, attempts: f64) -> f64 {
        let estimates = 1.0 + (attempts - 1.0) / self.measurements;
        terms * (self.pass * attempts + self.state * probes * estimates)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Two runs of a made-up cost, and back: ξ = 1 has nothing to reject but
    /// for the spread of the estimates, whose cap is known.
    #[test]
    fn both_parts_of_the_cost_are_found() {
        let (pass, state) = (2e-6, 5e-7);
        let run = |probes: f64| 100.0 * (pass + state * probes);
        let cost = ProbeCost::new(0.0, 4, 100, run(FEW as f64), run(MANY as f64));
        let cap = acceptance_cap(0.0, 1000, 50);
        let expected = 1000.0 * (pass * cap + state * 50.0 * (1.0 + (cap - 1.0) / 4.0));
        assert!((cost.predict(1000.0, 50.0) / expected - 1.0).abs() < 1e-9);
        let slow = cost.anchored(1000.0, 50.0, cap, 3.0 * expected);
        assert!((slow.predict(1000.0, 50.0) / expected - 3.0).abs() < 1e-9);
    }
}
