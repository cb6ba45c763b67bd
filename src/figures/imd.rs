//! Intermodulation.

use platewright_dsp::analysis::{Intermodulation, TonePair};
use platewright_dsp::circuit::Network;

use super::{ImdFigures, Why};

/// Intermodulation of a pair whose sum peaks where a sine of `input_rms` volts would.
pub fn of(network: &Network, pair: TonePair, input_rms: f64) -> ImdFigures {
    let mut figures = ImdFigures {
        kind: pair.key().to_owned(),
        input_rms,
        percent: None,
        d2_percent: None,
        d3_percent: None,
        why: Why::new(),
    };
    let keys: &[&str] = if pair == TonePair::Difference { &["d2_percent", "d3_percent"] } else { &["percent"] };
    let unsettled = "it did not settle as the steps were made finer";
    let percent = |part: Option<f64>| part.map(|part| 100.0 * part);
    let reason = match Intermodulation::measure(network, pair, input_rms) {
        Ok(Intermodulation::Sidebands(part)) => {
            figures.percent = percent(part);
            unsettled.to_owned()
        }
        Ok(Intermodulation::Difference { second, third }) => {
            (figures.d2_percent, figures.d3_percent) = (percent(second), percent(third));
            unsettled.to_owned()
        }
        Err(reason) => reason.to_string(),
    };
    for (key, value) in
        [("percent", figures.percent), ("d2_percent", figures.d2_percent), ("d3_percent", figures.d3_percent)]
    {
        if value.is_none() && keys.contains(&key) {
            figures.why.insert(key.to_owned(), reason.clone());
        }
    }
    figures
}
