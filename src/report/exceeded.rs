//! Limits that are exceeded, and what to change.

use crate::figures::{ConfigurationFigures, WarningFigures};

/// A warning with the configurations that share it.
#[derive(Clone, Debug, PartialEq)]
pub struct Warning {
    pub letters: String,
    pub text: String,
    pub remedy: String,
}

/// Exceeded limits, the worst first, and what else a builder must know.
pub fn warnings(configurations: &[ConfigurationFigures], letters: &[String]) -> (Vec<Warning>, Vec<Warning>) {
    let mut seen: Vec<(&WarningFigures, Vec<&str>)> = Vec::new();
    for (configuration, letter) in configurations.iter().zip(letters) {
        for warning in configuration.warnings() {
            match seen.iter_mut().find(|(other, _)| other.text == warning.text) {
                Some((_, letters)) => letters.push(letter),
                None => seen.push((warning, vec![letter])),
            }
        }
    }
    seen.sort_by(|(a, _), (b, _)| b.used_percent.unwrap_or(0.0).total_cmp(&a.used_percent.unwrap_or(0.0)));
    let shown = |(warning, letters): &&(&WarningFigures, Vec<&str>)| Warning {
        letters: letters.join(" "),
        text: super::words::nice_sentence(&warning.text),
        remedy: remedy(warning).to_owned(),
    };
    let (exceeded, notes): (Vec<_>, Vec<_>) = seen.iter().partition(|(warning, _)| warning.used_percent.is_some());
    (exceeded.iter().map(shown).collect(), notes.iter().map(shown).collect())
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
