//! How loud a recording is, and for how long.

use platewright_dsp::portable::decibels;

use super::RecordingFigures;
use crate::audio_files::{AudioError, Recording};

/// Lowest bin of the histogram, dBFS.
const LOWEST: i32 = -60;
/// Peaks are taken over this long, s.
const WINDOW: f64 = 0.01;

/// The recording's level histogram; reads the whole file.
///
/// # Errors
/// The file can no longer be read, or the user interrupts.
pub fn of(recording: &Recording) -> Result<RecordingFigures, AudioError> {
    let rate = f64::from(recording.sample_rate());
    let frames = ((WINDOW * rate).round() as usize).max(1);
    let mut planes = vec![Vec::new(); recording.channels()];
    let mut blocks = recording.blocks()?;
    let mut counts = vec![0_u64; (1 - LOWEST) as usize];
    let mut largest = 0.0_f64;
    while blocks.read(&mut planes, frames)? > 0 {
        let peak = planes.iter().flatten().fold(0.0_f64, |peak, sample| peak.max(sample.abs()));
        largest = largest.max(peak);
        counts[bin(peak)] += 1;
    }
    let all = counts.iter().sum::<u64>().max(1) as f64;
    let name = recording.path().file_name().map_or_else(String::new, |name| name.to_string_lossy().into_owned());
    Ok(RecordingFigures {
        name,
        seconds: recording.frames() as f64 / rate,
        peak_dbfs: (largest > 0.0).then(|| decibels(largest)),
        levels_dbfs: (LOWEST..=0).map(f64::from).collect(),
        time_percent: counts.iter().map(|&count| 100.0 * count as f64 / all).collect(),
    })
}

/// The bin whose upper end is the first at or above the level.
fn bin(peak: f64) -> usize {
    if peak <= 0.0 {
        return 0;
    }
    (decibels(peak).ceil() as i32 - LOWEST).clamp(0, -LOWEST) as usize
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_level_falls_into_the_bin_that_ends_above_it() {
        assert_eq!(bin(1.0), 60);
        assert_eq!(bin(0.9), 60);
        assert_eq!(bin(0.5), 54);
        assert_eq!(bin(1e-9), 0);
        assert_eq!(bin(0.0), 0);
        assert_eq!(bin(1.5), 60);
    }
}
