//! A folder to run the program in.
//! Each test binary uses a part of it.
#![allow(dead_code)]

pub mod sound;

use std::collections::BTreeSet;
use std::path::PathBuf;
use std::process::Command;

use tempfile::TempDir;

/// A temporary folder.
pub struct Folder(TempDir);

/// What a run left behind.
pub struct Run {
    /// Exit code; none where a signal ended it.
    pub code: Option<i32>,
    /// Standard output.
    pub stdout: String,
    /// Standard error.
    pub stderr: String,
}

impl Folder {
    /// An empty one.
    pub fn new() -> Self {
        Self(TempDir::new().expect("a temporary folder"))
    }

    /// The path of `name` in it.
    pub fn path(&self, name: &str) -> PathBuf {
        self.0.path().join(name)
    }

    /// Writes a file.
    pub fn write(&self, name: &str, bytes: &[u8]) {
        std::fs::write(self.path(name), bytes).expect("written");
    }

    /// Makes a folder.
    pub fn make(&self, name: &str) {
        std::fs::create_dir(self.path(name)).expect("made");
    }

    /// Writes a tenth of a second of silence, 48 kHz, 16 bit.
    pub fn write_silence(&self, name: &str) {
        let spec = hound::WavSpec {
            channels: 1,
            sample_rate: 48_000,
            bits_per_sample: 16,
            sample_format: hound::SampleFormat::Int,
        };
        let mut writer = hound::WavWriter::create(self.path(name), spec).expect("created");
        for _ in 0..4800 {
            writer.write_sample(0_i16).expect("written");
        }
        writer.finalize().expect("finished");
    }

    /// Everything in it, by name.
    pub fn listing(&self) -> BTreeSet<String> {
        let entries = std::fs::read_dir(self.0.path()).expect("a folder");
        entries.map(|entry| entry.expect("an entry").file_name().to_string_lossy().into_owned()).collect()
    }

    /// Runs the program here.
    pub fn run(&self, arguments: &[&str]) -> Run {
        self.run_with(&[], arguments)
    }

    /// Runs the program here with variables of its environment set.
    pub fn run_with(&self, variables: &[(&str, &str)], arguments: &[&str]) -> Run {
        let output = Command::new(env!("CARGO_BIN_EXE_platewright"))
            .args(arguments)
            .envs(variables.iter().copied())
            .current_dir(self.0.path())
            .output()
            .expect("the program starts");
        Run {
            code: output.status.code(),
            stdout: String::from_utf8_lossy(&output.stdout).into_owned(),
            stderr: String::from_utf8_lossy(&output.stderr).into_owned(),
        }
    }

    /// Runs the program and expects it to do what is asked.
    pub fn done(&self, arguments: &[&str]) -> Run {
        let run = self.run(arguments);
        assert_eq!(run.code, Some(0), "{arguments:?}:\n{}", run.stderr);
        run
    }

    /// The JSON that the program prints, and nothing else, for what is asked.
    pub fn json(&self, arguments: &[&str]) -> serde_json::Value {
        let run = self.done(&[arguments, &["--json"]].concat());
        serde_json::from_str(&run.stdout).unwrap_or_else(|error| panic!("{arguments:?}: {error}:\n{}", run.stdout))
    }

    /// The bytes of a file.
    pub fn bytes(&self, name: &str) -> Vec<u8> {
        std::fs::read(self.path(name)).unwrap_or_else(|error| panic!("{name}: {error}"))
    }

    /// Runs the program, expects it to refuse with exit code 2, nothing on standard output and nothing created, and
    /// returns its message.
    pub fn refused(&self, arguments: &[&str]) -> String {
        let before = self.listing();
        let run = self.run(arguments);
        assert_eq!(run.code, Some(2), "{arguments:?} was not refused:\n{}", run.stderr);
        assert_eq!(run.stdout, "", "{arguments:?} printed something");
        assert_eq!(self.listing(), before, "{arguments:?} created something");
        run.stderr
    }
}

/// The line of `text` that `place` begins on.
pub fn line_of(text: &str, place: &str) -> usize {
    let at = text.find(place).unwrap_or_else(|| panic!("\"{place}\" is not in the text"));
    text[..at].matches('\n').count() + 1
}
