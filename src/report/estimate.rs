//! Averages with standard errors, and their exact correction.
//!
//! Shots are drawn from P_out = [(k − 1)·P + ξ·P_comp]/(k − 1 + ξ), P the ideal
//! distribution of the noisy circuit and P_comp that of the companion circuit.
//! With λ = ξ/(k − 1 + ξ) any average obeys m_out = (1 − λ)·m + λ·m_comp, so
//!
//! ```text
//! m = (m_out − λ·m_comp)/(1 − λ)
//! se² = (se_out² + λ²·se_comp²)/(1 − λ)²
//! ```
//!
//! since the two sets of shots are independent. The corrected value is
//! unbiased, and therefore may lie a little outside [0, 1].
//!
//! Standard errors are the plain ones, √(p(1 − p)/N) for a frequency and
//! √(variance/N) for a mean. They say nothing where an event was never (or
//! always) seen; there the exact one-sided 95 % limit of the binomial
//! distribution is given, 1 − 0.05^(1/N), about 3/N. In a correction such a
//! frequency enters with the standard error of one event in N, lest a sample
//! without events pass for exact. (Common practice, no source.)

use serde::Serialize;

/// What was counted: the moments of one number a shot.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Sample {
    /// Number of shots N.
    pub shots: u64,
    /// Sum over the shots.
    pub sum: f64,
    /// Sum of squares over the shots.
    pub sum_of_squares: f64,
    /// Whether the number is 0 or 1.
    pub binary: bool,
}

/// An average and how far to trust it.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Estimate {
    /// The average.
    pub value: f64,
    /// Its standard error.
    pub standard_error: f64,
    /// For a frequency of exactly 0 or 1 the one-sided 95 % limit: the true
    /// one is below (for 0) or above (for 1) it with that confidence.
    pub limit_95: Option<f64>,
}

impl Sample {
    /// An event seen `hits` times in `shots` shots.
    pub fn of_event(hits: u64, shots: u64) -> Self {
        Sample {
            shots,
            sum: hits as f64,
            sum_of_squares: hits as f64,
            binary: true,
        }
    }

    /// A number with these sums over `shots` shots.
    pub fn of_number(sum: f64, sum_of_squares: f64, shots: u64) -> Self {
        Sample {
            shots,
            sum,
            sum_of_squares,
            binary: false,
        }
    }

    /// The plain average; `None` without shots.
    pub fn estimate(&self) -> Option<Estimate> {
        if self.shots == 0 {
            return None;
        }
        let shots = self.shots as f64;
        let value = self.sum / shots;
        let variance = (self.sum_of_squares / shots - value * value).max(0.0);
        let lower = 0.05f64.powf(1.0 / shots);
        let limit_95 = match () {
            () if !self.binary => None,
            () if self.sum == 0.0 => Some(1.0 - lower),
            () if self.sum == shots => Some(lower),
            () => None,
        };
        Some(Estimate {
            value,
            standard_error: (variance / shots).sqrt(),
            limit_95,
        })
    }

    /// Squared standard error for use in a correction, never 0.
    fn cautious_variance(&self, estimate: &Estimate) -> f64 {
        let shots = self.shots as f64;
        let one_event = (1.0 / shots) * (1.0 - 1.0 / (shots + 1.0)) / shots;
        if estimate.standard_error == 0.0 {
            one_event
        } else {
            estimate.standard_error.powi(2)
        }
    }
}

/// The average for the ideal distribution from shots and companion shots, λ =
/// `mixing_weight`; `None` where there are no shots of either kind, where λ = 0
/// (nothing to correct) or λ = 1 (k = 1: nothing but companion).
pub fn corrected(shots: &Sample, companion: &Sample, mixing_weight: f64) -> Option<Estimate> {
    let out = shots.estimate()?;
    let comp = companion.estimate()?;
    let lambda = mixing_weight;
    let rest = 1.0 - lambda;
    if !(lambda > 0.0 && rest > 0.0) {
        return None;
    }
    let variance =
        shots.cautious_variance(&out) + lambda.powi(2) * companion.cautious_variance(&comp);
    Some(Estimate {
        value: (out.value - lambda * comp.value) / rest,
        standard_error: variance.sqrt() / rest,
        limit_95: None,
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn close(left: f64, right: f64) {
        assert!((left - right).abs() < 1e-12, "{left} is not {right}");
    }

    /// By hand: p = 25/100, √(0.25·0.75/100) = 0.04330127018922193.
    #[test]
    fn frequency_has_the_binomial_standard_error() {
        let estimate = Sample::of_event(25, 100).estimate().unwrap();
        close(estimate.value, 0.25);
        close(estimate.standard_error, 0.043_301_270_189_221_93);
        assert_eq!(estimate.limit_95, None);
    }

    /// By hand: values 1, 2, 3, 6: mean 3, variance 12.5 − 9 = 3.5, √(3.5/4).
    #[test]
    fn mean_has_the_standard_error_of_its_variance() {
        let estimate = Sample::of_number(12.0, 50.0, 4).estimate().unwrap();
        close(estimate.value, 3.0);
        close(estimate.standard_error, 0.935_414_346_693_485_3);
    }

    /// The limit p solves (1 − p)^N = 0.05: for N = 2, p = 1 − √0.05.
    #[test]
    fn unseen_events_get_the_exact_limit() {
        let never = Sample::of_event(0, 2).estimate().unwrap();
        close(never.limit_95.unwrap(), 1.0 - 0.05f64.sqrt());
        let always = Sample::of_event(2, 2).estimate().unwrap();
        close(always.limit_95.unwrap(), 0.05f64.sqrt());
        // "Rule of three": about 3/N.
        let many = Sample::of_event(0, 1_000_000).estimate().unwrap();
        assert!((many.limit_95.unwrap() * 1e6 - 3.0).abs() < 0.01);
        assert_eq!(Sample::of_event(0, 0).estimate(), None);
    }

    /// By hand with ξ = 3, k = 7, so λ = 1/3: the mixture of P = 0.2 and P_comp =
    /// 0.5 is 0.3. se² = (0.3·0.7/1000 + 0.25/500/9)/(4/9) = 0.0005975.
    #[test]
    fn correction_undoes_the_mixture() {
        let shots = Sample::of_event(300, 1000);
        let companion = Sample::of_event(250, 500);
        let estimate = corrected(&shots, &companion, 1.0 / 3.0).unwrap();
        close(estimate.value, 0.2);
        close(estimate.standard_error, 0.000_597_5f64.sqrt());
        // The same in terms of k and ξ.
        let (k, xi) = (7.0, 3.0);
        let direct = ((k - 1.0 + xi) * 0.3 - xi * 0.5) / (k - 1.0);
        close(estimate.value, direct);
    }

    #[test]
    fn correction_is_refused_where_it_has_no_meaning() {
        let some = Sample::of_event(3, 10);
        let none = Sample::of_event(0, 0);
        assert_eq!(corrected(&some, &some, 0.0), None);
        assert_eq!(corrected(&some, &some, 1.0), None);
        assert_eq!(corrected(&some, &some, f64::NAN), None);
        assert_eq!(corrected(&some, &none, 0.5), None);
        assert_eq!(corrected(&none, &some, 0.5), None);
    }

    #[test]
    fn correction_of_unseen_events_is_not_exact() {
        let unseen = Sample::of_event(0, 100);
        let estimate = corrected(&unseen, &unseen, 0.1).unwrap();
        close(estimate.value, 0.0);
        assert!(estimate.standard_error > 0.009);
    }

    /// The standard error must cover the spread: over 2,000 repetitions the
    /// corrected value lies within one standard error of the truth in 68.3 % of
    /// cases; by chance it leaves 64 % to 72.5 % with probability below 1e-4.
    #[test]
    fn standard_error_covers_the_spread() {
        let (ideal, comp, lambda) = (0.2, 0.6, 0.3);
        let out = (1.0 - lambda) * ideal + lambda * comp;
        let mut state = 1u64;
        let mut event = |probability: f64, shots: u64| {
            let mut hits = 0;
            for _ in 0..shots {
                state = state
                    .wrapping_mul(6364136223846793005)
                    .wrapping_add(1442695040888963407);
                hits += u64::from(((state >> 11) as f64) < probability * (1u64 << 53) as f64);
            }
            Sample::of_event(hits, shots)
        };
        let covered = (0..2000)
            .filter(|_| {
                let estimate = corrected(&event(out, 800), &event(comp, 300), lambda).unwrap();
                (estimate.value - ideal).abs() < estimate.standard_error
            })
            .count();
        assert!((1280..=1450).contains(&covered), "{covered} of 2000");
    }
}
