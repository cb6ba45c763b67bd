//! The bench sheet: what a builder reads at each node, and what every part must stand.

use super::{CAUTIONS, units};
use crate::figures::{ConfigurationFigures, OperatingPointFigures, PartFigures, RatingFigures};
use crate::terminal::plain;

/// A wirewound or film resistor is chosen for at least this many times its heat. Common practice, no source.
const RESISTOR_MARGIN: f64 = 2.0;
/// A capacitor is chosen for at least this many times the most it meets. Common practice, no source.
const CAPACITOR_MARGIN: f64 = 1.2;
/// Wattages that resistors are sold in, W.
const SOLD_WATTS: [f64; 9] = [0.25, 0.5, 1.0, 2.0, 3.0, 5.0, 10.0, 25.0, 50.0];
/// Voltages that capacitors are sold for, V.
const SOLD_VOLTS: [f64; 14] =
    [16.0, 25.0, 35.0, 50.0, 63.0, 100.0, 160.0, 250.0, 350.0, 400.0, 450.0, 500.0, 630.0, 1000.0];

/// The sheets of all configurations, the cautions first.
pub fn bench_sheet(title: Option<&str>, configurations: &[ConfigurationFigures]) -> String {
    let mut out =
        format!("BENCH SHEET{}\n\n{CAUTIONS}", title.map(|t| format!(": {}", plain(t))).unwrap_or_default());
    for configuration in configurations {
        out.push_str(&sheet(configuration));
    }
    out
}

fn sheet(configuration: &ConfigurationFigures) -> String {
    let point = &configuration.operating_point;
    let mut out = format!("\n== {} ==\n", plain(&configuration.name));
    for warning in &point.warnings {
        let mark = if warning.used_percent.is_some() { "EXCEEDED" } else { "note" };
        out.push_str(&format!("{mark}: {}\n", plain(&warning.text)));
    }
    out.push_str(&readings(point));
    out.push_str(&tubes(point));
    out.push_str(&parts(point));
    out
}

fn readings(point: &OperatingPointFigures) -> String {
    let Some(meter) = &point.meter else { return String::new() };
    let mut out =
        format!("\nTo ground, {} meter            expect      true     read\n", units::ohms(meter.resistance));
    for reading in &meter.readings {
        out.push_str(&format!(
            "  {:<26}{:>11}{:>10}  ______\n",
            node_in_words(&reading.node),
            reading.metered.map_or_else(|| "–".to_owned(), units::volts),
            units::volts(reading.volts),
        ));
        if let Some(advice) = &reading.advice {
            out.push_str(&format!("      {advice}\n"));
        }
    }
    out + &across(point)
}

/// Voltages across the resistors that tell the currents, which load nothing.
fn across(point: &OperatingPointFigures) -> String {
    let told = ["gain.cathode_resistor", "follower.bias_resistor", "supply.resistance"];
    let mut out = String::from("\nAcross                                 expect                read\n");
    for part in point.parts.iter().filter(|p| told.contains(&p.part.as_str())) {
        out.push_str(&format!("  {:<26}{:>17}            ______\n", part.part, units::volts(part.volts)));
    }
    out
}

fn tubes(point: &OperatingPointFigures) -> String {
    let mut out = String::from("\nTubes\n");
    for (name, tube) in [("gain", Some(&point.gain)), ("follower", point.follower.as_ref())] {
        let Some(tube) = tube else { continue };
        out.push_str(&format!(
            "  {name} {}: {}, {} plate to cathode, {} grid to cathode, {}\n",
            plain(&tube.tube),
            units::amperes(tube.plate_current),
            units::volts(tube.plate_to_cathode),
            units::volts(tube.grid_to_cathode),
            units::watts(tube.plate_dissipation),
        ));
        for rating in point.ratings.iter().filter(|r| r.part == name) {
            out.push_str(&format!("      {}\n", margin(rating)));
        }
    }
    out
}

fn margin(rating: &RatingFigures) -> String {
    let name = rating.limit.replace('_', " ");
    let show = |value: f64| match rating.unit.as_str() {
        "A" => units::amperes(value),
        "W" => units::watts(value),
        _ => units::volts(value),
    };
    match (rating.allowed, rating.used_percent) {
        (Some(allowed), Some(used)) => {
            format!("{name}: {} of {} ({used:.0} %)", show(rating.asked), show(allowed))
        }
        _ => format!("{name}: {}; limit not stated", show(rating.asked)),
    }
}

fn parts(point: &OperatingPointFigures) -> String {
    let mut out = String::from("\nParts                         heat     volts      cold   fit at least\n");
    for part in &point.parts {
        out.push_str(&format!(
            "  {:<24}{:>10}{:>10}{:>10}   {}\n",
            part.part,
            if part.volts_cold.is_some() { "–".to_owned() } else { units::watts(part.watts) },
            units::volts(part.volts),
            part.volts_cold.map_or_else(|| "–".to_owned(), units::volts),
            suggested(part),
        ));
    }
    out
}

/// The next rating that is sold, with the usual margin.
pub fn suggested(part: &PartFigures) -> String {
    let (needed, sold, unit) = match part.volts_cold {
        Some(cold) => (CAPACITOR_MARGIN * part.volts.max(cold), &SOLD_VOLTS[..], "V"),
        None => (RESISTOR_MARGIN * part.watts, &SOLD_WATTS[..], "W"),
    };
    match sold.iter().find(|&&rating| rating >= needed) {
        Some(rating) => format!("{rating} {unit}"),
        None => format!("{needed:.0} {unit}: several in series or parallel"),
    }
}

fn node_in_words(node: &str) -> &str {
    match node {
        "B" => "B, decoupled supply",
        "p1" => "p1, plate of gain tube",
        "k1" => "k1, cathode of gain tube",
        "g1" => "g1, grid of gain tube",
        "x" => "x, behind coupling cap.",
        "g2" => "g2, grid of follower",
        "k2" => "k2, cathode of follower",
        "j" => "j, bias and tail junction",
        "o" => "o, output",
        other => other,
    }
}
