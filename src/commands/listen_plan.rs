//! `platewright listen plan`: how many trials a test needs.

use serde_json::json;

use crate::failure::{Failure, Outcome, RequestError};
use crate::listening::plan_trials;
use crate::plan::TrialsPlan;
use crate::terminal;

/// Runs the command.
///
/// # Errors
/// [`RequestError`] where no number of trials that anybody sits through is enough.
pub fn run(plan: &TrialsPlan) -> Result<Outcome, Failure> {
    let TrialsPlan { effect, power, alpha, json } = *plan;
    let found = plan_trials(effect, power, alpha).ok_or_else(|| {
        RequestError::new(
            format!("not even 2000 trials show an effect of {effect} with a power of {power}"),
            "expect a larger effect, or ask for less power",
        )
    })?;
    if json {
        let figures = json!({
            "effect": effect, "power": power, "alpha": alpha,
            "trials": found.trials, "needed": found.needed,
            "by_guessing": found.by_guessing, "achieved_power": found.power,
        });
        terminal::print(&format!("{figures:#}\n"))?;
    } else {
        terminal::print(&format!(
            "{} trials, of which {} must be right\n\
             A listener who is right {effect} of the time reaches that with probability {:.3};\n\
             one who guesses, with probability {:.4} (at most {alpha}).\n\
             Make the pack with --trials {}: the number stands before anybody listens.\n",
            found.trials, found.needed, found.power, found.by_guessing, found.trials
        ))?;
    }
    Ok(Outcome::Done)
}
