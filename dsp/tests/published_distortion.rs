//! Measured distortion against output level, bypassed and not: "Distortion in small signal tubes",
//! kolbrek.hornspeakersystems.info (seen). Supply and cathode resistor are not known, so slopes with level and the ratio
//! of bypassed to unbypassed at equal output judge; the chart's cathode resistor at 300 V and 100 kΩ stands in.

#![allow(clippy::disallowed_methods, reason = "a test may differ in the last bit from machine to machine")]

mod published;

use published::{Coupled, Row, table, tube};

const LEVELS: [f64; 7] = [100.0, 80.0, 50.0, 20.0, 10.0, 8.0, 5.0];

/// THD in percent at each level, as published.
fn measured(rows: &[Row], specimen: &str, bypassed: bool) -> Vec<Option<f64>> {
    let wanted = if bypassed { "yes" } else { "no" };
    let row = rows.iter().find(|row| row.text("specimen") == specimen && row.text("bypassed") == wanted).unwrap();
    LEVELS.iter().map(|level| row.maybe(&level.to_string())).collect()
}

#[test]
fn slopes_with_level_and_the_effect_of_bypassing() {
    let rows = table("measured-distortion.csv");
    // Chart rows of 100 kΩ into 220 kΩ (12AU7) and 250 kΩ (6SN7) at 300 V.
    for (specimen, name, cathode_resistor, next_grid_resistor) in [
        ("6SN7GTB #1", "6SN7GTB", 2440.0, 250e3),
        ("6SN7GTB #2", "6SN7GTB", 2440.0, 250e3),
        ("12AU7", "12AU7", 3000.0, 220e3),
    ] {
        let stage = |bypassed: bool| Coupled {
            supply: 300.0,
            plate_resistor: 100e3,
            cathode_resistor,
            next_grid_resistor,
            bypassed,
        };
        let tube = tube(name);
        let (with, without) = (measured(&rows, specimen, true), measured(&rows, specimen, false));
        let thd = |level: f64, bypassed: bool| 100.0 * stage(bypassed).thd_at(&tube, level);
        let levels = [20.0, 10.0, 8.0];
        for level in levels {
            let k = LEVELS.iter().position(|&other| other == level).unwrap();
            let (Some(a), Some(b)) = (with[k], without[k]) else { continue };
            let (published, got) = (a / b, thd(level, true) / thd(level, false));
            println!("{specimen} {level} V: bypassed over unbypassed {published:.2}, {got:.2}");
            assert!((got / published - 1.0).abs() < 0.25);
        }
        for (bypassed, all) in [(true, &with), (false, &without)] {
            // Power of the level with which THD rises, over the levels that every specimen has.
            let (high, low) = (all[3].unwrap(), all[5].unwrap_or_else(|| all[4].unwrap()));
            let ratio: f64 = if all[5].is_some() { 20.0 / 8.0 } else { 2.0 };
            let published = (high / low).ln() / ratio.ln();
            let got = (thd(20.0, bypassed) / thd(20.0 / ratio, bypassed)).ln() / ratio.ln();
            println!("{specimen} bypassed {bypassed}: THD rises as level^{published:.2}, {got:.2}");
            assert!((got / published - 1.0).abs() < 0.25);
        }
    }
}
