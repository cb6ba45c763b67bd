//! Shooting on random stages at random levels up to ten times full scale.

mod problems;

use std::time::{Duration, Instant};

use platewright_dsp::analysis::steady_state;
use platewright_dsp::circuit::Network;
use problems::random::{Random, Values, any_stage};
use problems::signals::sine;

const STAGES: usize = 1000;

#[test]
fn a_thousand_random_stages_find_their_steady_state() {
    let mut random = Random(7);
    let (mut failed, mut slowest, mut shots) = (Vec::new(), Duration::ZERO, 0);
    let mut times = Vec::new();
    for index in 0..STAGES {
        let stage = any_stage(&mut random, Values::Sensible);
        let rms = stage.source.full_scale * random.log_between(0.01, 10.0);
        let network = Network::of(&stage);
        let input = sine(385, 385e3, 1000.0, rms);
        let start = Instant::now();
        let found = steady_state(&network, &input, 385e3);
        let took = start.elapsed();
        times.push(took);
        match found {
            Ok(period) => {
                shots += period.shots;
                if period.shots > 12 {
                    println!("{index}: {} shots {took:?}", period.shots);
                }
                assert!(period.output.iter().all(|v| v.is_finite()));
            }
            Err(reason) => failed.push((index, reason, rms / stage.source.full_scale, took)),
        }
        if took > slowest {
            println!("slowest {index} {took:?}");
        }
        slowest = slowest.max(took);
    }
    times.sort();
    println!("median {:?}", times[500]);
    println!("{} of {STAGES} failed, slowest {slowest:?}, {shots} shots: {failed:?}", failed.len());
    assert!(failed.len() * 100 <= STAGES, "{failed:?}");
}
