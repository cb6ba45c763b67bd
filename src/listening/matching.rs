//! One loudness for all takes of a recording, reached by lowering alone.

use platewright_dsp::portable::decibels;
use platewright_dsp::signal::Levels;

/// No take may come above this true peak, dBTP: room for players that convert rates or code.
pub const HIGHEST_TRUE_PEAK: f64 = -1.0;

/// What one take is lowered by, and from where.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Match {
    /// Loudness before, LUFS.
    pub loudness: f64,
    /// True peak before, dBTP.
    pub true_peak: f64,
    /// Gain, dB: 0 or below.
    pub gain: f64,
}

/// The common loudness and each take's way to it. Takes stand as they were read, before any gain. `Err` is the index of
/// a take that has no loudness.
///
/// Loudness is counted in hundredths of an LU, so that a gain, which ends in the bytes of files, does not hang on the
/// last bits of a meter.
pub fn match_loudness(takes: &[Levels]) -> Result<(f64, Vec<Match>), usize> {
    let mut read = Vec::new();
    for (index, levels) in takes.iter().enumerate() {
        let loudness = levels.loudness.ok_or(index)?;
        let true_peak = decibels(levels.true_peak);
        read.push((hundredths(loudness, f64::round), hundredths(true_peak, f64::ceil)));
    }
    let highest = hundredths(HIGHEST_TRUE_PEAK, f64::round);
    let target = read.iter().map(|(loudness, peak)| (*loudness).min(highest - peak + loudness)).min().unwrap_or(0);
    let unit = |count: i64| count as f64 / 100.0;
    let matched = |(loudness, peak): &(i64, i64)| Match {
        loudness: unit(*loudness),
        true_peak: unit(*peak),
        gain: unit(target - loudness),
    };
    Ok((unit(target), read.iter().map(matched).collect()))
}

fn hundredths(value: f64, round: fn(f64) -> f64) -> i64 {
    // A hair below, so that a ceiling does not go up for a rounding error.
    round(value * 100.0 - 1e-6) as i64
}

#[cfg(test)]
#[allow(clippy::disallowed_methods, reason = "test signals need not be the same on every CPU")]
mod tests {
    use super::*;

    fn levels(loudness: f64, true_peak_db: f64) -> Levels {
        let true_peak = 10_f64.powf(true_peak_db / 20.0);
        Levels { peak: true_peak, true_peak, loudness: Some(loudness) }
    }

    #[test]
    fn the_quietest_take_stays_and_the_others_come_down() {
        let (target, matches) = match_loudness(&[levels(-20.0, -3.0), levels(-23.5, -8.0)]).unwrap();
        assert_eq!((target, matches[0].gain, matches[1].gain), (-23.5, -3.5, 0.0));
    }

    #[test]
    fn a_high_peak_takes_all_down_with_it() {
        let (target, matches) = match_loudness(&[levels(-20.0, -3.0), levels(-24.0, 0.5)]).unwrap();
        assert_eq!((target, matches[0].gain, matches[1].gain), (-25.5, -5.5, -1.5));
        assert!(matches.iter().all(|m| m.gain <= 0.0 && m.true_peak + m.gain <= HIGHEST_TRUE_PEAK));
    }

    #[test]
    fn a_take_without_loudness_is_named() {
        let silent = Levels { peak: 0.0, true_peak: 0.0, loudness: None };
        assert_eq!(match_loudness(&[levels(-20.0, -3.0), silent]), Err(1));
    }
}
