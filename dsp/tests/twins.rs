//! The fast engine (tables, one Newton step in most steps) against a nodal integrator with computed laws and converged
//! roots.

mod problems;
mod twin;

use platewright_dsp::circuit::{Network, Stage};
use platewright_dsp::wave::{Engine, Machine};
use platewright_dsp::{F64x4, Kernel, LANES};
use problems::signals::{chord, sine};
use problems::{known_answer, topologies, two_tube_stage};
use twin::Twin;

const RATE: f64 = 384e3;

fn by_engine(stage: &Stage, rate: f64, input: &[f64]) -> Vec<f64> {
    let machine = Machine::new(stage, rate).unwrap();
    let mut engine = Engine::new(&[machine], Kernel::detect()).unwrap();
    let input: Vec<F64x4> = input.iter().map(|&v| F64x4([v; LANES])).collect();
    let mut output = vec![F64x4::default(); input.len()];
    engine.process(&input, &mut output);
    output.iter().map(|v| v.0[0]).collect()
}

fn by_twin(stage: &Stage, rate: f64, input: &[f64]) -> Vec<f64> {
    let network = Network::of(stage);
    let mut twin = Twin::new(&network, rate);
    input.iter().map(|&v| twin.step(v)).collect()
}

/// The largest difference over the peak, dB.
fn difference(got: &[f64], want: &[f64]) -> f64 {
    let peak = want.iter().fold(0.0f64, |a, b| a.max(b.abs()));
    let miss = got.iter().zip(want).fold(0.0f64, |a, (g, w)| a.max((g - w).abs()));
    20.0 * libm::log10(miss / peak)
}

#[track_caller]
fn assert_twins(name: &str, stage: &Stage, input: &[f64]) {
    let found = difference(&by_engine(stage, RATE, input), &by_twin(stage, RATE, input));
    println!("{name}: {found:.1} dB");
    assert!(found < -120.0, "{name}: {found} dB of the peak");
}

#[test]
fn bright_music_at_full_scale() {
    let stage = two_tube_stage(true);
    assert_twins("a chord struck twice", &stage, &chord(150_000, RATE, 2.0 * 2f64.sqrt()));
}

/// The stage that clips hardest among those with known answers, grid current and cut-off in every period.
#[test]
fn the_fifth_known_stage_at_4_volts() {
    let stage = known_answer(5).stage;
    assert_twins("known 5, 1 kHz at 4 V rms", &stage, &sine(40_000, RATE, 1000.0, 4.0));
    assert_twins("known 5, a chord to 4 V rms", &stage, &chord(60_000, RATE, 4.0 * 2f64.sqrt()));
}

#[test]
fn every_topology_and_known_stage() {
    let known = (1..=6).map(|k| (format!("known {k}"), known_answer(k).stage));
    for (name, stage) in topologies().into_iter().chain(known) {
        if name == "pot at 0" {
            // Its output is the rounding of nothing.
            continue;
        }
        let peak = stage.source.full_scale * 2f64.sqrt();
        assert_twins(&name, &stage, &chord(12_000, RATE, peak));
    }
}
