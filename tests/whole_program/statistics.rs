//! Goodness of fit of drawn outcomes.
//!
//! Upper tail of chi-squared by the series and the continued fraction of the
//! incomplete gamma function (textbook), so that no table is needed.

/// A test fails below this p-value.
pub const FALSE_ALARM: f64 = 1e-6;

/// ln Γ of a multiple of 1/2.
fn ln_gamma_of_half(twice: usize) -> f64 {
    let mut value = if twice.is_multiple_of(2) {
        0.0
    } else {
        std::f64::consts::PI.sqrt().ln()
    };
    let mut at = if twice.is_multiple_of(2) { 1.0 } else { 0.5 };
    while 2.0 * at < twice as f64 {
        value += f64::ln(at);
        at += 1.0;
    }
    value
}

/// P(χ² > x) with `freedom` degrees of freedom.
pub fn upper_tail(x: f64, freedom: usize) -> f64 {
    let (a, x) = (freedom as f64 / 2.0, x / 2.0);
    if x <= 0.0 {
        return 1.0;
    }
    let front = (a * x.ln() - x - ln_gamma_of_half(freedom)).exp();
    if x < a + 1.0 {
        let (mut term, mut sum, mut n) = (1.0 / a, 1.0 / a, a);
        while term > sum * 1e-16 {
            n += 1.0;
            term *= x / n;
            sum += term;
        }
        return 1.0 - front * sum;
    }
    // Continued fraction from the back; 300 levels are ample for x ≥ a + 1.
    let mut fraction = 0.0;
    for i in (1..300).rev() {
        let i = f64::from(i);
        fraction = i * (i - a) / (x + 2.0 * i + 1.0 - a - fraction);
    }
    front / (x + 1.0 - a - fraction)
}

/// p-value of counts under a law. Bins that expect fewer than 10 are pooled; a
/// count in a bin of probability zero gives 0.
pub fn fit_p_value(counts: &[u64], law: &[f64]) -> f64 {
    assert!(
        (law.iter().sum::<f64>() - 1.0).abs() < 1e-9,
        "a law sums to 1"
    );
    let shots = counts.iter().sum::<u64>() as f64;
    let mut bins: Vec<(f64, f64)> = Vec::new();
    for (&count, &probability) in counts.iter().zip(law) {
        if probability > 1e-12 {
            bins.push((shots * probability, count as f64));
        } else if count > 0 {
            return 0.0;
        }
    }
    bins.sort_by(|a, b| a.0.total_cmp(&b.0));
    let mut pooled: Vec<(f64, f64)> = Vec::new();
    for (expected, count) in bins {
        match pooled.last_mut() {
            Some(last) if last.0 < 10.0 => *last = (last.0 + expected, last.1 + count),
            _ => pooled.push((expected, count)),
        }
    }
    if pooled.len() < 2 {
        return 1.0;
    }
    let statistic = pooled.iter().map(|(e, c)| (c - e) * (c - e) / e).sum();
    upper_tail(statistic, pooled.len() - 1)
}

/// Upper points of chi-squared, as tabulated in statistics textbooks.
#[test]
fn published_points() {
    for (freedom, level, point) in [
        (1, 0.05, 3.84145882),
        (1, 1e-4, 15.13670523),
        (3, 0.01, 11.34486673),
        (7, 1e-4, 29.87750391),
        (15, 0.05, 24.99579014),
        (31, 0.01, 52.19139483),
        (63, 1e-4, 113.50499285),
    ] {
        let tail = upper_tail(point, freedom);
        assert!(
            (tail / level - 1.0).abs() < 1e-6,
            "{freedom}: {tail} for {level}"
        );
    }
}

#[test]
fn a_wrong_law_and_an_impossible_outcome_are_caught() {
    assert!(fit_p_value(&[50_200, 49_800], &[0.5, 0.5]) > 0.1);
    assert!(fit_p_value(&[51_000, 49_000], &[0.5, 0.5]) < FALSE_ALARM);
    assert_eq!(fit_p_value(&[999, 1], &[1.0, 0.0]), 0.0);
}
