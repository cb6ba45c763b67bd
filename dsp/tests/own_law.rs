//! Properties of the library's own law, at random voltages up to a million volts, over every library type and its ensemble.

#![allow(clippy::disallowed_methods, reason = "a test may differ in the last bit from machine to machine")]

use platewright_dsp::triode::fitting::Random;
use platewright_dsp::triode::{Section, library};

/// Every law of the library, ensembles included.
fn laws() -> Vec<Section> {
    let types = library::names().filter_map(library::find);
    let members = types.flat_map(|tube| {
        let nominal = tube.section;
        let rest: Vec<Section> =
            tube.ensemble.iter().map(|&(law, grid)| Section { law, grid, ..nominal }).collect();
        std::iter::once(nominal).chain(rest)
    });
    members.collect()
}

/// A voltage of either sign, its size spread evenly over the decades from a millivolt to a million volts.
fn volts(random: &mut Random) -> f64 {
    let size = 10f64.powf(-3.0 + 9.0 * random.uniform());
    if random.uniform() < 0.5 { -size } else { size }
}

#[test]
fn finite_and_never_a_source_of_power_for_any_voltage() {
    let mut random = Random::new(7);
    for law in laws() {
        for _ in 0..400 {
            let (vgk, vpk) = (volts(&mut random), volts(&mut random));
            let c = law.currents(vgk, vpk);
            let all = [c.grid, c.plate, c.grid_by_vgk, c.plate_by_vgk, c.plate_by_vpk];
            assert!(all.iter().all(|value| value.is_finite()), "{vgk} {vpk} {c:?}");
            assert!(c.plate * vpk >= 0.0, "{vgk} {vpk} {c:?}");
        }
    }
}

#[test]
fn current_rises_with_both_voltages() {
    let mut random = Random::new(8);
    for law in laws() {
        for _ in 0..400 {
            let (vgk, vpk) = (60.0 * random.uniform() - 50.0, 600.0 * random.uniform());
            let c = law.currents(vgk, vpk);
            assert!(c.plate_by_vgk >= 0.0 && c.plate_by_vpk >= 0.0, "{law:?} {vgk} {vpk} {c:?}");
            let (further, higher) = (law.currents(vgk + 0.1, vpk), law.currents(vgk, vpk + 1.0));
            assert!(further.plate >= c.plate && higher.plate >= c.plate, "{law:?} {vgk} {vpk}");
        }
    }
}

/// C²: the second difference of a slope vanishes with the step, at the knee's foot (0 V plate) and at the cut-off too.
#[test]
fn slopes_have_no_corners() {
    let mut random = Random::new(9);
    for law in laws() {
        for k in 0..60 {
            let vpk = if k % 3 == 0 { 0.0 } else { 300.0 * random.uniform() };
            let vgk = 2.0 - 12.0 * random.uniform();
            let slope = |dg: f64, dp: f64| {
                let c = law.currents(vgk + dg, vpk + dp);
                [c.plate_by_vgk, c.plate_by_vpk]
            };
            for (dg, dp) in [(1.0, 0.0), (0.0, 1.0)] {
                // The one-sided slopes of a slope agree where the current has a second derivative.
                let corner = |step: f64| {
                    let (a, b, c) = (slope(-step * dg, -step * dp), slope(0.0, 0.0), slope(step * dg, step * dp));
                    [0, 1].map(|i| ((c[i] - 2.0 * b[i] + a[i]) / step).abs())
                };
                let (coarse, fine) = (corner(1e-2), corner(1e-4));
                for i in 0..2 {
                    assert!(fine[i] <= 0.05 * coarse[i] + 1e-8, "{law:?} {vgk} {vpk}: {coarse:?} {fine:?}");
                }
            }
        }
    }
}
