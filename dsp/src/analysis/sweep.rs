//! Sweeps over level and frequency.

use super::cycle::Cycle;
use super::{Response, SmallSignal};
use crate::circuit::Network;
use crate::portable::{decibels, magnitude, ratio};

/// Levels of `count` equal strides from 80 dB below `full_scale` to `top_db` over it, V rms.
pub fn levels(full_scale: f64, top_db: f64, count: usize) -> Vec<f64> {
    let stride = (top_db + 80.0) / (count.max(2) - 1) as f64;
    (0..count).map(|k| full_scale * ratio(-80.0 + stride * k as f64)).collect()
}

/// One cycle at each of `levels`, as far as a steady state is found.
pub fn level_sweep(network: &Network, frequency: f64, levels: &[f64]) -> Vec<Option<Cycle>> {
    levels.iter().map(|&level| Cycle::of(network, frequency, level).ok()).collect()
}

/// Frequencies of equal ratio from `low` to `high` Hz, `per_decade` to the decade, both ends included.
pub fn frequencies(low: f64, high: f64, per_decade: usize) -> Vec<f64> {
    let decades = libm::log10(high / low);
    let count = (decades * per_decade as f64).round() as usize;
    (0..=count).map(|k| low * libm::pow(10.0, decades * k as f64 / count as f64)).collect()
}

/// Where the gain has fallen 3 dB below that at 1 kHz.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Band {
    /// Hz, `None` where the gain holds down to `low` of the search.
    pub low: Option<f64>,
    /// Hz, `None` where the gain holds up to the end of the search.
    pub high: Option<f64>,
}

/// The half-power ratio that "−3 dB" stands for: 10·log10(2) dB.
const HALF_POWER: f64 = std::f64::consts::FRAC_1_SQRT_2;

/// The −3 dB points of a linearised stage between 0.01 Hz and 100 MHz, each the nearest to 1 kHz.
pub fn band(stage: &SmallSignal<'_>) -> Option<Band> {
    let gain = |frequency: f64| stage.at(frequency).map(|r: Response| magnitude(r.gain));
    let middle = gain(1000.0)?;
    let holds = |frequency: f64| gain(frequency).is_some_and(|g| g >= HALF_POWER * middle);
    Some(Band { low: edge(&holds, 0.01), high: edge(&holds, 1e8) })
}

/// Between 1 kHz and `end`, the frequency at which `holds` turns false first.
fn edge(holds: &dyn Fn(f64) -> bool, end: f64) -> Option<f64> {
    /// Steps a decade of the search for a bracket.
    const STEPS: f64 = 8.0;
    let decades = libm::log10(end / 1000.0);
    let count = (decades.abs() * STEPS).ceil() as usize;
    let at = |k: f64| 1000.0 * libm::pow(10.0, decades * k / count as f64);
    let first = (1..=count).find(|&k| !holds(at(k as f64)))?;
    let (mut inside, mut outside) = (first as f64 - 1.0, first as f64);
    // Down to a ten-thousandth of a per cent.
    for _ in 0..40 {
        let middle = 0.5 * (inside + outside);
        if holds(at(middle)) { inside = middle } else { outside = middle }
    }
    Some(at(outside))
}

/// Supply ripple at the output relative to the signal's gain: how many dB the stage rejects it, at `frequency` Hz.
pub fn ripple_rejection_db(stage: &SmallSignal<'_>, frequency: f64) -> Option<f64> {
    let leak = magnitude(super::supply_transfer(stage, frequency)?);
    (leak > 0.0).then(|| -decibels(leak))
}
