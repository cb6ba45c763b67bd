//! Warnings, the worst first and in red where the terminal has colours.

use crate::figures::{ConfigurationFigures, UndecidedFigures, WarningFigures};
use crate::terminal::plain;

/// One line a part and limit, with the configurations that share it; empty where there is none.
pub fn warnings(configurations: &[ConfigurationFigures], colour: bool) -> String {
    let mut groups: Vec<Group<'_>> = Vec::new();
    for configuration in configurations {
        for warning in configuration.warnings() {
            match groups.iter_mut().find(|group| group.holds(warning)) {
                Some(group) => group.add(warning, &configuration.name),
                None => groups.push(Group { worst: warning, names: vec![&configuration.name] }),
            }
        }
    }
    // Exceeded limits before everything else, the worst at the top.
    groups.sort_by(|a, b| used(b.worst).total_cmp(&used(a.worst)));
    groups.iter().map(|group| group.line(configurations.len(), colour)).collect()
}

fn used(warning: &WarningFigures) -> f64 {
    warning.used_percent.unwrap_or(0.0)
}

/// A limit of a part, in every configuration that warns of it.
struct Group<'a> {
    worst: &'a WarningFigures,
    names: Vec<&'a str>,
}

/// Names that a line spells out; more are counted.
const NAMES: usize = 4;

impl<'a> Group<'a> {
    /// Whether a warning is of this limit; a note, which has no size, is of its own words alone.
    fn holds(&self, warning: &WarningFigures) -> bool {
        let limit = |w: &WarningFigures| (w.part.clone(), w.limit.clone(), w.used_percent.is_some());
        limit(self.worst) == limit(warning) && (warning.used_percent.is_some() || self.worst.text == warning.text)
    }

    fn add(&mut self, warning: &'a WarningFigures, name: &'a str) {
        if used(warning) > used(self.worst) {
            self.worst = warning;
        }
        if self.names.last() != Some(&name) {
            self.names.push(name);
        }
    }

    fn line(&self, all: usize, colour: bool) -> String {
        let exceeded = self.worst.used_percent.is_some();
        let (red, end) = if exceeded && colour { ("\u{1b}[1;31m", "\u{1b}[0m") } else { ("", "") };
        let mark = if exceeded { "EXCEEDED" } else { "note" };
        let whose = match self.names.len() {
            1 if all == 1 => String::new(),
            count if count == all => format!("\n  in all configurations, this the worst of {count}"),
            count if count > NAMES => format!("\n  in {count} of {all} configurations, this the worst"),
            _ => format!("\n  in {}", plain(&self.names.join("; "))),
        };
        format!("{red}{mark}: {}{end}{whose}\n", plain(&self.worst.text))
    }
}

/// One line for each difference that the tube data do not settle; empty where there is none.
pub fn undecided(pairs: &[UndecidedFigures]) -> String {
    let line = |u: &UndecidedFigures| {
        let [a, b] = u.between.each_ref().map(|name| plain(name));
        let (order, difference, trust) = (u.order, u.difference_db.abs(), u.trust_db);
        format!(
            "H{order}: [{a}] and [{b}] differ by {difference:.1} dB, equally good tube data by ±{trust:.1} dB: these data cannot tell which is lower\n"
        )
    };
    pairs.iter().map(line).collect()
}
