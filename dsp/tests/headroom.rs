//! Headroom, sweeps and noise against what hand formulas and the definitions themselves say.

#![allow(clippy::disallowed_methods, reason = "a test may differ in the last bit from machine to machine")]

mod problems;

use platewright_dsp::Complex64;
use platewright_dsp::analysis::*;
use platewright_dsp::circuit::*;
use platewright_dsp::triode::Capacitances;
use problems::{known_answer, two_tube_stage};

fn db(ratio: f64) -> f64 {
    20.0 * ratio.log10()
}

#[test]
fn each_bound_holds_at_its_level_and_not_below() {
    for stage in [two_tube_stage(true), known_answer(1).stage, known_answer(5).stage] {
        let network = Network::of(&stage);
        let point = OperatingPoint::solve(&network, None).unwrap();
        let small = Cycle::of(&network, 1000.0, 1e-4 * stage.source.full_scale).unwrap().gain();
        let at = std::time::Instant::now();
        let all = headroom(&network, &point, stage.source.full_scale);
        println!("{:?}", at.elapsed());
        for reached in &all {
            println!("{reached:?}");
            let Ok((input, output)) = reached.level else { continue };
            let cycle = Cycle::of(&network, 1000.0, input).unwrap();
            assert!((cycle.output_rms() / output - 1.0).abs() < 1e-6);
            let holds = |cycle: &Cycle| match reached.bound {
                Bound::Thd(part) => cycle.thd() / part,
                Bound::Compression => 10f64.powf(-1.0 / 20.0) * small / cycle.gain(),
                Bound::GridCurrent(role) => {
                    cycle.tubes.iter().find(|t| t.role == role).unwrap().peak_grid_current / 0.3e-6
                }
                Bound::CutOff(role) => {
                    let tube = cycle.tubes.iter().position(|t| t.role == role).unwrap();
                    0.01 * point.tubes[tube].currents.plate / cycle.tubes[tube].least_plate_current
                }
            };
            let at = holds(&cycle);
            let below = holds(&Cycle::of(&network, 1000.0, input * 0.998).unwrap());
            assert!(at > 0.999, "{:?} reads {at}", reached.bound);
            assert!(below < 1.0, "{:?} holds below its level: {below}", reached.bound);
        }
        assert!(all.iter().filter(|r| r.level.is_ok()).count() >= 5, "{all:?}");
    }
}

/// H2 grows with the level and H3 with its square while both are small: the terms of a power series.
#[test]
fn low_harmonics_follow_the_power_series() {
    let network = Network::of(&two_tube_stage(false));
    let tone = |level: f64| Tone::measure(&network, 1000.0, level, 10).unwrap();
    let (low, high) = (tone(0.05), tone(0.1));
    assert!((high.dbc(2).unwrap() - low.dbc(2).unwrap() - db(2.0)).abs() < 0.02);
    assert!((high.dbc(3).unwrap() - low.dbc(3).unwrap() - db(4.0)).abs() < 0.1);
}

/// The output capacitor into bleed and load: f = 1/(2πC(Rload + Rout)), with Rout the follower's, small beside the load.
#[test]
fn the_low_corner_is_the_output_capacitor_s() {
    let mut stage = two_tube_stage(false);
    // One corner alone: the other capacitors a thousand times as large.
    stage.supply.reservoir *= 1e3;
    if let Some(Follower { coupling: Coupling::Capacitor { capacitor, .. }, .. }) = &mut stage.follower {
        *capacitor *= 1e4;
    }
    stage.output.capacitor = 100e-9;
    let network = Network::of(&stage);
    let point = OperatingPoint::solve(&network, None).unwrap();
    let small = SmallSignal::new(&network, &point);
    let source = small.at(1e5).unwrap().output_impedance.re;
    let load = 1.0 / (1.0 / 270e3 + 1.0 / 47e3);
    let corner = 1.0 / (std::f64::consts::TAU * 100e-9 * (load + source));
    let low = band(&small).unwrap().low.unwrap();
    assert!((low / corner - 1.0).abs() < 0.01, "{low} Hz against {corner} Hz");
}

/// Miller capacitance on the pot's source resistance sets the top: f = 1/(2πR(Cgk + Cgp(1+A))).
#[test]
fn the_high_corner_is_miller_s() {
    let mut stage = known_answer(1).stage;
    stage.source.resistance = 100e3;
    stage.output.load_capacitance = None;
    let network = Network::of(&stage);
    let point = OperatingPoint::solve(&network, None).unwrap();
    let small = SmallSignal::new(&network, &point);
    let middle = small.at(100.0).unwrap();
    // Gain from grid to plate, and the resistance that the grid sees.
    let driven = 680e3 / 780e3;
    let gain = middle.gain.norm() / driven;
    let resistance = 1.0 / (1.0 / 100e3 + 1.0 / 680e3) + 2200.0;
    // The cathode follows the grid in part, which shrinks what Cgk takes.
    let capacitance = 1.7e-12 * (1.0 + gain) + 1.6e-12;
    let corner = 1.0 / (std::f64::consts::TAU * resistance * capacitance);
    let high = band(&small).unwrap().high.unwrap();
    assert!((high / corner - 1.0).abs() < 0.06, "{high} Hz against {corner} Hz");
}

/// A divider in front of a tube that hardly conducts: at the output only √(4kTRB) of the resistors there is left.
#[test]
fn a_bare_resistor_makes_its_thermal_noise() {
    let mut stage = known_answer(1).stage;
    // The plate side is cut away by a vanishing output capacitor and leaves bleed and load alone.
    stage.output.capacitor = 1e-20;
    stage.output.load_capacitance = None;
    let network = Network::of(&stage);
    let point = OperatingPoint::solve(&network, None).unwrap();
    let noise = Noise::of(&SmallSignal::new(&network, &point)).unwrap();
    let resistance = 1.0 / (1.0 / 1.5e6 + 1.0 / 470e3);
    let want = (4.0 * 1.380649e-23 * 300.0 * resistance * 19_980.0f64).sqrt();
    assert!((noise.output_rms / want - 1.0).abs() < 1e-4, "{} V against {want} V", noise.output_rms);
    assert!(noise.output_rms_a < noise.output_rms);
}

/// By hand, with the tube's own capacitances and the load's left out: the supply's resistance and its
/// reservoir, beside which stands everything fed from node B, divide the ripple first; plate resistor and what stands at
/// the plate divide what is left. With the cathode resistor not bypassed the tube is rp + (µ+1)·Rk at its plate.
#[test]
fn ripple_reaches_the_output_as_the_dividers_say() {
    let mut stage = two_tube_stage(true);
    stage.follower = None;
    stage.gain.bypass = None;
    stage.output.load_capacitance = None;
    let none = Capacitances { grid_cathode: 0.0, grid_plate: 0.0, plate_cathode: 0.0 };
    std::sync::Arc::make_mut(&mut stage.gain.tube).section.capacitance = none;
    let network = Network::of(&stage);
    let point = OperatingPoint::solve(&network, None).unwrap();
    let small = SmallSignal::new(&network, &point);
    for hertz in [50.0, 100.0, 120.0] {
        let omega = std::f64::consts::TAU * hertz;
        let capacitor = |farads: f64| Complex64::new(0.0, -1.0 / (omega * farads));
        let beside = |a: Complex64, b: Complex64| a * b / (a + b);
        let ohms = |value: f64| Complex64::new(value, 0.0);
        let tube = &point.tubes[0];
        let tube = ohms(tube.rp() + (tube.mu() + 1.0) * stage.gain.cathode_resistor);
        let load = beside(ohms(stage.output.bleed), ohms(stage.output.load_resistance));
        let at_plate = beside(tube, capacitor(stage.output.capacitor) + load);
        let fed = at_plate + stage.gain.plate_resistor;
        let reservoir = beside(capacitor(stage.supply.reservoir), fed);
        let to_b = reservoir / (reservoir + stage.supply.resistance);
        let by_hand = to_b * at_plate / fed * load / (load + capacitor(stage.output.capacitor));
        let got = supply_transfer(&small, hertz).unwrap();
        assert!((got - by_hand).norm() < 1e-9 * by_hand.norm(), "{hertz} Hz: {got} against {by_hand}");
        let rejection = ripple_rejection_db(&small, hertz).unwrap();
        assert!((rejection + db(by_hand.norm())).abs() < 1e-8, "{hertz} Hz: {rejection} dB");
    }
}
