//! The one level factor that keeps loudness differences between configurations real.

use platewright_dsp::portable::ratio;

use crate::failure::RequestError;
use crate::plan::Sound;
use crate::stage_file::Configuration;

/// Where the loudest peak of all files goes when nothing states the full scale, dBFS.
const LOUDEST_PEAK_DBFS: f64 = -1.0;

/// How volts become samples.
#[derive(Clone, Debug, PartialEq)]
pub enum Level {
    /// V rms written as 0 dBFS, a configuration each.
    Stated(Vec<f64>),
    /// The loudest peak of all files decides.
    LoudestPeak,
}

impl Level {
    /// The level of a job: `--full-scale`, else `output.full_scale`, else the loudest peak.
    ///
    /// # Errors
    /// [`RequestError`] where only some configurations have an `output.full_scale`.
    pub fn of(configurations: &[Configuration], sound: &Sound) -> Result<Level, RequestError> {
        if let Some(volts) = sound.full_scale {
            return Ok(Level::Stated(vec![volts; configurations.len()]));
        }
        let stated: Vec<f64> = configurations.iter().filter_map(|c| c.stage.output.full_scale).collect();
        match stated.len() {
            0 => Ok(Level::LoudestPeak),
            all if all == configurations.len() => Ok(Level::Stated(stated)),
            _ => Err(RequestError::new(
                "output.full_scale stands in some configurations and not in others: their files would have no common level",
                "state it for all of them, for none, or set --full-scale",
            )),
        }
    }

    /// Samples a volt for `configuration`, when the loudest peak of all files is `peak` volts.
    pub fn samples_per_volt(&self, configuration: usize, peak: f64) -> f64 {
        match self {
            Level::Stated(volts) => 1.0 / (volts[configuration] * std::f64::consts::SQRT_2),
            Level::LoudestPeak if peak > 0.0 => ratio(LOUDEST_PEAK_DBFS) / peak,
            // Silence has no loudest peak, and any factor leaves it silent.
            Level::LoudestPeak => 1.0,
        }
    }
}
