//! The one table of every key a stage file may hold.
//!
//! Unknown keys, keys whose time has not come, overrides and values are all checked against it.

use super::quantity::{
    self as q, CAPACITOR, CURRENT, ELECTRODES, FORMAT, FRACTION, FREQUENCY, OR_WIRE, POWER, Quantity, RESISTOR,
    TOLERANCE, VOLTAGE,
};

/// One key.
#[derive(Clone, Copy, Debug)]
pub struct Key {
    /// Dotted path from the top of the file; the keys of each `[[tube]]` stand under "tube".
    pub path: &'static str,
    /// What it takes.
    pub kind: Kind,
    /// Whether this version knows what to do with it.
    pub status: Status,
    /// One line for a designer.
    pub doc: &'static str,
}

/// What a key takes.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Kind {
    /// A table with keys of its own.
    Table,
    /// A list of such tables, `[[…]]`.
    Tables,
    /// A part: a value, or a table of value, tolerance, watts and volts. The text is the part's name in figures.
    Part(Quantity, &'static str),
    /// A number that is no part of its own.
    Number(Quantity),
    /// true or false.
    Switch,
    /// One of a few words: those this version knows, and those it will.
    Choice(&'static [&'static str], &'static [&'static str]),
    /// The name of a tube type.
    Tube,
    /// Any text.
    Text,
    /// Parameters of a tube law; the keys depend on the law.
    Parameters,
    /// A list of such parameters.
    Ensemble,
    /// Keys that are paths of this table themselves: `[compare]` and `set`.
    Overrides,
}

/// Whether this version knows what to do with a key.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Status {
    /// It does.
    Now,
    /// A later version will.
    NotYet,
}

const fn now(path: &'static str, kind: Kind, doc: &'static str) -> Key {
    Key { path, kind, status: Status::Now, doc }
}

const fn part(path: &'static str, quantity: Quantity, doc: &'static str) -> Key {
    now(path, Kind::Part(quantity, path), doc)
}

const fn later(path: &'static str, doc: &'static str) -> Key {
    Key { path, kind: Kind::Text, status: Status::NotYet, doc }
}

/// Tables that describe the stage itself: overrides reach these and no others.
pub const STAGE_TABLES: [&str; 7] = ["supply", "source", "input", "gain", "coupling", "follower", "output"];

/// Words of `coupling.kind`.
pub const COUPLING_KINDS: [&str; 2] = ["capacitor", "direct"];
/// Words of `coupling.returns_to`.
pub const LEAK_RETURNS: [&str; 2] = ["bias-junction", "ground"];
/// Words of `tube.model`.
pub const MODELS: [&str; 3] = ["two-section", "dempwolf-zoelzer", "koren"];

/// Every key.
pub const KEYS: &[Key] = &[
    now("format", Kind::Number(FORMAT), "version of this file format"),
    now("title", Kind::Text, "a title for the report"),
    now("supply", Kind::Table, "the supply and its decoupling"),
    now("supply.voltage", Kind::Number(VOLTAGE), "supply voltage before its resistance"),
    part("supply.resistance", RESISTOR, "resistance between the supply and node B"),
    part("supply.reservoir", CAPACITOR, "capacitor from node B to ground"),
    later("supply.cold_voltage", "supply voltage while the tubes are cold"),
    later("supply.shared_by", "channels fed through the same resistance"),
    later("supply.other_current", "what else draws current from node B"),
    now("supply.ripple_rms", Kind::Number(VOLTAGE), "ripple on the supply voltage, V rms"),
    now("supply.ripple_frequency", Kind::Number(FREQUENCY), "frequency of the ripple"),
    later("supply.gain_decoupling", "the gain tube's own decoupled node"),
    later("heater", "the heater supply"),
    now("source", Kind::Table, "what drives the stage"),
    part("source.resistance", RESISTOR, "source resistance"),
    now("source.full_scale", Kind::Number(VOLTAGE), "V rms of a 0 dBFS sine"),
    now("input", Kind::Table, "pot, grid leak and grid stopper of the gain tube"),
    now("input.pot", Kind::Table, "level pot"),
    now("input.pot.resistance", Kind::Part(RESISTOR, "input.pot"), "whole track of the pot"),
    now("input.pot.position", Kind::Number(FRACTION), "rotation of the pot, 0 to 1"),
    now(
        "input.pot.taper",
        Kind::Choice(&["linear"], &["audio", "table"]),
        "how rotation becomes a fraction of the track",
    ),
    part("input.grid_leak", RESISTOR, "from the wiper, or the input, to ground"),
    part("input.grid_stopper", OR_WIRE, "in series with the gain tube's grid; left out or 0R is a wire"),
    later("input.series_capacitor", "capacitor between the source and the pot"),
    now("gain", Kind::Table, "the gain tube and its parts"),
    now("gain.tube", Kind::Tube, "tube type of the gain stage"),
    part("gain.plate_resistor", RESISTOR, "from node B to the plate"),
    part("gain.cathode_resistor", RESISTOR, "from the cathode to ground"),
    now("gain.bypass", Kind::Table, "capacitor beside the cathode resistor"),
    now("gain.bypass.capacitance", Kind::Part(CAPACITOR, "gain.bypass"), "the bypass capacitor"),
    now("gain.bypass.esr", Kind::Number(OR_WIRE), "series resistance of the bypass capacitor"),
    now("gain.bypass.engaged", Kind::Switch, "whether the bypass switch is closed"),
    part("gain.bypass.trickle_resistor", RESISTOR, "keeps the capacitor charged while the switch is open"),
    later("gain.sections", "sections of the tube in parallel"),
    later("gain.section", "which section of the tube, 1 or 2"),
    later("gain.emission", "emission of a worn tube"),
    later("gain.mu_factor", "µ of this tube over its type's"),
    later("gain.unbypassed_resistor", "between the cathode and the bypassed resistor"),
    later("gain.plate_load", "a current source instead of the plate resistor"),
    later("gain.bias", "a LED or fixed bias instead of the cathode resistor"),
    now("coupling", Kind::Table, "between the gain tube's plate and the follower's grid"),
    now("coupling.kind", Kind::Choice(&COUPLING_KINDS, &[]), "how the follower's grid is fed"),
    part("coupling.capacitor", CAPACITOR, "coupling capacitor"),
    part("coupling.grid_stopper", OR_WIRE, "in series with the follower's grid; left out or 0R is a wire"),
    part("coupling.grid_leak", RESISTOR, "the follower's grid leak"),
    now("coupling.returns_to", Kind::Choice(&LEAK_RETURNS, &[]), "where the follower's grid leak ends"),
    now("follower", Kind::Table, "the cathode follower and its parts"),
    now("follower.tube", Kind::Tube, "tube type of the follower"),
    part(
        "follower.bias_resistor",
        RESISTOR,
        "between the follower's cathode and the bias junction; left out is a wire",
    ),
    part("follower.tail_resistor", RESISTOR, "from the bias junction to ground"),
    later("follower.sections", "sections of the tube in parallel"),
    later("follower.section", "which section of the tube, 1 or 2"),
    later("follower.emission", "emission of a worn tube"),
    later("follower.mu_factor", "µ of this tube over its type's"),
    later("follower.plate_stopper", "in series with the follower's plate"),
    later("follower.tail", "a current source instead of the tail resistor"),
    now("output", Kind::Table, "output coupling and load"),
    part("output.capacitor", CAPACITOR, "output capacitor"),
    part("output.bleed", RESISTOR, "from the output to ground"),
    now("output.load", Kind::Table, "what the output drives"),
    now("output.load.resistance", Kind::Part(RESISTOR, "output.load"), "resistance of the load"),
    part("output.load.capacitance", CAPACITOR, "capacitance of cable and load"),
    now("output.full_scale", Kind::Number(VOLTAGE), "V rms written as 0 dBFS"),
    later("output.series_resistor", "in series with the output"),
    now("tube", Kind::Tables, "a tube type of your own"),
    now("tube.type", Kind::Text, "the name that `tube = …` uses"),
    now("tube.model", Kind::Choice(&MODELS, &[]), "the law"),
    now("tube.parameters", Kind::Parameters, "parameters of the law"),
    now("tube.ensemble", Kind::Ensemble, "equally good parameter sets"),
    now("tube.capacitance", Kind::Table, "capacitances between the electrodes"),
    now("tube.capacitance.grid_cathode", Kind::Number(ELECTRODES), "grid to cathode"),
    now("tube.capacitance.grid_plate", Kind::Number(ELECTRODES), "grid to plate"),
    now("tube.capacitance.plate_cathode", Kind::Number(ELECTRODES), "plate to cathode"),
    now("tube.heater", Kind::Table, "what the heater needs"),
    now("tube.heater.voltage", Kind::Number(VOLTAGE), "heater voltage"),
    now("tube.heater.current", Kind::Number(CURRENT), "heater current"),
    now("tube.basing", Kind::Text, "name of the pin layout"),
    now("tube.limits", Kind::Table, "stated limits; one that is left out is not stated"),
    now("tube.limits.plate_voltage", Kind::Number(VOLTAGE), "plate voltage in operation"),
    now("tube.limits.plate_voltage_cold", Kind::Number(VOLTAGE), "plate voltage with the tube cold"),
    now("tube.limits.plate_dissipation", Kind::Number(POWER), "plate dissipation of one section"),
    now("tube.limits.cathode_current", Kind::Number(CURRENT), "cathode current"),
    now("tube.limits.heater_cathode_voltage", Kind::Number(VOLTAGE), "between heater and cathode"),
    now("compare", Kind::Overrides, "lists of values to compare: every combination is a configuration"),
    now("configuration", Kind::Tables, "one more configuration"),
    now("configuration.name", Kind::Text, "its name"),
    now("configuration.set", Kind::Overrides, "the keys that it changes"),
    later("tolerance", "tolerances of everything that states none"),
    later("aim", "which values a search may change"),
];

/// What a part's table may hold.
pub const PART_KEYS: [(&str, Quantity); 4] = [
    ("value", RESISTOR), // the part's own quantity stands in its place
    ("tolerance", TOLERANCE),
    ("watts", POWER),
    ("volts", VOLTAGE),
];

/// The key of a path.
pub fn find(path: &str) -> Option<&'static Key> {
    KEYS.iter().find(|key| key.path == path)
}

/// The keys directly under `table` ("" is the top of the file).
pub fn children(table: &str) -> impl Iterator<Item = &'static Key> {
    KEYS.iter().filter(move |key| parent(key.path) == table)
}

/// The table that holds a path.
pub fn parent(path: &str) -> &str {
    path.rsplit_once('.').map_or("", |(table, _)| table)
}

/// The last key of a path.
pub fn last(path: &str) -> &str {
    path.rsplit_once('.').map_or(path, |(_, key)| key)
}

/// The key that a table inside a stage table cannot do without: with it an override brings a whole new table.
pub fn defining_key(table: &str) -> Option<&'static str> {
    match table {
        "gain.bypass" => Some("capacitance"),
        "input.pot" | "output.load" => Some("resistance"),
        _ => None,
    }
}

/// One parameter of a tube law.
#[derive(Clone, Copy, Debug)]
pub struct Parameter {
    /// As the file writes it.
    pub key: &'static str,
    /// Its plausible range.
    pub quantity: Quantity,
}

const fn parameter(key: &'static str, low: f64, high: f64, example: &'static str) -> Parameter {
    Parameter { key, quantity: q::parameter(low, high, example) }
}

const MU: Parameter = parameter("mu", 0.5, 1e3, "18.6");
const GAMMA: Parameter = parameter("gamma", 0.5, 5.0, "1.4");
const SHARPNESS: Parameter = parameter("C", 1e-3, 1e4, "3.2");
const PERVEANCE: Parameter = parameter("G", 1e-12, 1.0, "0.002");

/// Plate parameters of `two-section`.
pub const TWO_SECTION: &[Parameter] = &[
    PERVEANCE,
    MU,
    GAMMA,
    SHARPNESS,
    parameter("share", 0.0, 1.0, "0.03"),
    parameter("mu_ratio", 1e-3, 1e3, "0.4"),
    parameter("offset", -50.0, 50.0, "0.6"),
    parameter("knee", 1e-3, 1e3, "7"),
];
/// Plate parameters of `dempwolf-zoelzer`.
pub const DEMPWOLF_ZOELZER: &[Parameter] = &[PERVEANCE, MU, GAMMA, SHARPNESS];
/// Plate parameters of `koren`.
pub const KOREN: &[Parameter] = &[
    MU,
    parameter("Ex", 0.5, 5.0, "1.4"),
    parameter("Kg1", 1e-3, 1e9, "1060"),
    parameter("Kp", 1e-2, 1e6, "600"),
    Parameter { key: "Kvb", quantity: q::parameter_or_zero(1e-6, 1e9, "300") },
];
/// Grid parameters of every law.
pub const GRID: &[Parameter] = &[
    Parameter { key: "Gg", quantity: q::parameter_or_zero(1e-12, 1.0, "6e-4") },
    parameter("xi", 0.5, 5.0, "1.3"),
    parameter("Cg", 1e-3, 1e4, "9.9"),
];
/// The constant grid current of the two published laws.
pub const IG0: Parameter = Parameter { key: "Ig0", quantity: q::parameter_or_zero(1e-15, 1e-3, "4e-8") };

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_key_stands_once_and_in_a_table_that_takes_keys() {
        for (at, key) in KEYS.iter().enumerate() {
            assert!(KEYS[..at].iter().all(|earlier| earlier.path != key.path), "{} twice", key.path);
            let table = parent(key.path);
            if !table.is_empty() {
                let owner = find(table).unwrap_or_else(|| panic!("{table} has no entry"));
                assert!(matches!(owner.kind, Kind::Table | Kind::Tables), "{table} takes no keys");
            }
            assert!(!key.doc.is_empty() && !key.doc.ends_with('.'), "{} needs one plain line", key.path);
        }
    }

    #[test]
    fn the_keys_of_later_versions_are_known() {
        for path in ["supply.cold_voltage", "heater", "gain.plate_load", "follower.tail", "tolerance", "aim"] {
            assert_eq!(find(path).map(|key| key.status), Some(Status::NotYet), "{path}");
        }
    }
}
