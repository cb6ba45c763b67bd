//! A wanted harmonic profile, how far a tone misses it, and the level at which a stage gives a wanted output.

use super::cycle::Cycle;
use super::steady_state::NoSteadyState;
use super::tone::Tone;
use crate::circuit::Network;
use crate::portable::{decibels, ratio};

/// What is wanted of a harmonic, dBc.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Want {
    /// This size.
    Exactly(f64),
    /// This size or less.
    AtMost(f64),
    /// This size or more.
    AtLeast(f64),
}

/// One harmonic of a profile.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Target {
    /// 2 is the octave.
    pub order: usize,
    /// What is wanted.
    pub want: Want,
    /// What it may be off before it counts, dB; at least 0.
    pub within_db: f64,
    /// How much a miss counts; above 0.
    pub weight: f64,
}

impl Target {
    /// How far a harmonic of `dbc` misses, dB: positive where it is too large, negative where it is too small.
    pub fn miss_db(&self, dbc: f64) -> f64 {
        let above = |wanted: f64| (dbc - wanted - self.within_db).max(0.0);
        let below = |wanted: f64| (dbc - wanted + self.within_db).min(0.0);
        match self.want {
            Want::Exactly(wanted) => above(wanted) + below(wanted),
            Want::AtMost(wanted) => above(wanted),
            Want::AtLeast(wanted) => below(wanted),
        }
    }
}

/// The distance of several misses, dB: √(Σ weight·miss² / Σ weight); `None` where one of them is not known or there is
/// none.
pub fn distance_db(misses: impl IntoIterator<Item = (Option<f64>, f64)>) -> Option<f64> {
    let (mut squares, mut weights) = (0.0, 0.0);
    for (miss, weight) in misses {
        let miss = miss?;
        squares += weight * miss * miss;
        weights += weight;
    }
    (weights > 0.0).then(|| (squares / weights).sqrt())
}

/// Why no level gives the wanted output.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum NoLevel {
    /// The output stays below it up to 100 × full scale.
    Never,
    /// No steady state was found on the way.
    NoSteadyState(NoSteadyState),
    /// The output could not be measured closely enough on the way.
    NotSettled,
}

impl std::fmt::Display for NoLevel {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self {
            NoLevel::Never => write!(f, "the output does not reach this level below 100 times full scale"),
            NoLevel::NoSteadyState(reason) => write!(f, "the output does not reach this level before {reason}"),
            NoLevel::NotSettled => write!(f, "the output level did not settle as the steps were made finer"),
        }
    }
}

impl std::error::Error for NoLevel {}

/// Stride of the search for a bracket, dB.
const STRIDE_DB: f64 = 3.0;
/// Lowest level that is looked at, under that at which a linear stage would give the output, dB.
const BELOW_LINEAR_DB: f64 = 40.0;
/// The search ends this far over full scale: 100 ×.
const ABOVE_FULL_SCALE_DB: f64 = 40.0;
/// What the output may be off, dB.
const CLOSE_DB: f64 = 1e-5;
/// Halvings and secants before the search is given up.
const TRIALS: usize = 60;

/// The input level in V rms at which the fundamental at `o` is `output_rms` volts at `frequency` Hz, by exact figures
/// within 0.00001 dB: the lowest such level near that of a linear stage.
///
/// # Errors
/// [`NoLevel`].
pub fn level_for_output(
    network: &Network,
    frequency: f64,
    output_rms: f64,
    full_scale: f64,
) -> Result<f64, NoLevel> {
    let cycle = |level: f64| Cycle::of(network, frequency, level).map_err(NoLevel::NoSteadyState);
    let excess = |level: f64| Ok(decibels(cycle(level)?.output_rms() / output_rms));
    let highest = full_scale * ratio(ABOVE_FULL_SCALE_DB);
    let small = (1e-3 * full_scale).min(highest);
    let linear = output_rms / cycle(small)?.gain();
    if !linear.is_finite() || linear <= 0.0 {
        return Err(NoLevel::Never);
    }
    let rough = bracketed(&excess, linear, highest)?;
    polished(network, frequency, output_rms, rough)
}

/// A root of `excess` (dB over what is wanted, by level) near `start`, by coarse cycles.
fn bracketed(excess: &dyn Fn(f64) -> Result<f64, NoLevel>, start: f64, highest: f64) -> Result<f64, NoLevel> {
    let start = start.min(highest);
    let mut low = (start, excess(start)?);
    let mut high = low;
    while high.1 < 0.0 {
        if high.0 >= highest {
            return Err(NoLevel::Never);
        }
        low = high;
        let level = (high.0 * ratio(STRIDE_DB)).min(highest);
        high = (level, excess(level)?);
    }
    while low.1 > 0.0 {
        if low.0 < start * ratio(-BELOW_LINEAR_DB) {
            return Err(NoLevel::Never);
        }
        high = low;
        let level = low.0 * ratio(-STRIDE_DB);
        low = (level, excess(level)?);
    }
    for _ in 0..TRIALS {
        if high.1 - low.1 < CLOSE_DB {
            break;
        }
        // A straight line between decibels meets a nearly linear stage at once; halving keeps it honest.
        let share = (-low.1 / (high.1 - low.1)).clamp(0.02, 0.98);
        let level = low.0 * ratio(share * decibels(high.0 / low.0));
        let middle = (level, excess(level)?);
        if middle.1.abs() < CLOSE_DB {
            return Ok(level);
        }
        if middle.1 < 0.0 { low = middle } else { high = middle }
    }
    Ok(high.0)
}

/// The level corrected until the exact figure is met.
fn polished(network: &Network, frequency: f64, output_rms: f64, rough: f64) -> Result<f64, NoLevel> {
    let excess = |level: f64| -> Result<f64, NoLevel> {
        let tone = Tone::measure(network, frequency, level, 1).map_err(NoLevel::NoSteadyState)?;
        Ok(decibels(tone.output_rms().ok_or(NoLevel::NotSettled)? / output_rms))
    };
    let mut last = (rough, excess(rough)?);
    // Near the root a stage gives a little less than 1 dB a dB.
    let mut slope = 1.0;
    for _ in 0..TRIALS {
        if last.1.abs() < CLOSE_DB {
            return Ok(last.0);
        }
        let level = last.0 * ratio(-last.1 / slope);
        let next = (level, excess(level)?);
        let measured = (next.1 - last.1) / decibels(next.0 / last.0);
        if measured.is_finite() && measured > 0.01 {
            slope = measured;
        }
        last = next;
    }
    Err(NoLevel::NotSettled)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn target(want: Want, within_db: f64, weight: f64) -> Target {
        Target { order: 2, want, within_db, weight }
    }

    #[test]
    fn a_miss_is_what_lies_beyond_the_tolerance() {
        let exactly = target(Want::Exactly(-46.0), 1.0, 1.0);
        for (dbc, miss) in [(-46.0, 0.0), (-45.0, 0.0), (-47.0, 0.0), (-43.5, 1.5), (-50.0, -3.0)] {
            assert_eq!(exactly.miss_db(dbc), miss, "{dbc} dBc");
        }
        let at_most = target(Want::AtMost(-70.0), 2.0, 1.0);
        for (dbc, miss) in [(-90.0, 0.0), (-70.0, 0.0), (-68.0, 0.0), (-60.0, 8.0)] {
            assert_eq!(at_most.miss_db(dbc), miss, "{dbc} dBc");
        }
        let at_least = target(Want::AtLeast(-60.0), 0.0, 1.0);
        for (dbc, miss) in [(-20.0, 0.0), (-60.0, 0.0), (-64.0, -4.0)] {
            assert_eq!(at_least.miss_db(dbc), miss, "{dbc} dBc");
        }
    }

    #[test]
    fn the_distance_weighs_squares() {
        // √((1·3² + 2·0²)/3) = √3; one miss alone is its size whatever its weight; √((4 + 3·16)/4) = √13.
        let distance = |misses: &[(Option<f64>, f64)]| distance_db(misses.iter().copied());
        assert_eq!(distance(&[(Some(3.0), 1.0), (Some(0.0), 2.0)]), Some(3.0f64.sqrt()));
        assert_eq!(distance(&[(Some(-2.0), 0.25)]), Some(2.0));
        assert_eq!(distance(&[(Some(2.0), 1.0), (Some(-4.0), 3.0)]), Some(13.0f64.sqrt()));
        assert_eq!(distance(&[(Some(2.0), 1.0), (None, 1.0)]), None);
        assert_eq!(distance(&[]), None);
    }
}
