//! Durations and sizes as people write and read them.

/// Seconds in a Julian year of 365.25 days, as astronomers count.
const YEAR: f64 = 365.25 * 86_400.0;

/// Reads a duration such as `90s`, `10min`, `2h`, `1.5d`, `250ms`. In seconds;
/// above 0.
pub fn parse_duration(text: &str) -> Result<f64, String> {
    let units = [
        ("ms", 1e-3),
        ("s", 1.0),
        ("min", 60.0),
        ("h", 3600.0),
        ("d", 86_400.0),
    ];
    let expected = "expected a duration above 0 with its unit (ms, s, min, h or d), for example 90s, \
                    10min or 2h";
    quantity(text, &units).ok_or_else(|| expected.to_owned())
}

/// Reads a size such as `8GiB`, `500MB`, `1.5TiB`. In bytes, at least 1.
pub fn parse_bytes(text: &str) -> Result<u64, String> {
    let units = [
        ("B", 1.0),
        ("kB", 1e3),
        ("KB", 1e3),
        ("MB", 1e6),
        ("GB", 1e9),
        ("TB", 1e12),
        ("KiB", 1024.0),
        ("MiB", 1_048_576.0),
        ("GiB", 1_073_741_824.0),
        ("TiB", 1_099_511_627_776.0),
    ];
    let expected = "expected a size with its unit (B, kB, MB, GB, TB, KiB, MiB, GiB or TiB), for \
                    example 8GiB or 500MB";
    let bytes = quantity(text, &units).ok_or_else(|| expected.to_owned())?;
    // 2^63 and more would be no limit at all.
    if (1.0..9.2e18).contains(&bytes) {
        Ok(bytes as u64)
    } else {
        Err(expected.to_owned())
    }
}

/// A number above 0 and its unit, with or without a space between.
fn quantity(text: &str, units: &[(&str, f64)]) -> Option<f64> {
    let text = text.trim();
    let start = text.find(|letter: char| letter.is_ascii_alphabetic())?;
    let (number, unit) = text.split_at(start);
    let value: f64 = number.trim().parse().ok()?;
    let &(_, factor) = units.iter().find(|(word, _)| *word == unit)?;
    let value = value * factor;
    (value > 0.0 && value.is_finite()).then_some(value)
}

/// A duration with two significant digits and its unit: `12 ms`, `3.4 s`,
/// `10 min`, `2.1 h`, `46 days`, `3.1e9 years`.
pub fn format_seconds(seconds: f64) -> String {
    if !seconds.is_finite() {
        return "beyond counting".to_owned();
    }
    if seconds <= 0.0 {
        return "0 s".to_owned();
    }
    let scales = [
        (1e-9, "ns"),
        (1e-6, "µs"),
        (1e-3, "ms"),
        (1.0, "s"),
        (60.0, "min"),
        (3600.0, "h"),
        (86_400.0, "days"),
        (YEAR, "years"),
    ];
    // A unit is taken where it gives at least one of it, hours and days from
    // one and a half, so that 70 min do not read as 1.2 h.
    let (scale, unit) = scales
        .iter()
        .rev()
        .find(|(scale, unit)| {
            let least = match *unit {
                "min" | "h" | "days" | "years" => 1.5,
                _ => 0.9995,
            };
            seconds >= least * scale
        })
        .unwrap_or(&scales[0]);
    format!("{} {unit}", two_digits(seconds / scale))
}

/// A value above 0 with two significant digits, whole from 10 on.
fn two_digits(value: f64) -> String {
    match value {
        0.995..9.95 => format!("{value:.1}"),
        9.95..10_000.0 => format!("{value:.0}"),
        _ => format!("{value:.1e}"),
    }
}

/// Rounds up to two significant digits; above 0.
pub fn round_up(value: f64) -> f64 {
    let decade = value.log10().floor() as i32;
    // As decimal text and back, so that 0.14 is the number people write. A digit
    // is not raised for what rounding has left over.
    let mantissa = (value / 10f64.powi(decade - 1) - 1e-9).ceil();
    format!("{mantissa}e{}", decade - 1)
        .parse()
        .unwrap_or(value)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn durations_are_read_with_their_unit() {
        for (text, seconds) in [
            ("90s", 90.0),
            ("10min", 600.0),
            ("2h", 7200.0),
            ("1.5d", 129_600.0),
            ("250ms", 0.25),
            (" 10 min ", 600.0),
        ] {
            assert_eq!(parse_duration(text), Ok(seconds), "{text}");
        }
        for text in [
            "", "10", "min", "-3s", "0s", "10 m", "1e999h", "3 weeks", "nan s", "infs",
        ] {
            assert!(parse_duration(text).is_err(), "{text}");
        }
    }

    /// Binary prefixes: IEC 80000-13; decimal ones: SI.
    #[test]
    fn sizes_are_read_with_their_unit() {
        for (text, bytes) in [
            ("8GiB", 8 << 30),
            ("500MB", 500_000_000),
            ("1.5 TiB", 3 << 39),
            ("64KiB", 65_536),
            ("1B", 1),
        ] {
            assert_eq!(parse_bytes(text), Ok(bytes), "{text}");
        }
        for text in [
            "", "8", "GiB", "8G", "0B", "0.2B", "-1GB", "1e30TB", "8 gib",
        ] {
            assert!(parse_bytes(text).is_err(), "{text}");
        }
    }

    #[test]
    fn durations_of_any_length() {
        for (seconds, text) in [
            (0.0, "0 s"),
            (3.21e-7, "321 ns"),
            (0.0123, "12 ms"),
            (1.0, "1.0 s"),
            (61.0, "61 s"),
            (600.0, "10 min"),
            (4200.0, "70 min"),
            (7300.0, "2.0 h"),
            (4e6, "46 days"),
            (3.15576e7 * 2.0, "2.0 years"),
            (1e30, "3.2e22 years"),
            (f64::INFINITY, "beyond counting"),
        ] {
            assert_eq!(format_seconds(seconds), text, "{seconds}");
        }
    }

    #[test]
    fn rounding_goes_up_to_two_digits() {
        for (value, rounded) in [
            (0.01301, 0.014),
            (0.014, 0.014),
            (0.0991, 0.1),
            (1.0, 1.0),
            (0.995, 1.0),
            (1e-4, 1e-4),
            (1.04e-4, 1.1e-4),
        ] {
            assert_eq!(round_up(value), rounded, "{value}");
        }
    }
}
