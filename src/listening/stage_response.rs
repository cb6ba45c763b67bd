//! What the stage does to a vanishing sine, as far as a listener's maker needs it.

use platewright_dsp::analysis::{OperatingPoint, SmallSignal};
use platewright_dsp::circuit::Network;
use platewright_dsp::portable::{decibels, magnitude};

use crate::failure::{Failure, WorkError};
use crate::stage_file::Configuration;

/// Gain, polarity and response.
pub struct StageResponse {
    /// Whether a positive swing at the input comes out as a negative one, at 1 kHz.
    pub inverts: bool,
    /// At 1 kHz, dB.
    pub gain_db: f64,
    /// At 20 Hz over that at 1 kHz, dB.
    pub low_db: f64,
    /// At 20 kHz over that at 1 kHz, dB.
    pub high_db: f64,
}

impl StageResponse {
    /// Of a configuration.
    ///
    /// # Errors
    /// [`WorkError`] where it settles at no operating point.
    pub fn of(configuration: &Configuration) -> Result<StageResponse, Failure> {
        let network = Network::of(&configuration.stage);
        let gains = OperatingPoint::solve(&network, None).and_then(|point| {
            let small_signal = SmallSignal::new(&network, &point);
            let gain = |frequency| Some(small_signal.at(frequency)?.gain);
            Some((gain(20.0)?, gain(1000.0)?, gain(20_000.0)?))
        });
        let (low, middle, high) = gains.ok_or_else(|| WorkError::Failed {
            problem: format!("configuration \"{}\" settles at no operating point", configuration.name),
            remedy: "look at it with `platewright bias` first".to_owned(),
        })?;
        let over_middle = |gain| decibels(magnitude(gain)) - decibels(magnitude(middle));
        Ok(StageResponse {
            inverts: middle.re < 0.0,
            gain_db: decibels(magnitude(middle)),
            low_db: over_middle(low),
            high_db: over_middle(high),
        })
    }
}
