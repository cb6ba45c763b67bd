//! Published laws under signal.

use platewright_dsp::analysis::{BeyondLaw, beyond_law_under_tone};
use platewright_dsp::circuit::{Network, Stage};

use super::WarningFigures;

/// The laws of `stage`, which is `network`, that a tone takes beyond what they were made for.
pub fn under_tone(stage: &Stage, network: &Network, frequency: f64, input_rms: f64) -> Vec<WarningFigures> {
    // Where there is no steady state, the tone has no figures either and says why.
    let beyond = beyond_law_under_tone(stage, network, frequency, input_rms).unwrap_or_default();
    let warning = |beyond: &BeyondLaw| {
        let part = beyond.role.name();
        WarningFigures::note(part, "law", format!("{part} at {frequency} Hz, {input_rms} V rms: {beyond}"))
    };
    beyond.iter().map(warning).collect()
}
