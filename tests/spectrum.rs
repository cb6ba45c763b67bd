//! A rendered tone against the steady state of the same machine: an FFT of the file and shooting at the render's own rate
//! must see the same harmonics and the same intermodulation, down to the FFT's floor.

#![allow(clippy::disallowed_methods, reason = "a test may differ in the last bit from machine to machine")]

mod support;

use std::f64::consts::{SQRT_2, TAU};

use platewright_dsp::Complex64;
use platewright_dsp::analysis::{bins, steady_state};
use platewright_dsp::circuit::Network;
use rustfft::FftPlanner;
use support::Folder;
use support::sound::{Sound, sines, write_float};

#[path = "../dsp/tests/problems/mod.rs"]
mod problems;

const RATE: u32 = 96_000;
/// Engine steps a frame.
const TIMES: usize = 4;
/// V rms of a 0 dBFS sine at the input of the stage rendered here.
const FULL_SCALE: f64 = 2.0;
/// V rms of a 0 dBFS sine in the file.
const WRITTEN: f64 = 16.0;
/// Seconds until the bias has settled: some twenty time constants of the coupling capacitor into the grid leak, which the
/// follower makes ten times as large.
const SETTLING: f64 = 45.0;

/// A period of steps, and sines within it: (cycles, share of the peak).
struct Signal {
    /// Odd, so that the steady state can be shot for.
    steps: usize,
    parts: Vec<(usize, f64)>,
    /// V rms of the sine that peaks where the sum does.
    rms: f64,
    /// Multiples of the period's frequency to compare, the reference first.
    multiples: Vec<usize>,
}

impl Signal {
    /// Amplitudes at `multiples` in V, phases of a sine, by the FFT of the file's last whole period of frames; and the
    /// largest amplitude at a multiple where nothing belongs.
    fn rendered(&self) -> (Vec<Complex64>, f64) {
        let folder = Folder::new();
        folder.write("stage.toml", include_str!("known-answers/known2.toml").as_bytes());
        // `steps` frames are TIMES periods of `steps` steps.
        let settle = (SETTLING * f64::from(RATE) / self.steps as f64).ceil() as usize * self.steps;
        let window = self.steps * (20_000 / self.steps).max(1);
        let period = self.steps as f64 / TIMES as f64;
        let peak = self.rms / FULL_SCALE;
        let parts: Vec<(f64, f64)> =
            self.parts.iter().map(|&(cycles, share)| (cycles as f64, peak * share)).collect();
        write_float(&folder.path("take.wav"), RATE, &[sines(settle + window + 64, period, &parts)]);
        let (times, written) = (TIMES.to_string(), WRITTEN.to_string());
        folder.done(&[
            "render",
            "stage.toml",
            "--play",
            "take.wav",
            "--into",
            "out",
            "--format",
            "f32",
            "--oversample",
            &times,
            "--full-scale",
            &written,
        ]);
        let sound = Sound::read(&folder.path("out/as drawn.wav"));
        let mut spectrum: Vec<Complex64> = sound.channels[0][settle..settle + window]
            .iter()
            .map(|sample| Complex64::new(sample * WRITTEN * SQRT_2, 0.0))
            .collect();
        FftPlanner::new().plan_fft_forward(window).process(&mut spectrum);
        // Cycles of the period's frequency in the window.
        let periods = window * TIMES / self.steps;
        // A·sin(x + φ) reads −j·A·e^{jφ}·N/2.
        let at = |multiple: &usize| spectrum[multiple * periods] * Complex64::new(0.0, 2.0 / window as f64);
        let floor = (1..window / 2)
            .filter(|bin| !bin.is_multiple_of(periods))
            .map(|bin| spectrum[bin].norm() * 2.0 / window as f64)
            .fold(0.0, f64::max);
        (self.multiples.iter().map(at).collect(), floor)
    }

    /// The same by shooting, at RATE·TIMES steps a second.
    fn shot(&self) -> Vec<Complex64> {
        let network = Network::of(&problems::known_answer(2).stage);
        let peak = self.rms * SQRT_2;
        let volts = |step: usize| -> f64 {
            let turn = TAU * step as f64 / self.steps as f64;
            self.parts.iter().map(|&(cycles, share)| peak * share * (cycles as f64 * turn).sin()).sum()
        };
        let input: Vec<f64> = (0..self.steps).map(volts).collect();
        let period = steady_state(&network, &input, f64::from(RATE) * TIMES as f64).expect("a steady state");
        bins(&period.output, &self.multiples)
    }

    /// Both, held against each other: the file's floor is allowed, and what the filters of the oversampling ripple.
    fn compared(&self) -> (Vec<Complex64>, f64) {
        let ((rendered, floor), shot) = (self.rendered(), self.shot());
        let reference = shot[0].norm();
        println!("floor {:.1} dBc", 20.0 * (floor / reference).log10());
        assert!(floor < 3e-8 * reference, "the file's floor is at {:.1} dBc", 20.0 * (floor / reference).log10());
        for ((multiple, file), state) in self.multiples.iter().zip(&rendered).zip(&shot) {
            let db = |z: &Complex64| 20.0 * (z.norm() / reference).log10();
            println!("{multiple}: {:.4} dBc in the file, {:.4} by shooting", db(file), db(state));
            let most = RIPPLE * state.norm() + 3.0 * floor;
            assert!(
                (file.norm() - state.norm()).abs() < most,
                "{multiple}: {} V in the file, {} V by shooting, {most:e} V allowed",
                file.norm(),
                state.norm()
            );
        }
        (rendered, floor)
    }
}

/// What the oversampling's filters may change of any amplitude below 20 kHz, as a part.
const RIPPLE: f64 = 2e-5;

#[test]
fn gain_harmonics_and_thd() {
    // 997.4 Hz: 385 steps a period.
    let signal = Signal { steps: 385, parts: vec![(1, 1.0)], rms: 1.2, multiples: (1..=10).collect() };
    let (rendered, floor) = signal.compared();
    // And `measure` itself, whose steps are finer: at 1 kHz the trapezoid of the render's rate is hardly off.
    let folder = Folder::new();
    folder.write("stage.toml", include_str!("known-answers/known2.toml").as_bytes());
    let hertz = f64::from(RATE) * TIMES as f64 / 385.0;
    let measured = folder.json(&["measure", "stage.toml", "--tone", &format!("{hertz}:1.2")]);
    let tone = &measured["configurations"][0]["tones"][0];
    let figure = |value: &serde_json::Value| value.as_f64().expect("a figure");
    let gain = 20.0 * (rendered[0].norm() / SQRT_2 / 1.2).log10();
    assert!((gain - figure(&tone["gain_dB"])).abs() < 1e-3, "{gain} dB against {}", tone["gain_dB"]);
    let harmonics: f64 = rendered[1..].iter().map(|h| h.norm_sqr()).sum();
    let thd = 100.0 * harmonics.sqrt() / rendered[0].norm();
    assert!((thd / figure(&tone["thd_percent"]) - 1.0).abs() < 1e-3, "{thd} % against {}", tone["thd_percent"]);
    for (order, file) in (2..).zip(&rendered[1..]) {
        if file.norm() < 100.0 * floor {
            continue;
        }
        let dbc = 20.0 * (file.norm() / rendered[0].norm()).log10();
        let exact = figure(&tone["harmonics"][order - 2]["dBc"]);
        assert!((dbc - exact).abs() < 0.1, "H{order}: {dbc} dBc against {exact}");
        let turned = (file.arg() - order as f64 * rendered[0].arg()).to_degrees();
        let phase = figure(&tone["harmonics"][order - 2]["phase_deg"]);
        let off = (turned - phase + 180.0).rem_euclid(360.0) - 180.0;
        assert!(off.abs() < 2.0, "H{order}: {turned}° against {phase}°");
    }
}

#[test]
fn difference_tone() {
    let signal = Signal { steps: 385, parts: vec![(19, 0.5), (20, 0.5)], rms: 1.2, multiples: vec![20, 19, 1, 18] };
    signal.compared();
}

#[test]
fn smpte_pair() {
    // The common period of 60 Hz and 7 kHz, 20 Hz, in an odd number of steps.
    let sidebands = [350, 347, 353, 344, 356];
    let signal =
        Signal { steps: 19_201, parts: vec![(3, 0.8), (350, 0.2)], rms: 1.2, multiples: sidebands.to_vec() };
    let (rendered, _) = signal.compared();
    let sum: f64 = rendered[1..].iter().map(|h| h.norm_sqr()).sum();
    let percent = 100.0 * sum.sqrt() / rendered[0].norm();
    let folder = Folder::new();
    folder.write("stage.toml", include_str!("known-answers/known2.toml").as_bytes());
    let measured = folder.json(&["measure", "stage.toml", "--imd", "smpte", "--level", "1.2"]);
    let exact = measured["configurations"][0]["imd"][0]["percent"].as_f64().expect("a figure");
    assert!((percent / exact - 1.0).abs() < 0.01, "{percent} % against {exact} %");
}
