//! Progress on stderr: a bar in a terminal, now and then a line elsewhere.

use std::io::IsTerminal;
use std::time::{Duration, Instant};

use indicatif::{ProgressBar, ProgressStyle};

use crate::sampler::Progress;

/// Time between two lines where there is no terminal.
const LINE_EVERY: Duration = Duration::from_secs(10);

/// Shows how far the shots are.
pub(super) enum Shown {
    /// Nothing is shown.
    Quiet,
    /// A bar.
    Bar {
        bar: ProgressBar,
        shots: u64,
        attempts: u64,
    },
    /// Lines.
    Lines {
        what: &'static str,
        total: u64,
        shots: u64,
        started: Instant,
        last: Instant,
    },
}

impl Shown {
    /// Progress over `total` shots.
    pub fn new(what: &'static str, total: u64, quiet: bool) -> Self {
        if quiet {
            return Shown::Quiet;
        }
        if !std::io::stderr().is_terminal() {
            let now = Instant::now();
            return Shown::Lines {
                what,
                total,
                shots: 0,
                started: now,
                last: now,
            };
        }
        let bar = ProgressBar::new(total);
        let template = "{prefix} {wide_bar} {pos}/{len} shots, {per_sec}, {eta} left {msg}";
        if let Ok(style) = ProgressStyle::with_template(template) {
            bar.set_style(style);
        }
        bar.set_prefix(what);
        Shown::Bar {
            bar,
            shots: 0,
            attempts: 0,
        }
    }

    /// Takes the bar away.
    pub fn finish(&self) {
        if let Shown::Bar { bar, .. } = self {
            bar.finish_and_clear();
        }
    }
}

impl Progress for Shown {
    fn advance(&mut self, more: u64, tried: u64) {
        match self {
            Shown::Quiet => {}
            Shown::Bar {
                bar,
                shots,
                attempts,
            } => {
                *shots += more;
                *attempts += tried;
                bar.inc(more);
                if *attempts > *shots {
                    let rate = *shots as f64 / *attempts as f64;
                    bar.set_message(format!("({:.0} % accepted)", 100.0 * rate));
                }
            }
            Shown::Lines {
                what,
                total,
                shots,
                started,
                last,
            } => {
                *shots += more;
                if last.elapsed() < LINE_EVERY || *shots == 0 {
                    return;
                }
                *last = Instant::now();
                let seconds = started.elapsed().as_secs_f64();
                let rate = *shots as f64 / seconds;
                let left = (*total - *shots) as f64 / rate;
                eprintln!("{what}: {shots} of {total} shots, {rate:.3} a second, {left:.0} s left");
            }
        }
    }
}
