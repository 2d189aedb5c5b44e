//! The law of sparsified shots: how many terms buy which error.
//!
//! Keep a shot of k terms, drawn independently, with a chance proportional to
//! the squared norm of their sum. Then for any adaptive Clifford circuit
//!
//! P_out = [(k − 1)·P_ideal + ξ·P_companion] / (k − 1 + ξ),
//!
//! ξ the product of the extents of all sites, P_companion the outcome law with
//! every site replaced by a random one of its components. It follows from
//! E[ΩΩ†] = (1 − 1/k)·ψψ† + (ξ/k)·σ; PRX Quantum 2, 010345 (2021) for the
//! construction. The weight of the companion is λ = ξ/(k − 1 + ξ), so the trace
//! norm of the error is at most δ = 2λ and the total variation at most δ/2.
//!
//! ξ is exponential in the number of sites, so it is passed as its logarithm.
//! Without magic (log ξ = 0) one term is the state itself and nothing is mixed
//! in: k = 1, λ = 0.
//!
//! Knows nothing of what the terms are.

use super::site::Site;

/// More terms than this are not representable anywhere: 2^62.
const MOST_TERMS: f64 = (1u64 << 62) as f64;

/// log ξ, the sum of the logarithms of the sites' extents; at least 0. Extents
/// multiply for products of states on at most three qubits each, Quantum 3, 181
/// (2019).
pub fn log_extent<'a>(sites: impl IntoIterator<Item = &'a Site>) -> f64 {
    sites.into_iter().map(|site| site.extent.ln()).sum()
}

/// λ, the weight of the companion law among shots of `terms` (at least 1) terms:
/// from 0 to 1.
pub fn mixing_weight(log_extent: f64, terms: u64) -> f64 {
    if log_extent <= 0.0 {
        return 0.0;
    }
    // (k − 1)/ξ cannot overflow: e^(−log ξ) is below 1.
    let ideal = terms.saturating_sub(1) as f64 * (-log_extent).exp();
    1.0 / (1.0 + ideal)
}

/// δ = 2λ, the bound on the trace norm of the error with `terms` terms: from 0
/// to 2.
pub fn delta_of(log_extent: f64, terms: u64) -> f64 {
    2.0 * mixing_weight(log_extent, terms)
}

/// k = ⌈1 + ξ(2/δ − 1)⌉, the least number of terms whose trace-norm error bound
/// is at most `delta`. `None` if that is more than 2^62, or if `delta` is not
/// above 0.
pub fn terms_for_delta(log_extent: f64, delta: f64) -> Option<u64> {
    if delta.is_nan() || delta <= 0.0 {
        return None;
    }
    if log_extent <= 0.0 || delta >= 2.0 {
        return Some(1);
    }
    one_more_than((log_extent + (2.0 / delta - 1.0).ln()).exp())
}

/// The number of terms for which an average corrected with companion shots costs
/// least: k·(1 + ξ/(k−1))², work a shot times loss of precision, is least at
/// k = 1 + (ξ + √(ξ² + 8ξ))/2. `None` above 2^62.
pub fn terms_for_average(log_extent: f64) -> Option<u64> {
    if log_extent <= 0.0 {
        return Some(1);
    }
    // √(ξ² + 8ξ) = ξ·√(1 + 8/ξ) stays finite as long as ξ does.
    let extent = log_extent.exp();
    one_more_than(0.5 * extent * (1.0 + (1.0 + 8.0 / extent).sqrt()))
}

/// 1 + ⌈x⌉, unless that is too much.
fn one_more_than(x: f64) -> Option<u64> {
    (x < MOST_TERMS).then(|| 1 + x.ceil() as u64)
}

/// E‖Ω‖² = 1 + (ξ − 1)/k, the mean squared norm of a sum of `terms` (at least 1)
/// terms. Infinite where ξ is beyond floating point (log ξ > 709), never NaN.
pub fn mean_norm(log_extent: f64, terms: u64) -> f64 {
    1.0 + log_extent.max(0.0).exp_m1() / terms.max(1) as f64
}

#[cfg(test)]
mod tests {
    use std::f64::consts::FRAC_PI_4;

    use super::super::site::{CczSite, RotationSite, SiteKind};
    use super::*;

    fn rotations(count: usize, angle: f64) -> Vec<Site> {
        let rotation = RotationSite::new(angle, 0.0);
        let extent = rotation.extent_without_noise();
        vec![Site::new(SiteKind::Rotation(rotation), 0, vec![0], extent); count]
    }

    /// Powers of 1/cos²(π/8) and 16/9: the extent is multiplicative for products
    /// of states on at most three qubits, Quantum 3, 181 (2019), from memory.
    #[test]
    fn extents_multiply() {
        for (count, extent) in [
            (0, 1.0),
            (4, 1.883984097),
            (7, 3.029599058),
            (8, 3.549396079),
            (16, 12.598212529),
            (20, 23.734832061),
            (40, 563.342252979),
        ] {
            let found = log_extent(&rotations(count, FRAC_PI_4)).exp();
            assert!((found / extent - 1.0).abs() < 1e-9, "{count} T: {found}");
        }
        let ccz = Site::new(SiteKind::Ccz(CczSite), 0, vec![0, 1, 2], CczSite::EXTENT);
        for (count, extent) in [(1, 1.777777777778), (4, 9.988721232), (8, 99.774551841)] {
            let found = log_extent(&vec![ccz.clone(); count]).exp();
            assert!((found / extent - 1.0).abs() < 1e-9, "{count} CCZ: {found}");
        }
    }

    /// P_out = (1−λ)·P + λ·P_companion for h, gate, h; derived, and recomputed
    /// by summing over all draws.
    #[test]
    fn mixing_weight_gives_the_law_of_one_rotation() {
        let cases = [
            (FRAC_PI_4, 0.853553390593, 0.75, 1, 0.75),
            (FRAC_PI_4, 0.853553390593, 0.75, 2, 0.797685892458),
            (FRAC_PI_4, 0.853553390593, 0.75, 5, 0.830094310254),
            (FRAC_PI_4, 0.853553390593, 0.75, 10, 0.841625997942),
            (FRAC_PI_4, 0.853553390593, 0.75, 100, 0.852342265120),
            (0.3, 0.977668244563, 0.899427338071, 10, 0.969119989796),
            (1.1, 0.726798060713, 0.654269621158, 10, 0.718626063367),
        ];
        for (angle, ideal, companion, terms, expected) in cases {
            let weight = mixing_weight(log_extent(&rotations(1, angle)), terms);
            let found: f64 = (1.0 - weight) * ideal + weight * companion;
            assert!(
                (found / expected - 1.0).abs() < 1e-9,
                "{angle}, k = {terms}"
            );
        }
    }

    #[test]
    fn number_of_terms_is_the_least_that_keeps_the_bound() {
        for log_extent in [1e-9, 0.01, 0.2, 1.0, 3.7, 12.0, 25.0] {
            for delta in [1.9, 1.0, 0.3, 0.1, 0.01, 1e-4] {
                let terms = terms_for_delta(log_extent, delta).unwrap();
                assert!(delta_of(log_extent, terms) <= delta * (1.0 + 1e-12));
                assert!(delta_of(log_extent, terms - 1) > delta * (1.0 - 1e-12));
            }
        }
        // 1 + ξ(2/δ − 1) with ξ = 3.549396079 (8 T) and δ = 0.1: 68.44.
        assert_eq!(terms_for_delta(3.549396079_f64.ln(), 0.1), Some(69));
    }

    #[test]
    fn without_magic_one_term_is_the_state() {
        assert_eq!(terms_for_delta(0.0, 1e-9), Some(1));
        assert_eq!(terms_for_average(0.0), Some(1));
        for terms in [1, 2, 1000] {
            assert_eq!(mixing_weight(0.0, terms), 0.0);
            assert_eq!(delta_of(0.0, terms), 0.0);
            assert_eq!(mean_norm(0.0, terms), 1.0);
        }
    }

    #[test]
    fn terms_for_averages_cost_least() {
        for i in 0..400 {
            let extent = 1.01 * 1.03_f64.powi(i);
            let chosen = terms_for_average(extent.ln()).unwrap() as f64;
            // The cost k·(1 + ξ/(k−1))², at points a little apart, falls up to
            // less than one term below the chosen number and rises after it.
            let cost = |k: f64| k * (1.0 + extent / (k - 1.0)).powi(2);
            let step = 1e-3 * chosen.sqrt();
            assert!(cost(chosen + step) > cost(chosen), "ξ = {extent}");
            assert!(
                cost(chosen - 1.0 - step) > cost(chosen - 1.0),
                "ξ = {extent}"
            );
        }
    }

    #[test]
    fn mean_norm_is_the_trace_of_the_mean_operator() {
        // (k − 1 + ξ)/k.
        for (extent, terms) in [(1.171572875254_f64, 3), (16.0 / 9.0, 2), (563.34, 100)] {
            let expected = (terms as f64 - 1.0 + extent) / terms as f64;
            assert!((mean_norm(extent.ln(), terms) / expected - 1.0).abs() < 1e-13);
        }
        assert!((mean_norm(1e-12, 1) - 1.0 - 1e-12).abs() < 1e-15);
    }

    #[test]
    fn nothing_overflows_into_nonsense() {
        for log_extent in [400.0, 709.0, 710.0, 1e4] {
            assert_eq!(terms_for_delta(log_extent, 0.1), None);
            assert_eq!(terms_for_delta(log_extent, 2.0), Some(1));
            assert_eq!(terms_for_average(log_extent), None);
            let weight = mixing_weight(log_extent, 1 << 62);
            assert!(weight > 1.0 - 1e-12 && weight <= 1.0);
            assert!(mean_norm(log_extent, 1 << 62) > 1e100);
        }
        assert_eq!(terms_for_delta(1.0, 0.0), None);
        assert_eq!(terms_for_delta(1.0, -1.0), None);
        assert_eq!(terms_for_delta(1.0, f64::NAN), None);
        assert_eq!(terms_for_delta(1.0, 1e-300), None);
        assert_eq!(mixing_weight(1.0, 1), 1.0);
        assert!(mixing_weight(1.0, u64::MAX) < 1e-18);
    }
}
