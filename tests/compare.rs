//! The main job: every figure, every render and what is written beside them.

mod support;

use serde_json::Value;
use support::Folder;
use support::sound::{noise, sines, write_float};

fn folder() -> Folder {
    let folder = Folder::new();
    folder.done(&["new", "stage.toml"]);
    write_float(&folder.path("take.wav"), 8000, &[noise(1000, 1, 0.5)]);
    folder
}

const COMPARE: [&str; 6] = ["compare", "stage.toml", "--play", "take.wav", "--into", "out"];

#[test]
fn everything_is_written_and_the_report_is_what_json_prints() {
    let folder = folder();
    let run = folder.done(&[&COMPARE[..], &["--json"]].concat());
    let report = String::from_utf8(folder.bytes("out/report.json")).expect("text");
    assert_eq!(run.stdout, report);
    let figures: Value = serde_json::from_str(&report).expect("JSON");
    let names = ["12AU7, bypass in", "12AU7, bypass out", "12BH7A, bypass in", "12BH7A, bypass out"];
    let listed: Vec<&str> =
        figures["configurations"].as_array().into_iter().flatten().filter_map(|c| c["name"].as_str()).collect();
    assert_eq!(listed, names);
    for one in figures["configurations"].as_array().into_iter().flatten() {
        for part in
            ["operating_point", "response", "tones", "imd", "noise", "headroom", "level_sweep", "frequency_sweep"]
        {
            assert!(!one[part].is_null(), "{part} is missing");
        }
        assert_eq!(one["tones"][0]["input_rms"], 0.5, "a quarter of source.full_scale");
        assert!(one["headroom"]["thd"][1]["over_play_dB"].is_number());
    }
    for render in figures["renders"].as_array().into_iter().flatten() {
        assert!(folder.path("out").join(render["file"].as_str().expect("a file")).is_file(), "{render}");
    }
    let summary = String::from_utf8(folder.bytes("out/summary.txt")).expect("text");
    assert!(summary.starts_with("My first stage\n"), "{summary}");
    assert!(names.iter().all(|name| summary.contains(&format!("{name}.wav"))), "{summary}");
    assert!(summary.contains("THD_F") && summary.contains("check with a meter"), "{summary}");
    assert!(summary.lines().all(|line| !line.contains('\u{1b}')), "no colours in a file");
}

#[test]
fn the_level_is_that_of_every_figure() {
    let folder = folder();
    let figures = folder.json(&[&COMPARE[..], &["--level", "0.8"]].concat());
    let one = &figures["configurations"][0];
    for part in ["tones", "imd"] {
        for item in one[part].as_array().into_iter().flatten() {
            assert_eq!(item["input_rms"], 0.8, "{part}");
        }
    }
}

#[test]
fn exceeded_ratings_come_first_and_fail_a_strict_run() {
    let folder = folder();
    let text = String::from_utf8(folder.bytes("stage.toml")).expect("text");
    // Both exceed: the plate resistor's watts by little, the bypass capacitor's volts by much.
    let text = text
        .replace("value = \"33k\", tolerance = 0.05, watts = 2", "value = \"33k\", watts = 0.5")
        .replace("volts = 25", "volts = 1");
    folder.write("stage.toml", text.as_bytes());
    let run = folder.run(&[&COMPARE[..], &["--strict"]].concat());
    assert_eq!(run.code, Some(3), "{}", run.stderr);
    let mut lines = run.stdout.lines();
    assert_eq!(lines.next(), Some("My first stage"));
    // Below each limit stands which configurations exceed it.
    let of_warnings = lines.take_while(|line| line.starts_with("EXCEEDED") || line.starts_with("  in "));
    let exceeded: Vec<&str> = of_warnings.filter(|line| line.starts_with("EXCEEDED")).collect();
    assert!(exceeded.len() >= 2, "{}", run.stdout);
    assert!(exceeded[0].contains("gain.bypass: volts"), "the worst first: {exceeded:?}");
    assert!(exceeded.iter().any(|line| line.contains("gain.plate_resistor: watts")), "{exceeded:?}");
    let summary = String::from_utf8(folder.bytes("out/summary.txt")).expect("text");
    assert!(
        summary.lines().find(|line| !line.is_empty() && *line != "My first stage") == Some(exceeded[0]),
        "{summary}"
    );
    folder.done(&[&COMPARE[..], &["--replace"]].concat());
}

#[test]
fn a_profile_ranks_and_a_csv_stands_beside_the_results() {
    let folder = folder();
    folder.write("target.toml", b"[profile]\ntone = 1k\nlevel = 0.5\n[profile.harmonics]\n2 = { wanted = -46 }\n");
    let arguments = [&COMPARE[..], &["--profile", "target.toml", "--csv", "out/figures.csv"]].concat();
    let message = folder.refused(&arguments);
    assert!(message.contains("target.toml:2:"), "1k wants quotation marks: {message}");
    folder.write(
        "target.toml",
        b"[profile]\ntone = \"1k\"\nlevel = 0.5\n[profile.harmonics]\n2 = { wanted = -46 }\n",
    );
    let run = folder.done(&arguments);
    let summary = String::from_utf8(folder.bytes("out/summary.txt")).expect("text");
    for text in [&run.stdout, &summary] {
        assert!(text.contains("nearest first") && text.contains("H2 = -46 dBc"), "{text}");
    }
    let csv = String::from_utf8(folder.bytes("out/figures.csv")).expect("text");
    assert_eq!(csv.lines().filter(|line| line.contains(",profile,distance_dB,")).count(), 4);
    assert_eq!(csv.lines().filter(|line| line.contains(",renders,peak_volts,")).count(), 4);
    assert!(!csv.contains(",?,"), "every figure has its unit");
    let message = folder.refused(&[&arguments[..], &["--replace", "--csv", "out/report.json"]].concat());
    assert!(message.contains("--csv"), "{message}");
    let own = [&COMPARE[..], &["--replace", "--csv", "out/report.json"]].concat();
    assert!(folder.refused(&own).contains("two outputs would get this name"));
}

/// A loud take through a stage in hard grid current: its aliases are told, and that more steps bring less.
#[test]
fn aliases_are_estimated_at_the_peak_of_the_recording() {
    let folder = Folder::new();
    folder.write("stage.toml", include_str!("known-answers/known5.toml").as_bytes());
    write_float(&folder.path("take.wav"), 48_000, &[sines(4800, 48.0, &[(1.0, 0.99)])]);
    let alias = |more: &[&str]| {
        let figures = folder
            .json(&[&["render", "stage.toml", "--play", "take.wav", "--into", "out", "--replace"], more].concat());
        let render = &figures["renders"][0];
        assert!((render["input_rms"].as_f64().expect("a level") - 0.99 * 4.0).abs() < 1e-6, "{render}");
        assert_eq!(render["alias_tone"], 19_000.0);
        render["alias_dBc"].as_f64().expect("an estimate")
    };
    let (usual, fine) = (alias(&[]), alias(&["--oversample", "32"]));
    assert!(usual > -80.0 && usual < -40.0, "{usual} dBc");
    assert!(fine < usual - 20.0, "{fine} dBc at 32 times against {usual}");
    let shown = folder.done(&["render", "stage.toml", "--play", "take.wav", "--into", "out", "--replace"]).stdout;
    assert!(shown.contains("alias estimate for a 19 kHz tone at the peak of take.wav"), "{shown}");
    assert!(shown.contains("--oversample 16 brings less"), "{shown}");
}
