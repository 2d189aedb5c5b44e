//! Shots under a wall-clock limit, timed.

use std::sync::atomic::{AtomicBool, Ordering};
use std::time::{Duration, Instant};

use crate::sampler::{Block, Interrupt, SampleError};

/// How long a measurement may take.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Slice {
    /// Seconds after which no new batch of shots is begun.
    pub aim: f64,
    /// Seconds after which shots in hand are given up.
    pub most: f64,
}

/// What a measurement found.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Timing {
    /// Wall-clock seconds a shot with all threads at work.
    pub seconds: f64,
    /// Draws a shot until it was accepted.
    pub attempts: f64,
    /// Shots drawn.
    pub shots: u64,
}

/// Time and counts at the end of a batch.
#[derive(Debug, Clone, Copy, Default)]
struct Mark {
    seconds: f64,
    shots: u64,
    attempts: u64,
}

/// Times what `draw` draws until the slice is over. `draw` gets the flag it must
/// heed and what it must hand finished blocks to. `None` if not even one batch
/// was finished in time, or `stop` was raised.
pub fn time_shots(
    slice: Slice,
    stop: &Interrupt,
    draw: impl FnOnce(&Interrupt, &mut dyn FnMut(&Block)) -> Result<u64, SampleError>,
) -> Result<Option<Timing>, SampleError> {
    let flag = Interrupt::new();
    let given_up = AtomicBool::new(false);
    let started = Instant::now();
    let mut marks: Vec<Mark> = vec![Mark::default()];
    let drawn = std::thread::scope(|scope| {
        let watch = scope.spawn(|| {
            // Ends when it is unparked after the flag was raised.
            while !flag.raised() {
                if stop.raised() || started.elapsed().as_secs_f64() > slice.most {
                    given_up.store(true, Ordering::Relaxed);
                    flag.raise();
                    return;
                }
                std::thread::park_timeout(Duration::from_millis(10));
            }
        });
        let drawn = draw(&flag, &mut |block| {
            // A batch that was cut short took longer than its shots.
            if given_up.load(Ordering::Relaxed) {
                return;
            }
            let last = marks.last().copied().unwrap_or_default();
            let attempts: u64 = block
                .audit
                .iter()
                .map(|shot| u64::from(shot.attempts))
                .sum();
            let seconds = started.elapsed().as_secs_f64();
            marks.push(Mark {
                seconds,
                shots: last.shots + block.rows.shots as u64,
                attempts: last.attempts + attempts,
            });
            if seconds > slice.aim {
                flag.raise();
            }
        });
        flag.raise();
        watch.thread().unpark();
        drawn
    });
    drawn?;
    if stop.raised() {
        return Ok(None);
    }
    Ok(rate(&marks))
}

/// The rate of the marks without the first third of the time, in which
/// batches are still small and memory is still fresh.
fn rate(marks: &[Mark]) -> Option<Timing> {
    let last = *marks.last()?;
    let warm = marks
        .iter()
        .rfind(|mark| mark.seconds <= last.seconds / 3.0)?;
    let shots = last.shots - warm.shots;
    (shots > 0).then(|| Timing {
        seconds: (last.seconds - warm.seconds) / shots as f64,
        attempts: (last.attempts - warm.attempts) as f64 / shots as f64,
        shots,
    })
}
