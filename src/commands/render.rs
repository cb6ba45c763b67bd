//! `platewright render`.

use crate::failure::{Failure, Outcome};
use crate::plan::RenderPlan;

/// Runs the command.
///
/// # Errors
/// [`Failure`] where the stage file is wrong, or, as long as this command is not finished, always.
pub fn run(plan: &RenderPlan) -> Result<Outcome, Failure> {
    super::stage(&plan.stage)?;
    Err(super::not_yet("render"))
}
