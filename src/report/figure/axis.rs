//! Scales and their ticks.

/// A scale from values to pixels.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Scale {
    low: f64,
    high: f64,
    from: f64,
    to: f64,
    log: bool,
}

impl Scale {
    /// Values `low` to `high` on pixels `from` to `to`, linear.
    pub(super) fn linear(low: f64, high: f64, from: f64, to: f64) -> Self {
        Scale {
            low,
            high: if high > low { high } else { low + 1.0 },
            from,
            to,
            log: false,
        }
    }

    /// The same on a log axis; the values must be above 0.
    pub(super) fn log(low: f64, high: f64, from: f64, to: f64) -> Self {
        let high = if high > low { high } else { 10.0 * low };
        Scale {
            low: low.log10(),
            high: high.log10(),
            from,
            to,
            log: true,
        }
    }

    /// Pixel of a value, clipped to the axis.
    pub(super) fn at(&self, value: f64) -> f64 {
        let value = if self.log { value.log10() } else { value };
        let share = ((value - self.low) / (self.high - self.low)).clamp(0.0, 1.0);
        self.from + share * (self.to - self.from)
    }

    /// Whether a value lies on the axis.
    pub(super) fn holds(&self, value: f64) -> bool {
        let value = if self.log { value.log10() } else { value };
        value >= self.low - 1e-9 && value <= self.high + 1e-9
    }

    /// Powers of ten with 2 and 5 between where there are few of them, with
    /// labels.
    pub(super) fn decade_ticks(&self) -> Vec<(f64, String)> {
        let decades = self.high - self.low;
        let steps: &[f64] = if decades <= 3.2 {
            &[1.0, 2.0, 5.0]
        } else {
            &[1.0]
        };
        let mut ticks = Vec::new();
        for exponent in self.low.floor() as i32..=self.high.ceil() as i32 {
            for &step in steps {
                // From text, so that 0.3 is not 0.30000000000000004.
                let text = format!("{step}e{exponent}");
                let value: f64 = text.parse().unwrap_or(1.0);
                if self.holds(value) {
                    ticks.push((value, plain(value)));
                }
            }
        }
        ticks
    }

    /// Durations a person counts in, a handful of them.
    pub(super) fn duration_ticks(&self) -> Vec<(f64, String)> {
        let year = 365.25 * 86_400.0;
        let mut all: Vec<(f64, String)> = [
            (1e-9, "1 ns"),
            (1e-8, "10 ns"),
            (1e-7, "100 ns"),
            (1e-6, "1 µs"),
            (1e-5, "10 µs"),
            (1e-4, "100 µs"),
            (1e-3, "1 ms"),
            (1e-2, "10 ms"),
            (0.1, "100 ms"),
            (1.0, "1 s"),
            (10.0, "10 s"),
            (60.0, "1 min"),
            (600.0, "10 min"),
            (3600.0, "1 h"),
            (36_000.0, "10 h"),
            (4.0 * 86_400.0, "4 days"),
            (40.0 * 86_400.0, "40 days"),
            (year, "1 year"),
            (10.0 * year, "10 years"),
            (100.0 * year, "100 years"),
        ]
        .map(|(value, text)| (value, text.to_owned()))
        .to_vec();
        for exponent in 3..300 {
            all.push((
                year * 10f64.powi(exponent),
                format!("10{} years", superscript(exponent)),
            ));
        }
        all.retain(|(value, _)| self.holds(*value));
        thinned(all, 8)
    }

    /// Round values, about five of them.
    pub(super) fn linear_ticks(&self) -> Vec<(f64, String)> {
        let span = self.high - self.low;
        let rough = span / 5.0;
        let decade = 10f64.powf(rough.log10().floor());
        let step = [1.0, 2.0, 2.5, 5.0, 10.0]
            .into_iter()
            .map(|factor| factor * decade)
            .find(|step| *step >= rough * 0.999)
            .unwrap_or(10.0 * decade);
        let digits = (-(step.log10().floor()) + 1.0).clamp(0.0, 12.0) as usize;
        let first = (self.low / step).ceil() as i64;
        (0..=12)
            .map(|index| (first + index) as f64 * step)
            .filter(|value| self.holds(*value))
            .map(|value| {
                let text = format!("{value:.digits$}");
                let text = match text.contains('.') {
                    true => text.trim_end_matches('0').trim_end_matches('.').to_owned(),
                    false => text,
                };
                (value, if text == "-0" { "0".to_owned() } else { text })
            })
            .collect()
    }
}

/// Every so many, so that at most `most` are left.
fn thinned(ticks: Vec<(f64, String)>, most: usize) -> Vec<(f64, String)> {
    let step = ticks.len().div_ceil(most).max(1);
    ticks.into_iter().step_by(step).collect()
}

fn plain(value: f64) -> String {
    if (1e-4..1e5).contains(&value) {
        return format!("{value}");
    }
    format!("10{}", superscript(value.log10().round() as i32))
}

fn superscript(number: i32) -> String {
    const DIGITS: [char; 10] = ['⁰', '¹', '²', '³', '⁴', '⁵', '⁶', '⁷', '⁸', '⁹'];
    number
        .to_string()
        .chars()
        .map(|letter| match letter.to_digit(10) {
            Some(digit) => DIGITS[digit as usize],
            None => '⁻',
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn scales_map_their_ends() {
        let scale = Scale::log(0.01, 1.0, 100.0, 300.0);
        assert!((scale.at(0.01) - 100.0).abs() < 1e-9);
        assert!((scale.at(0.1) - 200.0).abs() < 1e-9);
        assert!((scale.at(5.0) - 300.0).abs() < 1e-9, "clipped");
        let scale = Scale::linear(0.0, 4.0, 0.0, 8.0);
        assert!((scale.at(1.0) - 2.0).abs() < 1e-9);
    }

    #[test]
    fn ticks_are_round_and_few() {
        let labels =
            |ticks: Vec<(f64, String)>| ticks.into_iter().map(|(_, text)| text).collect::<Vec<_>>();
        assert_eq!(
            labels(Scale::log(0.01, 1.0, 0.0, 1.0).decade_ticks()),
            ["0.01", "0.02", "0.05", "0.1", "0.2", "0.5", "1"]
        );
        assert_eq!(
            labels(Scale::linear(0.0, 0.4, 0.0, 1.0).linear_ticks()),
            ["0", "0.1", "0.2", "0.3", "0.4"]
        );
        assert_eq!(
            labels(Scale::log(0.5, 700.0, 0.0, 1.0).duration_ticks()),
            ["1 s", "10 s", "1 min", "10 min"]
        );
        let many = Scale::log(1e-3, 1e40, 0.0, 1.0).duration_ticks();
        assert!((4..=8).contains(&many.len()));
        assert_eq!(superscript(-12), "⁻¹²");
    }
}
