//! The file that `--csv` names.

use std::path::{Path, PathBuf};

use crate::audio_files::{AudioError, OutputFolder, OutputPlan, StagedFile};
use crate::failure::Failure;
use crate::figures::Figures;

/// A CSV file that has been found possible; nothing has been made yet.
pub struct CsvFile {
    plan: OutputPlan,
    name: PathBuf,
}

impl CsvFile {
    /// Looks whether the file can be written without harm: it must not exist unless `replace` is set, nor be one of
    /// `inputs` or of the `other` outputs.
    ///
    /// # Errors
    /// [`Failure`] where it cannot.
    pub fn check(
        file: Option<&Path>,
        replace: bool,
        inputs: &[PathBuf],
        other: &[PathBuf],
    ) -> Result<Option<Self>, Failure> {
        let Some(file) = file else { return Ok(None) };
        let (plan, name) = OutputPlan::check_file(file, replace, inputs)?;
        let place = |path: &Path| std::path::absolute(path).unwrap_or_else(|_| path.to_owned());
        if other.iter().any(|path| place(path) == place(file)) {
            return Err(AudioError::OutputTwice { path: file.to_owned() }.into());
        }
        Ok(Some(CsvFile { plan, name }))
    }

    /// The figures in a temporary that will become the file, and the folder that puts it in place.
    ///
    /// # Errors
    /// [`Failure`] where it cannot be written.
    pub fn stage(self, figures: &Figures) -> Result<(OutputFolder, StagedFile), Failure> {
        let folder = self.plan.create()?;
        let staged = folder.stage_contents(&self.name, &figures.to_csv()?)?;
        Ok((folder, staged))
    }
}
