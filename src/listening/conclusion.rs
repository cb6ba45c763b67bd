//! One plain sentence or two: what may be concluded and what not.

use super::statistics::at_least;
use super::tally::{Counts, ListenerCounts, Preference};
use crate::terminal::plain;

/// The customary level: guessing passes once in twenty tests.
const LEVEL: f64 = 0.05;
/// The listener that a test without result is judged by: right 7 times in 10.
const MODEST_EFFECT: f64 = 0.7;

/// What the counts of a comparison say.
pub fn sentence(
    one: &str,
    other: &str,
    together: Option<Counts>,
    each: &[ListenerCounts],
    preference: Option<&Preference>,
) -> String {
    let pair = format!("{} and {}", plain(one), plain(other));
    let mut parts = Vec::new();
    if let Some(counts) = together {
        parts.push(told_apart(&pair, counts, each.len()));
        parts.extend(one_of_many(counts, each));
    }
    if let Some(preference) = preference {
        parts.push(preferred(one, other, preference));
    }
    parts.join(" ")
}

fn told_apart(pair: &str, counts: Counts, listeners: usize) -> String {
    let Counts { trials, correct, by_guessing, .. } = counts;
    let who = if listeners == 1 { "the listener" } else { "these listeners together" };
    if by_guessing <= LEVEL {
        return format!(
            "{pair} were told apart: guessing gives {correct} of {trials} or more with probability {}, so {who} heard a \
             difference; that says neither which is better nor that every listener would hear it.",
            probability(by_guessing)
        );
    }
    let Some(needed) = counts.needed_95 else {
        return format!(
            "{correct} of {trials} says nothing about {pair}: so few trials cannot show a difference even if all are \
             right."
        );
    };
    format!(
        "{correct} of {trials} does not show that {pair} were told apart ({needed} were needed); it does not show that they \
         sound alike either: a listener who is right 7 times in 10 would have passed with probability {}.",
        probability(at_least(needed, trials, MODEST_EFFECT))
    )
}

/// Where only single listeners pass, how much that is worth among so many.
fn one_of_many(counts: Counts, each: &[ListenerCounts]) -> Option<String> {
    let passed: Vec<&ListenerCounts> = each.iter().filter(|each| each.counts.by_guessing <= LEVEL).collect();
    if each.len() < 2 || counts.by_guessing <= LEVEL || passed.is_empty() {
        return None;
    }
    let lucky = 1.0 - libm::pow(1.0 - LEVEL, each.len() as f64);
    Some(format!(
        "{} passed alone, but among {} listeners who guess one passes with probability {} or less: let them listen again.",
        passed.iter().map(|each| plain(&each.listener).into_owned()).collect::<Vec<_>>().join(", "),
        each.len(),
        probability(lucky)
    ))
}

fn preferred(one: &str, other: &str, preference: &Preference) -> String {
    let Preference { one: for_one, other: for_other, ties, by_chance, .. } = preference;
    let decided = for_one + for_other;
    if decided == 0 {
        return "Nobody preferred either.".to_owned();
    }
    let ties = if *ties > 0 { format!(", {ties} undecided left out") } else { String::new() };
    let (more, count) = if for_one >= for_other { (one, for_one) } else { (other, for_other) };
    let split = format!("{} was preferred {count} times of {decided}{ties}", plain(more));
    if *by_chance <= LEVEL {
        format!(
            "{split}: chance splits as unevenly with probability {}, so these listeners prefer it, in this music and at \
             equal loudness.",
            probability(*by_chance)
        )
    } else {
        format!("{split}, which chance does with probability {}: no preference is shown.", probability(*by_chance))
    }
}

/// Three digits, or that it is less.
fn probability(value: f64) -> String {
    if value < 0.0001 {
        "below 0.0001".to_owned()
    } else if value < 0.01 {
        format!("{value:.4}")
    } else {
        format!("{value:.3}")
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::listening::statistics::{clopper_pearson, needed};

    fn counts(correct: u32, trials: u32) -> Counts {
        let (low, high) = clopper_pearson(correct, trials, 0.95);
        Counts {
            runs: 1,
            trials,
            correct,
            by_guessing: at_least(correct, trials, 0.5),
            needed_95: needed(trials, 0.05),
            needed_99: needed(trials, 0.01),
            interval_95: [low, high],
        }
    }

    #[test]
    fn a_shown_difference_is_not_called_better() {
        let text = told_apart("a and b", counts(12, 16), 1);
        assert!(text.contains("probability 0.038") && text.contains("neither which is better"), "{text}");
    }

    #[test]
    fn nothing_shown_is_not_called_equal() {
        let text = told_apart("a and b", counts(11, 16), 1);
        assert!(text.contains("12 were needed") && text.contains("does not show that they sound alike"), "{text}");
        assert!(told_apart("a and b", counts(4, 4), 1).contains("cannot show a difference"));
    }

    #[test]
    fn one_lucky_listener_is_put_into_proportion() {
        let each = [("Ann", 12), ("Ben", 7)]
            .map(|(name, correct)| ListenerCounts { listener: name.to_owned(), counts: counts(correct, 16) });
        let text = one_of_many(counts(19, 32), &each).unwrap();
        assert!(text.starts_with("Ann passed alone") && text.contains("0.098"), "{text}");
    }

    #[test]
    fn preferences_name_the_preferred() {
        let preference = Preference { one: 1, other: 9, ties: 2, by_chance: 0.021, notes: Vec::new() };
        let text = preferred("a", "b", &preference);
        assert!(text.starts_with("b was preferred 9 times of 10, 2 undecided left out"), "{text}");
    }
}
