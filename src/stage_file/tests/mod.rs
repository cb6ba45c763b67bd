//! The stage file as a whole.

mod mutations;
mod overrides;
mod rules;
mod tubes;

use platewright_dsp::circuit::{Coupling, LeakReturn};
use platewright_dsp::triode::{GridLaw, Law, library};

use super::*;
use crate::commands::{DEMO_STAGE, EXAMPLE_STAGE};

fn parse(text: &str) -> Result<StageFile, Failure> {
    let names: Vec<String> = library::names().map(str::to_owned).collect();
    StageFile::parse("stage.toml", text.to_owned(), &Library { find: &library::find, names: &names })
}

fn good(text: &str) -> StageFile {
    parse(text).unwrap_or_else(|failure| panic!("{}", failure.message(false).unwrap_or_default()))
}

fn bad(text: &str) -> String {
    match parse(text) {
        Ok(_) => panic!("was read although it is wrong:\n{text}"),
        Err(failure) => failure.message(false).expect("a message"),
    }
}

fn names(file: &StageFile) -> Vec<&str> {
    file.configurations.iter().map(|configuration| configuration.name.as_str()).collect()
}

#[test]
fn the_demo_and_the_example_describe_the_same_stage() {
    let (demo, example) = (good(DEMO_STAGE), good(EXAMPLE_STAGE));
    let expected = ["12AU7, bypass in", "12AU7, bypass out", "12BH7A, bypass in", "12BH7A, bypass out"];
    assert_eq!(names(&demo), expected);
    for (ours, theirs) in demo.configurations.iter().zip(&example.configurations) {
        assert_eq!((&ours.name, &ours.stage, &ours.ratings), (&theirs.name, &theirs.stage, &theirs.ratings));
    }
    assert_eq!(demo.title.as_deref(), Some("One-box warming stage for a stage piano"));
}

#[test]
fn the_demo_has_the_values_that_it_names() {
    let demo = good(DEMO_STAGE);
    let stage = &demo.configurations[3].stage;
    assert_eq!((stage.supply.voltage, stage.supply.resistance, stage.supply.reservoir), (290.0, 2700.0, 39e-6));
    assert_eq!((stage.source.resistance, stage.source.full_scale), (330.0, 2.0));
    let pot = stage.input.pot.as_ref().expect("a pot");
    assert_eq!((pot.resistance, pot.position, stage.input.grid_stopper), (47e3, 0.45, 910.0));
    assert_eq!((stage.gain.plate_resistor, stage.gain.cathode_resistor), (33e3, 820.0));
    let bypass = stage.gain.bypass.expect("a bypass");
    assert_eq!((bypass.capacitance, bypass.esr, bypass.trickle_resistor), (150e-6, 0.12, Some(27e3)));
    assert!(!bypass.engaged && demo.configurations[2].stage.gain.bypass.expect("a bypass").engaged);
    let follower = stage.follower.as_ref().expect("a follower");
    assert_eq!((follower.bias_resistor, follower.tail_resistor), (Some(750.0), 12e3));
    let coupling = Coupling::Capacitor {
        capacitor: 330e-9,
        grid_stopper: 560.0,
        grid_leak: 680e3,
        returns_to: LeakReturn::BiasJunction,
    };
    assert_eq!(follower.coupling, coupling);
    assert_eq!((stage.output.capacitor, stage.output.bleed), (3.3e-6, 270e3));
    assert_eq!((stage.output.load_resistance, stage.output.load_capacitance), (47e3, Some(470e-12)));
    assert_eq!((stage.gain.tube.name.as_str(), follower.tube.name.as_str()), ("12BH7A", "12BH7A"));
    let settings = &demo.configurations[3].settings;
    let shown: Vec<_> = settings.iter().map(|(key, value)| (key.as_str(), value.as_str())).collect();
    assert_eq!(shown, [("gain.tube", "12BH7A"), ("follower.tube", "12BH7A"), ("gain.bypass.engaged", "out")]);
}

#[test]
fn the_known_answers_hold_their_values() {
    let read = |number: u32| {
        let path = format!("{}/tests/known-answers/known{number}.toml", env!("CARGO_MANIFEST_DIR"));
        good(&std::fs::read_to_string(path).expect("a known answer"))
    };
    for number in 1..=6 {
        let file = read(number);
        assert_eq!(names(&file), ["as drawn"]);
        assert_eq!(file.configurations[0].file_stem, "as drawn");
        assert!(file.notes.is_empty() && file.configurations[0].settings.is_empty());
    }
    let direct = &read(4).configurations[0].stage;
    let follower = direct.follower.as_ref().expect("a follower");
    assert_eq!((follower.coupling, follower.bias_resistor), (Coupling::Direct { grid_stopper: 390.0 }, None));
    assert!(matches!(follower.tube.section.law, Law::Koren(law) if law.mu == 28.0 && law.kvb == 300.0));
    let two = &read(6).configurations[0].stage;
    let Law::TwoSection(law) = two.gain.tube.section.law else { panic!("two-section") };
    assert_eq!((law.g, law.mu, law.gamma, law.c), (0.00118, 111.8, 1.478, 5.44));
    assert_eq!((law.share, law.mu_ratio, law.offset, law.knee), (0.0256, 0.369, 0.59, 7.0));
    assert_eq!(two.gain.tube.section.grid, GridLaw { gg: 0.00062, xi: 1.35, cg: 9.3, ig0: 0.0 });
    assert_eq!(two.gain.tube.section.capacitance.grid_plate, 1.7e-12);
    assert_eq!(two.gain.tube.limits.plate_dissipation, Some(5.0));
    assert_eq!(two.gain.tube.limits.plate_voltage_cold, None);
    let alone = &read(1).configurations[0].stage;
    assert!(alone.follower.is_none() && alone.gain.bypass.is_none() && alone.input.pot.is_none());
    assert_eq!(alone.gain.tube.section.grid.ig0, 4.527e-8);
}

/// A small stage without follower.
const SMALL: &str = r#"
[supply]
voltage = 300
resistance = "10k"
reservoir = "22u"
[source]
resistance = 600
full_scale = 2
[input]
grid_leak = "680k"
[gain]
tube = "12AX7"
plate_resistor = { value = "150k", tolerance = 0.05, watts = 1, volts = 350 }
cathode_resistor = "2k2"
[output]
capacitor = "47n"
bleed = "1M5"
load = { resistance = "470k" }
"#;

fn small(lines: &str) -> String {
    format!("{SMALL}{lines}\n")
}

const OWN: &str = r#"[[tube]]
type = "mine"
model = "dempwolf-zoelzer"
parameters = { G = 2e-3, mu = 20, gamma = 1.4, C = 3 }
"#;

#[test]
fn ratings_go_by_the_name_of_the_part() {
    let text = DEMO_STAGE
        .replacen(
            "resistance = \"47k\", position",
            "resistance = { value = \"47k\", tolerance = 0.2 }, position",
            1,
        )
        .replacen(
            "resistance = \"47k\", capacitance",
            "resistance = { value = \"47k\", watts = 1 }, capacitance",
            1,
        )
        .replacen("reservoir = \"39u\"", "reservoir = { value = \"39u\", volts = 450 }", 1);
    let ratings = &good(&text).configurations[0].ratings;
    let parts: Vec<&str> = ratings.keys().map(String::as_str).collect();
    let expected = [
        "coupling.capacitor",
        "follower.tail_resistor",
        "gain.bypass",
        "gain.plate_resistor",
        "input.pot",
        "output.capacitor",
        "output.load",
        "supply.reservoir",
    ];
    assert_eq!(parts, expected);
    assert_eq!(ratings["gain.bypass"].volts, Some(25.0));
}
