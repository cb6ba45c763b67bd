//! The six stages whose answers come from an independent nodal solver (Fourier collocation, double precision).

#![allow(clippy::disallowed_methods, reason = "a test may differ in the last bit from machine to machine")]

mod problems;

use platewright_dsp::analysis::{
    NoLevel, OperatingPoint, SmallSignal, Tone, harmonics, level_for_output, steady_state,
};
use platewright_dsp::circuit::{Network, Node};
use problems::{Known, known};
use serde_json::Value;

fn number(value: &Value) -> f64 {
    value.as_f64().unwrap()
}

fn list(value: &Value) -> Vec<f64> {
    value.as_array().unwrap().iter().map(number).collect()
}

fn node(name: &str) -> Node {
    Node::ALL.into_iter().find(|n| n.name() == name).unwrap()
}

/// Difference of two angles in degrees, −180…180.
fn angle(a: f64, b: f64) -> f64 {
    (a - b + 180.0).rem_euclid(360.0) - 180.0
}

#[test]
fn operating_points_within_a_millivolt() {
    for Known { name, stage, answers } in known() {
        let network = Network::of(&stage);
        let point = OperatingPoint::solve(&network, None).unwrap();
        for (key, volts) in answers["dc"].as_object().unwrap() {
            let miss = point.volts(node(key)).unwrap() - number(volts);
            assert!(miss.abs() < 1e-6, "{name} {key}: {miss:e} V");
        }
        // The current through the plate resistor, from the answer's own node voltages.
        let dc = &answers["dc"];
        let through = (number(&dc["B"]) - number(&dc["p1"])) / stage.gain.plate_resistor;
        let direct = stage
            .follower
            .as_ref()
            .is_some_and(|f| matches!(f.coupling, platewright_dsp::circuit::Coupling::Direct { .. }));
        // A direct-coupled follower's grid current flows through the same resistor.
        let grid = if direct { point.tubes[1].currents.grid } else { 0.0 };
        let plate = point.tubes[0].currents.plate + grid;
        assert!((plate / through - 1.0).abs() < 1e-4, "{name}: {plate} against {through} A");
    }
}

#[test]
fn small_signal_figures() {
    for Known { name, stage, answers } in known() {
        let network = Network::of(&stage);
        let point = OperatingPoint::solve(&network, None).unwrap();
        let small = SmallSignal::new(&network, &point);
        for answer in answers["response"].as_array().unwrap() {
            let frequency = number(&answer["frequency"]);
            let got = small.at(frequency).unwrap();
            let gain_miss = 20.0 * got.gain.norm().log10() - number(&answer["gain_dB"]);
            let phase_miss = angle(got.gain.arg().to_degrees(), number(&answer["phase_deg"]));
            assert!(gain_miss.abs() < 0.001, "{name} {frequency} Hz: {gain_miss} dB");
            assert!(phase_miss.abs() < 0.01, "{name} {frequency} Hz: {phase_miss} degrees");
            for (key, z) in [("zin", got.input_impedance), ("zout", got.output_impedance)] {
                let want = list(&answer[key]);
                let miss = (z.re - want[0]).hypot(z.im - want[1]) / want[0].hypot(want[1]);
                assert!(miss < 1e-4, "{name} {frequency} Hz {key}: {miss:e}");
            }
        }
    }
}

/// A tone of the answers: what was asked, and the harmonics whose answers can be trusted.
struct Answer {
    frequency: f64,
    input_rms: f64,
    output_rms: f64,
    /// Order, dBc, relative phase in degrees.
    trusted: Vec<(usize, f64, f64)>,
}

/// Harmonics above `floor` dBc.
fn tones(answers: &Value, floor: f64) -> Vec<Answer> {
    let read = |tone: &Value| {
        let tail = 20.0 * number(&tone["tail"]).log10();
        let (dbc, phases) = (list(&tone["dBc"]), list(&tone["phase_deg"]));
        let all = (2..=10).map(|order| (order, dbc[order - 2], phases[order - 2]));
        Answer {
            frequency: number(&tone["frequency"]),
            input_rms: number(&tone["input_rms"]),
            output_rms: number(&tone["output_fundamental_rms"]),
            // The answers' own rule: a harmonic 60 dB above the highest Fourier term kept.
            trusted: all.filter(|&(_, dbc, _)| dbc > floor && dbc > tail + 60.0).collect(),
        }
    };
    answers["tones"].as_array().unwrap().iter().map(read).collect()
}

#[test]
fn every_trusted_harmonic_at_a_fixed_number_of_steps() {
    let steps = 385;
    for Known { name, stage, answers } in known() {
        let network = Network::of(&stage);
        for tone in tones(&answers, -140.0) {
            let peak = tone.input_rms * 2f64.sqrt();
            let sine = |k: usize| peak * (std::f64::consts::TAU * k as f64 / steps as f64).sin();
            let input: Vec<f64> = (0..steps).map(sine).collect();
            let period = steady_state(&network, &input, tone.frequency * steps as f64).unwrap();
            let got = harmonics(&period.output, 10);
            for (order, want, _) in tone.trusted {
                let miss = 20.0 * (got[order - 1].norm() / got[0].norm()).log10() - want;
                assert!(miss.abs() < 0.01, "{name} {} Hz H{order}: {miss} dB", tone.frequency);
            }
        }
    }
}

#[test]
fn every_trusted_harmonic_extrapolated() {
    let (mut worst_db, mut worst_degrees, mut worst_gain, mut seen) = (0.0f64, 0.0f64, 0.0f64, 0);
    for Known { name, stage, answers } in known() {
        let network = Network::of(&stage);
        for want in tones(&answers, -220.0) {
            let got = Tone::measure(&network, want.frequency, want.input_rms, 10).unwrap();
            worst_gain = worst_gain.max((20.0 * (got.output_rms().unwrap() / want.output_rms).log10()).abs());
            for (order, dbc, phase) in want.trusted {
                let db = got.dbc(order).unwrap() - dbc;
                let degrees = angle(got.relative_phase(order).unwrap(), phase);
                worst_db = worst_db.max(db.abs());
                worst_degrees = worst_degrees.max(degrees.abs());
                seen += 1;
                let (most_db, most_degrees) = if dbc > -140.0 { (1e-4, 1e-3) } else { (0.01, 0.1) };
                assert!(db.abs() < most_db, "{name} {} Hz H{order}: {db} dB", want.frequency);
                assert!(degrees.abs() < most_degrees, "{name} {} Hz H{order}: {degrees} degrees", want.frequency);
            }
        }
    }
    println!("{seen} harmonics: {worst_db:.2e} dB, {worst_degrees:.2e} degrees, gain {worst_gain:.2e} dB");
    assert_eq!(seen, 118, "every trusted harmonic of the answers was compared");
    assert!(worst_gain < 1e-4, "gain {worst_gain} dB");
}

/// Every answer the other way round: the output that it states is reached at the input that it states.
#[test]
fn the_level_of_a_wanted_output() {
    let mut worst = 0.0f64;
    for Known { name, stage, answers } in known() {
        let network = Network::of(&stage);
        let full_scale = stage.source.full_scale;
        for want in tones(&answers, -140.0) {
            let level = level_for_output(&network, want.frequency, want.output_rms, full_scale).unwrap();
            let miss = 20.0 * (level / want.input_rms).log10();
            worst = worst.max(miss.abs());
            // Where the stage clips, an input that is a little off hardly moves the output.
            assert!(miss.abs() < 1e-3, "{name} {} Hz, {} V: {miss} dB", want.frequency, want.output_rms);
        }
        let beyond = 10.0 * stage.supply.voltage;
        assert_eq!(level_for_output(&network, 1000.0, beyond, full_scale), Err(NoLevel::Never), "{name}");
    }
    println!("{worst:.2e} dB at worst");
}
