//! Measures what shots of a program cost on this machine, read-out by read-out.

use std::time::Instant;

use crate::program::MAX_SLOTS;
use crate::readout::choice::{Choice, Readout};
use crate::readout::probe::Settings;
use crate::sampler::{Block, Drive, Interrupt, SampleError, Silent};

use super::dense::{self, Passes};
use super::measure::{Slice, Timing, time_shots};
use super::probe::{FEW, MANY, ProbeCost};
use super::profile::Profile;
use super::resident;
use super::walk::{Predicted, Rung, WalkCost, ladder};

/// More shots than any measurement draws.
const PLENTY: u64 = 1 << 40;

/// Longest that the shots of one rung of the ladder may take, seconds.
const LONGEST_RUNG: f64 = 0.8;

/// Longest that one dense shot may take to be measured whole, seconds on one
/// thread.
const LONGEST_DENSE: f64 = 0.4;

/// Measures shots of one program.
pub struct Survey<'p> {
    drive: Drive<'p>,
    log_extent: f64,
    threads: usize,
    /// Most bytes that all registers may take while measuring.
    memory: f64,
    stop: &'p Interrupt,
}

/// What is known of the walk.
#[derive(Debug, Clone, PartialEq)]
pub struct WalkSurvey {
    /// Time of a shot.
    pub cost: WalkCost,
    /// Bytes that one more term of one thread took, if it could be told.
    pub bytes_per_term: Option<f64>,
}

impl<'p> Survey<'p> {
    /// Measures with a drive; `memory` is in bytes, `stop` ends the work early.
    pub fn new(
        drive: Drive<'p>,
        log_extent: f64,
        threads: usize,
        memory: f64,
        stop: &'p Interrupt,
    ) -> Self {
        Survey {
            drive,
            log_extent,
            threads: threads.max(1),
            memory,
            stop,
        }
    }

    fn time(&self, choice: &Choice, slice: Slice) -> Result<Option<Timing>, SampleError> {
        time_shots(slice, self.stop, |flag, sink| {
            self.drive
                .shots(choice, 0..PLENTY, flag, &mut Silent, |block: &Block| {
                    sink(block);
                    Ok(())
                })
        })
    }

    /// Time of a companion shot.
    pub fn companion(&self, seconds: f64) -> Result<Option<Timing>, SampleError> {
        let slice = Slice {
            aim: seconds,
            most: 10.0 * seconds,
        };
        time_shots(slice, self.stop, |flag, sink| {
            self.drive
                .companion(0..PLENTY, flag, &mut Silent, |block: &Block| {
                    sink(block);
                    Ok(())
                })
        })
    }

    /// Some finished companion shots, for timing what is done with them.
    pub fn companion_blocks(&self, shots: u64) -> Result<Vec<Block>, SampleError> {
        self.keep(|flag, sink| {
            self.drive
                .companion(0..shots, flag, &mut Silent, |block: &Block| {
                    sink(block);
                    Ok(())
                })
        })
    }

    fn keep(
        &self,
        draw: impl FnOnce(&Interrupt, &mut dyn FnMut(&Block)) -> Result<u64, SampleError>,
    ) -> Result<Vec<Block>, SampleError> {
        let slice = Slice {
            aim: 0.05,
            most: 1.0,
        };
        let mut blocks = Vec::new();
        time_shots(slice, self.stop, |flag, sink| {
            draw(flag, &mut |block| {
                sink(block);
                blocks.push(block.clone());
            })
        })?;
        Ok(blocks)
    }

    /// The walk for numbers of terms from `least` to `most`; `seconds` is what it
    /// may take in all, about. A term takes `bytes_per_term` at least.
    pub fn walk(
        &mut self,
        least: u64,
        most: u64,
        bytes_per_term: f64,
        seconds: f64,
    ) -> Result<Option<WalkSurvey>, SampleError> {
        let room = self.memory / (self.threads as f64 * bytes_per_term * 1.5);
        let rungs = ladder(least, most, 5.0);
        let aim = (seconds / rungs.len().min(6) as f64).clamp(0.05, 0.35);
        let mut measured: Vec<Rung> = Vec::new();
        let mut footprint: Vec<(f64, f64)> = Vec::new();
        let started = Instant::now();
        for terms in rungs {
            // However slow the machine is: what was measured must do.
            if !measured.is_empty() && started.elapsed().as_secs_f64() > 2.5 * seconds {
                break;
            }
            if let Some(last) = measured.last() {
                let batch = last.timing.seconds * self.threads as f64 * terms as f64;
                if batch / last.terms as f64 > LONGEST_RUNG {
                    break;
                }
            }
            if terms as f64 > room && !measured.is_empty() {
                break;
            }
            let Some(rung) = self.rung(terms, aim)? else {
                break;
            };
            measured.push(rung);
            if let Some(peak) = resident::peak() {
                footprint.push((terms as f64, peak));
            }
        }
        let kept = self.kept(&measured, aim)?;
        let sites = self.drive.program.sites();
        let cost = WalkCost::new(sites, self.log_extent, measured, kept);
        Ok(cost.map(|cost| WalkSurvey {
            cost,
            bytes_per_term: slope(&footprint).map(|bytes| bytes / self.threads as f64),
        }))
    }

    /// One rung: with the acceptance of a run, or where no shot is accepted in
    /// time with every shot kept.
    fn rung(&mut self, terms: u64, aim: f64) -> Result<Option<Rung>, SampleError> {
        let slice = Slice {
            aim,
            most: aim + 2.0 * LONGEST_RUNG,
        };
        let choice = self.walk_choice(terms);
        for forced in [false, true] {
            self.drive.accept_all = forced;
            let timing = self.time(&choice, slice);
            self.drive.accept_all = false;
            if let Some(timing) = timing? {
                return Ok(Some(Rung {
                    terms,
                    timing,
                    forced,
                }));
            }
            if self.stop.raised() {
                break;
            }
        }
        Ok(None)
    }

    /// A rung once more with every shot kept: the one whose draws are rejected
    /// most among those measured well.
    fn kept(&mut self, rungs: &[Rung], aim: f64) -> Result<Option<Rung>, SampleError> {
        let well = |rung: &&Rung| !rung.forced && rung.timing.shots >= 100;
        let Some(&rung) = rungs.iter().filter(well).max_by(|a, b| {
            let attempts = |rung: &Rung| rung.timing.attempts;
            attempts(a).total_cmp(&attempts(b))
        }) else {
            return Ok(None);
        };
        if rung.timing.attempts < 1.2 {
            return Ok(None);
        }
        let slice = Slice {
            aim,
            most: 4.0 * aim,
        };
        self.drive.accept_all = true;
        let timing = self.time(&self.walk_choice(rung.terms), slice);
        self.drive.accept_all = false;
        Ok(timing?.map(|timing| Rung {
            terms: rung.terms,
            timing,
            forced: true,
        }))
    }

    fn walk_choice(&self, terms: u64) -> Choice {
        Choice {
            readout: Readout::Walk,
            terms: Some(terms),
            mixing_weight: 0.0,
            probe: None,
            memory: 0,
            room: MAX_SLOTS,
        }
    }

    /// The probe, measured with at most `most` terms, and with the real settings of
    /// the costliest of `anchors` whose shots are short enough.
    pub fn probe(
        &mut self,
        most: u64,
        anchors: &[Choice],
        seconds: f64,
    ) -> Result<Option<ProbeCost>, SampleError> {
        const FIRST: u64 = 32;
        let slice = Slice {
            aim: seconds / 3.0,
            most: seconds.max(0.5),
        };
        let Some(first) = self.probe_timing(FIRST.min(most), FEW, slice)? else {
            return Ok(None);
        };
        // As many terms as a few shots of the longer run leave time for.
        let longer = first.seconds * self.threads as f64 * (MANY / FEW) as f64;
        let scale = (slice.aim / 2.0 / longer).max(1.0);
        let terms = ((FIRST as f64 * scale) as u64).clamp(1, most.min(1 << 16));
        let Some(few) = self.probe_timing(terms, FEW, slice)? else {
            return Ok(None);
        };
        let Some(many) = self.probe_timing(terms, MANY, slice)? else {
            return Ok(None);
        };
        let measurements = self.drive.program.inner_measurements();
        let cost = ProbeCost::new(
            self.log_extent,
            measurements,
            terms,
            few.seconds,
            many.seconds,
        );
        let anchor = anchors
            .iter()
            .filter_map(|choice| {
                let (terms, probes) = (choice.terms? as f64, choice.probe?.probes as f64);
                Some((choice, terms, probes, cost.predict(terms, probes)))
            })
            .filter(|&(.., predicted)| predicted * self.threads as f64 <= LONGEST_RUNG / 2.0)
            .max_by(|a, b| a.3.total_cmp(&b.3));
        let Some((choice, terms, probes, _)) = anchor else {
            return Ok(Some(cost));
        };
        let slice = Slice {
            aim: seconds,
            most: seconds + 2.0 * LONGEST_RUNG,
        };
        Ok(Some(match self.time(choice, slice)? {
            Some(timing) => cost.anchored(terms, probes, timing.attempts, timing.seconds),
            None => cost,
        }))
    }

    fn probe_timing(
        &mut self,
        terms: u64,
        probes: usize,
        slice: Slice,
    ) -> Result<Option<Timing>, SampleError> {
        let choice = Choice {
            readout: Readout::Probe,
            probe: Some(Settings {
                probes,
                cap: 1.0,
                branches: self.drive.program.branches(),
            }),
            ..self.walk_choice(terms)
        };
        self.drive.accept_all = true;
        let timing = self.time(&choice, slice);
        self.drive.accept_all = false;
        timing
    }

    /// The dense read-out: whole shots where they are short enough and `choice`
    /// says that they can be drawn, else from single passes.
    pub fn dense(
        &self,
        choice: Option<&Choice>,
        profile: &Profile,
        seconds: f64,
    ) -> Result<Option<Predicted>, SampleError> {
        if let Some(choice) = choice
            && dense::guess(profile) < LONGEST_DENSE
        {
            let slice = Slice {
                aim: seconds,
                most: seconds + 4.0 * LONGEST_DENSE,
            };
            if let Some(timing) = self.time(choice, slice)? {
                return Ok(Some(Predicted {
                    seconds: timing.seconds,
                    extrapolated: false,
                }));
            }
        }
        if self.stop.raised() {
            return Ok(None);
        }
        // At least the register of the circuit itself, if it is small.
        let active = profile.steps.len().saturating_sub(1).max(2);
        let passes = Passes::measure(active, self.stop);
        Ok(passes.map(|passes| Predicted {
            seconds: passes.predict(profile),
            extrapolated: true,
        }))
    }
}

/// Slope between the last two points, where it stands out from the pages that a
/// process touches anyway.
fn slope(points: &[(f64, f64)]) -> Option<f64> {
    const LEAST: f64 = 8.0 * 1_048_576.0;
    let &(most, high) = points.last()?;
    let &(terms, low) = points.iter().rfind(|&&(terms, _)| terms <= most / 2.0)?;
    (high - low >= LEAST).then(|| (high - low) / (most - terms))
}
