//! Warnings, the worst first and in red where the terminal has colours.

use crate::figures::{ConfigurationFigures, UndecidedFigures, WarningFigures};
use crate::terminal::plain;

/// One line a warning, with the configurations that share it; empty where there is none.
pub fn warnings(configurations: &[ConfigurationFigures], colour: bool) -> String {
    let mut seen: Vec<(&WarningFigures, Vec<&str>)> = Vec::new();
    for configuration in configurations {
        for warning in configuration.warnings() {
            match seen.iter_mut().find(|(other, _)| other.text == warning.text) {
                Some((_, names)) => names.push(&configuration.name),
                None => seen.push((warning, vec![&configuration.name])),
            }
        }
    }
    // Exceeded limits before everything else, the worst at the top.
    seen.sort_by(|(a, _), (b, _)| b.used_percent.unwrap_or(0.0).total_cmp(&a.used_percent.unwrap_or(0.0)));
    let all = configurations.len();
    seen.iter().map(|(warning, names)| line(warning, names, all, colour)).collect()
}

fn line(warning: &WarningFigures, names: &[&str], all: usize, colour: bool) -> String {
    let exceeded = warning.used_percent.is_some();
    let (red, end) = if exceeded && colour { ("\u{1b}[1;31m", "\u{1b}[0m") } else { ("", "") };
    let mark = if exceeded { "EXCEEDED" } else { "note" };
    let whose = if names.len() == all { String::new() } else { format!("  [{}]", plain(&names.join("; "))) };
    format!("{red}{mark}: {}{end}{whose}\n", plain(&warning.text))
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
