//! Shapes of the figures that are measured on request: sweeps, intermodulation, noise, headroom.

use serde::{Deserialize, Deserializer, Serialize};

use super::Why;

/// One level of a sweep, at 1 kHz.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct LevelFigures {
    /// V rms at `in`.
    pub input_rms: f64,
    /// V rms of the fundamental at `o`.
    pub output_rms: Option<f64>,
    /// Of the fundamental.
    #[serde(rename = "gain_dB")]
    pub gain_db: Option<f64>,
    /// THD_F.
    pub thd_percent: Option<f64>,
    /// H2 to H7 over the fundamental; `null` where it is too small to be trusted.
    #[serde(rename = "harmonics_dBc")]
    pub harmonics_dbc: Vec<Option<f64>>,
    /// Least plate-to-cathode volts of each tube, gain tube first.
    pub least_plate_volts: Vec<f64>,
    /// Largest plate-to-cathode volts of each tube.
    pub peak_plate_volts: Vec<f64>,
    /// Why a figure is `null`.
    #[serde(skip_serializing_if = "Why::is_empty", default)]
    pub why: Why,
}

/// A sweep over frequency.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct FrequencySweepFigures {
    /// −3 dB from 1 kHz, Hz.
    pub low: Option<f64>,
    /// −3 dB from 1 kHz, Hz.
    pub high: Option<f64>,
    /// The sweep.
    pub points: Vec<SweepPointFigures>,
    /// Why a figure is `null`.
    #[serde(skip_serializing_if = "Why::is_empty", default)]
    pub why: Why,
}

/// One frequency of a sweep.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct SweepPointFigures {
    /// The small-signal figures.
    #[serde(flatten)]
    pub response: super::ResponseFigures,
    /// Supply ripple ahead of its resistance over what it leaves at `o`.
    #[serde(rename = "ripple_rejection_dB")]
    pub ripple_rejection_db: Option<f64>,
    /// THD_F at the level asked, from 20 Hz to 20 kHz.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub thd_percent: Option<f64>,
}

/// Intermodulation of a pair of tones.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(into = "ImdJson", from = "ImdJson")]
pub struct ImdFigures {
    /// smpte, din or difference.
    pub kind: String,
    /// V rms of the sine that peaks where the pair does.
    pub input_rms: f64,
    /// smpte and din.
    pub percent: Option<f64>,
    /// difference, second order.
    pub d2_percent: Option<f64>,
    /// difference, third order.
    pub d3_percent: Option<f64>,
    /// Why a figure is missing.
    pub why: Why,
}

/// The same as JSON has it: the figures that the pair has, `null` where one could not be had.
#[derive(Serialize, Deserialize)]
struct ImdJson {
    kind: String,
    input_rms: f64,
    #[serde(skip_serializing_if = "Option::is_none", default, deserialize_with = "there")]
    percent: Option<Option<f64>>,
    #[serde(skip_serializing_if = "Option::is_none", default, deserialize_with = "there")]
    d2_percent: Option<Option<f64>>,
    #[serde(skip_serializing_if = "Option::is_none", default, deserialize_with = "there")]
    d3_percent: Option<Option<f64>>,
    #[serde(skip_serializing_if = "Why::is_empty", default)]
    why: Why,
}

/// A key that is there, be it with `null`.
fn there<'de, D: Deserializer<'de>>(value: D) -> Result<Option<Option<f64>>, D::Error> {
    Option::deserialize(value).map(Some)
}

impl From<ImdFigures> for ImdJson {
    fn from(figures: ImdFigures) -> Self {
        let difference = figures.kind == "difference";
        ImdJson {
            kind: figures.kind,
            input_rms: figures.input_rms,
            percent: (!difference).then_some(figures.percent),
            d2_percent: difference.then_some(figures.d2_percent),
            d3_percent: difference.then_some(figures.d3_percent),
            why: figures.why,
        }
    }
}

impl From<ImdJson> for ImdFigures {
    fn from(json: ImdJson) -> Self {
        ImdFigures {
            kind: json.kind,
            input_rms: json.input_rms,
            percent: json.percent.flatten(),
            d2_percent: json.d2_percent.flatten(),
            d3_percent: json.d3_percent.flatten(),
            why: json.why,
        }
    }
}

/// Thermal and shot noise, 20 Hz to 20 kHz: a best case, without flicker and grid noise.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct NoiseFigures {
    /// V rms at `o`.
    pub output_rms: Option<f64>,
    /// V rms at `o`, A-weighted.
    pub output_rms_a: Option<f64>,
    /// The output's over the gain at 1 kHz, V rms.
    pub input_rms: Option<f64>,
    /// 0 dBFS times that gain over the unweighted output noise.
    #[serde(rename = "signal_to_noise_dB")]
    pub signal_to_noise_db: Option<f64>,
    /// What the supply's ripple leaves at `o`, V rms; there where the stage file states a ripple.
    #[serde(skip_serializing_if = "Option::is_none", default, deserialize_with = "there")]
    pub hum_rms: Option<Option<f64>>,
    /// Hz.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub hum_frequency: Option<f64>,
    /// 0 dBFS times the gain at 1 kHz over the hum.
    #[serde(
        rename = "hum_below_full_scale_dB",
        skip_serializing_if = "Option::is_none",
        default,
        deserialize_with = "there"
    )]
    pub hum_below_full_scale_db: Option<Option<f64>>,
    /// THD+N of the first tone asked, noise unweighted.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub thd_n_percent: Option<f64>,
    /// What is left out.
    pub note: String,
    /// Why a figure is `null`.
    #[serde(skip_serializing_if = "Why::is_empty", default)]
    pub why: Why,
}

/// How far a configuration misses the wanted harmonics.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct ProfileFigures {
    /// Of the tone, Hz.
    pub frequency: f64,
    /// V rms at `in`: the profile's, or what gives its output level.
    pub input_rms: Option<f64>,
    /// V rms of the fundamental at `o`.
    pub output_rms: Option<f64>,
    /// √(Σ weight·miss² / Σ weight).
    #[serde(rename = "distance_dB")]
    pub distance_db: Option<f64>,
    /// In rising order.
    pub harmonics: Vec<ProfileHarmonicFigures>,
    /// Why a figure is `null`.
    #[serde(skip_serializing_if = "Why::is_empty", default)]
    pub why: Why,
}

/// One harmonic of a profile.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct ProfileHarmonicFigures {
    /// 2 is the octave.
    pub order: u32,
    /// wanted, at_most or at_least.
    pub want: String,
    /// That size, dBc.
    pub wanted: f64,
    /// What it may be off before it counts.
    #[serde(rename = "within_dB")]
    pub within_db: f64,
    /// How much a miss counts.
    pub weight: f64,
    /// dBc.
    pub got: Option<f64>,
    /// What lies beyond the tolerance: positive where the harmonic is too large.
    #[serde(rename = "miss_dB")]
    pub miss_db: Option<f64>,
    /// Why a figure is `null`.
    #[serde(skip_serializing_if = "Why::is_empty", default)]
    pub why: Why,
}

/// The lowest levels at which limits are reached, at 1 kHz.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct HeadroomFigures {
    /// THD_F of 0.1, 1 and 3 %.
    pub thd: Vec<LimitFigures>,
    /// Gain 1 dB below small signal.
    #[serde(rename = "compression_1dB")]
    pub compression_1db: LimitFigures,
    /// Either grid's peak current reaches 0.3 µA.
    pub grid_current: LimitFigures,
    /// Either tube's least plate current falls below 1 % of idle.
    pub cutoff: LimitFigures,
    /// Grid current of each tube, gain tube first.
    #[serde(default)]
    pub grid_current_of: Vec<LimitFigures>,
    /// Cut-off of each tube, gain tube first.
    #[serde(default)]
    pub cutoff_of: Vec<LimitFigures>,
}

/// One limit.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct LimitFigures {
    /// For a THD.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub percent: Option<f64>,
    /// V rms at `in`.
    pub input_rms: Option<f64>,
    /// V rms of the fundamental at `o`.
    pub output_rms: Option<f64>,
    /// Over a 0 dBFS sine.
    #[serde(rename = "over_full_scale_dB")]
    pub over_full_scale_db: Option<f64>,
    /// Over the true peak of the recording, with `--play`.
    #[serde(rename = "over_play_dB", skip_serializing_if = "Option::is_none", default)]
    pub over_play_db: Option<f64>,
    /// The tube that reaches it, where a tube does.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub tube: Option<String>,
    /// Why a figure is `null`.
    #[serde(skip_serializing_if = "Why::is_empty", default)]
    pub why: Why,
}
