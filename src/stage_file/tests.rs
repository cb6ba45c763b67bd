//! The stage file as a whole.

use std::sync::Arc;

use platewright_dsp::circuit::{Coupling, LeakReturn};
use platewright_dsp::triode::{Capacitances, GridLaw, Koren, Law, Limits, Section, TubeType};

use super::*;
use crate::commands::{DEMO_STAGE, EXAMPLE_STAGE};

const NAMES: [&str; 3] = ["12AU7", "12BH7A", "12AX7"];

/// Stands for the tube library: the parser asks it for names alone.
fn stand_in(name: &str) -> Option<Arc<TubeType>> {
    let law = Law::Koren(Koren { mu: 20.0, ex: 1.3, kg1: 1100.0, kp: 80.0, kvb: 300.0 });
    NAMES.contains(&name).then(|| {
        Arc::new(TubeType {
            name: name.to_owned(),
            section: Section { law, grid: GridLaw::BORROWED, capacitance: Capacitances::default() },
            ensemble: Vec::new(),
            limits: Limits::default(),
            heater: None,
            basing: None,
            from_library: true,
        })
    })
}

fn parse(text: &str) -> Result<StageFile, Failure> {
    let names = NAMES.map(str::to_owned);
    StageFile::parse("stage.toml", text.to_owned(), &Library { find: &stand_in, names: &names })
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
