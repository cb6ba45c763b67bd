//! `platewright demo`.

use crate::failure::{Failure, Outcome};
use crate::plan::DemoPlan;

/// The built-in stage.
pub const STAGE: &str = include_str!("../demo/stage.toml");

/// Runs the command.
///
/// # Errors
/// [`Failure`], as long as this command is not finished, always.
pub fn run(_plan: &DemoPlan) -> Result<Outcome, Failure> {
    Err(super::not_yet("demo"))
}
