//! The way up and down held against its figures, against rubato, and against itself in other blocks and code paths.

#![allow(clippy::disallowed_methods, reason = "a test may differ in the last bit from machine to machine")]

use std::f64::consts::TAU;

use audioadapter_buffers::direct::InterleavedSlice;
use platewright_dsp::signal::{BadFactor, Oversampling};
use platewright_dsp::{F64x4, Kernel, LANES, Lanes};
use rubato::{Fft, FixedSync, Resampler};

const RATE: f64 = 44100.0;
const FACTORS: [usize; 7] = [1, 2, 4, 8, 16, 32, 64];

fn raise(oversampling: Oversampling, input: &[F64x4]) -> Vec<F64x4> {
    let mut output = vec![F64x4::default(); input.len() * oversampling.factor()];
    oversampling.upsampler(Kernel::detect()).process(input, &mut output);
    output
}

fn lower(oversampling: Oversampling, input: &[F64x4]) -> Vec<F64x4> {
    let mut output = vec![F64x4::default(); input.len() / oversampling.factor()];
    oversampling.downsampler(Kernel::detect()).process(input, &mut output);
    output
}

fn impulse(frames: usize, at: usize) -> Vec<F64x4> {
    (0..frames).map(|n| F64x4::splat(if n == at { 1.0 } else { 0.0 })).collect()
}

/// The level in dB, at `frequency` cycles a sample, of the response that `samples` are.
fn level_db(samples: impl Iterator<Item = f64>, frequency: f64) -> f64 {
    let (re, im) = samples.enumerate().fold((0.0, 0.0), |(re, im), (n, sample)| {
        let (sin, cos) = (TAU * frequency * n as f64).sin_cos();
        (re + sample * cos, im + sample * sin)
    });
    10.0 * f64::max(re * re + im * im, 1e-40).log10()
}

/// A repeatable bright signal, unlike in every lane.
fn noise(frames: usize) -> Vec<F64x4> {
    let mut state = 1_u64;
    let mut sample = || {
        state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        (state >> 11) as f64 / (1_u64 << 52) as f64 - 1.0
    };
    (0..frames).map(|_| F64x4(std::array::from_fn(|_| sample()))).collect()
}

/// Tones to 20 kHz at 44.1 kHz pass within 0.01 dB.
#[test]
fn tones_to_20_khz_pass_the_round_trip_within_a_hundredth_of_a_db() {
    for factor in FACTORS {
        let oversampling = Oversampling::new(factor).unwrap();
        let response = lower(oversampling, &raise(oversampling, &impulse(1024, 0)));
        for hertz in (0..=200).map(|k| 100.0 * f64::from(k)) {
            let level = level_db(response.iter().map(|frame| frame.0[1]), hertz / RATE);
            assert!(level.abs() < 0.01, "{factor} x: {level} dB at {hertz} Hz");
        }
    }
}

/// An input tone f leaves images at k × 44.1 kHz ± f; for tones to 20 kHz they lie within 20 kHz of those multiples.
#[test]
fn images_on_the_way_up_stay_below_140_db() {
    for factor in FACTORS {
        let oversampling = Oversampling::new(factor).unwrap();
        let response = raise(oversampling, &impulse(512, 0));
        let fast_rate = RATE * factor as f64;
        let unity = 20.0 * (factor as f64).log10();
        for multiple in 1..=factor / 2 {
            for step in -50..=50 {
                let hertz = RATE * multiple as f64 + 400.0 * f64::from(step);
                let level = level_db(response.iter().map(|frame| frame.0[0]), hertz / fast_rate) - unity;
                assert!(level < -140.0, "{factor} x: image of {level} dB at {hertz} Hz");
            }
        }
    }
}

/// What the engine adds within 20 kHz of a multiple of 44.1 kHz would fold to below 20 kHz.
#[test]
fn aliases_on_the_way_down_stay_below_140_db() {
    for factor in FACTORS {
        let oversampling = Oversampling::new(factor).unwrap();
        let fast_rate = RATE * factor as f64;
        // The phases of the decimator together are its whole response.
        let phases: Vec<Vec<F64x4>> =
            (0..factor).map(|at| lower(oversampling, &impulse(512 * factor, at))).collect();
        let response =
            || (0..512 * factor).map(|n| phases[(factor - n % factor) % factor][n.div_ceil(factor) % 512].0[2]);
        let pass = level_db(response(), 1000.0 / fast_rate);
        assert!(pass.abs() < 1e-3, "{factor} x: {pass} dB at 1 kHz");
        for multiple in 1..=factor / 2 {
            for step in -25..=25 {
                let hertz = RATE * multiple as f64 + 800.0 * f64::from(step);
                let level = level_db(response(), hertz / fast_rate);
                assert!(level < -140.0, "{factor} x: alias of {level} dB from {hertz} Hz");
            }
        }
    }
}

#[test]
fn round_trip_delays_by_the_stated_whole_number_of_frames() {
    for factor in FACTORS {
        let oversampling = Oversampling::new(factor).unwrap();
        let latency = oversampling.latency_frames();
        let tone: Vec<F64x4> = (0..2000)
            .map(|n| {
                F64x4(std::array::from_fn(|lane| {
                    (TAU * (440.0 + 5000.0 * lane as f64) / RATE * f64::from(n)).sin()
                }))
            })
            .collect();
        let output = lower(oversampling, &raise(oversampling, &tone));
        for n in latency + 300..2000 {
            for lane in 0..LANES {
                let error = output[n].0[lane] - tone[n - latency].0[lane];
                assert!(error.abs() < 1e-6, "{factor} x, lane {lane}, frame {n}: off by {error}");
            }
        }
    }
}

#[test]
fn blocks_of_any_length_give_the_same_bits() {
    let input = noise(1500);
    for factor in FACTORS {
        let oversampling = Oversampling::new(factor).unwrap();
        let whole_fast = raise(oversampling, &input);
        let whole = lower(oversampling, &whole_fast);
        for lengths in [&[1][..], &[7, 64, 3], &[128], &[129, 500], &[1000]] {
            let (mut up, mut down) =
                (oversampling.upsampler(Kernel::detect()), oversampling.downsampler(Kernel::detect()));
            let (mut fast, mut output) = (whole_fast.clone(), whole.clone());
            fast.fill(F64x4::default());
            output.fill(F64x4::default());
            let mut start = 0;
            for length in lengths.iter().cycle() {
                let end = (start + length).min(input.len());
                let fast = &mut fast[start * factor..end * factor];
                up.process(&input[start..end], fast);
                down.process(fast, &mut output[start..end]);
                start = end;
                if start == input.len() {
                    break;
                }
            }
            assert!(fast == whole_fast && output == whole, "{factor} x in blocks of {lengths:?}");
        }
    }
}

#[test]
fn portable_and_avx2_code_give_the_same_bits() {
    assert_eq!(Kernel::detect(), Kernel::Avx2, "this comparison needs a CPU with AVX2");
    let input = noise(777);
    for factor in FACTORS {
        let oversampling = Oversampling::new(factor).unwrap();
        let run = |kernel| {
            let mut fast = vec![F64x4::default(); input.len() * factor];
            let mut output = vec![F64x4::default(); input.len()];
            oversampling.upsampler(kernel).process(&input, &mut fast);
            oversampling.downsampler(kernel).process(&fast, &mut output);
            (fast, output)
        };
        assert!(run(Kernel::Portable) == run(Kernel::Avx2), "{factor} x");
    }
}

#[test]
fn lanes_do_not_hear_each_other() {
    let input = noise(600);
    let oversampling = Oversampling::new(8).unwrap();
    let together = lower(oversampling, &raise(oversampling, &input));
    for lane in 0..LANES {
        let alone: Vec<F64x4> = input
            .iter()
            .map(|frame| F64x4(std::array::from_fn(|other| if other == lane { frame.0[lane] } else { 0.0 })))
            .collect();
        let alone = lower(oversampling, &raise(oversampling, &alone));
        assert!(together.iter().zip(&alone).all(|(a, b)| a.0[lane] == b.0[lane]), "lane {lane}");
    }
}

#[test]
fn reset_goes_back_to_silence() {
    let input = noise(400);
    let oversampling = Oversampling::new(4).unwrap();
    let (mut up, mut down) = (oversampling.upsampler(Kernel::detect()), oversampling.downsampler(Kernel::detect()));
    let mut run = || {
        let mut fast = vec![F64x4::default(); input.len() * 4];
        let mut output = vec![F64x4::default(); input.len()];
        up.reset();
        down.reset();
        up.process(&input, &mut fast);
        down.process(&fast, &mut output);
        output
    };
    let first = run();
    assert!(first == run());
}

/// Three tones below 18 kHz under a smooth envelope.
fn burst(frames: usize) -> Vec<f64> {
    let sample = |n: usize| {
        let t = n as f64 - 2000.0;
        let tone = |hertz: f64| (TAU * hertz / RATE * t).sin();
        (-t * t / (2.0 * 300.0 * 300.0)).exp() * (tone(997.0) + 0.5 * tone(6001.0) + 0.3 * tone(17011.0))
    };
    (0..frames).map(sample).collect()
}

fn rubato(input: &[f64], from: usize, to: usize) -> Vec<f64> {
    let mut twin = Fft::<f64>::new(from, to, 1024, 1, FixedSync::Both).unwrap();
    let frames = InterleavedSlice::new(input, 1, input.len()).unwrap();
    twin.process_all(&frames, input.len(), None).unwrap().take_data()
}

fn delayed(samples: &[f64], frames: usize) -> Vec<F64x4> {
    let silence = std::iter::repeat_n(0.0, frames);
    silence.chain(samples.iter().copied()).map(F64x4::splat).collect()
}

fn largest_difference(expected: &[f64], ours: &[F64x4]) -> f64 {
    expected.iter().zip(ours).map(|(a, b)| (a - b.0[0]).abs()).fold(0.0, f64::max)
}

/// rubato's FFT resampler is another design by other hands. Its pass band is flat within 0.0017 dB, 2e-4 of a tone.
#[test]
fn burst_agrees_with_rubato_in_shape_and_alignment() {
    let base = burst(4096);
    for factor in [2, 8] {
        let oversampling = Oversampling::new(factor).unwrap();
        let twin_fast = rubato(&base, 44100, 44100 * factor);
        let twin_base = rubato(&twin_fast, 44100 * factor, 44100);
        assert_eq!((twin_fast.len(), twin_base.len()), (4096 * factor, 4096));

        let ours_fast = raise(oversampling, &delayed(&base, 0));
        let worst = largest_difference(&twin_fast, &ours_fast[oversampling.upsampler_delay()..]);
        assert!(worst < 4e-4, "{factor} x up: rubato differs by {worst}");

        let ours_base =
            lower(oversampling, &delayed(&twin_fast, oversampling.upsampler_delay()).as_slice()[..4096 * factor]);
        let worst = largest_difference(&twin_base, &ours_base[oversampling.latency_frames()..]);
        assert!(worst < 4e-4, "{factor} x down: rubato differs by {worst}");
    }
}

#[test]
fn factor_that_is_no_power_of_two_to_64_is_refused() {
    for factor in [0, 3, 12, 128] {
        assert_eq!(Oversampling::new(factor).unwrap_err(), BadFactor(factor));
    }
}

#[test]
fn engine_rate_is_reached_by_the_smallest_factor() {
    let factor = |base_rate| Oversampling::to_reach(352_800, base_rate).factor();
    assert_eq!([8000, 44100, 48000, 96000, 192_000].map(factor), [64, 8, 8, 4, 2]);
}
