//! `platewright measure`: figures of every configuration.

use crate::failure::{Failure, Outcome};
use crate::figures::{Asked, AskedTone, gather};
use crate::plan::MeasurePlan;
use crate::show;

/// The tone that is shown when nothing is asked, Hz.
const USUAL_TONE: f64 = 1000.0;

/// Runs the command.
///
/// # Errors
/// [`Failure`] where the stage file is wrong or a configuration settles nowhere.
pub fn run(plan: &MeasurePlan) -> Result<Outcome, Failure> {
    let file = super::stage(&plan.stage)?;
    let figures = gather(&file, &asked(plan))?;
    let tables: Vec<String> = [show::tones(&figures.configurations), show::responses(&figures.configurations)]
        .into_iter()
        .flatten()
        .map(|table| table.render(show::WIDTH))
        .collect();
    super::print_figures(&figures, plan.figures.json, &tables)?;
    Ok(Outcome::of(plan.figures.strict, figures.warn()))
}

fn asked(plan: &MeasurePlan) -> Asked {
    let tone = |t: &crate::plan::Tone| AskedTone { frequency: t.frequency, level: Some(t.level) };
    let mut tones: Vec<AskedTone> = plan.tones.iter().map(tone).collect();
    // A person who asks for nothing wants to see something; a program that reads JSON wants what it asked for.
    if tones.is_empty() && plan.frequencies.is_empty() && !plan.figures.json {
        tones.push(AskedTone { frequency: USUAL_TONE, level: plan.level });
    }
    Asked {
        tones: (!tones.is_empty()).then_some(tones),
        frequencies: (!plan.frequencies.is_empty()).then(|| plan.frequencies.clone()),
        meter_ohms: None,
    }
}
