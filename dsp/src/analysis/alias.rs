//! What a render's rate folds back into the audible band.

use super::steady_state::{NoSteadyState, bins, steady_state};
use crate::circuit::Network;
use crate::portable::{decibels, magnitude};

/// Distance of the frequencies looked at, Hz, near enough.
const GRID: f64 = 1000.0;
/// Where hearing ends, Hz.
const AUDIBLE: f64 = 20e3;

/// The largest alias product below 20 kHz of a tone near `tone_hz` with a peak of `peak_volts` at `in`, in dB over the
/// fundamental, where the stage is stepped `rate` times a second.
///
/// The steady state at that very rate, over a period in which the tone has a whole number of cycles that shares no factor
/// with the odd number of steps: harmonics that pass the Nyquist frequency then fold to multiples of the period's
/// frequency where no harmonic belongs.
///
/// # Errors
/// [`NoSteadyState`] where shooting does not close the period.
pub fn alias_estimate(network: &Network, rate: f64, tone_hz: f64, peak_volts: f64) -> Result<f64, NoSteadyState> {
    let cycles = (tone_hz / GRID).round().max(1.0) as usize;
    let steps = steps_for(rate, cycles);
    let spacing = rate / steps as f64;
    let turn = std::f64::consts::TAU * cycles as f64 / steps as f64;
    let input: Vec<f64> = (0..steps).map(|k| peak_volts * libm::sin(turn * k as f64)).collect();
    let period = steady_state(network, &input, spacing * steps as f64)?;
    let audible = (AUDIBLE / spacing) as usize;
    let multiples: Vec<usize> = (1..=audible).filter(|m| !m.is_multiple_of(cycles)).collect();
    let fundamental = magnitude(bins(&period.output, &[cycles])[0]);
    let worst = bins(&period.output, &multiples).into_iter().map(magnitude).fold(0.0, f64::max);
    Ok(decibels(worst / fundamental))
}

/// The odd number of steps nearest above `rate`/1 kHz that shares no factor with `cycles`.
fn steps_for(rate: f64, cycles: usize) -> usize {
    let mut steps = (rate / GRID) as usize | 1;
    while common_factor(steps, cycles) > 1 {
        steps += 2;
    }
    steps
}

fn common_factor(a: usize, b: usize) -> usize {
    if b == 0 { a } else { common_factor(b, a % b) }
}
