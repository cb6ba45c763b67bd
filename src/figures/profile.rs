//! How far a configuration misses a profile.

use platewright_dsp::analysis::{Tone, distance_db, level_for_output};
use platewright_dsp::circuit::Network;

use super::{ProfileFigures, ProfileHarmonicFigures, Why, tone};
use crate::profile::{Profile, ProfileLevel, Target, Want};

/// The misses and the distance of a network whose source reaches `full_scale` V rms.
pub fn of(network: &Network, profile: &Profile, full_scale: f64) -> ProfileFigures {
    let level = match profile.level {
        ProfileLevel::Input(volts) => Ok(volts),
        ProfileLevel::Output(volts) => {
            level_for_output(network, profile.tone, volts, full_scale).map_err(|reason| reason.to_string())
        }
    };
    let highest = profile.harmonics.iter().map(|target| target.order).fold(tone::ORDERS, usize::max);
    let measured = level.clone().and_then(|level| {
        Tone::measure(network, profile.tone, level, highest).map_err(|reason| reason.to_string())
    });
    let harmonics: Vec<_> = profile.harmonics.iter().map(|target| harmonic(target, &measured)).collect();
    let misses = harmonics.iter().map(|figures| (figures.miss_db, figures.weight));
    let distance = distance_db(misses);
    let mut figures = ProfileFigures {
        frequency: profile.tone,
        input_rms: level.clone().ok(),
        output_rms: measured.as_ref().ok().and_then(Tone::output_rms),
        distance_db: distance,
        harmonics,
        why: Why::new(),
    };
    explain(&mut figures, level.err(), measured.err());
    figures
}

fn harmonic(target: &Target, measured: &Result<Tone, String>) -> ProfileHarmonicFigures {
    let (want, wanted) = match target.want {
        Want::Exactly(dbc) => ("wanted", dbc),
        Want::AtMost(dbc) => ("at_most", dbc),
        Want::AtLeast(dbc) => ("at_least", dbc),
    };
    let got = measured
        .as_ref()
        .map_err(Clone::clone)
        .and_then(|tone| tone.dbc(target.order).ok_or_else(|| tone::NOT_TRUSTED.to_owned()));
    let mut why = Why::new();
    if let Err(reason) = &got {
        why.extend(["got", "miss_dB"].map(|key| (key.to_owned(), reason.clone())));
    }
    let got = got.ok();
    ProfileHarmonicFigures {
        order: target.order as u32,
        want: want.to_owned(),
        wanted,
        within_db: target.within_db,
        weight: target.weight,
        got,
        miss_db: got.map(|dbc| target.miss_db(dbc)),
        why,
    }
}

fn explain(figures: &mut ProfileFigures, no_level: Option<String>, no_tone: Option<String>) {
    let unknown: Vec<String> =
        figures.harmonics.iter().filter(|h| h.got.is_none()).map(|h| format!("H{}", h.order)).collect();
    if let Some(reason) = no_level {
        figures.why.insert("input_rms".to_owned(), reason);
    }
    if figures.output_rms.is_none() {
        let reason =
            no_tone.unwrap_or_else(|| "the fundamental did not settle as the steps were made finer".to_owned());
        figures.why.insert("output_rms".to_owned(), reason);
    }
    if !unknown.is_empty() {
        figures.why.insert("distance_dB".to_owned(), format!("{} could not be had", unknown.join(", ")));
    }
}
