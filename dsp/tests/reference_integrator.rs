//! The engine against scipy's Radau integrator on tone bursts that drive the grids positive.
//!
//! `tools/reference` writes the same nodal equations as an ordinary differential equation and integrates them to
//! tolerances far below what is asked here; its answers are committed in `tests/reference`.

mod problems;

use std::f64::consts::{PI, TAU};
use std::path::PathBuf;

use platewright_dsp::circuit::Stage;
use platewright_dsp::wave::{Engine, Machine};
use platewright_dsp::{F64x4, Kernel, LANES};
use problems::known_answer;
use serde_json::Value;

struct Reference {
    stage: Stage,
    frequency: f64,
    peak_input: f64,
    burst_seconds: f64,
    sample_rate: f64,
    peak: f64,
    volts: Vec<f64>,
}

impl Reference {
    fn read(name: &str) -> Reference {
        let path = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join(format!("../tests/reference/{name}.json"));
        let json: Value = serde_json::from_str(&std::fs::read_to_string(path).unwrap()).unwrap();
        let number = |value: &Value| value.as_f64().unwrap();
        let stage = json["stage"].as_str().unwrap().trim_start_matches("known").trim_end_matches(".toml");
        let input = &json["input"];
        Reference {
            stage: known_answer(stage.parse().unwrap()).stage,
            frequency: number(&input["frequency_hz"]),
            peak_input: 2f64.sqrt() * number(&input["rms_volts"]),
            burst_seconds: number(&input["burst_seconds"]),
            sample_rate: number(&json["sample_rate_hz"]),
            peak: number(&json["peak_volts"]),
            volts: json["output_volts"].as_array().unwrap().iter().map(number).collect(),
        }
    }

    fn input(&self, seconds: f64) -> f64 {
        if seconds >= self.burst_seconds {
            return 0.0;
        }
        let gate = libm::pow(libm::sin(PI * seconds / self.burst_seconds), 2.0);
        self.peak_input * gate * libm::sin(TAU * self.frequency * seconds)
    }

    /// The largest difference over the peak with `factor` steps a sample, as a ratio.
    fn difference(&self, factor: usize) -> f64 {
        let rate = self.sample_rate * factor as f64;
        let mut engine = Engine::new(&[Machine::new(&self.stage, rate).unwrap()], Kernel::detect()).unwrap();
        let steps = self.volts.len() * factor;
        let input: Vec<F64x4> = (0..steps).map(|k| F64x4([self.input(k as f64 / rate); LANES])).collect();
        let mut output = vec![F64x4::default(); steps];
        engine.process(&input, &mut output);
        let miss = |(n, want): (usize, &f64)| (output[n * factor].0[0] - want).abs();
        self.volts.iter().enumerate().map(miss).fold(0.0, f64::max) / self.peak
    }
}

#[test]
fn bursts_agree_and_the_error_falls_as_the_square_of_the_step() {
    for name in ["grid-current-burst", "capacitor-follower-burst", "direct-follower-burst"] {
        let reference = Reference::read(name);
        let misses = [8, 16, 32, 64].map(|factor| reference.difference(factor));
        let decibels = misses.map(|miss| 20.0 * libm::log10(miss));
        println!("{name}: {decibels:.1?} dB of the peak at 8, 16, 32 and 64 steps a sample");
        assert!(decibels[3] < -100.0, "{name}: {decibels:?}");
        for pair in misses.windows(2) {
            let fall = pair[0] / pair[1];
            assert!((3.5..4.5).contains(&fall), "{name}: half the step, {fall} times less");
        }
    }
}
