//! `platewright bias`.

use crate::failure::{Failure, Outcome};
use crate::plan::BiasPlan;

/// Runs the command.
///
/// # Errors
/// [`Failure`] where the stage file is wrong, or, as long as this command is not finished, always.
pub fn run(plan: &BiasPlan) -> Result<Outcome, Failure> {
    super::stage(&plan.stage)?;
    Err(super::not_yet("bias"))
}
