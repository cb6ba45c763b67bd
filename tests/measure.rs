//! Figures through the program: the JSON's keys, what cannot be had and why, order, profiles, CSV, hum and warnings.

mod support;

use std::collections::BTreeSet;

use serde_json::Value;
use support::{Folder, line_of};

const STAGE: &str = include_str!("known-answers/known2.toml");

const PROFILE: &str = "\
[profile]
tone = 1000
level = 0.5
[profile.harmonics]
2 = { wanted = -46, within = 1 }
3 = { at_most = -70, weight = 2 }
";

const EVERYTHING: [&str; 14] = [
    "measure",
    "stage.toml",
    "--tone",
    "1000:0.5",
    "--frequencies",
    "20,1k",
    "--imd",
    "smpte,difference",
    "--noise",
    "--headroom",
    "--profile",
    "target.toml",
    "--play",
    "take.wav",
];

fn folder() -> Folder {
    let folder = Folder::new();
    folder.write("stage.toml", STAGE.as_bytes());
    folder.write("target.toml", PROFILE.as_bytes());
    folder.write_silence("take.wav");
    folder
}

/// The paths of all keys, `[]` for the items of a list.
fn keys(value: &Value, path: &str, all: &mut BTreeSet<String>) {
    match value {
        Value::Object(map) => {
            for (key, inner) in map {
                let path = if path.is_empty() { key.clone() } else { format!("{path}.{key}") };
                all.insert(path.clone());
                keys(inner, &path, all);
            }
        }
        Value::Array(items) => items.iter().for_each(|item| keys(item, &format!("{path}[]"), all)),
        _ => {}
    }
}

/// Every `null` has its reason beside it, and no reason stands without one.
fn check_whys(value: &Value, path: &str) {
    let is_null =
        |value: &Value| value.is_null() || value.as_array().is_some_and(|all| all.iter().any(Value::is_null));
    match value {
        Value::Object(map) => {
            let why = map.get("why").and_then(Value::as_object);
            for (key, inner) in map {
                let told = why.is_some_and(|why| why.get(key).is_some_and(Value::is_string));
                assert_eq!(is_null(inner), told, "{path}.{key}: {inner}, why: {why:?}");
                check_whys(inner, &format!("{path}.{key}"));
            }
            for key in why.into_iter().flat_map(|why| why.keys()) {
                assert!(map.contains_key(key), "{path}: a reason for {key}, which is not there");
            }
        }
        Value::Array(items) => items.iter().for_each(|item| check_whys(item, &format!("{path}[]"))),
        _ => {}
    }
}

/// Other programs read these names: a key that is renamed or lost breaks them.
#[test]
fn the_json_has_the_keys_that_others_read() {
    let figures = folder().json(&EVERYTHING);
    let mut found = BTreeSet::new();
    keys(&figures, "", &mut found);
    let tube: Vec<String> = [
        "plate_to_ground",
        "cathode_to_ground",
        "grid_to_ground",
        "grid_to_cathode",
        "plate_to_cathode",
        "plate_current",
        "grid_current",
        "plate_dissipation",
        "gm",
        "mu",
        "rp",
    ]
    .map(str::to_owned)
    .to_vec();
    let of =
        |table: &str, keys: &[&str]| -> Vec<String> { keys.iter().map(|key| format!("{table}.{key}")).collect() };
    let tubes = ["gain", "follower"]
        .map(|place| tube.iter().map(|key| format!("operating_point.{place}.{key}")).collect::<Vec<_>>());
    let wanted = [
        of("operating_point", &["supply_node", "warnings", "follower.junction_to_ground"]),
        of("operating_point.parts[]", &["part", "watts", "volts"]),
        of("response[]", &["frequency", "gain_dB", "phase_deg", "input_impedance", "output_impedance"]),
        of(
            "tones[]",
            &["frequency", "input_rms", "output_fundamental_rms", "gain_dB", "thd_percent", "thd_r_percent"],
        ),
        of("tones[].harmonics[]", &["order", "dBc", "phase_deg", "trust_dB"]),
        of("imd[]", &["kind", "input_rms", "percent", "d2_percent", "d3_percent"]),
        of("noise", &["output_rms", "output_rms_a", "input_rms", "signal_to_noise_dB"]),
        of("headroom.thd[]", &["percent", "input_rms", "output_rms", "over_full_scale_dB"]),
        of("headroom", &["compression_1dB.input_rms", "grid_current.tube", "cutoff.over_full_scale_dB"]),
        of("profile", &["distance_dB"]),
        of("profile.harmonics[]", &["order", "wanted", "got", "miss_dB"]),
    ];
    for key in tubes.iter().chain(&wanted).flatten() {
        assert!(found.contains(&format!("configurations[].{key}")), "{key} is gone; there are {found:#?}");
    }
    assert!(["schema", "title", "configurations[].name"].iter().all(|key| found.contains(*key)));
    assert_eq!(figures["schema"], 1);
    let exceeded = STAGE.replace("plate_dissipation = 5", "plate_dissipation = 0.1");
    let folder = folder();
    folder.write("stage.toml", exceeded.as_bytes());
    let warning = &folder.json(&["bias", "stage.toml"])["configurations"][0]["operating_point"]["warnings"][0];
    assert!(["part", "limit", "used_percent", "text"].iter().all(|key| !warning[*key].is_null()), "{warning}");
}

#[test]
fn parts_that_nobody_asked_for_are_not_there() {
    let figures = folder().json(&["measure", "stage.toml"]);
    let configuration = figures["configurations"][0].as_object().expect("a configuration");
    assert_eq!(configuration.keys().collect::<Vec<_>>(), ["name", "operating_point"]);
    let figures = folder().json(&["measure", "stage.toml", "--noise", "--sweep", "level"]);
    let configuration = figures["configurations"][0].as_object().expect("a configuration");
    assert_eq!(configuration.keys().collect::<Vec<_>>(), ["level_sweep", "name", "noise", "operating_point"]);
}

#[test]
fn what_cannot_be_had_is_null_with_its_reason() {
    let folder = folder();
    check_whys(&folder.json(&EVERYTHING), "");
    let sweeps = ["measure", "stage.toml", "--sweep", "level", "--sweep", "frequency", "--tone", "1000:1u,5:200"];
    let figures = folder.json(&sweeps);
    check_whys(&figures, "");
    let high = &figures["configurations"][0]["tones"][0]["harmonics"][8];
    assert!(high["dBc"].is_null() && high["why"]["dBc"].is_string(), "H10 of a microvolt: {high}");
    // The pot turned down: nothing reaches the output.
    let silent = STAGE.replace("position = 0.45", "position = 0");
    folder.write("stage.toml", silent.as_bytes());
    check_whys(&folder.json(&EVERYTHING), "");
    // An output beyond the supply.
    folder.write("target.toml", PROFILE.replace("level = 0.5", "output_level = 1000").as_bytes());
    folder.write("stage.toml", STAGE.as_bytes());
    let figures = folder.json(&EVERYTHING);
    check_whys(&figures, "");
    let profile = &figures["configurations"][0]["profile"];
    assert!(profile["distance_dB"].is_null() && profile["input_rms"].is_null(), "{profile}");
    assert!(
        profile["why"]["input_rms"].as_str().is_some_and(|why| why.contains("100 times full scale")),
        "{profile}"
    );
}

#[test]
fn tones_and_frequencies_keep_their_order_and_repetitions() {
    let tones = "1k:0.5,60:0.1,1k:0.5,10k:0.2";
    let figures = folder().json(&["measure", "stage.toml", "--tone", tones, "--frequencies", "20k,20,20,1k"]);
    let one = &figures["configurations"][0];
    let numbers = |list: &Value, key: &str| -> Vec<f64> {
        list.as_array().expect("a list").iter().map(|item| item[key].as_f64().expect("a number")).collect()
    };
    assert_eq!(numbers(&one["tones"], "frequency"), [1000.0, 60.0, 1000.0, 10_000.0]);
    assert_eq!(numbers(&one["tones"], "input_rms"), [0.5, 0.1, 0.5, 0.2]);
    assert_eq!(one["tones"][0], one["tones"][2]);
    assert_eq!(numbers(&one["response"], "frequency"), [20_000.0, 20.0, 20.0, 1000.0]);
    for harmonic in one["tones"].as_array().into_iter().flatten().flat_map(|t| t["harmonics"].as_array()).flatten()
    {
        let phase = harmonic["phase_deg"].as_f64();
        assert!(phase.is_none_or(|phase| (0.0..360.0).contains(&phase)), "{harmonic}");
    }
    for response in one["response"].as_array().into_iter().flatten() {
        let phase = response["phase_deg"].as_f64().expect("a phase");
        assert!(phase > -180.0 && phase <= 180.0, "{response}");
    }
}

/// Misses and distance by hand from the harmonics that the same stage shows as a tone of the profile's level.
#[test]
fn a_profile_is_missed_by_what_the_harmonics_say() {
    let folder = folder();
    let figures = folder.json(&EVERYTHING);
    let one = &figures["configurations"][0];
    let dbc = |order: usize| one["tones"][0]["harmonics"][order - 2]["dBc"].as_f64().expect("a harmonic");
    let beyond = |value: f64, allowed: f64| value.signum() * (value.abs() - allowed).max(0.0);
    let misses = [beyond(dbc(2) + 46.0, 1.0), (dbc(3) + 70.0).max(0.0)];
    let distance = ((misses[0].powi(2) + 2.0 * misses[1].powi(2)) / 3.0).sqrt();
    let close = |value: &Value, want: f64| (value.as_f64().expect("a figure") - want).abs() < 1e-6;
    let profile = &one["profile"];
    assert!(misses[0] != 0.0, "this stage misses the second harmonic");
    assert!(close(&profile["harmonics"][0]["miss_dB"], misses[0]), "{profile}");
    assert!(close(&profile["harmonics"][1]["miss_dB"], misses[1]), "{profile}");
    assert!(close(&profile["distance_dB"], distance), "{profile}");

    folder.write("target.toml", PROFILE.replace("level = 0.5", "output_level = 3").as_bytes());
    let profile = &folder.json(&EVERYTHING)["configurations"][0]["profile"];
    assert!(close(&profile["output_rms"], 3.0), "{profile}");
    let level = profile["input_rms"].as_f64().expect("a level").to_string();
    let tone = &folder.json(&["measure", "stage.toml", "--tone", &format!("1000:{level}")])["configurations"][0]["tones"]
        [0];
    assert!(close(&tone["output_fundamental_rms"], 3.0), "{tone}");
}

#[test]
fn configurations_are_ranked_by_their_distance() {
    let folder = folder();
    folder.write("stage.toml", format!("{STAGE}\n[compare]\n\"gain.bypass.engaged\" = [true, false]\n").as_bytes());
    // Whatever the second harmonic with the bypass out is, to be wanted is to come first.
    let figures = folder.json(&["measure", "stage.toml", "--tone", "1000:0.5"]);
    let second = figures["configurations"][1]["tones"][0]["harmonics"][0]["dBc"].as_f64().expect("H2");
    folder.write("target.toml", PROFILE.replace("-46", &second.to_string()).as_bytes());
    let shown = folder.done(&["measure", "stage.toml", "--profile", "target.toml"]).stdout;
    let (first, second) = (shown.find("1. bypass out"), shown.find("2. bypass in"));
    assert!(first.is_some() && second.is_some() && first < second, "{shown}");
    assert!(shown.contains("distance") && shown.contains("met"), "{shown}");
}

#[test]
fn a_wrong_profile_names_its_line() {
    let folder = folder();
    let wrong = PROFILE.replace("3 =", "1 =");
    folder.write("target.toml", wrong.as_bytes());
    for command in [
        &["measure", "stage.toml", "--profile", "target.toml"][..],
        &["compare", "stage.toml", "--play", "take.wav", "--into", "out", "--profile", "target.toml"],
    ] {
        let message = folder.refused(command);
        assert!(message.contains(&format!("target.toml:{}:", line_of(&wrong, "1 ="))), "{message}");
        assert!(message.contains("H1 is the fundamental"), "{message}");
    }
    let message = folder.refused(&["measure", "stage.toml", "--profile", "take.wav"]);
    assert!(message.contains("take.wav is a binary file; a profile file is text"), "{message}");
    let message = folder.refused(&["measure", "stage.toml", "--profile", "none.toml"]);
    assert!(message.contains("there is no file none.toml"), "{message}");
}

#[test]
fn csv_holds_every_figure_of_the_json() {
    let folder = folder();
    let figures = folder.json(&[&EVERYTHING[..], &["--csv", "tables/figures.csv"]].concat());
    let text = String::from_utf8(folder.bytes("tables/figures.csv")).expect("text");
    let mut reader = csv::Reader::from_reader(text.as_bytes());
    let header: Vec<String> = reader.headers().expect("a header").iter().map(str::to_owned).collect();
    assert_eq!(header.join(";"), "configuration;group;figure;frequency (Hz);level (V rms);order;of;value;unit;why");
    let rows: Vec<Vec<String>> =
        reader.records().map(|row| row.expect("a row").iter().map(str::to_owned).collect()).collect();
    assert!(rows.iter().all(|row| row[8] != "?" && row[0] == "as drawn"), "every figure has its unit");
    let value = |group: &str, figure: &str, order: &str, of: &str| {
        let mut found = rows.iter().filter(|r| r[1] == group && r[2] == figure && r[5] == order && r[6] == of);
        let row = found.next().unwrap_or_else(|| panic!("{group} {figure} {order} {of} is not in:\n{text}"));
        assert!(found.next().is_none(), "{group} {figure} {order} {of} is there twice");
        (row[7].clone(), row[8].clone())
    };
    let one = &figures["configurations"][0];
    let same = |got: (String, String), want: &Value, unit: &str| {
        assert_eq!((got.0, got.1.as_str()), (want.to_string(), unit));
    };
    same(value("operating_point", "supply_node", "", ""), &one["operating_point"]["supply_node"], "V");
    same(value("tones.harmonics", "dBc", "2", ""), &one["tones"][0]["harmonics"][0]["dBc"], "dBc");
    same(value("headroom.thd", "input_rms", "", "1.0 %"), &one["headroom"]["thd"][1]["input_rms"], "V rms");
    same(value("profile.harmonics", "got", "3", "at_most"), &one["profile"]["harmonics"][1]["got"], "dBc");
    same(value("noise", "output_rms", "", ""), &one["noise"]["output_rms"], "V rms");
    // As many empty values as there are nulls, each with its reason.
    let empty: Vec<_> = rows.iter().filter(|row| row[7].is_empty()).collect();
    assert!(empty.iter().all(|row| !row[9].is_empty()), "{empty:?}");
    assert_eq!(empty.len(), nulls(&figures), "{empty:?}");
}

fn nulls(value: &Value) -> usize {
    match value {
        Value::Null => 1,
        Value::Object(map) => map.values().map(nulls).sum(),
        Value::Array(items) => items.iter().map(nulls).sum(),
        _ => 0,
    }
}

#[test]
fn csv_is_not_written_over_anything() {
    let folder = folder();
    folder.write("old.csv", b"mine");
    let message = folder.refused(&["measure", "stage.toml", "--csv", "old.csv"]);
    assert!(message.contains("old.csv: the file exists already") && message.contains("--replace"), "{message}");
    assert_eq!(folder.bytes("old.csv"), b"mine");
    let message = folder.refused(&["measure", "stage.toml", "--csv", "stage.toml", "--replace"]);
    assert!(message.contains("stage.toml: this output would overwrite an input"), "{message}");
    assert_eq!(folder.bytes("stage.toml"), STAGE.as_bytes());
    folder.done(&["measure", "stage.toml", "--csv", "old.csv", "--replace"]);
    assert!(folder.bytes("old.csv").starts_with(b"configuration,"));
}

/// Ripple by the rejection that the frequency sweep shows at the same frequency, 100 Hz being one of its points.
#[test]
fn hum_is_ripple_through_the_rejection() {
    let folder = folder();
    let text = STAGE.replace("voltage = 272.0", "voltage = 272.0\nripple_rms = 0.25\nripple_frequency = 100");
    folder.write("stage.toml", text.as_bytes());
    let arguments = ["measure", "stage.toml", "--noise", "--sweep", "frequency", "--frequencies", "1k"];
    let figures = folder.json(&arguments);
    let one = &figures["configurations"][0];
    let points = one["frequency_sweep"]["points"].as_array().expect("points");
    let hundred = points.iter().find(|p| (p["frequency"].as_f64().unwrap_or(0.0) - 100.0).abs() < 1e-6);
    let rejection = hundred.and_then(|p| p["ripple_rejection_dB"].as_f64()).expect("a rejection at 100 Hz");
    let hum = one["noise"]["hum_rms"].as_f64().expect("hum");
    assert!((20.0 * libm::log10(0.25 / hum) - rejection).abs() < 1e-6, "{hum} V, {rejection} dB");
    assert_eq!(one["noise"]["hum_frequency"], 100.0);
    let gain = one["response"][0]["gain_dB"].as_f64().expect("a gain");
    let below = one["noise"]["hum_below_full_scale_dB"].as_f64().expect("a distance");
    assert!((below - (20.0 * libm::log10(2.0 / hum) + gain)).abs() < 1e-6, "{below} dB");
    let shown = folder.done(&["measure", "stage.toml", "--noise"]).stdout;
    assert!(shown.contains("hum") && shown.contains("100 Hz"), "{shown}");
    let without = Folder::new();
    without.write("stage.toml", STAGE.as_bytes());
    let noise = &without.json(&["measure", "stage.toml", "--noise"])["configurations"][0]["noise"];
    assert!(noise.get("hum_rms").is_none(), "{noise}");
}

#[test]
fn a_published_law_beyond_its_reach_is_told() {
    let folder = folder();
    let low = folder.run(&["measure", "stage.toml", "--tone", "1000:0.5", "--strict"]);
    assert_eq!(low.code, Some(0), "{}{}", low.stdout, low.stderr);
    // 200 V drive the grid far positive, and the plate down to a few volts.
    let high = folder.run(&["measure", "stage.toml", "--tone", "1000:200", "--strict"]);
    assert_eq!(high.code, Some(3), "{}{}", high.stdout, high.stderr);
    let told = high.stdout.lines().find(|line| line.contains("was made for 10 V and more"));
    assert!(told.is_some_and(|line| line.contains("1000 Hz") && line.contains("KA-MED")), "{}", high.stdout);
    let figures = folder.json(&["measure", "stage.toml", "--tone", "1000:0.5,1000:200"]);
    let tones = &figures["configurations"][0]["tones"];
    assert!(tones[0].get("warnings").is_none());
    assert_eq!(tones[1]["warnings"][0]["limit"], "law");
    // The library's own law goes down to nothing.
    folder.done(&["new", "own.toml"]);
    assert_eq!(folder.run(&["measure", "own.toml", "--tone", "1000:200", "--strict"]).code, Some(0));
}
