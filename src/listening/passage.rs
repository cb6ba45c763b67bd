//! Which part of a recording is listened to.

use std::ops::Range;

use platewright_dsp::portable::decibels;
use platewright_dsp::signal::rms;

use crate::audio_files::Recording;
use crate::failure::{Failure, RequestError};
use crate::terminal;

/// Length where none is asked for, s: long enough for a phrase, short enough to be remembered.
const USUAL_SECONDS: f64 = 20.0;
/// ITU-R BS.1770-4 measures loudness in blocks of 0.4 s: anything shorter has none.
pub const SHORTEST_SECONDS: f64 = 0.4;
/// Level is followed in steps of this, s.
const STEP_SECONDS: f64 = 0.1;
/// Level movements this far below the loudest step do not count, dB: nobody compares stages on noise floors.
const COUNTED_DB: f64 = 40.0;

/// The frames of `recording` to listen to: from `from` and as long as `length` (s) where they are given, else the most
/// dynamic passage.
///
/// # Errors
/// [`RequestError`] where the recording is shorter than that or than loudness needs, or silent; a file error.
pub fn choose(recording: &Recording, from: Option<f64>, length: Option<f64>) -> Result<Range<u64>, Failure> {
    let name = terminal::path(recording.path());
    let rate = f64::from(recording.sample_rate());
    let all = recording.frames();
    if (all as f64) < SHORTEST_SECONDS * rate {
        return Err(RequestError::new(
            format!("{name}: {:.3} s long: loudness is defined from 0.4 s on", all as f64 / rate),
            "take a longer recording",
        )
        .into());
    }
    let start = from.map(|from| (from * rate).round() as u64);
    let wanted = (length.unwrap_or(USUAL_SECONDS) * rate).round() as u64;
    let left = all.saturating_sub(start.unwrap_or(0));
    let short_of = |needed: f64| (left as f64) < needed * rate;
    if short_of(SHORTEST_SECONDS) || (length.is_some() && wanted > left) {
        let seconds = all as f64 / rate;
        let asked = format!("{name} lasts {seconds:.2} s and cannot give the passage asked for");
        return Err(RequestError::new(asked, "choose --from and --length within it").into());
    }
    let frames = wanted.min(left);
    let (levels, step) = levels(recording)?;
    if levels.iter().all(|level| *level == f64::NEG_INFINITY) {
        return Err(RequestError::new(format!("{name} is silent"), "take one with sound in it").into());
    }
    let start = start.unwrap_or_else(|| most_dynamic(&levels, step, frames, all));
    Ok(start..start + frames)
}

/// The level of every step, dBFS rms over all channels, and the step's length in frames.
fn levels(recording: &Recording) -> Result<(Vec<f64>, usize), Failure> {
    let step = (STEP_SECONDS * f64::from(recording.sample_rate())).round() as usize;
    let mut blocks = recording.blocks()?;
    let mut planes = vec![Vec::new(); recording.channels()];
    let mut levels = Vec::new();
    while blocks.read(&mut planes, step)? > 0 {
        let loudest = planes.iter().map(|plane| rms(plane)).fold(0.0, f64::max);
        levels.push(if loudest > 0.0 { decibels(loudest) } else { f64::NEG_INFINITY });
    }
    Ok((levels, step))
}

/// The start of the passage in which level moves most from step to step; the earliest of equals.
fn most_dynamic(levels: &[f64], step: usize, frames: u64, all: u64) -> u64 {
    let loudest = levels.iter().copied().fold(f64::NEG_INFINITY, f64::max);
    let level = |k: usize| levels[k].max(loudest - COUNTED_DB);
    let moves: Vec<f64> = (1..levels.len()).map(|k| (level(k) - level(k - 1)).abs()).collect();
    let inside = (frames as usize / step).saturating_sub(1).min(moves.len());
    let last_start = (all - frames) / step as u64;
    let mut best = (0, 0.0);
    for start in 0..=last_start as usize {
        let end = (start + inside).min(moves.len());
        let movement: f64 = moves[start.min(end)..end].iter().sum();
        // A thousandth of a decibel is no more dynamic: sums in another place round otherwise.
        if movement > best.1 + 1e-3 {
            best = (start, movement);
        }
    }
    (best.0 * step) as u64
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_passage_in_which_level_moves_is_found() {
        // Ten seconds of a steady level, two that go up and down, ten of silence.
        let mut levels = vec![-20.0; 100];
        levels.extend((0..20).map(|k| if k % 2 == 0 { -12.0 } else { -30.0 }));
        levels.extend([f64::NEG_INFINITY; 100]);
        let start = most_dynamic(&levels, 4800, 2 * 48_000, 220 * 4800);
        let seconds = start as f64 / 48_000.0;
        assert!((9.8..=10.2).contains(&seconds), "from {seconds} s");
    }

    #[test]
    fn a_steady_recording_begins_at_its_start() {
        assert_eq!(most_dynamic(&[-20.0; 300], 4800, 48_000, 300 * 4800), 0);
        assert_eq!(most_dynamic(&[-20.0; 4], 4800, 4 * 4800, 4 * 4800), 0);
    }
}
