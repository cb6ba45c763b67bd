//! The library in published stages: RCA Receiving Tube Manual's resistance-coupled amplifier charts (from memory, gains in
//! whole numbers), the ECC83 table of Philips' data (from memory), and four stages of Zollner, *Physik der
//! Elektrogitarre*, p. 10-328 (seen, rounded). Files and provenance in `tests/published`.

mod published;

use std::collections::BTreeMap;

use platewright_dsp::triode::library;
use published::{Coupled, Errors, Row, table, tube};

fn chart_stage(row: &Row) -> Coupled {
    Coupled {
        supply: row.number("supply_volts"),
        plate_resistor: 1e6 * row.number("plate_resistor_Mohm"),
        cathode_resistor: row.number("cathode_resistor_ohms"),
        next_grid_resistor: 1e6 * row.number("next_grid_resistor_Mohm"),
        bypassed: true,
    }
}

/// Whether the type's data file says that its fit used the row.
fn fitted(name: &str, stage: &Coupled) -> bool {
    let record = library::record(name).unwrap();
    let set = record.evidence.iter().find(|set| set.quantity == "gain" && set.what.contains("chart")).unwrap();
    let at = [stage.supply, stage.plate_resistor, stage.cathode_resistor, stage.next_grid_resistor];
    let same = |row: &&library::Row| row.at.iter().zip(at).all(|(a, b)| (a / b - 1.0).abs() < 1e-5);
    set.rows.iter().find(same).unwrap().fitted
}

#[test]
fn amplifier_charts() {
    let (mut all, mut kept_out, mut by_type) = (Errors::default(), Errors::default(), BTreeMap::new());
    for row in table("rc-amplifier-charts.csv") {
        let (name, stage, published) = (row.text("type"), chart_stage(&row), row.number("gain"));
        let got = stage.gain(&tube(name));
        let error = all.add(got, published);
        by_type.entry(name.to_owned()).or_insert_with(Errors::default).add(got, published);
        let out = !fitted(name, &stage);
        if out {
            kept_out.add(got, published);
        }
        let doubt = if row.doubted() { ", off its own trend in the chart" } else { "" };
        let note = if out { "kept out" } else { "fitted" };
        let (supply, plate, next) = (stage.supply, stage.plate_resistor, stage.next_grid_resistor);
        println!("{name} {supply} V {plate} {next}: gain {published}, {got:.2}, {error:+.1} % {note}{doubt}");
    }
    for (name, errors) in &by_type {
        println!("{name}: {} rows, median {:.2} %, worst {:.2} %", errors.count(), errors.median(), errors.worst());
    }
    println!("all: median {:.2} %, worst {:.2} %", all.median(), all.worst());
    println!(
        "kept out: {} rows, median {:.2} %, worst {:.2} %",
        kept_out.count(),
        kept_out.median(),
        kept_out.worst()
    );
    assert_eq!(kept_out.count(), 21, "a third of each chart");
    assert!(all.median() < 2.0 && all.worst() < 8.0);
    assert!(kept_out.median() < 3.0);
}

#[test]
fn ecc83_table() {
    let tube = tube("12AX7");
    let (mut gains, mut currents, mut distortions) = (Errors::default(), Errors::default(), Errors::default());
    for row in table("ecc83-table.csv") {
        let stage = Coupled {
            supply: row.number("supply_volts"),
            plate_resistor: 1e3 * row.number("plate_resistor_kohm"),
            cathode_resistor: row.number("cathode_resistor_ohms"),
            next_grid_resistor: 1e3 * row.number("next_grid_resistor_kohm"),
            bypassed: true,
        };
        let gain = gains.add(stage.gain(&tube), row.number("gain"));
        let current = currents.add(stage.point(&tube).currents.plate, 1e-3 * row.number("plate_mA"));
        // Never fitted: this judges the shape of the curves.
        let published = row.number("distortion_percent");
        let got = 100.0 * stage.thd_at(&tube, row.number("output_rms_volts"));
        let distortion = distortions.add(got, published);
        let (supply, plate) = (stage.supply, stage.plate_resistor);
        println!(
            "{supply} V {plate}: gain {gain:+.1} %, current {current:+.1} %, THD {published} {got:.2} {distortion:+.0} %"
        );
    }
    for (what, errors) in [("gain", &gains), ("current", &currents), ("distortion", &distortions)] {
        println!("{what}: median {:.2} %, worst {:.2} %", errors.median(), errors.worst());
    }
    assert!(gains.median() < 3.0);
    assert!(currents.median() < 2.5);
    assert!(distortions.median() < 15.0);
}

/// 300 V, 100 kΩ, 1.5 kΩ: current within 8 % and µ within 12 % for 12AX7, 12AT7, 12AU7, rp within 12 % for the first two.
#[test]
fn operating_points_in_one_plain_stage() {
    let stage = Coupled {
        supply: 300.0,
        plate_resistor: 100e3,
        cathode_resistor: 1500.0,
        next_grid_resistor: 1e9,
        bypassed: true,
    };
    for row in table("operating-points.csv") {
        let name = row.text("type");
        let Some(tube) = library::find(name) else { continue };
        let point = stage.point(&tube);
        let (mu, rp) = (point.gm() * point.rp(), point.rp());
        let error = |got: f64, published: f64| 100.0 * (got / published - 1.0);
        let current = error(point.currents.plate, 1e-3 * row.number("plate_mA"));
        let (mu, rp) = (error(mu, row.number("mu")), error(rp, 1e3 * row.number("rp_kohm")));
        println!("{name}: current {current:+.1} %, mu {mu:+.1} %, rp {rp:+.1} %");
        if name == "12AY7" {
            continue;
        }
        assert!(current.abs() < 8.0 && mu.abs() < 12.0, "{name}");
        assert!(rp.abs() < 12.0 || name == "12AU7", "{name}");
    }
}
