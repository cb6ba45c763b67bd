//! The library against the makers' typical operation: data sheets and RCA Receiving Tube Manual RC-30, copied to
//! `tests/published/tubes.csv` with how sure each row is (most are from memory).

mod published;

use std::collections::BTreeMap;

use platewright_dsp::triode::fitting::{Condition, Quantity};
use platewright_dsp::triode::library;
use published::{Errors, Row, table, tube};

/// How the row was taken.
fn condition(row: &Row) -> Condition {
    let vpk = row.number("plate_volts");
    match row.maybe("grid_volts") {
        Some(vgk) => Condition::Bias { vpk, vgk },
        None => Condition::CathodeResistor { vpk, resistor: row.number("cathode_resistor_ohms") },
    }
}

#[test]
fn every_type_of_the_table_that_the_library_has_meets_its_typical_operation() {
    let columns = [
        ("plate_mA", 1e-3, Quantity::PlateCurrent),
        ("mu", 1.0, Quantity::Mu),
        ("gm_mS", 1e-3, Quantity::Gm),
        ("rp_kohm", 1e3, Quantity::Rp),
    ];
    let mut all: BTreeMap<&str, Errors> = BTreeMap::new();
    for row in table("tubes.csv") {
        let Some(tube) = library::find(row.text("type")) else { continue };
        let condition = condition(&row);
        for (column, unit, quantity) in columns {
            let got = quantity.of(&tube.section, &condition);
            let published = row.number(column) * unit;
            let error = all.entry(column).or_default().add(got, published);
            println!(
                "{} point {} {column}: {published} published, {got:.4e}, {error:+.1} %",
                tube.name,
                row.text("point")
            );
        }
    }
    let errors = |column: &str| &all[column];
    for (column, errors) in &all {
        println!("{column}: median {:.2} %, worst {:.2} %", errors.median(), errors.worst());
    }
    assert!(errors("plate_mA").median() < 2.0 && errors("plate_mA").worst() < 8.0);
    for column in ["mu", "gm_mS", "rp_kohm"] {
        assert!(errors(column).median() < 5.0, "{column}");
    }
}

/// Ratings, heater and capacitances are the table's, digit for digit.
#[test]
fn ratings_heaters_and_capacitances_are_as_published() {
    for row in table("tubes.csv") {
        let Some(tube) = library::find(row.text("type")) else { continue };
        let near = |got: Option<f64>, column: &str, unit: f64| {
            let published = row.maybe(column).map(|value| value * unit);
            let same = match (got, published) {
                (Some(a), Some(b)) => (a / b - 1.0).abs() < 1e-9,
                (a, b) => a == b,
            };
            assert!(same, "{} {column}: {got:?} for {published:?}", tube.name);
        };
        let (limits, c) = (tube.limits, tube.section.capacitance);
        near(limits.plate_voltage, "max_plate_V", 1.0);
        near(limits.plate_dissipation, "max_plate_W", 1.0);
        near(limits.cathode_current, "max_cathode_mA", 1e-3);
        near(limits.heater_cathode_voltage, "max_heater_cathode_V", 1.0);
        near(tube.heater.map(|heater| heater.voltage), "heater_V", 1.0);
        near(tube.heater.map(|heater| heater.current), "heater_A", 1.0);
        near(Some(c.grid_plate), "C_grid_plate_pF", 1e-12);
        near(Some(c.grid_cathode), "C_grid_cathode_pF", 1e-12);
        near(Some(c.plate_cathode), "C_plate_cathode_pF", 1e-12);
    }
}

/// No published typical operation breaks its own type's ratings by the library's law, the rows that the table doubts
/// apart.
#[test]
fn typical_operation_stays_within_the_ratings() {
    for row in table("tubes.csv").iter().filter(|row| !row.doubted()) {
        let Some(tube) = library::find(row.text("type")) else { continue };
        let condition = condition(row);
        let vpk = row.number("plate_volts");
        for current in [row.number("plate_mA") * 1e-3, Quantity::PlateCurrent.of(&tube.section, &condition)] {
            let within = |limit: Option<f64>, value: f64| limit.is_none_or(|limit| value < 1.01 * limit);
            assert!(within(tube.limits.plate_dissipation, vpk * current), "{} {} W", tube.name, vpk * current);
            assert!(within(tube.limits.cathode_current, current), "{} {current} A", tube.name);
            assert!(within(tube.limits.plate_voltage, vpk), "{} {vpk} V", tube.name);
        }
    }
}

#[test]
fn names_that_the_tests_use_are_there() {
    for name in ["12AX7", "12AT7", "12AU7", "12BH7A", "6SN7GTB", "6DJ8"] {
        assert_eq!(tube(name).name, name);
    }
}
