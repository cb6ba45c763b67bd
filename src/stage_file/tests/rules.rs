//! What a stage may not be.

use super::super::schema;
use super::*;

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
