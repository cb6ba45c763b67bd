//! What is put right in every take before it can be compared: polarity, DC, ends, level, and whole numbers.

use platewright_dsp::Kernel;
use platewright_dsp::portable::{decibels, ratio};
use platewright_dsp::signal::{LevelMeter, Levels, Resampler};

use crate::rendering::Planes;

/// Raised-cosine fades at both ends, s.
const FADE_SECONDS: f64 = 0.010;
/// The highest rate of a take, Hz: browsers decode it everywhere, and the FLAC encoder goes no further.
pub const HIGHEST_RATE: u32 = 96_000;
/// Full scale of the samples in a take: 24 bit.
const FULL_SCALE: f64 = 8_388_608.0;

/// Turns the sound around.
pub fn turn(planes: &mut Planes) {
    planes.iter_mut().flatten().for_each(|sample| *sample = -*sample);
}

/// Multiplies every sample.
pub fn scale(planes: &mut Planes, factor: f64) {
    planes.iter_mut().flatten().for_each(|sample| *sample *= factor);
}

/// Brings a take down to [`HIGHEST_RATE`] where its own is higher, and returns its rate.
pub fn limit_rate(planes: &mut Planes, rate: u32, kernel: Kernel) -> u32 {
    if rate <= HIGHEST_RATE {
        return rate;
    }
    // Recordings go up to 192 kHz, all of which the resampler takes.
    let Ok(resampler) = Resampler::new(rate, HIGHEST_RATE, kernel) else { return rate };
    for plane in planes {
        let mut resampler = resampler.clone();
        let mut lower = Vec::new();
        resampler.process(plane, &mut lower);
        resampler.finish(&mut lower);
        *plane = lower;
    }
    HIGHEST_RATE
}

/// Fades both ends in such a way that no DC is left, and returns what was taken from each channel.
pub fn remove_dc_and_fade(planes: &mut Planes, rate: u32) -> Vec<f64> {
    let frames = planes.first().map_or(0, Vec::len);
    let window = fades(frames, rate);
    let weight: f64 = window.iter().sum();
    let centre = |plane: &mut Vec<f64>| {
        let dc = plane.iter().zip(&window).map(|(sample, w)| sample * w).sum::<f64>() / weight;
        plane.iter_mut().zip(&window).for_each(|(sample, w)| *sample = (*sample - dc) * w);
        dc
    };
    planes.iter_mut().map(centre).collect()
}

/// 1 in the middle, raised cosines from and to 0 at the ends.
fn fades(frames: usize, rate: u32) -> Vec<f64> {
    let fade = ((FADE_SECONDS * f64::from(rate)).round() as usize).min(frames / 2);
    let up = |k: usize| 0.5 - 0.5 * libm::cos(std::f64::consts::PI * (k as f64 + 0.5) / fade as f64);
    let at = |k: usize| if k < fade { up(k) } else { 1.0 };
    (0..frames).map(|k| at(k.min(frames - 1 - k))).collect()
}

/// Loudness and true peak of a take.
pub fn levels(planes: &Planes, rate: u32) -> Option<Levels> {
    let mut meter = LevelMeter::new(planes.len(), rate).ok()?;
    meter.add(planes);
    Some(meter.finish())
}

/// The take at `gain_db` as 24-bit integers, one plane a channel, rounded to the nearest and not dithered: the error
/// lies 144 dB below full scale.
pub fn quantise(planes: &Planes, gain_db: f64) -> Vec<Vec<i32>> {
    let factor = FULL_SCALE * ratio(gain_db);
    // Peaks lie at −1 dBTP at most, so nothing ever comes near the limits.
    let whole = |sample: &f64| (sample * factor).round().clamp(-FULL_SCALE, FULL_SCALE - 1.0) as i32;
    planes.iter().map(|plane| plane.iter().map(whole).collect()).collect()
}

/// The take that integers stand for.
pub fn unquantise(planes: &[Vec<i32>]) -> Planes {
    planes.iter().map(|plane| plane.iter().map(|sample| f64::from(*sample) / FULL_SCALE).collect()).collect()
}

/// The largest DC of all channels, dBFS; none where there is none at all.
pub fn dc_dbfs(planes: &Planes) -> Option<f64> {
    let mean = |plane: &Vec<f64>| (plane.iter().sum::<f64>() / plane.len().max(1) as f64).abs();
    let largest = planes.iter().map(mean).fold(0.0, f64::max);
    (largest > 0.0).then(|| decibels(largest))
}

#[cfg(test)]
#[allow(clippy::disallowed_methods, reason = "test signals need not be the same on every CPU")]
mod tests {
    use super::*;

    #[test]
    fn fades_are_raised_cosines_of_ten_milliseconds() {
        let window = fades(48_000, 48_000);
        assert!(window[0] < 1e-4 && (window[239] + window[240] - 1.0).abs() < 1e-12);
        assert_eq!((window[480], window[47_519]), (1.0, 1.0));
        assert!(window.iter().zip(window.iter().rev()).all(|(a, b)| a == b), "both ends alike");
        assert_eq!(fades(3, 48_000).len(), 3);
    }

    #[test]
    fn no_dc_is_left_after_the_fades() {
        let offset = |k: i32| 0.1 + 0.3 * (f64::from(k) * 0.05).sin();
        let mut planes = vec![(0..20_000).map(offset).collect::<Vec<f64>>()];
        let dc = remove_dc_and_fade(&mut planes, 48_000);
        assert!((dc[0] - 0.1).abs() < 1e-3, "{dc:?}");
        let left = dc_dbfs(&unquantise(&quantise(&planes, -0.5))).unwrap_or(f64::NEG_INFINITY);
        assert!(left < -120.0, "{left} dBFS");
    }

    /// A sine of `peak` in every channel, a part after another: level in dBFS and length in s.
    fn parts(parts: &[(f64, f64)]) -> Planes {
        let tone = |(level, seconds): &(f64, f64)| {
            let peak = ratio(*level);
            (0..(seconds * 48_000.0) as usize)
                .map(move |n| peak * (std::f64::consts::TAU * 1000.0 * n as f64 / 48_000.0).sin())
                .collect::<Vec<f64>>()
        };
        vec![parts.iter().flat_map(tone).collect(); 2]
    }

    /// EBU Tech 3341, minimum requirements, tests 1 to 5 (signals made after its description, from memory): a stereo sine of
    /// 1 kHz reads its peak level in LUFS within 0.1 LU, and quiet parts are gated.
    #[test]
    fn loudness_meets_the_ebu_minimum_requirements() {
        let gated = [(-72.0, 10.0), (-36.0, 10.0), (-23.0, 60.0), (-36.0, 10.0), (-72.0, 10.0)];
        let cases: [(&[(f64, f64)], f64); 5] = [
            (&[(-23.0, 20.0)], -23.0),
            (&[(-33.0, 20.0)], -33.0),
            (&gated[1..4], -23.0),
            (&gated, -23.0),
            (&[(-26.0, 20.0), (-20.0, 20.1), (-26.0, 20.0)], -23.0),
        ];
        for (signal, expected) in cases {
            let read = levels(&parts(signal), 48_000).and_then(|levels| levels.loudness).unwrap();
            assert!((read - expected).abs() <= 0.1, "{signal:?}: {read} LUFS, not {expected}");
        }
    }

    /// EBU Tech 3341, tests 15 to 19 (from memory): sines at a part of the rate with a starting phase, whose true peak reads
    /// −6 dBTP, of the last +3 dBTP, within +0.2 and −0.4 dB.
    #[test]
    fn true_peak_meets_the_ebu_minimum_requirements() {
        let cases = [
            (4.0, 0.0, 0.5, -6.0),
            (4.0, 45.0, 0.5, -6.0),
            (6.0, 60.0, 0.5, -6.0),
            (8.0, 67.5, 0.5, -6.0),
            (4.0, 45.0, 1.41, 3.0),
        ];
        for (part, phase, peak, expected) in cases {
            let sample = |n: usize| peak * (std::f64::consts::TAU * n as f64 / part + f64::to_radians(phase)).sin();
            // Faded: a sine that sets in suddenly does swing beyond its own peak between the samples.
            let window = fades(48_000, 48_000);
            let planes = vec![(0..48_000).map(|n| window[n] * sample(n)).collect::<Vec<f64>>()];
            let read = decibels(levels(&planes, 48_000).unwrap().true_peak);
            assert!((-0.4..=0.2).contains(&(read - expected)), "rate/{part} at {phase} degrees: {read} dBTP");
        }
    }

    /// ITU-R BS.1770-4: a 997 Hz sine at 0 dBFS in one channel reads −3.01 LUFS.
    #[test]
    fn full_scale_sine_reads_as_published() {
        let sine = (0..96_000).map(|n| (std::f64::consts::TAU * 997.0 * f64::from(n) / 48_000.0).sin());
        let read = levels(&vec![sine.collect()], 48_000).and_then(|levels| levels.loudness).unwrap();
        assert!((read + 3.01).abs() <= 0.01, "{read} LUFS");
    }

    #[test]
    fn quantised_gain_is_the_stated_gain() {
        let planes = vec![(0..4800).map(|k| 0.5 * (f64::from(k) * 0.1).sin()).collect::<Vec<f64>>()];
        let back = unquantise(&quantise(&planes, -7.53));
        let energy = |planes: &Planes| planes[0].iter().map(|s| s * s).sum::<f64>();
        let gain = 10.0 * (energy(&back) / energy(&planes)).log10();
        assert!((gain + 7.53).abs() < 1e-4, "{gain} dB");
    }
}
