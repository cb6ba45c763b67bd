//! Sound for tests: made, written as WAV, read back.

use std::path::Path;

use hound::{SampleFormat, WavReader, WavSpec, WavWriter};

/// Samples of a file, 1.0 being full scale.
pub struct Sound {
    /// Hz.
    pub rate: u32,
    /// Bits a sample.
    pub bits: u16,
    /// Whether they are float.
    pub float: bool,
    /// One list a channel, all of one length.
    pub channels: Vec<Vec<f64>>,
}

impl Sound {
    /// Reads a file that the program wrote.
    pub fn read(path: &Path) -> Self {
        let mut reader = WavReader::open(path).unwrap_or_else(|error| panic!("{}: {error}", path.display()));
        let WavSpec { channels, sample_rate, bits_per_sample, sample_format } = reader.spec();
        let float = sample_format == SampleFormat::Float;
        let samples: Vec<f64> = if float {
            reader.samples::<f32>().map(|s| f64::from(s.expect("a sample"))).collect()
        } else {
            let scale = 2f64.powi(i32::from(bits_per_sample) - 1);
            reader.samples::<i32>().map(|s| f64::from(s.expect("a sample")) / scale).collect()
        };
        let count = usize::from(channels);
        let channel = |at: usize| samples.iter().skip(at).step_by(count).copied().collect();
        Self { rate: sample_rate, bits: bits_per_sample, float, channels: (0..count).map(channel).collect() }
    }

    /// Frames.
    pub fn frames(&self) -> usize {
        self.channels[0].len()
    }

    /// The largest absolute sample.
    pub fn peak(&self) -> f64 {
        self.channels.iter().flatten().fold(0.0, |peak, sample| peak.max(sample.abs()))
    }
}

/// Writes 32-bit float samples, one list a channel.
pub fn write_float(path: &Path, rate: u32, channels: &[Vec<f64>]) {
    let spec = WavSpec {
        channels: channels.len() as u16,
        sample_rate: rate,
        bits_per_sample: 32,
        sample_format: SampleFormat::Float,
    };
    let mut writer = WavWriter::create(path, spec).expect("created");
    for frame in 0..channels[0].len() {
        for channel in channels {
            writer.write_sample(channel[frame] as f32).expect("written");
        }
    }
    writer.finalize().expect("finished");
}

/// `frames` of noise between ±`peak` whose next sample no earlier one tells.
pub fn noise(frames: usize, seed: u32, peak: f64) -> Vec<f64> {
    let mut state = seed;
    let mut next = || {
        // Numerical Recipes' quick generator; good enough to be unlike itself at every shift.
        state = state.wrapping_mul(1_664_525).wrapping_add(1_013_904_223);
        peak * (f64::from(state) / f64::from(u32::MAX) * 2.0 - 1.0)
    };
    (0..frames).map(|_| next()).collect()
}

/// `frames` of a sum of sines of whole numbers of cycles in `period` frames: (cycles, peak).
pub fn sines(frames: usize, period: f64, parts: &[(f64, f64)]) -> Vec<f64> {
    let at = |frame: usize| {
        let turn = std::f64::consts::TAU * frame as f64 / period;
        parts.iter().map(|(cycles, peak)| peak * libm::sin(cycles * turn)).sum()
    };
    (0..frames).map(at).collect()
}

/// The shift of `late` against `early` in frames, by the largest cross-correlation within ±`reach`.
pub fn shift(early: &[f64], late: &[f64], reach: isize) -> isize {
    let correlation = |shift: isize| -> f64 {
        let product = |at: usize| {
            let other = at as isize + shift;
            usize::try_from(other).ok().and_then(|other| late.get(other)).map_or(0.0, |late| early[at] * late)
        };
        (0..early.len()).map(product).sum::<f64>().abs()
    };
    (-reach..=reach).max_by(|a, b| correlation(*a).total_cmp(&correlation(*b))).expect("some shift")
}
