//! `platewright listen`: packs, answers, and how many trials they need.

use super::{listen_pack, listen_plan, listen_tally};
use crate::failure::{Failure, Outcome};
use crate::plan::ListenPlan;

/// Runs the command.
///
/// # Errors
/// Whatever keeps it from ending.
pub fn run(plan: &ListenPlan) -> Result<Outcome, Failure> {
    match plan {
        ListenPlan::Pack(plan) => listen_pack::run(plan),
        ListenPlan::Tally(plan) => listen_tally::run(plan),
        ListenPlan::Trials(plan) => listen_plan::run(plan),
    }
}
