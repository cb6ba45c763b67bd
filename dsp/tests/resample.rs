//! Changes of sample rate held against their figures, against rubato, and against themselves in other blocks.

#![allow(clippy::disallowed_methods, reason = "a test may differ in the last bit from machine to machine")]

use std::f64::consts::TAU;

use audioadapter_buffers::direct::InterleavedSlice;
use platewright_dsp::Kernel;
use platewright_dsp::signal::{BadRate, Resampler};
use rubato::{Fft, FixedSync, Resampler as _};

/// The usual rates, and one that shares no divisor with them, so that its filter is worked out phase by phase.
const RATES: [u32; 8] = [8000, 11025, 44100, 44101, 48000, 88200, 96000, 192_000];

fn resample(input: &[f64], from: u32, to: u32) -> Vec<f64> {
    let mut resampler = Resampler::new(from, to, Kernel::detect()).unwrap();
    let mut output = Vec::new();
    resampler.process(input, &mut output);
    resampler.finish(&mut output);
    output
}

fn tone(frequency: f64, rate: u32, samples: usize) -> Vec<f64> {
    (0..samples).map(|n| (TAU * (frequency / f64::from(rate) * n as f64).fract()).sin()).collect()
}

fn largest(values: impl Iterator<Item = f64>) -> f64 {
    values.fold(0.0, |largest, value| largest.max(value.abs()))
}

/// A tone must come out as the same tone, in step from the first sample on; all else that comes out is images.
#[test]
fn tones_come_out_level_aligned_and_without_images() {
    for from in RATES {
        for to in RATES {
            let lower = f64::from(from.min(to));
            for fraction in [0.02, 0.2, 0.4, 0.44, 0.4535] {
                let frequency = fraction * lower;
                let ratio = f64::from(from) / f64::from(to);
                // Long enough for the filter's ends and some of the tone between them at either rate.
                let input = tone(frequency, from, (400.0 * (ratio.max(1.0 / ratio) + 1.0)) as usize);
                let output = resample(&input, from, to);
                let ends = (70.0 / ratio.min(1.0)).ceil() as usize;
                let kept = ends..output.len().saturating_sub(ends);
                assert!(kept.len() > 20, "{from} to {to}: the test keeps {} samples", kept.len());
                let expected = tone(frequency, to, output.len());
                let error = largest(kept.map(|n| output[n] - expected[n]));
                assert!(error < 1e-7, "{from} to {to}, {frequency} Hz: off by {} dB", 20.0 * error.log10());
            }
        }
    }
}

/// Above the lower rate's half and as far beyond it as 0.4535 lies before, nothing may come through.
#[test]
fn sound_that_the_lower_rate_cannot_hold_is_gone() {
    for (from, to) in [(48000, 44100), (96000, 44100), (192_000, 8000), (96000, 48000), (48000, 44101)] {
        for fraction in [0.5465, 0.6, 0.8] {
            let frequency = fraction * f64::from(to);
            if frequency < f64::from(from) / 2.0 {
                let output = resample(&tone(frequency, from, 12_000), from, to);
                let ends = 120;
                let left = largest(output[ends..output.len() - ends].iter().copied());
                assert!(left < 1e-7, "{from} to {to}, {frequency} Hz: {} dB left", 20.0 * left.log10());
            }
        }
    }
}

#[test]
fn length_is_the_ratio_rounded() {
    for (from, to, input, expected) in [
        (44100, 48000, 44100, 48000),
        (44100, 48000, 1, 1),
        (48000, 44100, 3, 3),
        (48000, 8000, 3, 1),
        (48000, 8000, 2, 0),
        (192_000, 8000, 0, 0),
        (8000, 192_000, 7, 168),
    ] {
        assert_eq!(resample(&vec![0.5; input], from, to).len(), expected, "{input} frames from {from} to {to}");
        let resampler = Resampler::new(from, to, Kernel::detect()).unwrap();
        assert_eq!(resampler.output_frames(input as u64), expected as u64);
    }
}

#[test]
fn equal_rates_return_the_input_bit_for_bit() {
    let input = tone(1234.5, 48000, 1000);
    assert_eq!(resample(&input, 48000, 48000), input);
}

#[test]
fn blocks_of_any_length_and_both_kernels_give_the_same_bits() {
    let input = tone(3210.0, 44100, 5000);
    for (from, to) in [(44100, 48000), (192_000, 44100), (44101, 96000)] {
        let whole = resample(&input, from, to);
        for kernel in [Kernel::detect(), Kernel::Portable] {
            let mut resampler = Resampler::new(from, to, kernel).unwrap();
            for length in [1, 7, 480, 4999] {
                // The second round also shows that `finish` leaves the initial state.
                let mut output = Vec::new();
                input.chunks(length).for_each(|block| resampler.process(block, &mut output));
                resampler.finish(&mut output);
                assert!(output == whole, "{from} to {to} in blocks of {length}, {kernel:?}");
            }
        }
    }
}

/// rubato's FFT resampler is another design by other hands. Its pass band is flat within 0.0017 dB, 2e-4 of a tone.
#[test]
fn burst_agrees_with_rubato_in_shape_and_alignment() {
    for (from, to) in [(44100, 48000), (48000, 44100), (44100, 192_000), (96000, 44100)] {
        let frames = 8192;
        let burst: Vec<f64> = (0..frames)
            .map(|n| {
                let t = f64::from(n) - 3000.0;
                let tone = |hertz: f64| (TAU * hertz / f64::from(from) * t).sin();
                (-t * t / (2.0 * 500.0 * 500.0)).exp() * (tone(997.0) + 0.5 * tone(6001.0) + 0.3 * tone(17011.0))
            })
            .collect();
        // rubato drops a delay of half a chunk: a multiple of the ratio's terms makes that a whole number at both rates.
        let chunk = 8 * from as usize / 300;
        let mut twin = Fft::<f64>::new(from as usize, to as usize, chunk, 1, FixedSync::Both).unwrap();
        let input = InterleavedSlice::new(&burst, 1, burst.len()).unwrap();
        let expected = twin.process_all(&input, burst.len(), None).unwrap().take_data();
        let ours = resample(&burst, from, to);
        assert!(expected.len().abs_diff(ours.len()) <= 1, "{} and {} frames", expected.len(), ours.len());
        let worst = largest(ours.iter().zip(&expected).map(|(a, b)| a - b));
        assert!(worst < 4e-4, "{from} to {to}: rubato differs by {worst}");
    }
}

#[test]
fn rates_beyond_8_to_192_khz_are_refused() {
    for (from, to, bad) in [(7999, 48000, 7999), (48000, 192_001, 192_001), (48000, 0, 0)] {
        assert_eq!(Resampler::new(from, to, Kernel::detect()).err(), Some(BadRate(bad)));
    }
}
