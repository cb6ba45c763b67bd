//! Limits that are exceeded, and what to change.

use crate::figures::{ConfigurationFigures, WarningFigures};

/// A warning with the configurations that share it.
#[derive(Clone, Debug, PartialEq)]
pub struct Warning {
    pub letters: String,
    pub text: String,
    pub remedy: String,
}

/// Exceeded limits, the worst first, and what else a builder must know; one line a limit of a part.
pub fn warnings(configurations: &[ConfigurationFigures], letters: &[String]) -> (Vec<Warning>, Vec<Warning>) {
    let mut seen: Vec<Shared<'_>> = Vec::new();
    for (configuration, letter) in configurations.iter().zip(letters) {
        for warning in configuration.warnings() {
            // What exceeds no limit is the same only where the words are.
            let same = |other: &&mut Shared<'_>| {
                let (a, b) = (other[0].0, warning);
                let limit = a.used_percent.is_some() && b.used_percent.is_some();
                a.text == b.text || (limit && a.part == b.part && a.limit == b.limit)
            };
            match seen.iter_mut().find(same) {
                Some(shared) => shared.push((warning, letter)),
                None => seen.push(vec![(warning, letter)]),
            }
        }
    }
    let used = |warning: &WarningFigures| warning.used_percent.unwrap_or(0.0);
    for shared in &mut seen {
        shared.sort_by(|a, b| used(b.0).total_cmp(&used(a.0)));
    }
    seen.sort_by(|a, b| used(b[0].0).total_cmp(&used(a[0].0)));
    let (exceeded, notes): (Vec<_>, Vec<_>) = seen.iter().partition(|shared| shared[0].0.used_percent.is_some());
    (exceeded.into_iter().map(shown).collect(), notes.into_iter().map(shown).collect())
}

/// Warnings of one kind with the letters of their configurations.
type Shared<'a> = Vec<(&'a WarningFigures, &'a str)>;

fn shown(shared: &Shared<'_>) -> Warning {
    let (worst, _) = shared[0];
    let alike: Vec<&str> = shared.iter().filter(|(w, _)| w.text == worst.text).map(|(_, letter)| *letter).collect();
    let others: Vec<String> = shared
        .iter()
        .filter(|(warning, _)| warning.text != worst.text)
        .map(|(warning, letter)| format!("{letter} {:.0}\u{a0}%", warning.used_percent.unwrap_or(0.0)))
        .collect();
    let others = if others.is_empty() { String::new() } else { format!("; {}", others.join(", ")) };
    Warning {
        letters: alike.join(" "),
        text: format!("{}{others}", super::words::nice_sentence(&worst.text)),
        remedy: remedy(worst).to_owned(),
    }
}

/// What a designer would try first.
fn remedy(warning: &WarningFigures) -> &'static str {
    let follower = warning.part == "follower";
    match warning.limit.as_str() {
        "plate_dissipation" if follower => {
            "Raise follower.tail_resistor, lower supply.voltage, or fit a tube with a larger plate."
        }
        "plate_dissipation" => {
            "Raise gain.cathode_resistor or gain.plate_resistor, lower supply.voltage, or fit a tube with a larger plate."
        }
        "plate_voltage" if follower => "Lower supply.voltage, or raise the follower's cathode.",
        "plate_voltage" => "Lower supply.voltage, raise gain.plate_resistor, or lower gain.cathode_resistor.",
        "plate_voltage_cold" => "Lower supply.voltage, or hold the supply back until the heaters are warm.",
        "cathode_current" => "Raise the cathode or tail resistor, or fit a tube that may carry more.",
        "heater_cathode_voltage" => {
            "Elevate the heater supply towards the cathode's voltage, or fit a tube that stands more."
        }
        "watts" => "Fit a part rated for at least twice its heat.",
        "volts" => "Fit a part rated above the most it meets, tubes cold included.",
        _ => "",
    }
}
