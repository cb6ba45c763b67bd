//! `platewright render`: sound alone.

use crate::audio_files::OutputPlan;
use crate::failure::{Failure, Outcome};
use crate::figures::{Asked, gather};
use crate::plan::RenderPlan;
use crate::rendering::{self, Job};
use crate::{show, terminal};

/// Runs the command.
///
/// # Errors
/// [`Failure`] where an input is wrong, an output cannot be written, or the user interrupts.
pub fn run(plan: &RenderPlan) -> Result<Outcome, Failure> {
    let file = super::stage(&plan.stage)?;
    let recordings = super::recordings(&plan.play)?;
    let job = Job::new(&file.configurations, &recordings, &plan.sound, super::kernel())?;
    let files: Vec<_> = job.files().cloned().collect();
    let inputs: Vec<_> = plan.play.iter().chain([&plan.stage]).cloned().collect();
    let outputs = OutputPlan::check(&plan.into.folder, plan.into.replace, &files, &inputs)?;
    let mut figures = gather(&file, &Asked::default())?;

    let folder = outputs.create()?;
    let (staged, renders) = job.run(&folder)?;
    folder.commit(staged)?;

    let warnings = rendering::warnings(&renders);
    for warning in &warnings {
        terminal::message(&format!("warning: {warning}"));
    }
    let table = show::renders(&renders);
    figures.renders = Some(renders);
    super::print_figures(&figures, plan.figures.json, &[table])?;
    Ok(Outcome::of(plan.figures.strict, figures.warn() || !warnings.is_empty()))
}
