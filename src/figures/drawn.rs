//! Shapes of what report.json holds for the page alone: the stage's values, curves, bench sheet and provenance.

use std::collections::BTreeMap;

use serde::{Deserialize, Serialize};

/// A configuration's values by the stage file's keys, defaults filled in: "gain.plate_resistor", "coupling.kind".
pub type ValuesFigures = BTreeMap<String, ValueFigure>;

/// A value of the stage file.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(untagged)]
pub enum ValueFigure {
    /// SI units.
    Number(f64),
    /// A switch.
    Switch(bool),
    /// A word or a tube's type.
    Word(String),
}

/// Curves that are drawn.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct CurvesFigures {
    /// Static plate curves, gain tube first.
    pub plates: Vec<PlateFigures>,
    /// One cycle of a 1 kHz sine at three levels.
    pub cycles: Vec<CycleFigures>,
}

/// A tube's plate curves.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct PlateFigures {
    /// "gain" or "follower".
    pub role: String,
    /// The tube's type.
    pub tube: String,
    /// Plate-to-cathode volts of every point of every curve.
    pub plate_volts: Vec<f64>,
    /// One a grid voltage, from 0 down.
    pub curves: Vec<GridCurveFigures>,
    /// Plate-to-cathode volts and plate amperes at the ends of the load line at direct current.
    pub load_line: [[f64; 2]; 2],
    /// Volts and amperes at rest.
    pub at_rest: [f64; 2],
    /// Stated plate dissipation, W.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub dissipation: Option<f64>,
}

/// One plate curve.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct GridCurveFigures {
    /// Grid-to-cathode volts.
    pub grid_volts: f64,
    /// Plate amperes.
    pub amperes: Vec<f64>,
}

/// One cycle of a sine, from its upward zero crossing.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct CycleFigures {
    /// V rms at `in`.
    pub input_rms: f64,
    /// V at `o`, at equal steps of a period; empty where no steady state was found.
    pub output: Vec<f64>,
    /// What each tube passes through, gain tube first.
    pub paths: Vec<PathFigures>,
}

/// The path of a tube during a cycle.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct PathFigures {
    /// Plate-to-cathode volts.
    pub volts: Vec<f64>,
    /// Plate amperes.
    pub amperes: Vec<f64>,
}

/// What a builder reads and how far builds differ.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct BenchSheetFigures {
    /// The meter's input resistance, Ω.
    pub meter_resistance: f64,
    /// Builds that the bands were taken from.
    pub builds: usize,
    /// Their seed.
    pub seed: u64,
    /// Every resistor of a build lies within this part of its value, %.
    pub resistors_percent: f64,
    /// The supply lies within this part of its value, %.
    pub supply_percent: f64,
    /// Readings to ground.
    pub nodes: Vec<BandFigures>,
    /// Volts across the resistors that tell the currents.
    pub across: Vec<BandFigures>,
}

/// A reading with its band.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct BandFigures {
    /// The node's short name, or the part's key.
    pub place: String,
    /// V, nominal: as the meter reads it.
    pub expected: Option<f64>,
    /// V, 5th percentile.
    pub low: Option<f64>,
    /// V, 95th percentile.
    pub high: Option<f64>,
    /// Where to measure instead, when the meter disturbs what it reads.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub advice: Option<String>,
}

/// A recording that was played.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct RecordingFigures {
    /// File name.
    pub name: String,
    /// Seconds.
    pub seconds: f64,
    /// Largest sample.
    #[serde(rename = "peak_dBFS")]
    pub peak_dbfs: Option<f64>,
    /// Upper ends of the histogram's bins, 1 dB wide, dBFS; the first holds everything below too.
    #[serde(rename = "levels_dBFS")]
    pub levels_dbfs: Vec<f64>,
    /// Part of the time, %, whose 10 ms peaks of all channels lie in each bin.
    pub time_percent: Vec<f64>,
}

/// Where the figures come from.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct ProvenanceFigures {
    /// The program and its version.
    pub program: String,
    /// What was asked, in words.
    pub options: Vec<[String; 2]>,
    /// The stage file, complete.
    pub stage_file: String,
    /// The tube types in use.
    pub tubes: Vec<TubeDataFigures>,
}

/// What is known of a tube type.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct TubeDataFigures {
    /// The type's name.
    pub tube: String,
    /// True for a type of the library.
    pub from_library: bool,
    /// The law's name in the stage file.
    pub model: String,
    /// What the parameters rest on.
    pub rests_on: String,
    /// Published figures beside the law's, in words.
    pub evidence: Vec<String>,
    /// Equally good parameter sets.
    pub ensemble: usize,
    /// Heater volts.
    pub heater_voltage: Option<f64>,
    /// Heater amperes.
    pub heater_current: Option<f64>,
    /// The pin layout's standard name.
    pub basing: Option<String>,
}
