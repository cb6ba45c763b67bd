//! What `[compare]` and `[[configuration]]` make of a stage.

use platewright_dsp::circuit::Coupling;

use super::*;

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
    assert_eq!(file.configurations[0].name, "12AU7, grid_stopper 560, cathode_resistor 750, bias_resistor 750");
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
        ("[compare]\n\"supply.cold_voltage\" = [1]", "`supply.cold_voltage` is not available yet"),
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
