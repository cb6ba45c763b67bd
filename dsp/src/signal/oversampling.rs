//! Raising and lowering the sample rate of four lanes by a power of two around the engine.

use std::fmt;

use super::halfband::{Doubler, Halver, design};
use crate::lanes::{F64x4, Kernel};

/// The largest factor.
pub const MAX_OVERSAMPLING: usize = 64;

/// log2 of the largest factor.
const MAX_STAGES: usize = 6;

/// Base-rate frames that pass the cascade together; longer blocks are taken in pieces, so that the windows of the
/// fastest stages stay in the CPU's nearest caches.
const PIECE: usize = 128;

/// The halfband filters of a cascade; the first stage is the one next to the base rate.
///
/// Later stages have most of their band free of sound and are much shorter.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct FilterSet {
    /// Pairs of taps of each stage; its filter has 4 × pairs − 1 taps.
    pub pairs: [usize; MAX_STAGES],
    /// The Kaiser window's nominal rejection of each stage in dB.
    pub window_db: [f64; MAX_STAGES],
}

impl FilterSet {
    /// For files: flat to 0.4535 of the base rate (20 kHz at 44.1 kHz), images and aliases of that band below −140 dB.
    ///
    /// Each entry is the shortest filter that rejects at least 141 dB, with the window that serves it best, found by
    /// trying every length and window in steps of half a dB.
    pub const RENDER: FilterSet =
        FilterSet { pairs: [51, 9, 7, 6, 5, 5], window_db: [143.0, 148.5, 151.5, 147.5, 132.5, 133.0] };
}

/// A factor that is not a power of two from 1 to [`MAX_OVERSAMPLING`].
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct BadFactor(pub usize);

impl fmt::Display for BadFactor {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "oversampling by {} is not possible: choose 1, 2, 4, 8, 16, 32 or {MAX_OVERSAMPLING}", self.0)
    }
}

impl std::error::Error for BadFactor {}

/// A factor with its filters: builds the two cascades and knows their common delay.
///
/// The way up, the engine and the way down together delay by [`latency_frames`](Self::latency_frames), a whole number
/// of base-rate frames. To get an output as long as the input and aligned with it: pass the input, then as many frames
/// of silence as the latency, and drop as many frames from the head of the output.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Oversampling {
    factor: usize,
    filters: FilterSet,
}

impl Oversampling {
    /// Oversampling with the filters for files.
    ///
    /// # Errors
    /// `factor` is not a power of two from 1 to [`MAX_OVERSAMPLING`].
    pub fn new(factor: usize) -> Result<Self, BadFactor> {
        Self::with_filters(factor, FilterSet::RENDER)
    }

    /// Oversampling with a given set of filters.
    ///
    /// # Errors
    /// `factor` is not a power of two from 1 to [`MAX_OVERSAMPLING`].
    pub fn with_filters(factor: usize, filters: FilterSet) -> Result<Self, BadFactor> {
        if !factor.is_power_of_two() || factor > MAX_OVERSAMPLING {
            return Err(BadFactor(factor));
        }
        Ok(Oversampling { factor, filters })
    }

    /// The smallest factor that takes `base_rate` (Hz) to `engine_rate` (Hz) or above, at most [`MAX_OVERSAMPLING`].
    pub fn to_reach(engine_rate: u32, base_rate: u32) -> Self {
        let reaches = |factor: &usize| *factor as u64 * u64::from(base_rate) >= u64::from(engine_rate);
        let factor = (0..MAX_STAGES).map(|stage| 1 << stage).find(reaches).unwrap_or(MAX_OVERSAMPLING);
        Oversampling { factor, filters: FilterSet::RENDER }
    }

    /// Engine-rate frames to each base-rate frame.
    pub fn factor(&self) -> usize {
        self.factor
    }

    /// The delay of the way up and the way down together, in base-rate frames.
    pub fn latency_frames(&self) -> usize {
        (self.filter_delay() + self.padding()) / self.factor
    }

    /// The delay of the way up alone, in engine-rate frames.
    pub fn upsampler_delay(&self) -> usize {
        self.filter_delay() / 2
    }

    /// The way up, from silence.
    pub fn upsampler(&self, kernel: Kernel) -> Upsampler {
        let stages = (0..self.stages()).map(|s| Doubler::new(&self.taps(s), PIECE << s, kernel)).collect();
        Upsampler { factor: self.factor, stages }
    }

    /// The way down, from silence.
    pub fn downsampler(&self, kernel: Kernel) -> Downsampler {
        let last = self.stages().saturating_sub(1);
        let stage = |s| {
            let padding = if s == last { self.padding() } else { 0 };
            Halver::new(self.taps(s), PIECE << (s + 1), padding, kernel)
        };
        Downsampler { factor: self.factor, stages: (0..self.stages()).map(stage).collect() }
    }

    fn stages(&self) -> usize {
        self.factor.trailing_zeros() as usize
    }

    fn taps(&self, stage: usize) -> Vec<f64> {
        design(self.filters.pairs[stage], self.filters.window_db[stage])
    }

    /// The delay of all filters in engine-rate frames: 2 × pairs − 1 frames of a stage's higher rate, up and down.
    fn filter_delay(&self) -> usize {
        let stages = self.stages();
        (0..stages).map(|s| (4 * self.filters.pairs[s] - 2) << (stages - 1 - s)).sum()
    }

    /// The engine-rate frames that fill the filters' delay up to whole base-rate frames.
    fn padding(&self) -> usize {
        self.filter_delay().next_multiple_of(self.factor) - self.filter_delay()
    }
}

/// Raises the rate of four lanes.
pub struct Upsampler {
    factor: usize,
    stages: Vec<Doubler>,
}

impl Upsampler {
    /// Raises a block of any length; the same sound in other blocks gives the same bits.
    ///
    /// # Panics
    /// If `output.len() != input.len() * factor`.
    pub fn process(&mut self, input: &[F64x4], output: &mut [F64x4]) {
        assert_eq!(output.len(), input.len() * self.factor, "the output holds factor frames for each input frame");
        for (input, output) in input.chunks(PIECE).zip(output.chunks_mut(PIECE * self.factor)) {
            self.process_piece(input, output);
        }
    }

    fn process_piece(&mut self, input: &[F64x4], output: &mut [F64x4]) {
        let Some(first) = self.stages.first_mut() else {
            return output.copy_from_slice(input);
        };
        first.room(input.len()).copy_from_slice(input);
        let mut frames = input.len();
        for s in 0..self.stages.len() {
            frames *= 2;
            let (done, ahead) = self.stages.split_at_mut(s + 1);
            match ahead.first_mut() {
                Some(next) => done[s].run(next.room(frames)),
                None => done[s].run(output),
            }
        }
    }

    /// Back to silence.
    pub fn reset(&mut self) {
        self.stages.iter_mut().for_each(Doubler::clear);
    }
}

/// Lowers the rate of four lanes.
pub struct Downsampler {
    factor: usize,
    /// The first stage is the one next to the base rate, the last to run.
    stages: Vec<Halver>,
}

impl Downsampler {
    /// Lowers a block of any whole number of base-rate frames; the same sound in other blocks gives the same bits.
    ///
    /// # Panics
    /// If `input.len() != output.len() * factor`.
    pub fn process(&mut self, input: &[F64x4], output: &mut [F64x4]) {
        assert_eq!(input.len(), output.len() * self.factor, "the input holds factor frames for each output frame");
        for (input, output) in input.chunks(PIECE * self.factor).zip(output.chunks_mut(PIECE)) {
            self.process_piece(input, output);
        }
    }

    fn process_piece(&mut self, input: &[F64x4], output: &mut [F64x4]) {
        let Some(last) = self.stages.last_mut() else {
            return output.copy_from_slice(input);
        };
        last.room(input.len()).copy_from_slice(input);
        let mut frames = input.len();
        for s in (0..self.stages.len()).rev() {
            frames /= 2;
            let (ahead, here) = self.stages.split_at_mut(s);
            match ahead.last_mut() {
                Some(next) => here[0].run(next.room(frames)),
                None => here[0].run(output),
            }
        }
    }

    /// Back to silence.
    pub fn reset(&mut self) {
        self.stages.iter_mut().for_each(Halver::clear);
    }
}
