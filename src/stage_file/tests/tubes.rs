//! Tubes of the user's own.

use platewright_dsp::triode::{Capacitances, GridLaw, Law};

use super::*;

#[test]
fn a_tube_of_the_users_own_takes_everything_it_states() {
    let text = SMALL.replacen("12AX7", "mine", 1)
        + r#"[[tube]]
type = "mine"
model = "two-section"
parameters = { G = "1m2", mu = 100, gamma = 1.5, C = 5, share = 0.02, mu_ratio = 0.4, offset = -0.5, knee = 7, Gg = 6e-4, xi = 1.3, Cg = 9 }
ensemble = [
  { G = "1m1", mu = 99, gamma = 1.5, C = 5, share = 0.02, mu_ratio = 0.4, offset = -0.5, knee = 7, Gg = 6e-4, xi = 1.3, Cg = 9 },
  { G = "1m3", mu = 98, gamma = 1.5, C = 5, share = 0.02, mu_ratio = 0.4, offset = -0.5, knee = 7, Gg = 5e-4, xi = 1.3, Cg = 9 },
]
capacitance = { grid_cathode = "1p6", grid_plate = 1.7e-12 }
heater = { voltage = 6.3, current = "300m" }
basing = "9A"
limits = { plate_voltage = 330, cathode_current = "20m" }
"#;
    let tube = &good(&text).configurations[0].stage.gain.tube;
    assert_eq!((tube.name.as_str(), tube.from_library, tube.basing.as_deref()), ("mine", false, Some("9A")));
    assert_eq!(tube.ensemble.len(), 2);
    assert!(matches!(tube.ensemble[1].0, Law::TwoSection(law) if law.g == 1.3e-3 && law.mu == 98.0));
    assert_eq!(tube.ensemble[1].1.gg, 5e-4);
    let capacitance = Capacitances { grid_cathode: 1.6e-12, grid_plate: 1.7e-12, plate_cathode: 0.0 };
    assert_eq!(tube.section.capacitance, capacitance);
    assert_eq!(tube.heater.map(|heater| (heater.voltage, heater.current)), Some((6.3, 0.3)));
    assert_eq!((tube.limits.plate_voltage, tube.limits.cathode_current), (Some(330.0), Some(0.02)));
    assert_eq!(tube.limits.plate_dissipation, None);
}

#[test]
fn a_borrowed_grid_law_is_said_to_be_borrowed() {
    let file = good(&(SMALL.replacen("12AX7", "mine", 1) + OWN));
    assert_eq!(file.configurations[0].stage.gain.tube.section.grid, GridLaw::BORROWED);
    assert!(file.notes.len() == 1 && file.notes[0].contains("\"mine\"") && file.notes[0].contains("borrowed"));
}

#[test]
fn tube_rules() {
    let own = |change: (&str, &str)| {
        assert!(OWN.contains(change.0), "{}", change.0);
        SMALL.to_owned() + &OWN.replacen(change.0, change.1, 1)
    };
    let cases = [
        (own(("\"mine\"", "\"12AU7\"")), "\"12AU7\" is a type of the library"),
        (own(("\"mine\"", "\"12au7\"")), "\"12au7\" is a type of the library"),
        (own(("\"mine\"", "\"ECC82\"")), "\"ECC82\" is a type of the library"),
        (own(("type = \"mine\"", "")), "`tube.type` is missing"),
        (own(("model", "modell")), "did you mean `model`?"),
        (own(("\"dempwolf-zoelzer\"", "\"dempwolf\"")), "\"two-section\" or \"dempwolf-zoelzer\" or \"koren\""),
        (own(("parameters", "#")), "`tube.parameters` is missing"),
        (own(("C = 3", "C = 3, Gg = 1e-4")), "`tube.parameters.xi` is missing"),
        (own(("C = 3", "C = 3, share = 0.1")), "unknown key `tube.parameters.share`"),
        (own(("mu = 20", "mu = -20")), "`tube.parameters.mu` is -20"),
        (own(("mu = 20", "mu = nan")), "`tube.parameters.mu` is not a number"),
        (own(("{ G", "[ 1 ] # { G")), "`tube.parameters` is a list where a table belongs"),
        (own(("dempwolf-zoelzer", "koren")), "`tube.parameters.Kp` is missing"),
        (own(("C = 3 }", "C = 3 }\nlimits = { plate_volts = 1 }")), "unknown key `tube.limits.plate_volts`"),
        (own(("C = 3 }", "C = 3 }\ncapacitance = { grid_plate = 1.6 }")), "`tube.capacitance.grid_plate` is 1.6 F"),
        (own(("C = 3 }", "C = 3 }\nheater = { voltage = 6.3 }")), "`tube.heater.current` is missing"),
        (own(("C = 3 }", "C = 3 }\nensemble = [{ G = 1 }]")), "`tube.ensemble.mu` is missing"),
        (own(("C = 3 }", "C = 3 }\nensemble = 5")), "`tube.ensemble` is a number where a list belongs"),
        (own(("[[tube]]", "[tube]")), "[[tube]]"),
        (own(("[[tube]]", &format!("{OWN}[[tube]]"))), "\"mine\" is there twice"),
        (SMALL.replacen("12AX7", "12BH7B", 1), "did you mean \"12BH7A\"?"),
        (SMALL.replacen("12AX7", "lamp", 1), "known types: 12AX7, 12AT7, 12AU7"),
        (SMALL.replacen("\"12AX7\"", "12", 1), "`gain.tube` is a number where a text belongs"),
    ];
    for (text, expected) in cases {
        let message = bad(&text);
        assert!(message.contains(expected), "{expected}: {message}");
    }
}

#[test]
fn a_tube_that_is_wrong_is_told_once_where_it_is_wrong() {
    let text = SMALL.replacen("12AX7", "mine", 1) + &OWN.replacen("mu = 20", "mu = 0", 1);
    let message = bad(&text);
    assert_eq!(message.matches("error:").count(), 1, "{message}");
    assert!(message.contains("`tube.parameters.mu` is 0"), "{message}");
}
