//! The command line: help, refusals, `new`, and what a closed pipe does.

mod support;

use std::process::Command;

use support::Folder;

const COMMANDS: [&str; 8] = ["new", "bias", "measure", "render", "compare", "listen", "demo", "report"];

#[test]
fn help_of_every_command_has_an_example() {
    let folder = Folder::new();
    let run = folder.run(&["--help"]);
    assert_eq!(run.code, Some(0));
    for command in COMMANDS {
        assert!(run.stdout.contains(command), "{command} is not in the help:\n{}", run.stdout);
        let help = folder.run(&[command, "--help"]);
        assert_eq!(help.code, Some(0));
        assert!(help.stdout.contains(&format!("Example:  platewright {command}")), "{}", help.stdout);
    }
}

#[test]
fn a_request_that_is_not_understood_is_refused() {
    let folder = Folder::new();
    let cases: [(&[&str], &str); 7] = [
        (&[], "Usage"),
        (&["biass", "stage.toml"], "bias"),
        (&["bias"], "<STAGE>"),
        (&["bias", "stage.toml", "--sheeet"], "--sheet"),
        (&["render", "stage.toml", "--into", "out"], "--play"),
        (&["render", "stage.toml", "--play", "take.wav"], "--into"),
        (&["render", "stage.toml", "--play", "a", "--into", "out", "--format", "i12"], "i24"),
    ];
    for (arguments, expected) in cases {
        let message = folder.refused(arguments);
        assert!(message.contains(expected), "{arguments:?}: {message}");
    }
}

#[test]
fn a_malformed_item_is_named_with_the_reason() {
    let folder = Folder::new();
    let message = folder.refused(&["measure", "stage.toml", "--tone", "1000:0.5,60"]);
    assert!(message.contains("--tone: \"60\"") && message.contains("1000:0.5 or 1k:500m"), "{message}");
    let message = folder.refused(&["measure", "stage.toml", "--frequencies", "20,20kHz"]);
    assert!(message.contains("--frequencies: \"20kHz\"") && message.contains("no unit"), "{message}");
}

#[test]
fn new_writes_a_commented_stage_file() {
    let folder = Folder::new();
    let run = folder.run(&["new", "stage.toml"]);
    assert_eq!(run.code, Some(0), "{}", run.stderr);
    let text = std::fs::read_to_string(folder.path("stage.toml")).expect("written");
    assert!(text.contains("SAFETY") && text.contains("discharge"), "the cautions are missing");
    for line in text.lines().filter(|line| line.contains(" = ") && !line.starts_with('#')) {
        let table_explains_it = ["tube =", "capacitance =", "\"gain."].iter().any(|key| line.starts_with(key));
        assert!(line.contains('#') || table_explains_it, "no comment: {line}");
    }
}

#[test]
fn the_example_is_a_stage_that_biases() {
    let folder = Folder::new();
    assert_eq!(folder.run(&["new", "stage.toml"]).code, Some(0));
    let run = folder.run(&["bias", "stage.toml", "--json"]);
    assert_eq!(run.code, Some(0), "{}", run.stderr);
    let figures: serde_json::Value = serde_json::from_str(&run.stdout).expect("JSON and nothing else");
    let names: Vec<_> =
        figures["configurations"].as_array().into_iter().flatten().map(|one| one["name"].clone()).collect();
    assert_eq!(names, ["12AU7, bypass in", "12AU7, bypass out", "12BH7A, bypass in", "12BH7A, bypass out"]);
}

#[test]
fn new_never_overwrites() {
    let folder = Folder::new();
    folder.write("stage.toml", b"mine");
    folder.make("folder");
    for (name, expected) in [
        ("stage.toml", "stage.toml exists already"),
        ("folder", "exists already"),
        ("nowhere/stage.toml", "the folder of nowhere/stage.toml does not exist"),
        ("stage.toml/stage.toml", "is a file"),
    ] {
        let message = folder.refused(&["new", name]);
        assert!(message.contains(expected), "{message}");
    }
    assert_eq!(std::fs::read(folder.path("stage.toml")).expect("there"), b"mine");
}

#[test]
fn a_closed_pipe_is_no_defect() {
    let folder = Folder::new();
    assert_eq!(folder.run(&["new", "stage.toml"]).code, Some(0));
    for arguments in [&["measure", "--help"][..], &["bias", "stage.toml"], &["bias", "stage.toml", "--json"]] {
        // Closed before the program starts, so that its first byte meets nobody.
        let (reader, writer) = std::io::pipe().expect("a pipe");
        drop(reader);
        let output = Command::new(env!("CARGO_BIN_EXE_platewright"))
            .args(arguments)
            .current_dir(folder.path(""))
            .stdout(writer)
            .output()
            .expect("the program starts");
        assert_eq!(String::from_utf8_lossy(&output.stderr), "", "{arguments:?}");
        assert_eq!(output.status.code(), Some(0), "{arguments:?}");
    }
}
