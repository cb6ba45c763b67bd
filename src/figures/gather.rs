//! Gathers what was asked of every configuration.

use platewright_dsp::analysis::{OperatingPoint, TonePair, ensemble};
use platewright_dsp::circuit::Network;
use rayon::prelude::*;

use super::tone::Trust;
use super::{
    ConfigurationFigures, Figures, SCHEMA, ToneFigures, curves, headroom, imd, law, noise, point, profile, sheet,
    sweep, tone, undecided, values,
};
use crate::failure::{Failure, WorkError};
use crate::profile::Profile;
use crate::rendering::Progress;
use crate::stage_file::{Configuration, StageFile};

/// What is asked beside the operating point.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Asked {
    /// Tones, in the order wanted.
    pub tones: Option<Vec<AskedTone>>,
    /// Whether each harmonic carries the spread of equally good tube fits.
    pub trust: bool,
    /// Frequencies of the small-signal response, Hz.
    pub frequencies: Option<Vec<f64>>,
    /// Level of intermodulation and of the frequency sweep's THD, V rms; `None` as for a tone.
    pub level: Option<f64>,
    /// Whether to sweep the level.
    pub level_sweep: bool,
    /// Whether to sweep the frequency.
    pub frequency_sweep: bool,
    /// Pairs of tones, in the order wanted.
    pub imd: Option<Vec<TonePair>>,
    /// Whether to work out the noise.
    pub noise: bool,
    /// Whether to look for the headroom.
    pub headroom: bool,
    /// Harmonics that are wanted.
    pub profile: Option<Profile>,
    /// True peak of the recordings played, as a part of full scale.
    pub play_peak: Option<f64>,
    /// Input resistance of a meter to hold to every node, Ω.
    pub meter_ohms: Option<f64>,
    /// Whether a page is to be drawn: the stage's values, curves and, with a meter, the bench sheet.
    pub page: bool,
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
    let progress = Progress::new("measuring", file.configurations.len() as u64);
    let configurations: Result<Vec<_>, Failure> = file
        .configurations
        .par_iter()
        .map(|configuration| one(configuration, asked).inspect(|_| progress.add(1)))
        .collect();
    progress.done();
    let configurations = configurations?;
    let undecided = undecided::of(&configurations);
    let (schema, title) = (SCHEMA, file.title.clone());
    Ok(Figures {
        schema,
        title,
        configurations,
        undecided,
        renders: None,
        listening_pack: None,
        recordings: None,
        provenance: None,
    })
}

fn one(configuration: &Configuration, asked: &Asked) -> Result<ConfigurationFigures, Failure> {
    let network = Network::of(&configuration.stage);
    let at_rest = OperatingPoint::solve(&network, None).ok_or_else(|| WorkError::Failed {
        problem: format!("configuration \"{}\" settles at no operating point", configuration.name),
        remedy: "check its resistors and its supply for values far from any real stage".to_owned(),
    })?;
    let response = |f: &Vec<f64>| f.par_iter().map(|&f| tone::response(&network, &at_rest, f)).collect();
    let full_scale = configuration.stage.source.full_scale;
    let level = |asked: Option<f64>| asked.unwrap_or(USUAL_LEVEL * full_scale);
    let members = if asked.trust { ensemble(&configuration.stage) } else { Vec::new() };
    let trust = if asked.trust { Trust::Ensemble(&members) } else { Trust::Off };
    let tone = |t: &AskedTone| ToneFigures {
        warnings: law::under_tone(&configuration.stage, &network, t.frequency, level(t.level)),
        ..tone::tone(&network, &trust, t.frequency, level(t.level))
    };
    let tones: Option<Vec<ToneFigures>> = asked.tones.as_ref().map(|t| t.par_iter().map(tone).collect());
    let pair = |&pair: &TonePair| imd::of(&network, pair, level(asked.level));
    let first_tone = tones.as_ref().and_then(|t| t.first());
    let stage = &configuration.stage;
    let operating_point = point::operating_point(configuration, &network, &at_rest, asked.meter_ohms);
    let meter = operating_point.meter.as_ref().filter(|_| asked.page);
    Ok(ConfigurationFigures {
        name: configuration.name.clone(),
        values: asked.page.then(|| values::of(stage)),
        curves: asked.page.then(|| curves::of(stage, &network, &at_rest, level(asked.level))),
        bench_sheet: meter.map(|meter| sheet::of(stage, &network, &at_rest, meter)),
        operating_point,
        response: asked.frequencies.as_ref().map(response),
        level_sweep: asked.level_sweep.then(|| sweep::over_level(&network, full_scale)),
        frequency_sweep: asked
            .frequency_sweep
            .then(|| sweep::over_frequency(&network, &at_rest, level(asked.level))),
        imd: asked.imd.as_ref().map(|pairs| pairs.par_iter().map(pair).collect()),
        noise: asked.noise.then(|| noise::of(&configuration.stage, &network, &at_rest, first_tone)),
        headroom: asked.headroom.then(|| headroom::of(&network, &at_rest, full_scale, asked.play_peak)),
        profile: asked.profile.as_ref().map(|wanted| profile::of(&network, wanted, full_scale)),
        tones,
    })
}
