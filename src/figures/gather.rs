//! Gathers what was asked of every configuration.

use platewright_dsp::analysis::OperatingPoint;
use platewright_dsp::circuit::Network;
use rayon::prelude::*;

use super::{ConfigurationFigures, Figures, SCHEMA, point, tone};
use crate::failure::{Failure, WorkError};
use crate::stage_file::{Configuration, StageFile};

/// What is asked beside the operating point.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Asked {
    /// Tones, in the order wanted.
    pub tones: Option<Vec<AskedTone>>,
    /// Frequencies of the small-signal response, Hz.
    pub frequencies: Option<Vec<f64>>,
    /// Input resistance of a meter to hold to every node, Ω.
    pub meter_ohms: Option<f64>,
}

/// A tone that is asked.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct AskedTone {
    /// Hz.
    pub frequency: f64,
    /// V rms at `in`; `None` is a quarter of the configuration's source.full_scale.
    pub level: Option<f64>,
}

/// Part of the source's full scale at which figures are taken when no level is asked.
const USUAL_LEVEL: f64 = 0.25;

/// The figures of every configuration of `file`, in its order.
///
/// # Errors
/// [`WorkError`] where a configuration settles at no operating point.
pub fn gather(file: &StageFile, asked: &Asked) -> Result<Figures, Failure> {
    let configurations: Result<Vec<_>, Failure> =
        file.configurations.par_iter().map(|configuration| one(configuration, asked)).collect();
    Ok(Figures { schema: SCHEMA, title: file.title.clone(), configurations: configurations?, renders: None })
}

fn one(configuration: &Configuration, asked: &Asked) -> Result<ConfigurationFigures, Failure> {
    let network = Network::of(&configuration.stage);
    let at_rest = OperatingPoint::solve(&network, None).ok_or_else(|| WorkError::Failed {
        problem: format!("configuration \"{}\" settles at no operating point", configuration.name),
        remedy: "check its resistors and its supply for values far from any real stage".to_owned(),
    })?;
    let response = |f: &Vec<f64>| f.par_iter().map(|&f| tone::response(&network, &at_rest, f)).collect();
    let usual = USUAL_LEVEL * configuration.stage.source.full_scale;
    let tone = |t: &AskedTone| tone::tone(&network, t.frequency, t.level.unwrap_or(usual));
    let tones = |t: &Vec<AskedTone>| t.par_iter().map(tone).collect();
    Ok(ConfigurationFigures {
        name: configuration.name.clone(),
        operating_point: point::operating_point(configuration, &network, &at_rest, asked.meter_ohms),
        response: asked.frequencies.as_ref().map(response),
        tones: asked.tones.as_ref().map(tones),
    })
}
