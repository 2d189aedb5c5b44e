//! Which read-out a run takes where none is asked for.
//!
//! Rough costs settle it where the answer is plain (one is more than
//! [`PLAIN`] times cheaper) or does not matter (the cheaper one needs less than
//! [`SMALL`] seconds for all shots). In between a fraction of a second is spent
//! on shots of both, and the rough answer is given up only where the other
//! read-out is cheaper by [`MARGIN`] or more: so noise of the clock does not
//! decide between equals, and a wrong choice costs little.
//!
//! A choice that was measured may differ from one machine, or one day, to
//! another. The bits of a shot depend on the read-out, therefore a part of a run
//! (`--part`) never measures: its choice follows from the circuit and the
//! options alone, memory that is too small aside, and all parts agree.

use crate::program::Program;
use crate::readout::Interrupt;
use crate::readout::choice::{self, Choice, ChoiceError, Readout, Wish};
use crate::sampler::{Drive, SampleError};

use super::model::counted_bytes;
use super::profile::Profile;
use super::survey::Survey;

/// Ratio of rough costs that needs no measurement.
pub const PLAIN: f64 = 20.0;
/// Rough seconds of a run below which no measurement pays.
pub const SMALL: f64 = 2.0;
/// By how much the other read-out must be cheaper to be taken.
pub const MARGIN: f64 = 1.15;

/// Seconds of measuring a read-out at most, and as a share of the run.
const AIM: f64 = 0.15;
const AIM_SHARE: f64 = 0.015;

/// How many shots there are to draw.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Work {
    /// Shots.
    pub shots: u64,
    /// Companion shots, or none for the usual number.
    pub companion: Option<u64>,
}

/// Chooses a read-out. Where shots must be timed `drive` draws them; `stop`
/// ends that early. Nothing is timed unless `may_time` is set: the choice then
/// depends on nothing but the program and the wish.
pub fn choose<'p>(
    program: &'p Program,
    log_extent: f64,
    wish: &Wish,
    work: Work,
    may_time: bool,
    stop: &'p Interrupt,
    drive: impl FnOnce() -> Drive<'p>,
) -> Result<Choice, ChoiceError> {
    let only = |readout| {
        let wish = Wish {
            readout: Some(readout),
            ..*wish
        };
        choice::choose(program, log_extent, &wish)
    };
    let (None, Ok(dense), Ok(walk)) = (wish.readout, only(Readout::Dense), only(Readout::Walk))
    else {
        return choice::choose(program, log_extent, wish);
    };
    let shots = work.shots as f64 / wish.threads.max(1) as f64;
    let rough = [&dense, &walk].map(|choice| shots * choice::rough_seconds(program, choice));
    let guess = usize::from(rough[1] < rough[0]);
    let ratio = rough[1 - guess] / rough[guess];
    let mut chosen = guess;
    if may_time && rough[guess] > SMALL && ratio < PLAIN {
        let survey = Survey::new(drive(), log_extent, wish.threads, wish.memory as f64, stop);
        // What cannot be timed is left to the rough costs; an error of a branch
        // comes up again in the run itself.
        let aim = AIM.min(AIM_SHARE * rough[guess]);
        if let Ok(Some(found)) = timed(survey, program, &dense, &walk, work, aim)
            && found[1 - guess] * MARGIN < found[guess]
        {
            chosen = 1 - guess;
        }
    }
    Ok([dense, walk][chosen])
}

/// Seconds a shot of both read-outs, the share of companion shots included.
fn timed(
    mut survey: Survey<'_>,
    program: &Program,
    dense: &Choice,
    walk: &Choice,
    work: Work,
    aim: f64,
) -> Result<Option<[f64; 2]>, SampleError> {
    let profile = Profile::new(program);
    let Some(exact) = survey.dense(Some(dense), &profile, aim)? else {
        return Ok(None);
    };
    let terms = walk.terms.unwrap_or(1);
    let Some(found) = survey.walk(terms, terms, counted_bytes(program), aim)? else {
        return Ok(None);
    };
    let mut sampled = found.cost.predict(terms as f64).seconds;
    let companion = work.companion.unwrap_or(work.shots);
    if companion > 0
        && work.shots > 0
        && let Some(timing) = survey.companion(aim / 3.0)?
    {
        sampled += timing.seconds * companion as f64 / work.shots as f64;
    }
    Ok(Some([exact.seconds, sampled]))
}
