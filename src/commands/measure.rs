//! `platewright measure`.

use crate::failure::{Failure, Outcome};
use crate::plan::MeasurePlan;

/// Runs the command.
///
/// # Errors
/// [`Failure`] where the stage file is wrong, or, as long as this command is not finished, always.
pub fn run(plan: &MeasurePlan) -> Result<Outcome, Failure> {
    super::stage(&plan.stage)?;
    Err(super::not_yet("measure"))
}
