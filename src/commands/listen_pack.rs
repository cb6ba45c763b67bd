//! `platewright listen pack`: takes that differ by the stage alone, and the page that plays them blind.

use std::path::Path;

use crate::audio_files::OutputPlan;
use crate::failure::{Failure, Outcome, WorkError};
use crate::listening::{PackFigures, PackJob};
use crate::plan::PackPlan;
use crate::terminal;

/// Runs the command.
///
/// # Errors
/// [`Failure`] where an input is wrong, an output cannot be written, or the user interrupts.
pub fn run(plan: &PackPlan) -> Result<Outcome, Failure> {
    let file = super::stage(&plan.stage)?;
    let recordings = super::recordings(&plan.play)?;
    let job = PackJob::new(&file, &recordings, &plan.options, super::kernel())?;
    let inputs: Vec<_> = plan.play.iter().chain([&plan.stage]).cloned().collect();
    let outputs = OutputPlan::check(&plan.into.folder, plan.into.replace, &job.files(), &inputs)?;

    let folder = outputs.create()?;
    let (staged, figures) = job.run(&folder, Path::new(""))?;
    folder.commit(staged)?;

    tell(&figures);
    if plan.json {
        let key = figures.key.to_json().map_err(|error| WorkError::Failed {
            problem: format!("the key cannot be printed: {error}"),
            remedy: "read keep/key.json".to_owned(),
        })?;
        terminal::print(&key)?;
    } else {
        terminal::print(&summary(&figures, &plan.into.folder))?;
    }
    Ok(Outcome::of(plan.strict, !figures.notes.is_empty()))
}

/// What a person should know of a pack although it is made.
pub fn tell(figures: &PackFigures) {
    for note in &figures.notes {
        terminal::message(&format!("warning: {note}"));
    }
}

fn summary(figures: &PackFigures, folder: &Path) -> String {
    let key = &figures.key;
    let mut text = format!("Listening pack {}\n", &key.pack[..8]);
    for recording in &key.recordings {
        text.push_str(&format!(
            "  recording {}: {}, {} takes of {:.1} s at {:.2} LUFS\n",
            recording.number,
            terminal::plain(&recording.name),
            recording.takes.len(),
            recording.frames as f64 / f64::from(recording.sample_rate),
            recording.loudness
        ));
    }
    let megabytes = figures.send_bytes as f64 / 1e6;
    let at = |name: &str| terminal::path(&folder.join(name));
    text.push_str(&format!("send    {} ({megabytes:.1} MB): the listener opens index.html\n", at("send")));
    text.push_str(&format!("keep    {}: which letter is which, and every correction\n", at("keep")));
    text.push_str(&format!("later   platewright listen tally {} ANSWERS.json\n", terminal::path(folder)));
    text
}
