//! Published laws under signal.

use platewright_dsp::analysis::beyond_law_under_tone;
use platewright_dsp::circuit::{Network, Stage};

use super::WarningFigures;

/// The laws of `stage`, which is `network`, that a tone takes beyond what they were made for.
pub fn under_tone(stage: &Stage, network: &Network, frequency: f64, input_rms: f64) -> Vec<WarningFigures> {
    // Where there is no steady state, the tone has no figures either and says why.
    let beyond = beyond_law_under_tone(stage, network, frequency, input_rms).unwrap_or_default();
    let warning = |beyond: &platewright_dsp::analysis::BeyondLaw| WarningFigures {
        part: beyond.role.name().to_owned(),
        limit: "law".to_owned(),
        used_percent: None,
        text: format!("{} at {frequency} Hz, {input_rms} V rms: {beyond}", beyond.role.name()),
    };
    beyond.iter().map(warning).collect()
}
