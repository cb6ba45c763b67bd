//! Levels of recorded sound: peak, rms, true peak and loudness.

use ebur128::{EbuR128, Mode};

use super::resample::Resampler;
use crate::lanes::Kernel;

/// The largest absolute sample; 0 for none.
pub fn peak(samples: &[f64]) -> f64 {
    samples.iter().fold(0.0, |peak, sample| peak.max(sample.abs()))
}

/// The root of the mean square; 0 for none.
pub fn rms(samples: &[f64]) -> f64 {
    let energy: f64 = samples.iter().map(|sample| sample * sample).sum();
    libm::sqrt(energy / samples.len().max(1) as f64)
}

/// The rate for which ITU-R BS.1770-4 gives its filters, Hz.
const LOUDNESS_RATE: u32 = 48_000;

/// Loudness and true peak by ITU-R BS.1770-4, over blocks as they come.
///
/// The meter's filters rest on the system's mathematical functions, whose last bit differs between CPUs: what it reads
/// is rounded far above that and far below what can be heard.
pub struct LevelMeter {
    loudness: EbuR128,
    true_peak: EbuR128,
    /// To [`LOUDNESS_RATE`]: the same filters at another rate read up to 0.02 dB apart.
    resamplers: Vec<Resampler>,
    resampled: Vec<Vec<f64>>,
    interleaved: Vec<f64>,
    peak: f64,
}

/// What a [`LevelMeter`] has read; 1.0 is full scale.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Levels {
    /// The largest absolute sample of all channels.
    pub peak: f64,
    /// The largest value of all channels with the sound between the samples included, at four times the rate (twice
    /// from 96 kHz, once from 192 kHz): 0.6 dB low at the very worst. In steps of 10⁻⁶.
    pub true_peak: f64,
    /// Integrated loudness in LUFS; in steps of 0.001; none where no 0.4 s rise above −70 LUFS.
    pub loudness: Option<f64>,
}

/// A number of channels or a sample rate that the meter cannot take.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct BadMeter {
    /// Channels asked for.
    pub channels: usize,
    /// Sample rate asked for, Hz.
    pub sample_rate: u32,
}

impl std::fmt::Display for BadMeter {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        write!(f, "loudness of {} channels at {} Hz cannot be measured", self.channels, self.sample_rate)
    }
}

impl std::error::Error for BadMeter {}

impl LevelMeter {
    /// A meter for planes of samples.
    ///
    /// Channels are weighted as the standard's left, right, centre, (low-frequency channel, left out), left and right
    /// surround; beyond these they do not count for loudness.
    ///
    /// # Errors
    /// No channels or more than 64, or a sample rate outside 8 to 192 kHz.
    pub fn new(channels: usize, sample_rate: u32) -> Result<Self, BadMeter> {
        let bad = BadMeter { channels, sample_rate };
        let count = u32::try_from(channels).map_err(|_| bad)?;
        let resampler = Resampler::new(sample_rate, LOUDNESS_RATE, Kernel::detect()).map_err(|_| bad)?;
        Ok(LevelMeter {
            loudness: EbuR128::new(count, LOUDNESS_RATE, Mode::I).map_err(|_| bad)?,
            true_peak: EbuR128::new(count, sample_rate, Mode::TRUE_PEAK).map_err(|_| bad)?,
            resamplers: vec![resampler; channels],
            resampled: vec![Vec::new(); channels],
            interleaved: Vec::new(),
            peak: 0.0,
        })
    }

    /// Takes a block, one plane a channel.
    ///
    /// # Panics
    /// If the number of planes is not the meter's, or they differ in length.
    pub fn add(&mut self, planes: &[impl AsRef<[f64]>]) {
        assert_eq!(planes.len(), self.resamplers.len(), "one plane a channel");
        assert!(
            planes.iter().all(|plane| plane.as_ref().len() == planes[0].as_ref().len()),
            "planes of one length"
        );
        self.peak = planes.iter().fold(self.peak, |largest, plane| largest.max(peak(plane.as_ref())));
        feed(&mut self.true_peak, planes, &mut self.interleaved);
        for ((resampler, plane), output) in self.resamplers.iter_mut().zip(planes).zip(&mut self.resampled) {
            output.clear();
            resampler.process(plane.as_ref(), output);
        }
        feed(&mut self.loudness, &self.resampled, &mut self.interleaved);
    }

    /// What has been read.
    pub fn finish(mut self) -> Levels {
        for (resampler, output) in self.resamplers.iter_mut().zip(&mut self.resampled) {
            output.clear();
            resampler.finish(output);
        }
        feed(&mut self.loudness, &self.resampled, &mut self.interleaved);
        let channels = 0..self.true_peak.channels();
        let between = channels.filter_map(|channel| self.true_peak.true_peak(channel).ok()).fold(0.0, f64::max);
        let true_peak = self.peak.max((between * 1e6).round() / 1e6);
        let loudness = self.loudness.loudness_global().ok().filter(|loudness| loudness.is_finite());
        let loudness = loudness.map(|loudness| (loudness * 1e3).round() / 1e3);
        Levels { peak: self.peak, true_peak, loudness }
    }
}

/// Loudness alone by ITU-R BS.1770-4, over blocks as they come: what a [`LevelMeter`] reads, for less work.
pub struct LoudnessMeter {
    loudness: EbuR128,
    resamplers: Vec<Resampler>,
    resampled: Vec<Vec<f64>>,
    interleaved: Vec<f64>,
}

impl LoudnessMeter {
    /// A meter for planes of samples.
    ///
    /// # Errors
    /// No channels or more than 64, or a sample rate outside 8 to 192 kHz.
    pub fn new(channels: usize, sample_rate: u32) -> Result<Self, BadMeter> {
        let bad = BadMeter { channels, sample_rate };
        let count = u32::try_from(channels).map_err(|_| bad)?;
        // At the filters' own rate there is nothing to resample.
        let needed = if sample_rate == LOUDNESS_RATE { 0 } else { channels };
        let resampler = Resampler::new(sample_rate, LOUDNESS_RATE, Kernel::detect()).map_err(|_| bad)?;
        Ok(LoudnessMeter {
            loudness: EbuR128::new(count, LOUDNESS_RATE, Mode::I).map_err(|_| bad)?,
            resamplers: vec![resampler; needed],
            resampled: vec![Vec::new(); channels],
            interleaved: Vec::new(),
        })
    }

    /// Takes a block, one plane a channel.
    ///
    /// # Panics
    /// If the number of planes is not the meter's, or they differ in length.
    pub fn add(&mut self, planes: &[impl AsRef<[f64]>]) {
        assert_eq!(planes.len(), self.resampled.len(), "one plane a channel");
        if self.resamplers.is_empty() {
            return feed(&mut self.loudness, planes, &mut self.interleaved);
        }
        for ((resampler, plane), output) in self.resamplers.iter_mut().zip(planes).zip(&mut self.resampled) {
            output.clear();
            resampler.process(plane.as_ref(), output);
        }
        feed(&mut self.loudness, &self.resampled, &mut self.interleaved);
    }

    /// Integrated loudness in LUFS, in steps of 0.001; none where no 0.4 s rise above −70 LUFS.
    pub fn finish(mut self) -> Option<f64> {
        if !self.resamplers.is_empty() {
            for (resampler, output) in self.resamplers.iter_mut().zip(&mut self.resampled) {
                output.clear();
                resampler.finish(output);
            }
            feed(&mut self.loudness, &self.resampled, &mut self.interleaved);
        }
        let loudness = self.loudness.loudness_global().ok().filter(|loudness| loudness.is_finite());
        loudness.map(|loudness| (loudness * 1e3).round() / 1e3)
    }
}

fn feed(meter: &mut EbuR128, planes: &[impl AsRef<[f64]>], interleaved: &mut Vec<f64>) {
    interleaved.clear();
    for frame in 0..planes[0].as_ref().len() {
        interleaved.extend(planes.iter().map(|plane| plane.as_ref()[frame]));
    }
    let added = meter.add_frames_f64(interleaved);
    debug_assert!(added.is_ok(), "whole frames");
}

#[cfg(test)]
mod tests {
    #![allow(clippy::disallowed_methods, reason = "a test may differ in the last bit from machine to machine")]

    use super::*;

    fn tone(frequency: f64, rate: u32, seconds: usize, peak: f64, phase: f64) -> Vec<f64> {
        let turn = std::f64::consts::TAU * frequency / f64::from(rate);
        (0..seconds * rate as usize).map(|n| peak * (turn * n as f64 + phase).sin()).collect()
    }

    fn loudness(planes: &[Vec<f64>], rate: u32) -> Option<f64> {
        let mut meter = LevelMeter::new(planes.len(), rate).unwrap();
        for start in (0..planes[0].len()).step_by(1000) {
            let end = (start + 1000).min(planes[0].len());
            meter.add(&planes.iter().map(|plane| &plane[start..end]).collect::<Vec<_>>());
        }
        let read = meter.finish().loudness;
        let mut alone = LoudnessMeter::new(planes.len(), rate).unwrap();
        alone.add(planes);
        match (read, alone.finish()) {
            (Some(a), Some(b)) => assert!((a - b).abs() < 0.002, "{a} {b}"),
            (a, b) => assert_eq!(a, b),
        }
        read
    }

    /// ITU-R BS.1770-4: a 997 Hz sine at 0 dBFS in one front channel reads −3.01 LUFS.
    #[test]
    fn full_scale_sine_in_one_channel_reads_minus_3_01() {
        for rate in [8000, 44100, 48000, 96000, 192_000] {
            let sine = tone(997.0, rate, 5, 1.0, 0.0);
            let silence = vec![0.0; sine.len()];
            for planes in [vec![sine.clone()], vec![sine.clone(), silence.clone()], vec![silence, sine]] {
                let read = loudness(&planes, rate).unwrap();
                assert!((read + 3.01).abs() < 0.01, "{rate} Hz, {} channels: {read}", planes.len());
            }
        }
    }

    /// EBU Tech 3341, minimum requirements test 3 (from memory): −36, −23 and −36 dBFS for 10, 60 and 10 s in both
    /// channels read −23 LUFS, as the gate leaves the quiet parts out.
    #[test]
    fn quiet_parts_are_gated() {
        let part = |level: f64, seconds| tone(1000.0, 48000, seconds, 10_f64.powf(level / 20.0), 0.0);
        let plane = [part(-36.0, 10), part(-23.0, 60), part(-36.0, 10)].concat();
        let read = loudness(&[plane.clone(), plane], 48000).unwrap();
        assert!((read + 23.0).abs() < 0.1, "{read}");
    }

    #[test]
    fn silence_has_no_loudness() {
        assert_eq!(loudness(&[vec![0.0; 48000]], 48000), None);
    }

    /// A sine at a quarter of the rate, sampled 45° beside its crests: samples at 0.707, true peak 1.
    #[test]
    fn true_peak_finds_crests_between_samples() {
        let sine = tone(12_000.0, 48000, 1, 1.0, std::f64::consts::FRAC_PI_4);
        assert!((peak(&sine) - 0.5_f64.sqrt()).abs() < 1e-9);
        let mut meter = LevelMeter::new(1, 48000).unwrap();
        meter.add(&[&sine]);
        // EBU Tech 3341 allows −0.4 to +0.2 dB.
        let error_db = 20.0 * meter.finish().true_peak.log10();
        assert!((-0.4..=0.2).contains(&error_db), "{error_db} dB");
    }

    #[test]
    fn rms_of_a_sine_is_its_peak_over_root_two() {
        assert!((rms(&tone(1000.0, 48000, 1, 0.8, 0.3)) - 0.8 / 2_f64.sqrt()).abs() < 1e-12);
        assert_eq!((rms(&[]), peak(&[])), (0.0, 0.0));
    }

    #[test]
    fn impossible_meters_are_refused() {
        assert!(LevelMeter::new(0, 48000).is_err());
        assert!(LevelMeter::new(2, 0).is_err());
    }
}
