//! The figures of a stage as JSON writes them, and how they are gathered.
//!
//! A figure that cannot be had is `null`, and the object's `why` maps its key to the reason.

mod bench;
mod csv;
mod curves;
mod drawn;
mod gather;
mod headroom;
mod imd;
mod law;
mod noise;
mod point;
mod profile;
pub mod provenance;
pub mod recording;
mod sheet;
mod sweep;
mod tone;

#[cfg(test)]
mod tests;
mod undecided;
mod values;

use std::collections::BTreeMap;

use serde::{Deserialize, Serialize};

pub use bench::*;
pub use drawn::*;
pub use gather::{Asked, AskedTone, gather};

use crate::failure::{Failure, WorkError};
use crate::rendering::RenderFigures;

/// Version of the JSON's shape.
pub const SCHEMA: u32 = 1;

/// Reasons for the figures that are `null`, by key.
pub type Why = BTreeMap<String, String>;

/// Everything printed by `--json` and written to report.json.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct Figures {
    /// [`SCHEMA`].
    pub schema: u32,
    /// The stage file's title.
    pub title: Option<String>,
    /// In the stage file's order.
    pub configurations: Vec<ConfigurationFigures>,
    /// Pairs of configurations whose order in a harmonic the tube data do not settle.
    #[serde(skip_serializing_if = "Vec::is_empty", default)]
    pub undecided: Vec<UndecidedFigures>,
    /// Rendered files, where there are any.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub renders: Option<Vec<RenderFigures>>,
    /// The page of the listening pack below the output folder, where one was made.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub listening_pack: Option<String>,
    /// What was played, where a page is to be drawn.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub recordings: Option<Vec<RecordingFigures>>,
    /// Where the figures come from, where a page is to be drawn.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub provenance: Option<ProvenanceFigures>,
}

impl Figures {
    /// The figures as JSON, indented.
    ///
    /// # Errors
    /// Never for figures made here; a defect otherwise.
    pub fn to_json(&self) -> Result<String, Failure> {
        serde_json::to_string_pretty(self).map_err(|error| {
            let problem = format!("the figures could not be written as JSON: {error}");
            WorkError::Failed { problem, remedy: "please report this".to_owned() }.into()
        })
    }

    /// Whether anything calls for a warning.
    pub fn warn(&self) -> bool {
        self.configurations.iter().any(|c| c.warnings().next().is_some())
    }
}

/// Two configurations whose order in a harmonic of the first tone the tube data do not settle.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct UndecidedFigures {
    /// The harmonic.
    pub order: u32,
    /// The two configurations' names, in the file's order.
    pub between: [String; 2],
    /// First over second, dB.
    #[serde(rename = "difference_dB")]
    pub difference_db: f64,
    /// Half the range of that difference over equally good fits, dB.
    #[serde(rename = "trust_dB")]
    pub trust_db: f64,
}

/// The figures of one configuration.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct ConfigurationFigures {
    /// The configuration's name, its id.
    pub name: String,
    /// Always there.
    pub operating_point: OperatingPointFigures,
    /// Small-signal response, when asked.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub response: Option<Vec<ResponseFigures>>,
    /// Tones, when asked.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub tones: Option<Vec<ToneFigures>>,
    /// Level sweep, when asked.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub level_sweep: Option<Vec<LevelFigures>>,
    /// Frequency sweep with its −3 dB points, when asked.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub frequency_sweep: Option<FrequencySweepFigures>,
    /// Intermodulation, when asked.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub imd: Option<Vec<ImdFigures>>,
    /// Noise, when asked.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub noise: Option<NoiseFigures>,
    /// Headroom, when asked.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub headroom: Option<HeadroomFigures>,
    /// A target profile's misses, when asked.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub profile: Option<ProfileFigures>,
    /// The stage's values, where a page is to be drawn.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub values: Option<ValuesFigures>,
    /// Curves, where a page is to be drawn.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub curves: Option<CurvesFigures>,
    /// Readings for the bench, where a page is to be drawn.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub bench_sheet: Option<BenchSheetFigures>,
}

impl ConfigurationFigures {
    /// Warnings at rest, then those of the tones.
    pub fn warnings(&self) -> impl Iterator<Item = &WarningFigures> {
        self.operating_point.warnings.iter().chain(self.tones.iter().flatten().flat_map(|tone| &tone.warnings))
    }
}

/// The stage at rest.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct OperatingPointFigures {
    /// Volts at node B.
    pub supply_node: f64,
    /// The gain tube.
    pub gain: TubeFigures,
    /// The follower, where there is one.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub follower: Option<TubeFigures>,
    /// Watts and volts of every part.
    pub parts: Vec<PartFigures>,
    /// How much of each limit is used.
    pub ratings: Vec<RatingFigures>,
    /// Exceeded limits and what else a builder must know, worst first.
    pub warnings: Vec<WarningFigures>,
    /// With `--meter`: every node as a meter of that resistance to ground would read it.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub meter: Option<MeterFigures>,
}

/// A tube at rest.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct TubeFigures {
    /// The type that stands there.
    pub tube: String,
    /// V.
    pub plate_to_ground: f64,
    /// V.
    pub cathode_to_ground: f64,
    /// V.
    pub grid_to_ground: f64,
    /// V.
    pub grid_to_cathode: f64,
    /// V.
    pub plate_to_cathode: f64,
    /// A.
    pub plate_current: f64,
    /// A.
    pub grid_current: f64,
    /// W.
    pub plate_dissipation: f64,
    /// S.
    pub gm: f64,
    /// No unit.
    pub mu: Option<f64>,
    /// Ω.
    pub rp: Option<f64>,
    /// V at the junction of bias resistor and tail; for the follower alone.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub junction_to_ground: Option<f64>,
    /// Why a figure is `null`.
    #[serde(skip_serializing_if = "Why::is_empty", default)]
    pub why: Why,
}

/// What a part stands at rest.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct PartFigures {
    /// The stage file's key.
    pub part: String,
    /// W.
    pub watts: f64,
    /// V.
    pub volts: f64,
    /// V before the tubes conduct, for a capacitor.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub volts_cold: Option<f64>,
}

/// One limit beside what the stage asks.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct RatingFigures {
    /// "gain", "follower" or a part's key.
    pub part: String,
    /// The limit's name.
    pub limit: String,
    /// What the stage asks.
    pub asked: f64,
    /// What is stated, `null` where nothing is.
    pub allowed: Option<f64>,
    /// Unit of both.
    pub unit: String,
    /// Part of the limit in use, `null` where nothing is stated.
    pub used_percent: Option<f64>,
    /// Why a figure is `null`.
    #[serde(skip_serializing_if = "Why::is_empty", default)]
    pub why: Why,
}

/// Something a builder must know.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct WarningFigures {
    /// "gain", "follower" or a part's key.
    pub part: String,
    /// The limit's name.
    pub limit: String,
    /// Part of the limit in use; `null` where no limit is exceeded.
    pub used_percent: Option<f64>,
    /// In words.
    pub text: String,
    /// Why a figure is `null`.
    #[serde(skip_serializing_if = "Why::is_empty", default)]
    pub why: Why,
}

impl WarningFigures {
    /// A warning of `part` that is no exceeded limit.
    pub fn note(part: &str, about: &str, text: String) -> Self {
        WarningFigures {
            part: part.to_owned(),
            limit: about.to_owned(),
            used_percent: None,
            text,
            why: [("used_percent".to_owned(), "no limit is exceeded".to_owned())].into(),
        }
    }
}

/// Readings of a meter.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct MeterFigures {
    /// The meter's input resistance, Ω.
    pub resistance: f64,
    /// One a node.
    pub readings: Vec<ReadingFigures>,
}

/// A node without and with the meter.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct ReadingFigures {
    /// The node's short name.
    pub node: String,
    /// V with nothing attached.
    pub volts: f64,
    /// V with the meter from the node to ground.
    pub metered: Option<f64>,
    /// Where to measure instead, when the meter disturbs what it reads.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub advice: Option<String>,
    /// Why a figure is `null`.
    #[serde(skip_serializing_if = "Why::is_empty", default)]
    pub why: Why,
}

/// Small-signal figures at one frequency.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct ResponseFigures {
    /// Hz.
    pub frequency: f64,
    /// From `in` to `o`.
    #[serde(rename = "gain_dB")]
    pub gain_db: Option<f64>,
    /// −180 < phase ≤ 180.
    pub phase_deg: Option<f64>,
    /// Ω, real and imaginary part.
    pub input_impedance: Option<[f64; 2]>,
    /// Ω, real and imaginary part.
    pub output_impedance: Option<[f64; 2]>,
    /// Why a figure is `null`.
    #[serde(skip_serializing_if = "Why::is_empty", default)]
    pub why: Why,
}

/// A tone through the stage.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct ToneFigures {
    /// Hz.
    pub frequency: f64,
    /// V rms at `in`.
    pub input_rms: f64,
    /// V rms at `o`.
    pub output_fundamental_rms: Option<f64>,
    /// Of the fundamental.
    #[serde(rename = "gain_dB")]
    pub gain_db: Option<f64>,
    /// THD_F.
    pub thd_percent: Option<f64>,
    /// THD_R.
    pub thd_r_percent: Option<f64>,
    /// Highest harmonic that is summed into the THD.
    pub thd_orders: u32,
    /// From the second.
    pub harmonics: Vec<HarmonicFigures>,
    /// Published laws that the tone takes beyond what they were made for.
    #[serde(skip_serializing_if = "Vec::is_empty", default)]
    pub warnings: Vec<WarningFigures>,
    /// Why a figure is `null`.
    #[serde(skip_serializing_if = "Why::is_empty", default)]
    pub why: Why,
}

/// One harmonic.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct HarmonicFigures {
    /// 2 is the octave.
    pub order: u32,
    /// Over the fundamental.
    #[serde(rename = "dBc")]
    pub dbc: Option<f64>,
    /// φn − n·φ1, 0 ≤ phase < 360.
    pub phase_deg: Option<f64>,
    /// Half the range from the 5th to the 95th percentile over equally good fits of the tubes' published points.
    #[serde(rename = "trust_dB")]
    pub trust_db: Option<f64>,
    /// What each of these fits makes of it, dBc; kept to compare configurations, not written.
    #[serde(skip)]
    pub fits_dbc: Vec<f64>,
    /// Why a figure is `null`.
    #[serde(skip_serializing_if = "Why::is_empty", default)]
    pub why: Why,
}
