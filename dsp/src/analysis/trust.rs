//! How far a harmonic may be trusted: what equally good fits of the tubes' published points make of it.

use super::steady_state::{NoSteadyState, harmonics, steady_state};
use crate::circuit::{Network, Stage};
use crate::portable::{decibels, magnitude};
use crate::triode::TubeType;
use std::sync::Arc;

/// Steps of a cycle. Only differences between fits are wanted, and these hardly depend on the step.
const STEPS: usize = 129;
/// Percentiles between which the spread is taken.
const PERCENTILES: (f64, f64) = (5.0, 95.0);

/// The networks of `stage` with every other set of its tubes' parameters; empty where no tube has an ensemble.
///
/// A type that stands in both places takes the same set in both: what is uncertain is the type, not the bottle.
pub fn ensemble(stage: &Stage) -> Vec<Network> {
    let follower = stage.follower.as_ref().map_or(0, |f| f.tube.ensemble.len());
    let members = stage.gain.tube.ensemble.len().max(follower);
    (0..members).map(|member| Network::of(&with_member(stage, member))).collect()
}

fn with_member(stage: &Stage, member: usize) -> Stage {
    let mut stage = stage.clone();
    stage.gain.tube = other_fit(&stage.gain.tube, member);
    if let Some(follower) = &mut stage.follower {
        follower.tube = other_fit(&follower.tube, member);
    }
    stage
}

fn other_fit(tube: &Arc<TubeType>, member: usize) -> Arc<TubeType> {
    if tube.ensemble.is_empty() {
        return Arc::clone(tube);
    }
    let (law, grid) = tube.ensemble[member % tube.ensemble.len()];
    let mut other = TubeType::clone(tube);
    other.section.law = law;
    other.section.grid = grid;
    Arc::new(other)
}

/// The dBc of each harmonic from the second to `orders` in every member of an ensemble: a list of members an order. A
/// member without a steady state reads NaN.
///
/// # Errors
/// [`NoSteadyState`] where no member finds a steady state.
pub fn fits(
    members: &[Network],
    frequency: f64,
    input_rms: f64,
    orders: usize,
) -> Result<Vec<Vec<f64>>, NoSteadyState> {
    let peak = input_rms * std::f64::consts::SQRT_2;
    let sine = |k: usize| peak * libm::sin(std::f64::consts::TAU * k as f64 / STEPS as f64);
    let input: Vec<f64> = (0..STEPS).map(sine).collect();
    let mut levels: Vec<Vec<f64>> = vec![Vec::with_capacity(members.len()); orders.saturating_sub(1)];
    let mut failed = None;
    for member in members {
        let period = steady_state(member, &input, frequency * STEPS as f64);
        let amplitudes = period.map(|period| harmonics(&period.output, orders));
        for (order, level) in levels.iter_mut().enumerate() {
            level.push(match &amplitudes {
                Ok(a) => decibels(magnitude(a[order + 1]) / magnitude(a[0])),
                Err(_) => f64::NAN,
            });
        }
        failed = amplitudes.err().or(failed);
    }
    match failed {
        Some(reason) if levels.iter().flatten().all(|level| level.is_nan()) => Err(reason),
        _ => Ok(levels),
    }
}

/// Half the range from the 5th to the 95th percentile; `None` where a value is missing.
pub fn half_range(values: &[f64]) -> Option<f64> {
    let sorted = sorted(values)?;
    let (low, high) = PERCENTILES;
    Some(0.5 * (percentile(&sorted, high) - percentile(&sorted, low)))
}

/// The middle of the values; `None` where one is missing.
pub fn median(values: &[f64]) -> Option<f64> {
    Some(percentile(&sorted(values)?, 50.0))
}

fn sorted(values: &[f64]) -> Option<Vec<f64>> {
    if values.is_empty() || values.iter().any(|v| !v.is_finite()) {
        return None;
    }
    let mut values = values.to_vec();
    values.sort_by(f64::total_cmp);
    Some(values)
}

/// The percentile of sorted values, linear between them.
///
/// # Panics
/// If `sorted` is empty.
pub fn percentile(sorted: &[f64], percent: f64) -> f64 {
    let place = percent / 100.0 * (sorted.len() - 1) as f64;
    let below = place.floor() as usize;
    let above = (below + 1).min(sorted.len() - 1);
    sorted[below] + (place - below as f64) * (sorted[above] - sorted[below])
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn percentiles_are_linear_between_values() {
        // numpy.percentile([0, 1, …, 20], [5, 95]) gives 1 and 19.
        let values: Vec<f64> = (0..=20).map(f64::from).collect();
        assert_eq!(percentile(&values, 5.0), 1.0);
        assert_eq!(percentile(&values, 95.0), 19.0);
        assert_eq!(half_range(&values), Some(9.0));
        assert_eq!(median(&values), Some(10.0));
        assert_eq!(half_range(&[1.0, f64::NAN]), None);
    }
}
