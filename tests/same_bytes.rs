//! The same input gives the same bytes: in every run, on any number of threads, with and without the instructions of a
//! newer CPU, and whatever stands beside a configuration.

mod support;

use std::collections::BTreeMap;
use std::path::Path;

use support::Folder;
use support::sound::{noise, write_float};

/// Four configurations of two tubes and two topologies.
fn folder() -> Folder {
    let folder = Folder::new();
    folder.done(&["new", "stage.toml"]);
    write_float(&folder.path("take.wav"), 44_100, &[noise(5000, 1, 0.7), noise(5000, 2, 0.3)]);
    folder
}

/// Every file below a folder, by name.
fn files(folder: &Path) -> BTreeMap<String, Vec<u8>> {
    let mut files = BTreeMap::new();
    for entry in std::fs::read_dir(folder).expect("a folder") {
        let path = entry.expect("an entry").path();
        let name = path.file_name().expect("a name").to_string_lossy().into_owned();
        if path.is_dir() {
            files.extend(self::files(&path).into_iter().map(|(inner, bytes)| (format!("{name}/{inner}"), bytes)));
        } else {
            files.insert(name, std::fs::read(&path).expect("read"));
        }
    }
    files
}

fn assert_same(got: &BTreeMap<String, Vec<u8>>, want: &BTreeMap<String, Vec<u8>>, what: &str) {
    assert_eq!(got.keys().collect::<Vec<_>>(), want.keys().collect::<Vec<_>>(), "{what}");
    for (name, bytes) in got {
        assert!(bytes == &want[name], "{name} differs: {what}");
    }
}

#[test]
fn any_number_of_threads_and_any_cpu() {
    let folder = folder();
    let compared = |into: &str, variables: &[(&str, &str)]| {
        let run = folder
            .run_with(variables, &["compare", "stage.toml", "--play", "take.wav", "--into", into, "--rate", "48k"]);
        assert_eq!(run.code, Some(0), "{}", run.stderr);
        files(&folder.path(into))
    };
    let usual = compared("two threads", &[("RAYON_NUM_THREADS", "2")]);
    assert!(usual.contains_key("report.json") && usual.contains_key("12BH7A, bypass out.wav"));
    let cases: [(&str, &[(&str, &str)]); 2] = [
        ("one thread", &[("RAYON_NUM_THREADS", "1")]),
        ("any CPU", &[("PLATEWRIGHT_PORTABLE", "1"), ("RAYON_NUM_THREADS", "3")]),
    ];
    for (what, variables) in cases {
        assert_same(&compared(what, variables), &usual, what);
    }
}

#[test]
fn whatever_stands_beside_a_configuration() {
    let folder = folder();
    let text = String::from_utf8(folder.bytes("stage.toml")).expect("text");
    let turned = text
        .replace("[\"12AU7\", \"12BH7A\"]", "[\"12BH7A\", \"12AX7\", \"12AU7\"]")
        .replace("[true, false]", "[false, true]");
    assert_ne!(text, turned);
    folder.write("turned.toml", turned.as_bytes());
    let rendered = |stage: &str, into: &str| {
        folder.done(&["render", stage, "--play", "take.wav", "--into", into, "--full-scale", "20"]);
        files(&folder.path(into))
    };
    let usual = rendered("stage.toml", "usual");
    let mut other = rendered("turned.toml", "turned");
    assert_eq!((usual.len(), other.len()), (4, 6));
    other.retain(|name, _| usual.contains_key(name));
    assert_same(&other, &usual, "in another order, beside others");
}

#[test]
fn the_demo_twice() {
    let folder = Folder::new();
    folder.done(&["demo", "--into", "one"]);
    folder.done(&["demo", "--into", "two"]);
    let one = files(&folder.path("one"));
    assert!(one.contains_key("report.json") && one.contains_key("stage-piano.wav"), "{:?}", one.keys());
    assert_same(&files(&folder.path("two")), &one, "the second time");
    let home = folder.path("").to_string_lossy().into_owned();
    for (name, bytes) in one.iter().filter(|(name, _)| !name.ends_with(".wav")) {
        let text = String::from_utf8_lossy(bytes);
        assert!(!text.contains(home.trim_end_matches('/')), "{name} holds a path of the machine");
    }
}
