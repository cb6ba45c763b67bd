//! Operating points, tones and responses as tables.

use super::{SideBySide, units};
use crate::figures::{ConfigurationFigures, HarmonicFigures, OperatingPointFigures, RatingFigures, TubeFigures};

/// Highest harmonic whose phase a table shows; JSON has them all.
const HIGHEST_PHASE: u32 = 4;
use crate::plan::LevelUnit;

/// The operating points side by side.
pub fn operating_points(configurations: &[ConfigurationFigures]) -> SideBySide {
    let mut table = table(configurations);
    let points: Vec<_> = configurations.iter().map(|c| &c.operating_point).collect();
    table.heading("Supply");
    table.row("node B", points.iter().map(|p| Some(units::volts(p.supply_node))));
    tube_rows(&mut table, "Gain tube", "gain", &points, &|p| Some(&p.gain));
    tube_rows(&mut table, "Follower", "follower", &points, &|p| p.follower.as_ref());
    part_rows(&mut table, &points);
    meter_rows(&mut table, &points);
    table
}

pub(super) fn table(configurations: &[ConfigurationFigures]) -> SideBySide {
    SideBySide::of(configurations.iter().map(|c| c.name.as_str()))
}

type Points<'a> = [&'a OperatingPointFigures];

fn tube_rows(
    table: &mut SideBySide,
    heading: &str,
    part: &str,
    points: &Points<'_>,
    tube: &dyn for<'p> Fn(&'p OperatingPointFigures) -> Option<&'p TubeFigures>,
) {
    if points.iter().all(|p| tube(p).is_none()) {
        return;
    }
    let mut row = |label: &str, figure: &dyn Fn(&TubeFigures) -> Option<String>| {
        table.row(label, points.iter().map(|p| tube(p).and_then(figure)));
    };
    row(heading, &|t| Some(t.tube.clone()));
    row("plate", &|t| Some(units::volts(t.plate_to_ground)));
    row("cathode", &|t| Some(units::volts(t.cathode_to_ground)));
    row("junction", &|t| t.junction_to_ground.map(units::volts));
    row("grid–cathode", &|t| Some(units::volts(t.grid_to_cathode)));
    row("plate–cathode", &|t| Some(units::volts(t.plate_to_cathode)));
    row("plate current", &|t| Some(units::amperes(t.plate_current)));
    row("grid current", &|t| Some(units::amperes(t.grid_current)));
    row("gm", &|t| Some(units::siemens(t.gm)));
    row("µ", &|t| t.mu.map(|mu| format!("{mu:.2}")));
    row("rp", &|t| t.rp.map(units::ohms));
    row("dissipation", &|t| Some(units::watts(t.plate_dissipation)));
    for limit in limits(part, points) {
        let used = |p: &&OperatingPointFigures| {
            let rating = p.ratings.iter().find(|r| r.part == part && r.limit == limit)?;
            Some(used(rating))
        };
        table.row(&label(&limit), points.iter().map(used));
    }
}

/// The limits of a part, in the order of the figures.
fn limits(part: &str, points: &Points<'_>) -> Vec<String> {
    let mut out: Vec<String> = Vec::new();
    for rating in points.iter().flat_map(|p| &p.ratings).filter(|r| r.part == part) {
        if !out.contains(&rating.limit) {
            out.push(rating.limit.clone());
        }
    }
    out
}

fn label(limit: &str) -> String {
    match limit {
        "plate_dissipation" => "of plate watts",
        "plate_voltage" => "of plate volts",
        "plate_voltage_cold" => "of cold volts",
        "cathode_current" => "of cathode mA",
        "heater_cathode_voltage" => "of heater–cath.",
        other => other,
    }
    .to_owned()
}

fn used(rating: &RatingFigures) -> String {
    match rating.used_percent {
        Some(used) if used > 100.0 => format!("{used:.1} % !"),
        Some(used) => format!("{used:.0} %"),
        None => "not stated".to_owned(),
    }
}

fn part_rows(table: &mut SideBySide, points: &Points<'_>) {
    let mut keys: Vec<&str> = Vec::new();
    for part in points.iter().flat_map(|p| &p.parts) {
        if !keys.contains(&part.part.as_str()) {
            keys.push(&part.part);
        }
    }
    let figure = |key: &str, of: &dyn Fn(&crate::figures::PartFigures) -> Option<String>| {
        let found = |p: &&OperatingPointFigures| p.parts.iter().find(|part| part.part == key).and_then(of);
        points.iter().map(found).collect::<Vec<_>>()
    };
    table.heading("Heat in the parts");
    for &key in &keys {
        let cells = figure(key, &|p| p.volts_cold.is_none().then(|| units::watts(p.watts)));
        if cells.iter().flatten().any(|cell| cell != "0 W") {
            table.row(&short(key), cells.into_iter());
        }
    }
    table.heading("Capacitors, working");
    for &key in &keys {
        table.row(&short(key), figure(key, &|p| p.volts_cold.map(|_| units::volts(p.volts))).into_iter());
    }
    table.heading("Capacitors, tubes cold");
    for &key in &keys {
        table.row(&short(key), figure(key, &|p| p.volts_cold.map(units::volts)).into_iter());
    }
}

/// A part's key in few letters: the table's name alone where it says enough.
fn short(key: &str) -> String {
    match key {
        "source.resistance" => "source",
        "supply.resistance" => "supply resistor",
        "supply.reservoir" => "reservoir",
        "input.pot" => "pot",
        "input.grid_leak" => "grid leak",
        "input.grid_stopper" => "grid stopper",
        "gain.plate_resistor" => "plate resistor",
        "gain.cathode_resistor" => "cathode resist.",
        "gain.bypass" => "bypass",
        "gain.bypass.esr" => "bypass ESR",
        "gain.bypass.trickle_resistor" => "trickle resist.",
        "coupling.capacitor" => "coupling",
        "coupling.grid_stopper" => "2nd stopper",
        "coupling.grid_leak" => "2nd grid leak",
        "follower.bias_resistor" => "bias resistor",
        "follower.tail_resistor" => "tail resistor",
        "output.capacitor" => "output",
        "output.bleed" => "bleed",
        "output.load" => "load",
        "output.load.capacitance" => "load capacit.",
        other => other,
    }
    .to_owned()
}

fn meter_rows(table: &mut SideBySide, points: &Points<'_>) {
    let Some(ohms) = points.iter().find_map(|p| p.meter.as_ref()).map(|m| m.resistance) else { return };
    table.heading(&format!("With a {} meter", units::ohms(ohms)));
    let mut nodes: Vec<&str> = Vec::new();
    for reading in points.iter().filter_map(|p| p.meter.as_ref()).flat_map(|m| &m.readings) {
        if !nodes.contains(&reading.node.as_str()) {
            nodes.push(&reading.node);
        }
    }
    for node in nodes {
        let cell = |p: &&OperatingPointFigures| {
            let reading = p.meter.as_ref()?.readings.iter().find(|r| r.node == node)?;
            let mark = if reading.advice.is_some() { "* " } else { "" };
            Some(format!("{mark}{}", reading.metered.map_or_else(|| "–".to_owned(), units::volts)))
        };
        table.row(node, points.iter().map(cell));
    }
}

/// The tones side by side; `None` where none was asked.
pub fn tones(configurations: &[ConfigurationFigures], unit: LevelUnit) -> Option<SideBySide> {
    let count = configurations.iter().filter_map(|c| c.tones.as_ref()).map(Vec::len).max()?;
    let mut table = table(configurations);
    for index in 0..count {
        let each = || configurations.iter().map(move |c| c.tones.as_ref().and_then(|t| t.get(index)));
        let Some(first) = each().flatten().next() else { continue };
        table.heading(&format!("{}, {} rms", units::hertz(first.frequency), units::level(first.input_rms, unit)));
        table.row("gain", each().map(|t| t.map(|t| or_dash(t.gain_db, units::decibels))));
        table
            .row("output", each().map(|t| t.map(|t| or_dash(t.output_fundamental_rms, |v| units::level(v, unit)))));
        table.row("THD_F", each().map(|t| t.map(|t| or_dash(t.thd_percent, units::percent))));
        table.row("THD_R", each().map(|t| t.map(|t| or_dash(t.thd_r_percent, units::percent))));
        for order in 2..=first.thd_orders {
            let figure = |of: fn(&HarmonicFigures) -> String| {
                each().map(move |t| t.and_then(|t| t.harmonics.iter().find(|h| h.order == order)).map(of))
            };
            table.row(&format!("H{order} dBc"), figure(level_with_trust));
            if order <= HIGHEST_PHASE {
                table.row("  phase", figure(|h| or_dash(h.phase_deg, |p| format!("{:.0}°", p.round() % 360.0))));
            }
        }
    }
    Some(table)
}

/// A harmonic's level, and how far the tube data carry it where that is known.
fn level_with_trust(harmonic: &HarmonicFigures) -> String {
    match (harmonic.dbc, harmonic.trust_db) {
        (Some(dbc), Some(trust)) => format!("{dbc:.2} ±{trust:.1}"),
        (Some(dbc), None) => format!("{dbc:.2}"),
        _ => "–".to_owned(),
    }
}

pub(super) fn or_dash(value: Option<f64>, show: impl Fn(f64) -> String) -> String {
    value.map_or_else(|| "–".to_owned(), show)
}

/// The responses side by side; `None` where none was asked.
pub fn responses(configurations: &[ConfigurationFigures]) -> Option<SideBySide> {
    let count = configurations.iter().filter_map(|c| c.response.as_ref()).map(Vec::len).max()?;
    let mut table = table(configurations);
    for index in 0..count {
        let each = || configurations.iter().map(move |c| c.response.as_ref().and_then(|r| r.get(index)));
        let Some(first) = each().flatten().next() else { continue };
        table.heading(&units::hertz(first.frequency));
        table.row("gain", each().map(|r| r.map(|r| or_dash(r.gain_db, units::decibels))));
        table.row("phase", each().map(|r| r.map(|r| or_dash(r.phase_deg, |p| format!("{p:.2}°")))));
        table.row("input |Z|", each().map(|r| r.map(|r| or_dash(r.input_impedance.map(size), units::ohms))));
        table.row("output |Z|", each().map(|r| r.map(|r| or_dash(r.output_impedance.map(size), units::ohms))));
    }
    Some(table)
}

fn size([re, im]: [f64; 2]) -> f64 {
    libm::hypot(re, im)
}

/// The few figures that a choice begins with, at the first tone that was measured.
pub fn at_a_glance(configurations: &[ConfigurationFigures], unit: LevelUnit) -> SideBySide {
    let mut table = table(configurations);
    let tone = || configurations.iter().map(|c| c.tones.as_ref().and_then(|t| t.first()));
    if let Some(first) = tone().flatten().next() {
        let at = format!("{}, {} rms", units::hertz(first.frequency), units::level(first.input_rms, unit));
        table.heading(&at);
    }
    table.row("gain", tone().map(|t| t.and_then(|t| t.gain_db).map(units::decibels)));
    table.row("THD_F", tone().map(|t| t.and_then(|t| t.thd_percent).map(units::percent)));
    let dbc = |order: u32| {
        tone().map(move |t| {
            let harmonic = t?.harmonics.iter().find(|h| h.order == order)?;
            Some(level_with_trust(harmonic))
        })
    };
    table.row("H2 dBc", dbc(2));
    table.row("H3 dBc", dbc(3));
    let point = || configurations.iter().map(|c| &c.operating_point);
    table.row("gain tube", point().map(|p| Some(p.gain.tube.clone())));
    table.row("  current", point().map(|p| Some(units::amperes(p.gain.plate_current))));
    table.row("  plate–cathode", point().map(|p| Some(units::volts(p.gain.plate_to_cathode))));
    table.row("follower", point().map(|p| p.follower.as_ref().map(|f| f.tube.clone())));
    table.row("  current", point().map(|p| p.follower.as_ref().map(|f| units::amperes(f.plate_current))));
    table.row("  cathode", point().map(|p| p.follower.as_ref().map(|f| units::volts(f.cathode_to_ground))));
    table.row("worst rating", point().map(|p| Some(worst(&p.ratings))));
    table
}

fn worst(ratings: &[RatingFigures]) -> String {
    let known = ratings.iter().filter_map(|r| r.used_percent);
    known.max_by(f64::total_cmp).map_or_else(|| "none stated".to_owned(), |used| format!("{used:.0} %"))
}

/// Where not to hold a meter, and where to hold it instead; empty where no meter was asked.
pub fn meter_advice(configurations: &[ConfigurationFigures]) -> String {
    let mut out = String::new();
    for configuration in configurations {
        let readings = configuration.operating_point.meter.iter().flat_map(|m| &m.readings);
        for reading in readings.filter(|r| r.advice.is_some()) {
            let advice = reading.advice.as_deref().unwrap_or_default();
            let name = crate::terminal::plain(&configuration.name);
            out.push_str(&format!("* {} [{name}]: {advice}\n", reading.node));
        }
    }
    out
}
