//! Sampled sound: oversampling, sample rates, coherent spectra, levels and dither.

mod halfband;
mod oversampling;
mod window;

pub use oversampling::{BadFactor, Downsampler, FilterSet, MAX_OVERSAMPLING, Oversampling, Upsampler};
