//! Progress on stderr: a bar in a terminal, now and then a line elsewhere.

use std::io::IsTerminal;
use std::time::{Duration, Instant};

use indicatif::{ProgressBar, ProgressStyle};

use crate::plan::units::format_seconds;
use crate::sampler::Progress;

/// Time between two lines where there is no terminal.
const LINE_EVERY: Duration = Duration::from_secs(10);

/// Shows how far the shots are.
pub(super) struct Shown {
    what: &'static str,
    total: u64,
    shots: u64,
    attempts: u64,
    peak_active: u16,
    started: Instant,
    way: Way,
}

/// How it is shown.
enum Way {
    /// Nothing is shown.
    Quiet,
    /// A bar.
    Bar(ProgressBar),
    /// Lines, the last one at this time.
    Lines(Instant),
}

impl Shown {
    /// Progress over `total` shots.
    pub fn new(what: &'static str, total: u64, quiet: bool) -> Self {
        let started = Instant::now();
        let way = if quiet {
            Way::Quiet
        } else if std::io::stderr().is_terminal() {
            let bar = ProgressBar::new(total);
            let template = "{prefix} {wide_bar} {pos}/{len} shots{msg}";
            if let Ok(style) = ProgressStyle::with_template(template) {
                bar.set_style(style);
            }
            bar.set_prefix(what);
            Way::Bar(bar)
        } else {
            Way::Lines(started)
        };
        Shown {
            what,
            total,
            shots: 0,
            attempts: 0,
            peak_active: 0,
            started,
            way,
        }
    }

    /// Takes the bar away.
    pub fn finish(&self) {
        if let Way::Bar(bar) = &self.way {
            bar.finish_and_clear();
        }
    }

    /// Rate, time left, draws a shot and active qubits so far.
    fn state(&self) -> String {
        let seconds = self.started.elapsed().as_secs_f64().max(1e-9);
        let rate = self.shots as f64 / seconds;
        let left = self.total.saturating_sub(self.shots) as f64 / rate;
        let mut state = format!(", {} a second, {} left", digits(rate), format_seconds(left));
        if self.attempts > self.shots {
            let draws = self.attempts as f64 / self.shots as f64;
            state.push_str(&format!(", {draws:.2} draws a shot"));
        }
        if self.peak_active > 0 {
            state.push_str(&format!(", {} active", self.peak_active));
        }
        state
    }
}

/// A rate in few digits.
fn digits(rate: f64) -> String {
    if rate >= 100.0 {
        format!("{rate:.0}")
    } else {
        format!("{rate:.2}")
    }
}

impl Progress for Shown {
    fn active(&mut self, peak: u16) {
        self.peak_active = self.peak_active.max(peak);
    }

    fn advance(&mut self, more: u64, tried: u64) {
        self.shots += more;
        self.attempts += tried;
        if self.shots == 0 {
            return;
        }
        match &self.way {
            Way::Quiet => {}
            Way::Bar(bar) => {
                bar.set_message(self.state());
                bar.inc(more);
            }
            Way::Lines(last) => {
                if last.elapsed() >= LINE_EVERY {
                    eprintln!(
                        "{}: {} of {} shots{}",
                        self.what,
                        self.shots,
                        self.total,
                        self.state()
                    );
                    self.way = Way::Lines(Instant::now());
                }
            }
        }
    }
}

/// Says in a terminal that something takes a moment.
pub(super) struct Stage(Option<ProgressBar>);

impl Stage {
    /// Shows what is being done.
    pub fn new(what: &'static str) -> Self {
        if !std::io::stderr().is_terminal() {
            return Stage(None);
        }
        let bar = ProgressBar::new_spinner();
        bar.set_message(what);
        bar.enable_steady_tick(Duration::from_millis(120));
        Stage(Some(bar))
    }

    /// Takes it away.
    pub fn finish(&self) {
        if let Some(bar) = &self.0 {
            bar.finish_and_clear();
        }
    }
}
