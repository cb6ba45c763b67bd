//! The cost of the engine: ns a step for lanes that differ in every value, and ms for a configuration's exact figures.
//! Best of several runs.
//!
//! `cargo bench -p platewright-dsp --bench engine`

#[path = "../tests/problems/mod.rs"]
mod problems;

use std::time::Instant;

use platewright_dsp::analysis::Tone;
use platewright_dsp::circuit::{Network, Stage};
use platewright_dsp::wave::{Engine, Machine};
use platewright_dsp::{F64x4, Kernel, LANES};
use problems::random::{Random, Values, any_stage};
use problems::{known_answer, two_tube_stage};

const RATE: f64 = 384e3;
const STEPS: usize = 96_000;
const RUNS: usize = 11;

fn main() {
    let alone = |mut stage: Stage| {
        stage.follower = None;
        stage
    };
    let shapes: [(&str, [Stage; LANES]); 4] = [
        ("two tubes, library law", unlike(two_tube_stage(true))),
        ("one tube, library law", unlike(alone(two_tube_stage(true)))),
        ("two tubes, Dempwolf & Zölzer", unlike(known_answer(2).stage)),
        ("two tubes, Koren", unlike(known_answer(4).stage)),
    ];
    for (name, stages) in &shapes {
        for kernel in [Kernel::detect(), Kernel::Portable] {
            for lanes in [1, 2, 4] {
                println!("{name}, {lanes} lanes, {kernel:?}: {:.1} ns a step", step_ns(&stages[..lanes], kernel));
            }
        }
    }
    for number in 1..=6 {
        let known = known_answer(number);
        let network = Network::of(&known.stage);
        let level = 0.5 * known.stage.source.full_scale;
        println!("{}: exact 1 kHz H1 to H10 at {level} V rms: {:.2} ms", known.name, tone_ms(&network, level));
    }
    let network = Network::of(&two_tube_stage(true));
    for level in [0.1, 0.5, 2.0, 10.0] {
        println!("two tubes: exact 1 kHz H1 to H10 at {level} V rms: {:.2} ms", tone_ms(&network, level));
    }
    random_tones();
}

/// Four configurations of a stage that share no value the engine uses.
fn unlike(stage: Stage) -> [Stage; LANES] {
    std::array::from_fn(|lane| {
        let mut stage = stage.clone();
        let factor = 1.0 + 0.07 * lane as f64;
        stage.gain.plate_resistor *= factor;
        stage.gain.cathode_resistor *= factor;
        stage.supply.voltage /= factor;
        stage.output.load_resistance *= factor;
        stage
    })
}

/// A chord with bright partials that peaks at the stage's full scale.
fn chord(stage: &Stage) -> Vec<f64> {
    let partials =
        [(82.0, 1.0), (164.0, 0.8), (330.0, 0.6), (659.0, 0.4), (1320.0, 0.25), (2637.0, 0.15), (5274.0, 0.08)];
    let sample = |k: usize| {
        let turn = |(order, &(hertz, size)): (usize, &(f64, f64))| {
            size * libm::sin(std::f64::consts::TAU * hertz * k as f64 / RATE + order as f64)
        };
        partials.iter().enumerate().map(turn).sum::<f64>()
    };
    let volts: Vec<f64> = (0..STEPS).map(sample).collect();
    let peak = volts.iter().fold(0.0f64, |a, b| a.max(b.abs()));
    volts.iter().map(|v| v * stage.source.full_scale * std::f64::consts::SQRT_2 / peak).collect()
}

fn step_ns(stages: &[Stage], kernel: Kernel) -> f64 {
    let machines: Vec<Machine> = stages.iter().map(|s| Machine::new(s, RATE).expect("a sound stage")).collect();
    let mut engine = Engine::new(&machines, kernel).expect("machines of one shape");
    let input: Vec<F64x4> = chord(&stages[0]).iter().map(|&v| F64x4([v, 0.9 * v, 0.7 * v, -v])).collect();
    let mut output = vec![F64x4::default(); STEPS];
    let run = || {
        engine.reset();
        let start = Instant::now();
        engine.process(&input, &mut output);
        start.elapsed().as_secs_f64() * 1e9 / STEPS as f64
    };
    best(run)
}

/// The time of a 1 kHz tone through each of a thousand random stages, to ten times full scale.
fn random_tones() {
    let mut random = Random(23);
    let one = |_| {
        let stage = any_stage(&mut random, Values::Sensible);
        let level = random.log_between(0.01, 10.0) * stage.source.full_scale;
        let network = Network::of(&stage);
        let start = Instant::now();
        let _ = std::hint::black_box(Tone::measure(&network, 1000.0, level, 10));
        start.elapsed().as_secs_f64() * 1e3
    };
    let mut times: Vec<f64> = (0..1000).map(one).collect();
    times.sort_by(f64::total_cmp);
    println!(
        "random stages: exact 1 kHz H1 to H10: {:.2} ms in the median, {:.2} ms at worst",
        times[500], times[999]
    );
}

fn tone_ms(network: &Network, level: f64) -> f64 {
    best(|| {
        let start = Instant::now();
        std::hint::black_box(Tone::measure(network, 1000.0, level, 10).expect("a steady state"));
        start.elapsed().as_secs_f64() * 1e3
    })
}

fn best(run: impl FnMut() -> f64) -> f64 {
    std::iter::repeat_with(run).take(RUNS).fold(f64::INFINITY, f64::min)
}
