//! `platewright measure`: figures of every configuration.

use super::csv_file::CsvFile;
use crate::cli::SweepKind;
use crate::failure::{Failure, Outcome};
use crate::figures::{Asked, AskedTone, gather};
use crate::plan::MeasurePlan;
use crate::profile::Profile;
use crate::show;

/// The tone that is shown when nothing is asked, Hz.
const USUAL_TONE: f64 = 1000.0;

/// Runs the command.
///
/// # Errors
/// [`Failure`] where the stage file, a recording or the profile is wrong, or a configuration settles nowhere.
pub fn run(plan: &MeasurePlan) -> Result<Outcome, Failure> {
    let file = super::stage(&plan.stage)?;
    let recordings = super::recordings(&plan.play)?;
    let play_peak = if recordings.is_empty() { None } else { Some(super::true_peak(&recordings)?) };
    let profile = plan.profile.as_deref().map(Profile::load).transpose()?;
    let inputs: Vec<_> = plan.play.iter().chain([&plan.stage]).chain(&plan.profile).cloned().collect();
    let csv = CsvFile::check(plan.csv.as_deref(), plan.replace, &inputs, &[])?;
    let figures = gather(&file, &Asked { play_peak, profile, ..asked(plan) })?;
    if let Some(csv) = csv {
        let (folder, staged) = csv.stage(&figures)?;
        folder.commit(vec![staged])?;
    }
    super::print_figures(&figures, plan.figures.json, &show::measured(&figures.configurations, plan.levels))?;
    Ok(Outcome::of(plan.figures.strict, figures.warn()))
}

fn asked(plan: &MeasurePlan) -> Asked {
    let tone = |t: &crate::plan::Tone| AskedTone { frequency: t.frequency, level: Some(t.level) };
    let mut tones: Vec<AskedTone> = plan.tones.iter().map(tone).collect();
    let (level_sweep, frequency_sweep) =
        (plan.sweep.contains(&SweepKind::Level), plan.sweep.contains(&SweepKind::Frequency));
    let nothing = tones.is_empty()
        && plan.frequencies.is_empty()
        && plan.imd.is_empty()
        && plan.profile.is_none()
        && !(plan.noise || plan.headroom || level_sweep || frequency_sweep);
    // A person who asks for nothing wants to see something; a program that reads JSON wants what it asked for.
    if nothing && !plan.figures.json {
        tones.push(AskedTone { frequency: USUAL_TONE, level: plan.level });
    }
    Asked {
        tones: (!tones.is_empty()).then_some(tones),
        frequencies: (!plan.frequencies.is_empty()).then(|| plan.frequencies.clone()),
        trust: plan.trust,
        level: plan.level,
        level_sweep,
        frequency_sweep,
        imd: (!plan.imd.is_empty()).then(|| plan.imd.clone()),
        noise: plan.noise,
        headroom: plan.headroom,
        ..Asked::default()
    }
}
