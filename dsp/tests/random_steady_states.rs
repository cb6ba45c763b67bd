//! Shooting on random stages: every one finds its steady state, in few steps.

mod problems;

use platewright_dsp::analysis::{Tone, steady_state};
use platewright_dsp::circuit::Network;
use problems::random::{Random, Values, any_stage};
use problems::signals::sine;

const STEPS: usize = 385;
/// A shot of 385 steps takes some 0.4 ms, so this many take less than 20 ms.
const MOST_SHOTS: usize = 45;

/// Shoots at `count` random stages under sines of `hertz` and of levels from a hundredth of full scale to `loudest`
/// times it; the largest number of shots.
fn shoot(seed: u64, count: usize, values: Values, loudest: f64, hertz: (f64, f64)) -> usize {
    let mut random = Random(seed);
    let (mut most, mut total, mut failed) = (0, 0, Vec::new());
    for index in 0..count {
        let stage = any_stage(&mut random, values);
        let level = random.log_between(0.01, loudest);
        let frequency = random.log_between(hertz.0, hertz.1);
        let rate = frequency * STEPS as f64;
        let input = sine(STEPS, rate, frequency, level * stage.source.full_scale);
        match steady_state(&Network::of(&stage), &input, rate) {
            Ok(period) => {
                assert!(period.output.iter().all(|v| v.is_finite()), "stage {index}");
                total += period.shots;
                most = most.max(period.shots);
            }
            Err(reason) => {
                failed.push(format!("stage {index}, {level:.2} × full scale, {frequency:.0} Hz: {reason}"))
            }
        }
    }
    println!("{count} stages: {} failed, {total} shots in all, {most} at most", failed.len());
    assert!(failed.len() * 100 <= count, "more than 1 % failed: {failed:#?}");
    most
}

#[test]
fn a_thousand_stages_at_1_khz_to_ten_times_full_scale() {
    assert!(shoot(7, 1000, Values::Sensible, 10.0, (1000.0, 1000.0)) < MOST_SHOTS);
}

#[test]
fn any_frequency_to_a_hundred_times_full_scale() {
    assert!(shoot(11, 500, Values::Sensible, 100.0, (5.0, 100e3)) < MOST_SHOTS);
}

#[test]
fn extreme_values_to_a_hundred_times_full_scale() {
    shoot(11, 300, Values::Extreme, 100.0, (1000.0, 1000.0));
}

/// The whole figure, refined until it stands still, at 1 kHz to ten times full scale.
#[test]
fn a_thousand_tones_are_measured() {
    let mut random = Random(23);
    let (mut failed, mut unsettled) = (Vec::new(), 0);
    for index in 0..1000 {
        let stage = any_stage(&mut random, Values::Sensible);
        let level = random.log_between(0.01, 10.0) * stage.source.full_scale;
        match Tone::measure(&Network::of(&stage), 1000.0, level, 10) {
            Ok(tone) => {
                let (gain, thd) = (tone.gain_db(), tone.thd_f());
                assert!(gain.is_none_or(f64::is_finite) && thd.is_none_or(f64::is_finite), "stage {index}");
                unsettled += usize::from(gain.is_none() || thd.is_none());
            }
            Err(reason) => failed.push(format!("stage {index}, {level:.2} V: {reason}")),
        }
    }
    println!("{} failed, {unsettled} without gain or THD", failed.len());
    assert!(failed.len() + unsettled <= 10, "more than 1 %: {unsettled} not settled, {failed:#?}");
}
