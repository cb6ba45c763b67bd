//! Stage files through the program itself: every wrong one is refused with its place and nothing is created.

mod support;

use support::{Folder, line_of};

const STAGE: &str = include_str!("known-answers/known2.toml");

/// Renders `text` and expects exit code 2, a message with the file, the line of `place` and every one of `parts`, and
/// nothing new in the folder.
fn refused(text: &str, place: &str, parts: &[&str]) {
    let message = refusal(text);
    let line = line_of(text, place);
    assert!(message.contains(&format!("stage.toml:{line}:")), "line {line} is not named:\n{message}");
    for part in parts {
        assert!(message.contains(part), "\"{part}\" is not said:\n{message}");
    }
}

fn refusal(text: &str) -> String {
    let folder = Folder::new();
    folder.write("stage.toml", text.as_bytes());
    folder.write_silence("take.wav");
    folder.refused(&["render", "stage.toml", "--play", "take.wav", "--into", "out"])
}

/// The stage with one line replaced.
fn with(old: &str, new: &str) -> String {
    assert!(STAGE.contains(old), "{old} is not in the stage");
    STAGE.replacen(old, new, 1)
}

/// The stage with lines added at its end.
fn and(lines: &str) -> String {
    format!("{STAGE}\n{lines}\n")
}

#[test]
fn the_known_answers_are_read() {
    for number in 1..=6 {
        let text = std::fs::read(format!("{}/tests/known-answers/known{number}.toml", env!("CARGO_MANIFEST_DIR")));
        let folder = Folder::new();
        folder.write("stage.toml", &text.expect("a known answer"));
        let run = folder.run(&["bias", "stage.toml"]);
        assert_ne!(run.code, Some(2), "known{number}.toml was refused:\n{}", run.stderr);
    }
}

#[test]
fn unknown_key() {
    let text = with("plate_resistor = 33000.0", "plate_resister = 33000.0");
    refused(&text, "plate_resister", &["unknown key `gain.plate_resister`", "did you mean `plate_resistor`?"]);
}

#[test]
fn all_unknown_keys_at_once() {
    let text = with("plate_resistor = 33000.0", "plate_resister = 33000.0").replacen("bleed", "blead", 1);
    let message = refusal(&text);
    assert!(message.contains("`gain.plate_resister`") && message.contains("`output.blead`"), "{message}");
    assert!(!message.contains("missing"), "a misspelt key is told as missing too:\n{message}");
}

#[test]
fn override_of_a_key_that_is_not_in_the_schema() {
    let text = and("[compare]\n\"gain.plate_resister\" = [\"33k\", \"47k\"]");
    refused(
        &text,
        "\"gain.plate_resister\"",
        &["unknown key `gain.plate_resister`", "did you mean `gain.plate_resistor`?"],
    );
    let text = and("[[configuration]]\nname = \"x\"\nset = { \"gain.colour\" = \"47k\" }");
    refused(&text, "gain.colour", &["unknown key `gain.colour`"]);
}

#[test]
fn override_outside_the_stage() {
    refused(
        &and("[compare]\ntitle = [\"a\", \"b\"]"),
        "title = [",
        &["`title` cannot be changed by a configuration"],
    );
}

#[test]
fn override_of_a_part_that_the_stage_lacks() {
    let text =
        STAGE.replacen("bypass = {", "# bypass = {", 1) + "\n[compare]\n\"gain.bypass.engaged\" = [true, false]\n";
    refused(&text, "\"gain.bypass.engaged\"", &["the stage has no `gain.bypass`"]);
}

#[test]
fn override_with_a_wrong_value_points_at_that_value() {
    let text = and("[compare]\n\"gain.plate_resistor\" = [\n\"33k\",\n\"-47k\"]");
    refused(
        &text,
        "\"-47k\"",
        &["`gain.plate_resistor` is -47k Ω", "in the configuration \"plate_resistor -47k\""],
    );
}

#[test]
fn duplicate_configuration_name() {
    let set = "[[configuration]]\nname = \"twin\"\nset = { \"gain.plate_resistor\" = \"47k\" }\n";
    let text = and(&format!("{set}{}", set.replace("name = \"twin\"", "name = \"twin\" # second")));
    refused(&text, "# second", &["two configurations have the name \"twin\""]);
}

#[test]
fn configurations_past_256() {
    let list = (0..17).map(|at| format!("{}", 1000 + at)).collect::<Vec<_>>().join(", ");
    let lists = format!("[compare]\n\"gain.plate_resistor\" = [{list}]\n\"gain.cathode_resistor\" = [{list}]");
    refused(&and(&lists), "[compare]", &["too many configurations: 289", "at most 256"]);
}

#[test]
fn a_product_that_would_never_end_is_only_counted() {
    let list = (0..1000).map(|at| format!("{}", 1000 + at)).collect::<Vec<_>>().join(", ");
    let keys = [
        "gain.plate_resistor",
        "gain.cathode_resistor",
        "follower.tail_resistor",
        "output.bleed",
        "input.grid_leak",
    ];
    let lists: String = keys.map(|key| format!("\"{key}\" = [{list}]\n")).concat();
    refused(&and(&format!("[compare]\n{lists}")), "[compare]", &["too many configurations: 1000000000000000"]);
}

#[test]
fn not_a_number() {
    refused(
        &with("cathode_resistor = 820.0", "cathode_resistor = nan"),
        "= nan",
        &["`gain.cathode_resistor`", "NaN"],
    );
}

#[test]
fn infinite() {
    refused(&with("voltage = 272.0", "voltage = inf"), "= inf", &["`supply.voltage` is infinite"]);
}

#[test]
fn larger_than_any_number() {
    refused(
        &with("voltage = 272.0", "voltage = 1e400"),
        "1e400",
        &["`supply.voltage`", "1e400 is larger than any number"],
    );
}

#[test]
fn absurd() {
    refused(&with("capacitor = 3.3e-07", "capacitor = 330"), "= 330\n", &["`coupling.capacitor` is 330 F", "330n"]);
}

#[test]
fn not_a_value() {
    refused(&with("33000.0", "\"33kohm\""), "33kohm", &["`gain.plate_resistor`", "\"33kohm\" is not a value"]);
}

#[test]
fn zero_where_a_wire_would_be_meant() {
    refused(&with("33000.0", "\"0R\""), "\"0R\"", &["`gain.plate_resistor` is 0 Ω", "only grid stoppers"]);
}

#[test]
fn negative_resistor() {
    refused(&with("33000.0", "-33000.0"), "-33000", &["`gain.plate_resistor` is -33k Ω", "negative"]);
}

#[test]
fn position_outside_the_turn() {
    refused(&with("position = 0.45", "position = 45"), "position = 45", &["`input.pot.position` is 45", "0 to 1"]);
}

#[test]
fn missing_key() {
    refused(&with("plate_resistor = 33000.0", ""), "[gain]", &["`gain.plate_resistor` is missing"]);
}

#[test]
fn missing_table() {
    let text = with("[source]\nresistance = 330.0\nfull_scale = 2.0", "");
    refused(&text, "limits = {", &["[source] is missing", "resistance, full_scale"]);
}

#[test]
fn neither_pot_nor_leak() {
    refused(&with("pot = {", "# pot = {"), "[input]", &["neither `input.pot` nor `input.grid_leak`"]);
}

#[test]
fn both_plate_resistor_and_plate_load() {
    let text =
        with("cathode_resistor", "plate_load = { kind = \"current-source\", current = 5e-3 }\ncathode_resistor");
    refused(&text, "plate_load", &["both `gain.plate_resistor` and `gain.plate_load`"]);
}

#[test]
fn neither_plate_resistor_nor_plate_load_yet() {
    let text = with("plate_resistor = 33000.0", "plate_load = { kind = \"current-source\", current = 5e-3 }");
    refused(&text, "plate_load", &["`gain.plate_load` is not available yet"]);
}

#[test]
fn follower_without_coupling() {
    let start = STAGE.find("[coupling]").expect("there");
    let end = STAGE.find("[follower]").expect("there");
    let text = format!("{}{}", &STAGE[..start], &STAGE[end..]);
    refused(&text, "[follower]", &["[follower] is there without [coupling]"]);
}

#[test]
fn coupling_without_follower() {
    let start = STAGE.find("[follower]").expect("there");
    let end = STAGE.find("[output]").expect("there");
    let text = format!("{}{}", &STAGE[..start], &STAGE[end..]);
    refused(&text, "[coupling]", &["[coupling] is there without [follower]"]);
}

#[test]
fn direct_coupling_with_leak_and_bias_resistor() {
    let text = with("kind = \"capacitor\"", "kind = \"direct\"");
    refused(&text, "grid_leak = 680000.0", &["`coupling.grid_leak` is there although the coupling is direct"]);
    refused(&text, "bias_resistor", &["`follower.bias_resistor` is there although the coupling is direct"]);
}

#[test]
fn follower_grid_without_a_way_to_ground() {
    refused(
        &with("grid_leak = 680000.0", ""),
        "[coupling]",
        &["follower's grid has no way to ground", "coupling.grid_leak"],
    );
}

#[test]
fn unknown_tube_type() {
    let text = with("tube = \"KA-MED\"", "tube = \"KA-MUD\"");
    refused(&text, "KA-MUD", &["`gain.tube`: there is no tube type \"KA-MUD\"", "did you mean \"KA-MED\"?"]);
}

#[test]
fn tube_with_a_parameter_too_few_and_one_too_many() {
    let text = with("gamma = 1.38", "gama = 1.38");
    refused(&text, "gama", &["unknown key `tube.parameters.gama`", "did you mean `gamma`?"]);
    refused(&with("gamma = 1.38, ", ""), "parameters", &["`tube.parameters.gamma` is missing"]);
}

#[test]
fn ripple_without_its_frequency_or_its_size() {
    let text = with("voltage = 272.0", "voltage = 272.0\nripple_rms = 0.1");
    refused(&text, "[supply]", &["`supply.ripple_frequency` is missing", "add ripple_frequency = 100"]);
    let text = with("voltage = 272.0", "voltage = 272.0\nripple_frequency = 100");
    refused(&text, "[supply]", &["`supply.ripple_rms` is missing"]);
    let text = with("voltage = 272.0", "voltage = 272.0\nripple_frequency = 100\nripple_rms = -0.1");
    refused(&text, "ripple_rms", &["`supply.ripple_rms` is -0.1 V, which is negative"]);
}

#[test]
fn another_format() {
    refused(&format!("format = 2\n{STAGE}"), "format = 2", &["`format` is 2", "reads format 1"]);
}

#[test]
fn a_key_of_a_later_version() {
    let text = with("voltage = 272.0", "voltage = 272.0\ncold_voltage = 400");
    refused(&text, "cold_voltage", &["`supply.cold_voltage` is not available yet"]);
}

#[test]
fn not_toml() {
    refused(&with("voltage = 272.0", "voltage = = 272.0"), "= =", &["not TOML"]);
    refused(
        &with("voltage = 272.0", "voltage = 272.0\nvoltage = 2"),
        "voltage = 2\n",
        &["not TOML", "duplicate key"],
    );
}

#[test]
fn empty_file() {
    let message = refusal("");
    assert!(message.contains("stage.toml is empty") && message.contains("platewright new"), "{message}");
    let message = refusal("# nothing yet\n\n");
    assert!(message.contains("stage.toml holds nothing but comments"), "{message}");
}

#[test]
fn binary_file() {
    let folder = Folder::new();
    folder.write_silence("take.wav");
    let message = folder.refused(&["render", "take.wav", "--play", "take.wav", "--into", "out"]);
    assert!(message.contains("take.wav is a binary file"), "{message}");
}

#[test]
fn file_in_another_encoding() {
    let folder = Folder::new();
    folder.write("stage.toml", b"title = \"a\"\n# caf\xe9\n");
    let message = folder.refused(&["bias", "stage.toml"]);
    assert!(message.contains("stage.toml, line 2") && message.contains("UTF-8"), "{message}");
}

#[test]
fn file_that_is_missing_a_folder_or_enormous() {
    let folder = Folder::new();
    folder.write("large.toml", "# comment\n".repeat(200_000).as_bytes());
    folder.make("folder.toml");
    for (name, expected) in [
        ("missing.toml", "there is no file missing.toml"),
        ("folder.toml", "folder.toml is a folder"),
        ("large.toml", "large.toml is larger than"),
    ] {
        let message = folder.refused(&["bias", name]);
        assert!(message.contains(expected), "{message}");
    }
}

#[test]
fn hidden_signs_stay_off_the_terminal() {
    let name = "\u{202e}gpj.\u{1b}[31mred\u{7}";
    let escaped = "\\u202egpj.\\u001b[31mred\\u0007";
    let text = and(&format!("[[configuration]]\nname = \"{escaped}\"\n[[configuration]]\nname = \"{escaped}\""));
    let text = text.replacen("title = \"", &format!("title = \"{}", "\u{202e}\u{2066}"), 1);
    let message = refusal(&text);
    assert!(message.contains("two configurations have the name"), "{message}");
    assert!(!message.contains(|c: char| name.contains(c) && (c.is_control() || c == '\u{202e}')), "{message:?}");
}

#[test]
fn messages_are_plain_where_no_terminal_reads_them() {
    assert!(!refusal("x = 1").contains('\u{1b}'));
}
