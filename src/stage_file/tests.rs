//! The stage file as a whole.

use platewright_dsp::circuit::{Coupling, LeakReturn};
use platewright_dsp::triode::{Capacitances, GridLaw, Law, library};

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

#[test]
fn a_plain_value_over_a_part_keeps_its_ratings() {
    let file = good(&small(
        "[compare]\n\"gain.plate_resistor\" = [\"100k\", 220000, { value = \"330k\", watts = 3 }]\n\
         [[configuration]]\nname = \"rated\"\nset = { gain.plate_resistor.volts = 500, \"output.bleed\" = { watts = 0.5 } }",
    ));
    assert_eq!(names(&file), ["plate_resistor 100k", "plate_resistor 220k", "plate_resistor 330k", "rated"]);
    let found: Vec<_> = file
        .configurations
        .iter()
        .map(|one| (one.stage.gain.plate_resistor, one.ratings["gain.plate_resistor"]))
        .collect();
    let rating = |watts, volts| PartRating { tolerance: Some(0.05), watts: Some(watts), volts: Some(volts) };
    let expected = [
        (100e3, rating(1.0, 350.0)),
        (220e3, rating(1.0, 350.0)),
        (330e3, rating(3.0, 350.0)),
        (150e3, rating(1.0, 500.0)),
    ];
    assert_eq!(found, expected);
    let rated = &file.configurations[3];
    assert_eq!((rated.stage.output.bleed, rated.ratings["output.bleed"].watts), (1.5e6, Some(0.5)));
    assert_eq!(file.configurations[0].ratings.len(), 1);
    let settings = [("gain.plate_resistor", "volts 500"), ("output.bleed", "watts 0.5")];
    assert_eq!(rated.settings, settings.map(|(key, value)| (key.to_owned(), value.to_owned())));
}

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

#[test]
fn compare_keys_may_be_bare_and_follow_the_order_of_the_file() {
    let quoted = "[compare]\n\"supply.voltage\" = [250, 300]\n\"gain.cathode_resistor\" = [\"1k\", \"1k5\"]";
    let bare = "[compare]\nsupply.voltage = [250, 300]\ngain.cathode_resistor = [\"1k\", \"1k5\"]";
    let nested = "[compare.supply]\nvoltage = [250, 300]\n[compare.gain]\ncathode_resistor = [\"1k\", \"1k5\"]";
    let expected = [
        "voltage 250, cathode_resistor 1k",
        "voltage 250, cathode_resistor 1k5",
        "voltage 300, cathode_resistor 1k",
        "voltage 300, cathode_resistor 1k5",
    ];
    for lines in [quoted, bare, nested] {
        assert_eq!(names(&good(&small(lines))), expected, "{lines}");
    }
}

#[test]
fn linked_keys_name_a_shared_value_once() {
    let text = DEMO_STAGE.replacen(
        "\"gain.bypass.engaged\" = [true, false]",
        "\"input.grid_stopper + coupling.grid_stopper\" = [560, 910]\n\"gain.cathode_resistor + follower.bias_resistor\" = [750]",
        1,
    );
    let file = good(&text);
    assert_eq!(file.configurations[0].name, "12AU7, grid_stopper 560R, cathode_resistor 750R, bias_resistor 750R");
    let stage = &file.configurations[1].stage;
    let Some(Coupling::Capacitor { grid_stopper, .. }) = stage.follower.as_ref().map(|follower| follower.coupling)
    else {
        panic!("a capacitor")
    };
    assert_eq!((stage.input.grid_stopper, grid_stopper), (910.0, 910.0));
}

#[test]
fn the_product_comes_before_the_named_ones_which_start_from_the_stage_as_drawn() {
    let file = good(&small(
        "[[configuration]]\nname = \"reference\"\n[compare]\n\"gain.tube\" = [\"12AX7\", \"12AU7\"]\n\
         [[configuration]]\nname = \"both\"\nset = { \"gain.plate_resistor\" = \"47k\", gain.cathode_resistor = 820 }",
    ));
    assert_eq!(names(&file), ["12AX7", "12AU7", "reference", "both"]);
    assert_eq!(file.configurations[2].stage, file.configurations[0].stage);
    let both = &file.configurations[3];
    assert_eq!((both.stage.gain.plate_resistor, both.stage.gain.cathode_resistor), (47e3, 820.0));
    assert_eq!(both.stage.gain.tube.name, "12AX7");
}

#[test]
fn a_configuration_may_bring_a_whole_bypass_and_a_key_that_was_left_out() {
    let file = good(&small(
        "[[configuration]]\nname = \"bypassed\"\nset = { \"gain.bypass\" = { capacitance = \"100u\", esr = 0.2 }, \
         \"input.grid_stopper\" = \"1k\" }",
    ));
    let stage = &file.configurations[0].stage;
    let bypass = stage.gain.bypass.expect("a bypass");
    assert_eq!(
        (bypass.capacitance, bypass.esr, bypass.engaged, bypass.trickle_resistor),
        (100e-6, 0.2, true, None)
    );
    assert_eq!(stage.input.grid_stopper, 1000.0);
    let half = bad(&small("[[configuration]]\nname = \"x\"\nset = { gain.bypass.esr = 1 }"));
    assert!(half.contains("the stage has no `gain.bypass`"), "{half}");
    let unknown = bad(&small(
        "[[configuration]]\nname = \"x\"\nset = { \"gain.bypass\" = { capacitance = \"100u\", color = 1 } }",
    ));
    assert!(unknown.contains("unknown key `gain.bypass.color`"), "{unknown}");
}

#[test]
fn what_a_list_gives_need_not_stand_in_the_stage() {
    let text = SMALL.replacen("tube = \"12AX7\"\n", "", 1);
    assert!(bad(&text).contains("`gain.tube` is missing"));
    assert_eq!(names(&good(&format!("{text}[compare]\ngain.tube = [\"12AU7\", \"12AX7\"]"))), ["12AU7", "12AX7"]);
}

#[test]
fn override_rules() {
    let cases = [
        ("[compare]\n\"gain.tube\" = \"12AU7\"", "is a text where a list belongs"),
        ("[compare]\n\"gain.tube\" = []", "is empty"),
        ("[compare]\n\"gain.tube\" = [\"12AU7\", \"12AU7\"]", "has the value 12AU7 twice"),
        ("[compare]\n\"gain.plate_resistor\" = [\"47k\", 47000]", "twice"),
        (
            "[compare]\n\"gain.tube\" = [\"12AU7\"]\n\"gain.tube + gain.plate_resistor\" = [1]",
            "`gain.tube` is set twice",
        ),
        ("[compare]\n\"gain.tube + gain.tube\" = [\"12AU7\"]", "`gain.tube` is set twice"),
        ("[compare]\n\"gain.tube +\" = [\"12AU7\"]", "unknown key ``"),
        ("[compare]\n\"follower.tube\" = [\"12AU7\"]", "the stage has no [follower] table"),
        ("[compare]\n\"supply\" = [1]", "`supply` cannot be changed"),
        ("[compare]\n\"tube.type\" = [1]", "`tube.type` cannot be changed"),
        ("[compare]\n\"output.load\" = [\"47k\"]", "\"output.load\" is a table, not a value"),
        ("[compare]\n\"plate_resistor\" = [1]", "did you mean `gain.plate_resistor`?"),
        ("[compare]\n\"gain.plate_load.current\" = [1]", "`gain.plate_load.current` is not available yet"),
        ("[compare]\n\"supply.ripple_rms\" = [1]", "`supply.ripple_rms` is not available yet"),
        (
            "[compare]\n\"gain.cathode_resistor\" = [{ value = 1, wats = 2 }]",
            "unknown key `gain.cathode_resistor.wats`",
        ),
        ("[compare]\n\"gain.cathode_resistor\" = [[1], [2]]", "is a list where a number belongs"),
        ("[compare]\n\"gain.cathode_resistor\" = [nan, 1]", "is not a number (NaN)"),
        ("compare = 5", "`compare` is a number where a table belongs"),
        ("[[configuration]]\nset = {}", "`configuration.name` is missing"),
        ("[[configuration]]\nname = \" \"", "`configuration.name` is blank"),
        ("[[configuration]]\nname = \"x\"\nset = 5", "`configuration.set` is a number where a table belongs"),
        ("[[configuration]]\nname = \"x\"\nsets = {}", "unknown key `configuration.sets`"),
        ("[configuration]\nname = \"x\"", "[[configuration]]"),
        (
            "[[configuration]]\nname = \"x\"\nset = { \"output.load\" = 5 }",
            "`output.load` is a number where a table belongs",
        ),
    ];
    for (lines, expected) in cases {
        // A key without table belongs above the first table.
        let text = if lines.starts_with('[') { small(lines) } else { format!("{lines}\n{SMALL}") };
        let message = bad(&text);
        assert!(message.contains(expected), "{lines}: {message}");
    }
}

#[test]
fn exactly_256_configurations_are_allowed() {
    let list = (0..16).map(|at| format!("{}", 1000 + at)).collect::<Vec<_>>().join(", ");
    let lines = format!("[compare]\n\"gain.plate_resistor\" = [{list}]\n\"gain.cathode_resistor\" = [{list}]");
    assert_eq!(good(&small(&lines)).configurations.len(), 256);
    let message = bad(&small(&format!("{lines}\n[[configuration]]\nname = \"one more\"")));
    assert!(message.contains("256 combinations and 1 more"), "{message}");
}

#[test]
fn every_later_key_is_answered_with_not_yet_at_its_place() {
    let mut seen = 0;
    for key in schema::KEYS.iter().filter(|key| key.status == schema::Status::NotYet) {
        // As the only line of its own kind, in the table that it belongs to or as a table itself.
        let (table, last) = (schema::parent(key.path), schema::last(key.path));
        let base = DEMO_STAGE.split("[compare]").next().expect("the stage");
        let without = match last {
            "plate_load" => "plate_resistor",
            "bias" => "cathode_resistor",
            "tail" => "tail_resistor",
            _ => "nothing at all",
        };
        let base: String =
            base.lines().filter(|line| !line.starts_with(without)).map(|line| format!("{line}\n")).collect();
        let text = if table.is_empty() {
            format!("{base}[{last}]\nx = 1\n")
        } else {
            base.replacen(&format!("[{table}]\n"), &format!("[{table}]\n{last} = 1\n"), 1)
        };
        let message = bad(&text);
        let place = if table.is_empty() { format!("\n[{last}]") } else { format!("\n{last} = 1") };
        let line = text[..text.find(&place).expect("there") + 1].matches('\n').count() + 1;
        assert!(message.contains(&format!("`{}` is not available yet", key.path)), "{message}");
        assert!(message.contains(&format!("stage.toml:{line}:")), "line {line}: {message}");
        assert_eq!(message.matches("error:").count(), 1, "{message}");
        seen += 1;
    }
    assert!(seen > 20, "{seen} later keys");
}

#[test]
fn an_audio_taper_is_not_available_yet() {
    for taper in
        ["\"audio\"", "{ kind = \"audio\", mid = 0.15 }", "{ kind = \"table\", points = [[0, 0], [1, 1]] }"]
    {
        let message = bad(&DEMO_STAGE.replacen("\"linear\"", taper, 1));
        assert!(message.contains("`input.pot.taper` as") && message.contains("not available yet"), "{message}");
    }
    assert!(bad(&DEMO_STAGE.replacen("\"linear\"", "\"lin\"", 1)).contains("not one of its words"));
}

const OWN: &str = r#"[[tube]]
type = "mine"
model = "dempwolf-zoelzer"
parameters = { G = 2e-3, mu = 20, gamma = 1.4, C = 3 }
"#;

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
        (SMALL.replacen("12AX7", "12BH7", 1), "did you mean \"12BH7A\"?"),
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

#[test]
fn stage_rules() {
    let demo = |from: &str, to: &str| {
        assert!(DEMO_STAGE.contains(from), "{from}");
        DEMO_STAGE.replacen(from, to, 1)
    };
    let cases = [
        (demo("position = 0.45", "position = 1.01"), "`input.pot.position` is 1.01, which is too large"),
        (demo("position = 0.45", "position = -0.01"), "`input.pot.position` is -0.01, which is negative"),
        (demo("position = 0.45, ", ""), "`input.pot.position` is missing"),
        (demo("tolerance = 0.05", "tolerance = 5"), "a tolerance is a fraction"),
        (demo("watts = 2", "watts = 0"), "`gain.plate_resistor.watts` is 0 W"),
        (
            demo("{ value = \"33k\", tolerance = 0.05, watts = 2 }", "{ watts = 2 }"),
            "`gain.plate_resistor.value` is missing",
        ),
        (demo("value = \"33k\"", "vaule = \"33k\""), "did you mean `value`?"),
        (demo("reservoir = \"39u\"", "reservoir = 0"), "`supply.reservoir` is 0 F"),
        (demo("resistance = 330", "resistance = 0"), "`source.resistance` is 0 Ω, which is a wire"),
        (demo("\"27k\"", "\"0R\""), "`gain.bypass.trickle_resistor` is 0 Ω"),
        (demo("\"680k\"", "\"1m\""), "m is milli and M is mega"),
        (demo("engaged = true", "engaged = 1"), "`gain.bypass.engaged` is a number where a switch belongs"),
        (demo("engaged = true", "engaged = \"true\""), "`gain.bypass.engaged` is a text where a switch belongs"),
        (demo("returns_to = \"bias-junction\"", ""), "`coupling.returns_to` is missing"),
        (demo("returns_to = \"bias-junction\"", "returns_to = \"bias\""), "\"bias-junction\" or \"ground\""),
        (demo("kind = \"capacitor\"", ""), "`coupling.kind` is missing"),
        (
            demo("voltage = 290", "voltage = 2026-01-01"),
            "`supply.voltage` is a date or time where a number belongs",
        ),
        (demo("voltage = 290", "voltage = [290]"), "`supply.voltage` is a list where a number belongs"),
        (demo("voltage = 290", "voltage = 99999999999999999999999"), "`supply.voltage`"),
        (demo("title = \"One-box", "title = 5 # \"One-box"), "`title` is a number where a text belongs"),
        (demo("format = 1", "format = \"one\""), "`format`"),
        (demo("load = {", "load = 5 # {"), "`output.load` is a number where a table belongs"),
        (demo("[gain]", "[gian]"), "did you mean `gain`?"),
        (
            demo("grid_stopper = 560", "grid_stopper = 560\nplate_resistor = 1"),
            "did you mean `gain.plate_resistor`?",
        ),
    ];
    for (text, expected) in cases {
        let message = bad(&text);
        assert!(message.contains(expected), "{expected}: {message}");
    }
}

#[test]
fn zero_is_a_wire_for_stoppers_and_the_esr() {
    let text = DEMO_STAGE
        .replacen("grid_stopper = 910", "grid_stopper = \"0R\"", 1)
        .replacen("grid_stopper = 560", "grid_stopper = 0", 1)
        .replacen("esr = 0.12", "esr = \"0R\"", 1);
    let stage = &good(&text).configurations[0].stage;
    assert_eq!((stage.input.grid_stopper, stage.gain.bypass.expect("a bypass").esr), (0.0, 0.0));
}

#[test]
fn windows_line_ends_and_a_byte_order_mark_do_not_matter() {
    let text = format!("\u{feff}{}", DEMO_STAGE.replace('\n', "\r\n"));
    assert_eq!(names(&good(&text)), names(&good(DEMO_STAGE)));
    let message = bad(&text.replacen("plate_resistor", "plate_resister", 1));
    let line = DEMO_STAGE[..DEMO_STAGE.find("plate_resistor").expect("there")].matches('\n').count() + 1;
    assert!(message.contains(&format!("stage.toml:{line}:1")), "{message}");
}

/// Small steps of a 64-bit linear congruential generator (Knuth's MMIX constants, from memory).
struct Dice(u64);

impl Dice {
    fn roll(&mut self, sides: usize) -> usize {
        self.0 = self.0.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        (self.0 >> 33) as usize % sides.max(1)
    }
}

/// Whatever happens to the text, it is read or refused, and the message is plain.
#[test]
fn no_mutation_of_the_example_is_a_surprise() {
    const PIECES: [&str; 24] = [
        "\"",
        "[",
        "]",
        "{",
        "}",
        "=",
        "#",
        "nan",
        "-",
        "1e400",
        "0",
        "\n",
        "[[tube]]\n",
        "[compare]\n",
        "+",
        ".",
        "'''",
        "\u{202e}",
        "é",
        "\u{1b}",
        "[[configuration]]\nname=\"x\"\n",
        "gain.bypass = 5\n",
        "inf",
        ",",
    ];
    let own_tube = DEMO_STAGE.to_owned() + OWN;
    let sources = [EXAMPLE_STAGE, &own_tube, SMALL];
    let mut dice = Dice(20_240_229);
    let (mut read, mut refused) = (0, 0);
    for round in 0..3000 {
        let source = sources[round % sources.len()];
        let mut lines: Vec<String> = source.lines().map(str::to_owned).collect();
        for _ in 0..=dice.roll(4) {
            let at = dice.roll(lines.len());
            match dice.roll(5) {
                0 => drop(lines.remove(at)),
                1 => lines.insert(at, lines[dice.roll(lines.len())].clone()),
                2 => lines[at] = lines[dice.roll(lines.len())].clone(),
                mutation => {
                    let characters: Vec<char> = lines[at].chars().collect();
                    let cut = dice.roll(characters.len() + 1);
                    let skip = if mutation == 3 { dice.roll(4) } else { 0 };
                    let (head, tail) = (&characters[..cut], characters.get(cut + skip..).unwrap_or(&[]));
                    let piece = PIECES[dice.roll(PIECES.len())];
                    lines[at] = head.iter().collect::<String>() + piece + &tail.iter().collect::<String>();
                }
            }
        }
        match parse(&lines.join("\n")) {
            Ok(file) => {
                assert!(!file.configurations.is_empty());
                read += 1;
            }
            Err(failure) => {
                assert_eq!(failure.exit_code(), 2);
                let message = failure.message(false).expect("a message");
                assert!(!message.contains(['\u{202e}', '\u{1b}']), "{message:?}");
                assert!(message.lines().count() < 200, "a flood:\n{message}");
                refused += 1;
            }
        }
    }
    assert!(
        read > 100 && refused > 1000,
        "{read} read and {refused} refused: the mutations are too mild or too wild"
    );
}
