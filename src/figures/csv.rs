//! The figures as CSV: one figure a row, taken from the same values and names as the JSON.

use serde_json::{Map, Value};

use super::Figures;
use crate::failure::{Failure, WorkError};

/// The first row.
const HEADER: [&str; 10] =
    ["configuration", "group", "figure", "frequency (Hz)", "level (V rms)", "order", "of", "value", "unit", "why"];

/// Keys that say where a group's figures belong rather than being figures: those that fill `of`, and those that fill the
/// columns of their own.
const PLACES: &[(&str, &[&str])] = &[
    ("operating_point.parts", &["part"]),
    ("operating_point.ratings", &["part", "limit"]),
    ("operating_point.warnings", &["part", "limit"]),
    ("operating_point.meter.readings", &["node"]),
    ("response", &["frequency"]),
    ("tones", &["frequency", "input_rms"]),
    ("tones.harmonics", &["order"]),
    ("tones.warnings", &["part", "limit"]),
    ("level_sweep", &["input_rms"]),
    ("frequency_sweep.points", &["frequency"]),
    ("imd", &["kind", "input_rms"]),
    ("headroom.thd", &["percent"]),
    ("headroom.grid_current_of", &["tube"]),
    ("headroom.cutoff_of", &["tube"]),
    ("profile", &["frequency"]),
    ("profile.harmonics", &["order", "want"]),
    ("undecided", &["order"]),
    ("renders", &["recording", "file"]),
];

/// What a configuration holds beside its figures: its name, and what the page draws.
const NO_FIGURES: [&str; 4] = ["name", "values", "curves", "bench_sheet"];

/// Units by the end of a figure's name; the first that fits.
const UNITS: &[(&str, &str)] = &[
    ("_dB", "dB"),
    ("_dBFS", "dBFS"),
    ("_LUFS", "LUFS"),
    ("dBc", "dBc"),
    ("wanted", "dBc"),
    ("got", "dBc"),
    ("_deg", "°"),
    ("percent", "%"),
    ("hum_frequency", "Hz"),
    ("low", "Hz"),
    ("high", "Hz"),
    ("sample_rate", "Hz"),
    ("alias_tone", "Hz"),
    ("full_scale_rms", "V rms"),
    ("_rms", "V rms"),
    ("_rms_a", "V rms"),
    ("volts", "V"),
    ("volts_cold", "V"),
    ("metered", "V"),
    ("supply_node", "V"),
    ("to_ground", "V"),
    ("to_cathode", "V"),
    ("_current", "A"),
    ("dissipation", "W"),
    ("watts", "W"),
    ("gm", "S"),
    ("rp", "Ω"),
    ("_impedance_re", "Ω"),
    ("_impedance_im", "Ω"),
    ("resistance", "Ω"),
    // Plain numbers and counts.
    ("mu", ""),
    ("weight", ""),
    ("thd_orders", ""),
    ("channels", ""),
    ("frames", ""),
    ("oversampling", ""),
    ("over_full_scale", ""),
    ("newton_per_step", ""),
    ("unresolved_steps", ""),
];

impl Figures {
    /// The figures as CSV (RFC 4180, lines ended by a newline alone).
    ///
    /// # Errors
    /// Never for figures made here; a defect otherwise.
    pub fn to_csv(&self) -> Result<Vec<u8>, Failure> {
        let defect = |reason: String| WorkError::Failed {
            problem: format!("the figures could not be written as CSV: {reason}"),
            remedy: "please report this".to_owned(),
        };
        let value = serde_json::to_value(self).map_err(|error| defect(error.to_string()))?;
        let mut writer = csv::Writer::from_writer(Vec::new());
        writer.write_record(HEADER).map_err(|error| defect(error.to_string()))?;
        for row in rows(&value) {
            writer.write_record(&row).map_err(|error| defect(error.to_string()))?;
        }
        writer.into_inner().map_err(|error| defect(error.to_string()).into())
    }
}

type Row = [String; HEADER.len()];

/// Where a figure belongs.
#[derive(Clone, Default)]
struct Place {
    configuration: String,
    group: String,
    frequency: String,
    level: String,
    order: String,
    of: Vec<String>,
}

fn rows(figures: &Value) -> Vec<Row> {
    let mut rows = Vec::new();
    let list = |key: &str| figures[key].as_array().into_iter().flatten().filter_map(Value::as_object);
    for configuration in list("configurations") {
        let place = Place { configuration: text(&configuration["name"]), ..Place::default() };
        object(&place, configuration, &NO_FIGURES, &mut rows);
    }
    for undecided in list("undecided") {
        let between: Vec<String> = undecided["between"].as_array().into_iter().flatten().map(text).collect();
        let place = Place { configuration: between.join(" / "), group: "undecided".to_owned(), ..Place::default() };
        object(&place, undecided, &["between"], &mut rows);
    }
    for render in list("renders") {
        let place = Place {
            configuration: text(&render["configuration"]),
            group: "renders".to_owned(),
            ..Place::default()
        };
        object(&place, render, &["configuration"], &mut rows);
    }
    rows
}

fn object(outer: &Place, figures: &Map<String, Value>, named: &[&str], rows: &mut Vec<Row>) {
    let mut place = outer.clone();
    let places = PLACES.iter().find(|(group, _)| *group == place.group).map_or(&[][..], |(_, keys)| keys);
    for key in places.iter().filter(|key| figures.contains_key(**key)) {
        let shown = text(&figures[*key]);
        match *key {
            "frequency" => place.frequency = shown,
            "input_rms" => place.level = shown,
            "order" => place.order = shown,
            "percent" => place.of.push(format!("{shown} %")),
            _ => place.of.push(shown),
        }
    }
    let why = figures.get("why").and_then(Value::as_object);
    let mut ordered: Vec<(&String, &Value)> = figures.iter().collect();
    // Single figures before the groups within.
    ordered.sort_by_key(|(_, value)| value.is_object() || value.is_array());
    for (key, value) in ordered {
        if key == "why" || key == "unit" || named.contains(&key.as_str()) || places.contains(&key.as_str()) {
            continue;
        }
        let inner = || Place { group: join(&place.group, key), ..place.clone() };
        match value {
            Value::Object(map) => object(&inner(), map, &[], rows),
            Value::Array(items) if items.iter().any(Value::is_object) => {
                items.iter().filter_map(Value::as_object).for_each(|map| object(&inner(), map, &[], rows));
            }
            Value::Array(items) => {
                let reason = why.and_then(|why| why.get(key)).map(text).unwrap_or_default();
                list(&place, key, items, &reason, rows);
            }
            single => {
                let reason = why.and_then(|why| why.get(key)).map(text).unwrap_or_default();
                let own_unit = figures.get("unit").filter(|_| matches!(key.as_str(), "asked" | "allowed"));
                let unit = own_unit.map_or_else(|| unit_of(key, single), text);
                rows.push(row(&place, key, single, unit, reason));
            }
        }
    }
}

/// A list of numbers: a complex number, harmonics from the second, volts of each tube, or one a fit.
fn list(outer: &Place, key: &str, items: &[Value], why: &str, rows: &mut Vec<Row>) {
    for (at, item) in items.iter().enumerate() {
        let mut place = outer.clone();
        let mut figure = key.to_owned();
        match key {
            "input_impedance" | "output_impedance" => figure.push_str(if at == 0 { "_re" } else { "_im" }),
            "harmonics_dBc" => place.order = (at + 2).to_string(),
            "least_plate_volts" | "peak_plate_volts" => {
                place.of.push(if at == 0 { "gain" } else { "follower" }.to_owned());
            }
            _ => place.of.push((at + 1).to_string()),
        }
        let unit = unit_of(&figure, item);
        let reason = if item.is_null() { why.to_owned() } else { String::new() };
        rows.push(row(&place, &figure, item, unit, reason));
    }
}

fn row(place: &Place, figure: &str, value: &Value, unit: String, why: String) -> Row {
    let Place { configuration, group, frequency, level, order, of } = place.clone();
    let value = text(value);
    [configuration, group, figure.to_owned(), frequency, level, order, of.join(", "), value, unit, why]
}

/// The unit of a number, none of a text.
fn unit_of(figure: &str, value: &Value) -> String {
    if value.is_string() {
        return String::new();
    }
    UNITS
        .iter()
        .find(|(end, _)| figure.ends_with(end))
        .map_or_else(|| "?".to_owned(), |(_, unit)| (*unit).to_owned())
}

fn text(value: &Value) -> String {
    match value {
        Value::Null => String::new(),
        Value::String(text) => text.clone(),
        other => other.to_string(),
    }
}

fn join(group: &str, key: &str) -> String {
    if group.is_empty() { key.to_owned() } else { format!("{group}.{key}") }
}
