//! Signals for tests and benches, the same bits on every machine.

use std::f64::consts::{SQRT_2, TAU};

use super::random::Random;

/// Partials of a bright chord: frequency in Hz, size.
const PARTIALS: [(f64, f64); 8] = [
    (82.0, 1.0),
    (164.0, 0.8),
    (330.0, 0.6),
    (659.0, 0.4),
    (1320.0, 0.25),
    (2637.0, 0.15),
    (5274.0, 0.08),
    (9000.0, 0.03),
];

/// `steps` of a bright chord that decays and is struck again four times a second; its peak is `peak` volts.
pub fn chord(steps: usize, rate: f64, peak: f64) -> Vec<f64> {
    let sample = |k: usize| {
        let seconds = k as f64 / rate;
        let since_struck = seconds % 0.25;
        let partial = |(order, &(hertz, size)): (usize, &(f64, f64))| {
            size * libm::exp(-since_struck * (2.0 + hertz / 400.0))
                * libm::sin(TAU * hertz * seconds + order as f64)
        };
        // The hammer takes a millisecond.
        (1.0 - libm::exp(-since_struck / 1e-3)) * PARTIALS.iter().enumerate().map(partial).sum::<f64>()
    };
    let volts: Vec<f64> = (0..steps).map(sample).collect();
    let largest = volts.iter().fold(0.0f64, |a, b| a.max(b.abs()));
    volts.iter().map(|v| v * peak / largest).collect()
}

/// A sine of `rms` volts.
pub fn sine(steps: usize, rate: f64, hertz: f64, rms: f64) -> Vec<f64> {
    (0..steps).map(|k| SQRT_2 * rms * libm::sin(TAU * hertz * k as f64 / rate)).collect()
}

/// White noise of even density within ±`peak` volts.
pub fn noise(steps: usize, seed: u64, peak: f64) -> Vec<f64> {
    let mut random = Random(seed);
    (0..steps).map(|_| random.between(-peak, peak)).collect()
}
