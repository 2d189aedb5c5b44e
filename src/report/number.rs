//! Numbers as a person reads them.

use super::Estimate;

/// An extent from its natural logarithm: plain below a thousand, with an
/// exponent below a million, as a power of ten beyond.
pub fn format_extent(log_extent: f64) -> String {
    let log10 = log_extent / std::f64::consts::LN_10;
    let extent = log_extent.exp();
    if !log_extent.is_finite() {
        "unknown".to_owned()
    } else if log10 < 3.0 {
        format!("{extent:.4}")
    } else if log10 < 6.0 {
        format!("{extent:.3e}")
    } else {
        format!("10^{log10:.2}")
    }
}

/// A value with its standard error to two digits, both in the same unit:
/// `0.1230 ± 0.0035`, `(1.20 ± 0.35)e-7`; or `0 (< 3.0e-5)` with a limit.
pub(super) fn format_estimate(estimate: &Estimate) -> String {
    let Estimate {
        value,
        standard_error,
        limit_95,
    } = *estimate;
    if let Some(limit) = limit_95 {
        return match value > 0.5 {
            true => format!("1 (> 1 - {:.1e})", 1.0 - limit),
            false => format!("0 (< {limit:.1e})"),
        };
    }
    if !(standard_error > 0.0 && standard_error.is_finite()) {
        return format_plain(value);
    }
    let digits = 1 - decade(standard_error);
    if digits <= 7 {
        let digits = digits.max(0) as usize;
        return format!("{value:.digits$} ± {standard_error:.digits$}");
    }
    let exponent = decade(value.abs().max(standard_error));
    let scale = 10f64.powi(-exponent);
    let digits = (digits + exponent).clamp(0, 12) as usize;
    format!(
        "({:.digits$} ± {:.digits$})e{exponent}",
        value * scale,
        standard_error * scale
    )
}

/// A number without an error: four significant digits, no trailing zeros.
pub(super) fn format_plain(value: f64) -> String {
    if value == 0.0 || !value.is_finite() {
        return format!("{value}");
    }
    let decade = decade(value.abs());
    if !(-4..6).contains(&decade) {
        return format!("{value:.3e}");
    }
    let digits = (3 - decade).max(0) as usize;
    let text = format!("{value:.digits$}");
    match text.contains('.') {
        true => text.trim_end_matches('0').trim_end_matches('.').to_owned(),
        false => text,
    }
}

/// Exponent of the leading decimal digit.
fn decade(value: f64) -> i32 {
    value.log10().floor() as i32
}

#[cfg(test)]
mod tests {
    use super::*;

    fn estimate(value: f64, standard_error: f64) -> String {
        format_estimate(&Estimate {
            value,
            standard_error,
            limit_95: None,
        })
    }

    #[test]
    fn errors_have_two_digits() {
        assert_eq!(estimate(0.123_04, 0.003_456), "0.1230 ± 0.0035");
        assert_eq!(estimate(-0.001, 0.02), "-0.001 ± 0.020");
        assert_eq!(estimate(61.5, 14.2), "62 ± 14");
        assert_eq!(estimate(1.234e-7, 3.5e-8), "(1.23 ± 0.35)e-7");
        assert_eq!(estimate(0.0, 3.5e-8), "(0.0 ± 3.5)e-8");
        assert_eq!(estimate(0.5, 0.0), "0.5");
    }

    #[test]
    fn limits_are_shown_instead_of_a_zero_error() {
        let limit = |value, limit| {
            format_estimate(&Estimate {
                value,
                standard_error: 0.0,
                limit_95: Some(limit),
            })
        };
        assert_eq!(limit(0.0, 3.0e-5), "0 (< 3.0e-5)");
        assert_eq!(limit(1.0, 0.997), "1 (> 1 - 3.0e-3)");
    }

    #[test]
    fn plain_numbers_have_four_digits() {
        assert_eq!(format_plain(0.1), "0.1");
        assert_eq!(format_plain(0.052_631_6), "0.05263");
        assert_eq!(format_plain(12.0), "12");
        assert_eq!(format_plain(1234.56), "1235");
        assert_eq!(format_plain(1.5e-9), "1.500e-9");
        assert_eq!(format_plain(f64::INFINITY), "inf");
    }

    /// 40 gates t: 1.171572875254^40 = 563.342252979.
    #[test]
    fn extents_of_any_size() {
        let t = 1.171_572_875_254f64.ln();
        assert_eq!(format_extent(0.0), "1.0000");
        assert_eq!(format_extent(40.0 * t), "563.3423");
        assert_eq!(format_extent(60.0 * t), "1.337e4");
        assert_eq!(format_extent(5000.0 * t), "10^343.85");
    }
}
