//! What a recording's peak does to a stage: alias products, and laws taken beyond what they were made for.

use std::collections::BTreeMap;

use platewright_dsp::analysis::{alias_estimate, beyond_law_under_tone};
use platewright_dsp::circuit::{Network, Stage};
use serde::{Deserialize, Serialize};

/// The tone whose alias products are estimated, Hz: near the end of hearing, where they are worst.
const ALIAS_TONE: f64 = 19_000.0;
/// Alias products below this are not told apart from the arithmetic.
const TRUSTED_DBC: f64 = -220.0;
/// The tone under which the plate voltages are looked at, Hz.
const LAW_TONE: f64 = 1000.0;

/// Estimates for a sine that peaks where the recording does.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct Estimate {
    /// V rms at `in` of the sine that peaks where the recording does, `--drive` included.
    pub input_rms: f64,
    /// Hz: 19 kHz, or less where the recording's sample rate ends below.
    pub alias_tone: f64,
    /// The largest alias product below 20 kHz over that tone; `null` for silence and below −220.
    #[serde(rename = "alias_dBc")]
    pub alias_dbc: Option<f64>,
    /// Tubes whose published law a 1 kHz sine of that level takes beyond what it was made for, in words.
    #[serde(skip_serializing_if = "Vec::is_empty", default)]
    pub beyond_law: Vec<String>,
    /// Why a figure is `null`.
    #[serde(skip_serializing_if = "BTreeMap::is_empty", default)]
    pub why: BTreeMap<String, String>,
}

impl Estimate {
    /// The estimates of `stage` stepped `oversampling` times a sample of a recording with a peak of `input_rms` · √2 volts
    /// at `in`.
    pub fn of(stage: &Stage, sample_rate: u32, oversampling: usize, input_rms: f64) -> Estimate {
        let network = Network::of(stage);
        let alias_tone = alias_tone(f64::from(sample_rate));
        let alias = if input_rms > 0.0 {
            let rate = f64::from(sample_rate) * oversampling as f64;
            let peak_volts = input_rms * std::f64::consts::SQRT_2;
            let estimate = alias_estimate(&network, rate, alias_tone, peak_volts);
            estimate
                .map_err(|reason| reason.to_string())
                .and_then(|dbc| if dbc >= TRUSTED_DBC { Ok(dbc) } else { Err(format!("below {TRUSTED_DBC} dBc")) })
        } else {
            Err("the recording is silent".to_owned())
        };
        // Where no steady state is found the alias estimate says so already.
        let beyond = beyond_law_under_tone(stage, &network, LAW_TONE, input_rms).unwrap_or_default();
        Estimate {
            input_rms,
            alias_tone,
            alias_dbc: alias.as_ref().ok().copied(),
            beyond_law: beyond.iter().map(|beyond| format!("{}: {beyond}", beyond.role.name())).collect(),
            why: alias.err().map(|reason| ("alias_dBc".to_owned(), reason)).into_iter().collect(),
        }
    }
}

/// 19 kHz, or the highest whole kilohertz that the recording can hold.
fn alias_tone(sample_rate: f64) -> f64 {
    let highest = 1000.0 * ((0.5 * sample_rate / 1000.0).ceil() - 1.0);
    ALIAS_TONE.min(highest)
}

#[cfg(test)]
mod tests {
    use super::alias_tone;

    #[test]
    fn the_tone_is_one_that_the_recording_can_hold() {
        assert_eq!([8000.0, 11_025.0, 44_100.0, 192_000.0].map(alias_tone), [3000.0, 5000.0, 19_000.0, 19_000.0]);
    }
}
