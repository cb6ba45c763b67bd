//! Alias products: the demo's stage stays clean, and the estimate agrees with a long run of the engine through an FFT.

mod problems;

use platewright_dsp::analysis::alias_estimate;
use platewright_dsp::circuit::{Network, Stage};
use platewright_dsp::wave::{Engine, Machine};
use platewright_dsp::{F64x4, Kernel, LANES};
use problems::{known_answer, two_tube_stage};
use rustfft::FftPlanner;
use rustfft::num_complex::Complex64;

const BASE_RATE: f64 = 48_000.0;
const TONE: f64 = 19_000.0;

fn full_scale_peak(stage: &Stage) -> f64 {
    stage.source.full_scale * 2f64.sqrt()
}

/// The largest product below 20 kHz that is no harmonic, dB over the fundamental: the engine settles for ten seconds,
/// then a second of it, a whole number of the tone's cycles, is transformed.
fn by_running(stage: &Stage, rate: f64) -> f64 {
    let second = rate as usize;
    let sample = |k: usize| {
        // A whole second holds a whole number of cycles, so the phase may start again with every one.
        full_scale_peak(stage) * libm::sin(std::f64::consts::TAU * TONE * (k % second) as f64 / rate)
    };
    let input: Vec<F64x4> = (0..second).map(|k| F64x4([sample(k); LANES])).collect();
    let mut output = vec![F64x4::default(); second];
    let mut engine = Engine::new(&[Machine::new(stage, rate).unwrap()], Kernel::detect()).unwrap();
    for _ in 0..10 {
        engine.process(&input, &mut output);
    }
    // A Hann window, as what is left of the bias's drift must not leak into every bin.
    let hann = |k: usize| 1.0 - libm::cos(std::f64::consts::TAU * k as f64 / second as f64);
    let mut spectrum: Vec<Complex64> =
        output.iter().enumerate().map(|(k, v)| Complex64::new(v.0[0] * hann(k), 0.0)).collect();
    FftPlanner::new().plan_fft_forward(second).process(&mut spectrum);
    let tone = TONE as usize;
    // Below 20 Hz there is the drift.
    let size = |bin: usize| libm::hypot(spectrum[bin].re, spectrum[bin].im);
    let worst = (20..20_000).filter(|bin: &usize| bin.abs_diff(tone) > 2).map(size).fold(0.0, f64::max);
    20.0 * libm::log10(worst / size(tone))
}

#[test]
fn the_demo_at_eight_times_48_khz_stays_below_100_db() {
    let stage = two_tube_stage(true);
    let found = alias_estimate(&Network::of(&stage), 8.0 * BASE_RATE, TONE, full_scale_peak(&stage)).unwrap();
    println!("19 kHz at 0 dBFS: {found:.1} dBc");
    assert!(found < -100.0, "{found} dBc");
}

/// The hardest of the known stages: grid current and cut-off in every period.
#[test]
fn the_estimate_agrees_with_a_run_of_the_engine() {
    let stage = known_answer(5).stage;
    for factor in [8.0, 16.0] {
        let rate = factor * BASE_RATE;
        let estimated = alias_estimate(&Network::of(&stage), rate, TONE, full_scale_peak(&stage)).unwrap();
        let found = by_running(&stage, rate);
        println!("{factor} x: estimated {estimated:.1}, found {found:.1} dBc");
        assert!((estimated - found).abs() < 6.0, "{factor} x: estimated {estimated}, found {found} dBc");
    }
}
