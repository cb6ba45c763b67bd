//! How many trials a run needs, before anybody listens.

use super::statistics::{at_least, needed};

/// More trials than this nobody sits through.
pub const MOST_TRIALS: u32 = 2000;

/// A number of trials and what it achieves.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct TrialPlan {
    /// Trials.
    pub trials: u32,
    /// Right answers that are then needed.
    pub needed: u32,
    /// The probability that guessing reaches them.
    pub by_guessing: f64,
    /// The probability that the listener reaches them.
    pub power: f64,
}

/// The fewest trials in which a listener who is right with probability `effect` reaches, with probability `power` at
/// least, a count that guessing reaches with probability `alpha` at most. None where not even [`MOST_TRIALS`] do.
pub fn plan_trials(effect: f64, power: f64, alpha: f64) -> Option<TrialPlan> {
    (1..=MOST_TRIALS).filter_map(|trials| achieved(trials, effect, alpha)).find(|plan| plan.power >= power)
}

/// What `trials` trials achieve; none where no count of them is rare enough.
pub fn achieved(trials: u32, effect: f64, alpha: f64) -> Option<TrialPlan> {
    let needed = needed(trials, alpha)?;
    let by_guessing = at_least(needed, trials, 0.5);
    Some(TrialPlan { trials, needed, by_guessing, power: at_least(needed, trials, effect) })
}

#[cfg(test)]
mod tests {
    use super::*;

    /// scipy.stats, from tools/reference/binomial.py.
    #[test]
    fn plans_agree_with_scipy() {
        let table: serde_json::Value =
            serde_json::from_str(include_str!("../../tests/reference/binomial.json")).unwrap();
        let rows = table["plans"].as_array().unwrap();
        assert!(rows.len() >= 6);
        for row in rows {
            let value = |key: &str| row[key].as_f64().unwrap();
            let plan = plan_trials(value("effect"), value("power"), value("alpha")).unwrap();
            assert_eq!(
                (f64::from(plan.trials), f64::from(plan.needed)),
                (value("trials"), value("needed")),
                "{row}"
            );
            assert!((plan.power - value("achieved")).abs() < 1e-10 && plan.by_guessing <= value("alpha"), "{row}");
        }
    }

    #[test]
    fn a_listener_who_guesses_is_never_planned_for() {
        assert_eq!(plan_trials(0.5, 0.8, 0.05), None);
    }
}
