//! Work that ends early, by Ctrl-C or a full disk, leaves no output behind.
#![cfg(unix)]

mod support;

use std::path::Path;
use std::process::{Command, Stdio};
use std::time::{Duration, Instant};

use support::Folder;

/// Far longer than any of these tests renders.
const RECORDING_SECONDS: u32 = 600;

/// A folder with the example stage and a long recording.
fn folder() -> Folder {
    let folder = Folder::new();
    assert_eq!(folder.run(&["new", "stage.toml"]).code, Some(0));
    let spec = hound::WavSpec {
        channels: 2,
        sample_rate: 48_000,
        bits_per_sample: 16,
        sample_format: hound::SampleFormat::Int,
    };
    let mut writer = hound::WavWriter::create(folder.path("take.wav"), spec).expect("created");
    for n in 0..RECORDING_SECONDS * 48_000 {
        let sample = (n % 100) as i16 * 80 - 4000;
        writer.write_sample(sample).and_then(|()| writer.write_sample(-sample)).expect("written");
    }
    writer.finalize().expect("finished");
    folder
}

fn render(folder: &Folder, into: &str, more: &[&str]) -> Command {
    let mut command = Command::new(env!("CARGO_BIN_EXE_platewright"));
    command.args(["render", "stage.toml", "--play", "take.wav", "--into", into]).args(more);
    command.current_dir(folder.path("")).stdin(Stdio::null()).stderr(Stdio::piped()).stdout(Stdio::piped());
    command
}

fn wait_until(what: &str, mut holds: impl FnMut() -> bool) {
    let start = Instant::now();
    while !holds() {
        assert!(start.elapsed() < Duration::from_secs(60), "{what}: not within a minute");
        std::thread::sleep(Duration::from_millis(20));
    }
}

fn entries(folder: &Path) -> Vec<String> {
    let entries = std::fs::read_dir(folder).expect("a folder");
    let mut names: Vec<String> =
        entries.map(|entry| entry.expect("an entry").file_name().to_string_lossy().into_owned()).collect();
    names.sort();
    names
}

/// With the level stated, the sound goes straight into the temporary of the output, else into a scratch file first.
#[test]
fn interrupted_render_leaves_nothing_and_says_so() {
    for level in [&["--full-scale", "4"][..], &[]] {
        let folder = folder();
        let mut program = render(&folder, "made/out", level).spawn().expect("started");
        wait_until("the output folder", || folder.path("made/out").exists());
        std::thread::sleep(Duration::from_millis(300));
        let kill = Command::new("kill").args(["-INT", &program.id().to_string()]).status().expect("kill");
        assert!(kill.success());
        wait_until("the end after Ctrl-C", || program.try_wait().expect("a state").is_some());
        let output = program.wait_with_output().expect("output");
        let messages = String::from_utf8_lossy(&output.stderr);
        assert!(output.status.code().is_some_and(|code| code != 0), "{:?}: {messages}", output.status);
        assert!(messages.contains("interrupted"), "{messages}");
        assert_eq!(entries(&folder.path("")), ["stage.toml", "take.wav"], "{level:?}");
    }
}

/// The shell's limit on the size of a file stands for a disk that is full.
#[test]
fn full_disk_leaves_the_old_files_and_nothing_else() {
    let folder = folder();
    folder.make("out");
    folder.write("out/notes.txt", b"mine");
    for level in [&["--full-scale", "4"][..], &[]] {
        let command = render(&folder, "out", level);
        let arguments: Vec<&str> = command.get_args().map(|argument| argument.to_str().expect("plain")).collect();
        let output = Command::new("sh")
            .args(["-c", "ulimit -f 2048; trap '' XFSZ; exec \"$@\"", "sh", env!("CARGO_BIN_EXE_platewright")])
            .args(arguments)
            .arg("--replace")
            .current_dir(folder.path(""))
            .output()
            .expect("started");
        let messages = String::from_utf8_lossy(&output.stderr);
        assert_eq!(output.status.code(), Some(1), "{messages}");
        assert!(messages.contains("cannot be written") && messages.contains("out"), "{messages}");
        assert_eq!(entries(&folder.path("out")), ["notes.txt"], "{level:?}");
    }
}
