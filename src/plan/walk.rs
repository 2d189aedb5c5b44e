//! What a shot of `walk` costs as a function of the number of terms.
//!
//! Measured at a ladder of k, in between by interpolation on log axes. Past the
//! last rung the base cost, a pass over all terms a step, goes on as a straight
//! line; it is multiplied with what rejected draws cost. A draw is rejected at
//! the start, in proportion to the cap of the acceptance ratio
//!
//! f(λ) = (1 + 3.8·√(λ/(1−λ)))²·(1−λ)
//!
//! (3.8 standard deviations of a complex normal law leave out one value in a
//! million), so the number of draws falls towards 1 as k grows.

use crate::magic::mixing::mixing_weight;
use crate::magic::{Site, SiteKind};

use super::measure::Timing;

/// A rung of the ladder.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Rung {
    /// Number of terms k.
    pub terms: u64,
    /// What was measured there.
    pub timing: Timing,
    /// Whether shots were kept whatever their weight.
    pub forced: bool,
}

/// Cost of a shot by number of terms.
#[derive(Debug, Clone, PartialEq)]
pub struct WalkCost {
    log_extent: f64,
    /// By ascending number of terms; not empty.
    rungs: Vec<Rung>,
    /// Cost of one more draw in units of an accepted one.
    retry: f64,
    /// Whether whole shots may be rejected at their end.
    redraws: bool,
}

/// A predicted time.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Predicted {
    /// Seconds a shot, all threads at work.
    pub seconds: f64,
    /// Whether it lies outside what was measured.
    pub extrapolated: bool,
}

impl WalkCost {
    /// From rungs by ascending number of terms, and a measurement with every
    /// shot kept at one of them. `None` without rungs.
    pub fn new(
        sites: &[Site],
        log_extent: f64,
        mut rungs: Vec<Rung>,
        kept: Option<Rung>,
    ) -> Option<Self> {
        if rungs.is_empty() {
            return None;
        }
        // More terms never cost less; where they seem to, it is noise.
        for index in 1..rungs.len() {
            let before = rungs[index - 1].timing.seconds;
            let here = &mut rungs[index].timing.seconds;
            *here = here.max(before);
        }
        let redraws = sites.iter().any(|site| match &site.kind {
            SiteKind::Rotation(rotation) => {
                site.extent > 1.0 && (rotation.angle - std::f64::consts::FRAC_PI_4).abs() > 1e-9
            }
            _ => false,
        });
        let retry = kept
            .and_then(|kept| {
                let found = rungs
                    .iter()
                    .find(|rung| rung.terms == kept.terms && !rung.forced)?;
                let more = found.timing.attempts - kept.timing.attempts;
                let cost = found.timing.seconds / kept.timing.seconds - 1.0;
                (more > 0.1).then(|| (cost / more).clamp(0.0, 1.0))
            })
            .unwrap_or(if redraws { 1.0 } else { 0.1 });
        Some(WalkCost {
            log_extent,
            rungs,
            retry,
            redraws,
        })
    }

    /// The rungs.
    pub fn rungs(&self) -> &[Rung] {
        &self.rungs
    }

    /// Cost of a shot with so many terms, at least 1.
    pub fn predict(&self, terms: f64) -> Predicted {
        let position = self
            .rungs
            .partition_point(|rung| (rung.terms as f64) < terms);
        let extrapolated = position == self.rungs.len();
        let seconds = match position {
            0 => self.rungs[0].timing.seconds,
            _ if extrapolated => self.beyond(terms),
            _ => between(&self.rungs[position - 1], &self.rungs[position], terms),
        };
        // On the last rung itself nothing is extrapolated.
        Predicted {
            seconds,
            extrapolated: extrapolated || self.rungs[position.min(self.rungs.len() - 1)].forced,
        }
    }

    fn beyond(&self, terms: f64) -> f64 {
        let last = &self.rungs[self.rungs.len() - 1];
        let base = |rung: &Rung| {
            rung.timing.seconds / (1.0 + self.retry * (rung.timing.attempts - 1.0).max(0.0))
        };
        let per_term = base(last) / last.terms as f64;
        let slope = match self.rungs.len() {
            0 | 1 => per_term,
            count => {
                let before = &self.rungs[count - 2];
                let slope = (base(last) - base(before)) / (last.terms - before.terms) as f64;
                // A line through two noisy points may be anything; the cost a
                // term at the last rung cannot be far off, though.
                slope.clamp(0.7 * per_term, 1.5 * per_term)
            }
        };
        let attempts = self.attempts(last, terms);
        (base(last) + slope * (terms - last.terms as f64)) * (1.0 + self.retry * (attempts - 1.0))
    }

    /// Draws a shot with so many terms, from those measured at a rung.
    fn attempts(&self, rung: &Rung, terms: f64) -> f64 {
        let law = |terms: f64| start_excess(self.weight(terms));
        let known = law(rung.terms as f64);
        let excess = if rung.forced || known <= 0.0 {
            law(terms)
        } else {
            (rung.timing.attempts - 1.0).max(0.0) * law(terms) / known
        };
        let weight = self.weight(terms).min(1.0 - 1e-9);
        let end = if rung.forced && self.redraws {
            1.0 + 3.0 * weight / (1.0 - weight)
        } else {
            1.0
        };
        (1.0 + excess) * end
    }

    fn weight(&self, terms: f64) -> f64 {
        mixing_weight(self.log_extent, terms.min(1e18) as u64)
    }
}

/// f(λ) − 1, at least 0.
fn start_excess(weight: f64) -> f64 {
    let rest = (1.0 - weight).max(0.0);
    // √rest·(1 + 3.8·√(λ/rest)) = √rest + 3.8·√λ.
    ((rest.sqrt() + 3.8 * weight.sqrt()).powi(2) - 1.0).max(0.0)
}

/// Interpolation on log axes.
fn between(low: &Rung, high: &Rung, terms: f64) -> f64 {
    let share = (terms / low.terms as f64).ln() / (high.terms as f64 / low.terms as f64).ln();
    let (low, high) = (low.timing.seconds, high.timing.seconds);
    // Rounding must not lead out of the two.
    (low.ln() + share * (high / low).ln())
        .exp()
        .clamp(low, high)
}

/// Numbers of terms to measure at, ascending: from `least` to `most` by about
/// `factor`, with a few smaller ones in front where `least` is large.
pub fn ladder(least: u64, most: u64, factor: f64) -> Vec<u64> {
    const FIRST: u64 = 512;
    let most = most.max(least);
    let mut terms = Vec::new();
    let mut rung = FIRST;
    while rung < least / 2 {
        terms.push(rung);
        rung = rung.saturating_mul(8);
    }
    let span = (most as f64 / least as f64).ln();
    let steps = (span / factor.ln()).ceil().clamp(0.0, 40.0) as u32;
    for step in 0..=steps {
        let share = f64::from(step) / f64::from(steps.max(1));
        terms.push((least as f64 * (share * span).exp()).round() as u64);
    }
    terms.dedup();
    terms
}

#[cfg(test)]
mod tests {
    use super::*;

    fn rung(terms: u64, seconds: f64, attempts: f64) -> Rung {
        Rung {
            terms,
            timing: Timing {
                seconds,
                attempts,
                shots: 10,
            },
            forced: false,
        }
    }

    /// A cost of exactly k microseconds and no rejected draws (ξ = 1 leaves none)
    /// must come back at any k.
    #[test]
    fn proportional_cost_is_reproduced_everywhere() {
        let rungs = vec![rung(100, 1e-4, 1.0), rung(1000, 1e-3, 1.0)];
        let cost = WalkCost::new(&[], 0.0, rungs, None).unwrap();
        for (terms, extrapolated) in [(100.0, false), (300.0, false), (1000.0, false), (1e6, true)]
        {
            let found = cost.predict(terms);
            assert!(
                (found.seconds / (terms * 1e-6) - 1.0).abs() < 1e-9,
                "{terms}"
            );
            assert_eq!(found.extrapolated, extrapolated, "{terms}");
        }
    }

    /// With draws rejected in proportion to f(λ) − 1 and a cost of 0.2 for each:
    /// the law itself, written out at λ = 0.05, is 2.6 draws.
    #[test]
    fn rejected_draws_are_taken_out_past_the_last_rung() {
        let log_extent = 1000f64.ln();
        let law = |terms: f64| {
            let weight: f64 = 1000.0 / (terms - 1.0 + 1000.0);
            let root = 1.0 + 3.8 * (weight / (1.0 - weight)).sqrt();
            root * root * (1.0 - weight)
        };
        assert!((law(19_001.0) - 3.33).abs() < 0.01);
        let time = |terms: f64| terms * 1e-6 * (1.0 + 0.2 * (law(terms) - 1.0));
        let at = |terms: u64| rung(terms, time(terms as f64), law(terms as f64));
        let kept = rung(2000, 2e-3, 1.0);
        let rungs = vec![at(2000), at(4000)];
        let cost = WalkCost::new(&[], log_extent, rungs, Some(kept)).unwrap();
        for terms in [2e4, 2e5, 2e6] {
            let ratio = cost.predict(terms).seconds / time(terms);
            assert!((ratio - 1.0).abs() < 1e-6, "{terms}: {ratio}");
        }
    }

    #[test]
    fn noise_cannot_make_more_terms_cheaper() {
        let rungs = vec![rung(100, 2e-4, 1.0), rung(1000, 1e-4, 1.0)];
        let cost = WalkCost::new(&[], 0.0, rungs, None).unwrap();
        let mut last = 0.0;
        for step in 0..200 {
            let found = cost.predict(50.0 * 1.1f64.powi(step)).seconds;
            assert!(found >= last);
            last = found;
        }
    }

    #[test]
    fn ladders_begin_low_and_end_at_the_most() {
        assert_eq!(ladder(80, 80, 6.0), [80]);
        assert_eq!(ladder(100, 10_000, 10.0), [100, 1000, 10_000]);
        assert_eq!(
            ladder(100_000, 1_000_000, 10.0),
            [512, 4096, 32_768, 100_000, 1_000_000]
        );
        assert!(ladder(1, u64::MAX, 6.0).len() < 60);
    }
}
