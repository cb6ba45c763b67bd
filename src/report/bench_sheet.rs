//! One sheet of paper for the bench.

use super::words;
use crate::figures::{BandFigures, ConfigurationFigures, PartFigures, ProvenanceFigures, ValueFigure};
use crate::iec60062::{self, Letters};
use crate::show::{self, units};

/// What a sheet holds, in words.
#[derive(Clone, Debug, PartialEq)]
pub struct Sheet {
    pub meter: String,
    pub basis: String,
    pub nodes: Vec<Reading>,
    pub across: Vec<Reading>,
    pub resistors: Vec<PartLine>,
    pub capacitors: Vec<PartLine>,
    pub tubes: Vec<String>,
    pub advice: Vec<String>,
}

/// A line with room for what was read.
#[derive(Clone, Debug, PartialEq)]
pub struct Reading {
    pub place: String,
    pub meaning: String,
    pub expected: String,
    pub json: String,
    pub band: String,
    /// Where the meter disturbs what it reads.
    pub avoid: bool,
}

/// A part and what it must stand.
#[derive(Clone, Debug, PartialEq)]
pub struct PartLine {
    pub part: String,
    pub value: String,
    pub stands: String,
    pub cold: String,
    pub fit: String,
}

/// The sheet of configuration number `k`; `None` where report.json holds no readings for it.
pub fn sheet(k: usize, figures: &ConfigurationFigures, provenance: Option<&ProvenanceFigures>) -> Option<Sheet> {
    let bench = figures.bench_sheet.as_ref()?;
    let nodes = |list: &[BandFigures], key: &str| -> Vec<Reading> {
        let pointer = |at: usize| format!("/configurations/{k}/bench_sheet/{key}/{at}/expected");
        list.iter().enumerate().map(|(at, band)| reading(band, pointer(at))).collect()
    };
    let parts = || figures.operating_point.parts.iter().filter(|part| part.part != "source.resistance");
    let line = |part: &PartFigures| part_line(figures, part);
    let basis = format!(
        "Bands: 5th to 95th percentile of {} builds; resistors ±{} %, supply ±{} %, tubes as measured sections scatter.",
        bench.builds,
        words::significant(bench.resistors_percent, 3),
        words::significant(bench.supply_percent, 3)
    );
    Some(Sheet {
        meter: words::nice(&units::ohms(bench.meter_resistance)),
        basis,
        nodes: nodes(&bench.nodes, "nodes"),
        across: nodes(&bench.across, "across"),
        resistors: parts().filter(|p| p.volts_cold.is_none() && p.watts > 0.0).map(line).collect(),
        capacitors: parts().filter(|p| p.volts_cold.is_some()).map(line).collect(),
        tubes: tubes(figures, provenance),
        advice: advice(&bench.nodes),
    })
}

/// Nodes with the same advice, in one line.
fn advice(nodes: &[BandFigures]) -> Vec<String> {
    let mut lines: Vec<(String, &str)> = Vec::new();
    for (place, advice) in nodes.iter().filter_map(|band| Some((&band.place, band.advice.as_deref()?))) {
        match lines.iter_mut().find(|(_, known)| *known == advice) {
            Some((places, _)) => places.push_str(&format!(", {place}")),
            None => lines.push((place.clone(), advice)),
        }
    }
    lines.iter().map(|(places, advice)| format!("{places}: {}.", words::nice_sentence(advice))).collect()
}

fn reading(band: &BandFigures, json: String) -> Reading {
    let ends = band.low.zip(band.high);
    Reading {
        place: band.place.clone(),
        meaning: meaning(&band.place).to_owned(),
        expected: band.expected.map_or_else(|| "–".to_owned(), words::bench_volts),
        json,
        band: ends.map_or_else(|| "–".to_owned(), |(low, high)| range(low, high)),
        avoid: band.advice.is_some(),
    }
}

/// "171 to 198 V", both with the digits of the larger.
fn range(low: f64, high: f64) -> String {
    let size = low.abs().max(high.abs());
    let (scale, decimals, unit) = match size {
        size if size >= 99.95 => (1.0, 0, "V"),
        size if size >= 9.995 => (1.0, 1, "V"),
        size if size >= 0.0995 => (1.0, 2, "V"),
        _ => (1e3, 1, "mV"),
    };
    if size < 0.5e-4 {
        return words::fixed(0.0, 0, "V");
    }
    let number = |value: f64| words::plain_number(scale * value, decimals);
    format!("{} to {}\u{a0}{unit}", number(low), number(high))
}

fn part_line(figures: &ConfigurationFigures, part: &PartFigures) -> PartLine {
    let capacitor = part.volts_cold.is_some();
    let stands = if capacitor { words::bench_volts(part.volts) } else { words::nice(&units::watts(part.watts)) };
    PartLine {
        part: part.part.clone(),
        value: value(figures, &part.part),
        stands,
        cold: part.volts_cold.map_or_else(String::new, words::bench_volts),
        fit: words::nice(&show::suggested(part)),
    }
}

/// A part's value as it is marked.
fn value(figures: &ConfigurationFigures, part: &str) -> String {
    let key = match part {
        "gain.bypass" => "gain.bypass.capacitance",
        "input.pot" => "input.pot.resistance",
        "output.load" => "output.load.resistance",
        other => other,
    };
    let farads = part.contains("capacit") || part == "gain.bypass" || part == "supply.reservoir";
    let letters = if farads { Letters::Capacitance } else { Letters::Resistance };
    match figures.values.as_ref().and_then(|values| values.get(key)) {
        Some(ValueFigure::Number(value)) => iec60062::format(*value, letters).replace('u', "µ"),
        _ => String::new(),
    }
}

fn tubes(figures: &ConfigurationFigures, provenance: Option<&ProvenanceFigures>) -> Vec<String> {
    let point = &figures.operating_point;
    let line = |(role, tube): (&str, &crate::figures::TubeFigures)| {
        let known = provenance.and_then(|p| p.tubes.iter().find(|data| data.tube == tube.tube));
        let heater = known.and_then(|data| data.heater_voltage.zip(data.heater_current)).map_or_else(
            || "heater not stated".to_owned(),
            |(volts, amperes)| {
                format!("heater {} V, {} A", words::significant(volts, 3), words::significant(amperes, 3))
            },
        );
        let basing = known.and_then(|data| data.basing.as_ref());
        let basing = basing.map_or_else(|| "base not stated".to_owned(), |basing| format!("base {basing}"));
        format!(
            "{role}: {}, {heater}, {basing}; plate current {}, plate to cathode {}, heat at the plate {}",
            tube.tube,
            words::nice(&units::amperes(tube.plate_current)),
            words::bench_volts(tube.plate_to_cathode),
            words::nice(&units::watts(tube.plate_dissipation)),
        )
    };
    [("gain", Some(&point.gain)), ("follower", point.follower.as_ref())]
        .into_iter()
        .filter_map(|(role, tube)| Some(line((role, tube?))))
        .map(|text| crate::terminal::plain(&text).into_owned())
        .collect()
}

fn meaning(place: &str) -> &'static str {
    match place {
        "B" => "decoupled supply",
        "p1" => "plate, gain tube",
        "k1" => "cathode, gain tube",
        "g1" => "grid, gain tube",
        "x" => "behind coupling capacitor",
        "g2" => "grid, follower",
        "k2" => "cathode, follower",
        "j" => "bias and tail junction",
        "o" => "output",
        _ => "",
    }
}
