//! `platewright report`: the page of a comparison again, from its report.json alone.

use std::fs;
use std::io;
use std::path::PathBuf;

use super::compare::REPORT;
use crate::audio_files::OutputPlan;
use crate::failure::{Failure, Outcome, RequestError};
use crate::plan::ReportPlan;
use crate::{report, terminal};

/// Largest report.json, bytes: some hundred times what a comparison of many configurations needs.
const LARGEST: u64 = 1 << 28;

/// Runs the command.
///
/// # Errors
/// [`Failure`] where report.json is missing, damaged or of another schema, or the page cannot be written.
pub fn run(plan: &ReportPlan) -> Result<Outcome, Failure> {
    let path = plan.folder.join(REPORT);
    let name = terminal::path(&path);
    if fs::metadata(&path).is_ok_and(|data| data.len() > LARGEST) {
        let problem = format!("{name} is larger than {} MiB, so it is no report", LARGEST >> 20);
        return Err(RequestError::new(problem, "name the folder of a comparison").into());
    }
    let json = fs::read_to_string(&path).map_err(|error| cannot_read(&name, &error))?;
    let page = report::draw(&name, &json)?;
    let mut files = vec![PathBuf::from(report::PAGE)];
    if plan.plots {
        files.extend(page.plots.iter().map(|(name, _)| PathBuf::from(format!("{}/{name}", report::PLOTS))));
    }
    let folder = OutputPlan::check(&plan.folder, true, &files, &[path])?.create()?;
    let staged = page.staged(&folder, plan.plots)?;
    folder.commit(staged)?;
    terminal::message(&format!("page in {}", terminal::path(&plan.folder.join(report::PAGE))));
    Ok(Outcome::Done)
}

fn cannot_read(name: &str, error: &io::Error) -> Failure {
    let problem = match error.kind() {
        io::ErrorKind::NotFound => format!("there is no {name}"),
        io::ErrorKind::InvalidData => format!("{name} cannot be drawn: it is not UTF-8 text"),
        _ => format!("{name} cannot be read: {error}"),
    };
    RequestError::new(problem, "name the folder that `platewright compare` wrote").into()
}
