//! The page: written beside a comparison, drawn again from report.json alone, refused where that is not to be read.

mod support;

use support::Folder;

const COMPARE: [&str; 9] =
    ["compare", "stage.toml", "--play", "take.wav", "--into", "out", "--plots", "svg", "--trust=off"];

fn compared() -> Folder {
    let folder = Folder::new();
    assert_eq!(folder.run(&["new", "stage.toml"]).code, Some(0));
    folder.write_silence("take.wav");
    let run = folder.run(&COMPARE);
    assert_eq!(run.code, Some(0), "{}", run.stderr);
    folder
}

fn text(folder: &Folder, name: &str) -> String {
    std::fs::read_to_string(folder.path(name)).unwrap_or_else(|error| panic!("{name}: {error}"))
}

#[test]
fn the_page_comes_again_from_report_json_alone() {
    let folder = compared();
    let page = text(&folder, "out/report.html");
    folder.make("alone");
    folder.write("alone/report.json", text(&folder, "out/report.json").as_bytes());
    let run = folder.run(&["report", "alone", "--plots", "svg"]);
    assert_eq!((run.code, run.stdout.as_str()), (Some(0), ""), "{}", run.stderr);
    assert!(text(&folder, "alone/report.html") == page, "another page");
    let names = |at: &str| {
        let entries = std::fs::read_dir(folder.path(at)).expect("a folder");
        let mut names: Vec<String> =
            entries.map(|entry| entry.expect("an entry").file_name().to_string_lossy().into_owned()).collect();
        names.sort();
        names
    };
    let pictures = names("out/plots");
    assert_eq!(names("alone/plots"), pictures);
    // Four configurations with a follower: seven pictures each, three that they share, and one of the recording.
    assert_eq!(pictures.len(), 4 * 7 + 3 + 1, "{pictures:?}");
    for picture in &pictures {
        let svg = text(&folder, &format!("out/plots/{picture}"));
        assert!(svg.starts_with("<svg xmlns=\"http://www.w3.org/2000/svg\""), "{picture}");
        assert_eq!(svg, text(&folder, &format!("alone/plots/{picture}")));
        assert!(page.contains(&format!("aria-label=\"{}", between(&svg, "aria-label=\"", "\""))), "{picture}");
    }
}

fn between<'a>(text: &'a str, start: &str, end: &str) -> &'a str {
    let rest = text.split_once(start).map_or("", |(_, rest)| rest);
    rest.split_once(end).map_or("", |(inside, _)| inside)
}

#[test]
fn a_report_that_cannot_be_read_is_refused_and_the_page_left_alone() {
    let folder = compared();
    let json = text(&folder, "out/report.json");
    let page = text(&folder, "out/report.html");
    let other_schema = json.replacen("\"schema\": 1", "\"schema\": 7", 1);
    let cases = [
        (&json[..json.len() / 2], "damaged"),
        ("", "damaged"),
        ("\u{1}\u{2}", "damaged"),
        ("{}", "no schema"),
        (other_schema.as_str(), "schema 7"),
        ("{\"schema\": 1, \"title\": null, \"configurations\": []}", "no configuration"),
        ("{\"schema\": 1, \"title\": null, \"configurations\": [{\"name\": \"a\"}]}", "operating_point"),
    ];
    for (damaged, reason) in cases {
        folder.write("out/report.json", damaged.as_bytes());
        let message = folder.refused(&["report", "out"]);
        assert!(message.contains("report.json") && message.contains(reason), "{reason}: {message}");
        assert!(message.contains("help:"), "{message}");
        assert!(text(&folder, "out/report.html") == page, "the page was touched");
    }
    folder.write("out/report.json", b"\xff\xfe");
    assert!(folder.refused(&["report", "out"]).contains("UTF-8"));
    assert!(folder.refused(&["report", "nowhere"]).contains("there is no nowhere/report.json"));
}

/// The figures of a plain `measure --json` are no comparison, yet everything in them is shown.
#[test]
fn what_was_not_measured_is_left_out_quietly() {
    let folder = Folder::new();
    assert_eq!(folder.run(&["new", "stage.toml"]).code, Some(0));
    let run = folder.run(&["bias", "stage.toml", "--json"]);
    folder.make("out");
    folder.write("out/report.json", run.stdout.as_bytes());
    let run = folder.run(&["report", "out"]);
    assert_eq!(run.code, Some(0), "{}", run.stderr);
    let page = text(&folder, "out/report.html");
    assert!(page.contains("not measured"));
    assert!(!page.contains("NaN") && !page.contains("inf"), "a number that is none");
}
