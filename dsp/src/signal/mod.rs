//! Sampled sound: oversampling, sample rates, coherent spectra, levels and dither.

mod coherent;
mod dither;
mod halfband;
mod level;
mod oversampling;
mod resample;
mod window;

pub use coherent::{CoherentTable, harmonics, mean};
pub use dither::TriangularDither;
pub use level::{BadMeter, LevelMeter, Levels, LoudnessMeter, peak, rms};
pub use oversampling::{BadFactor, Downsampler, FilterSet, MAX_OVERSAMPLING, Oversampling, Upsampler};
pub use resample::{BadRate, MAX_RATE, MIN_RATE, Resampler};
