//! Recordings and packs for the listening tests.
#![allow(dead_code)]
#![allow(clippy::disallowed_methods, reason = "test signals need not be the same on every CPU")]

use std::path::{Path, PathBuf};
use std::process::Command;

use serde_json::Value;

use super::support::Folder;

/// A stage of the demonstration's kind: two tubes, bypass in and out.
pub const STAGE: &str = include_str!("../../src/demo/stage.toml");

/// The demonstration's stage as drawn alone, to which a test adds what it compares.
pub fn stage_with(compared: &str) -> String {
    let drawn = STAGE.split("[compare]").next().expect("a stage");
    format!("{drawn}{compared}")
}

/// Noise that repeats, from −1 to 1.
pub fn noise(seed: u32, count: usize) -> Vec<f64> {
    let mut state = seed.wrapping_mul(2_654_435_761).wrapping_add(12345);
    let mut next = || {
        // Marsaglia's xorshift32.
        state ^= state << 13;
        state ^= state >> 17;
        state ^= state << 5;
        f64::from(state) / f64::from(u32::MAX) * 2.0 - 1.0
    };
    (0..count).map(|_| next()).collect()
}

/// Music of a sort: decaying tones twice a second and a little noise, different in each channel.
pub fn music(rate: u32, seconds: f64, channels: usize) -> Vec<Vec<f64>> {
    let frames = (seconds * f64::from(rate)) as usize;
    let channel = |channel: usize| {
        let hiss = noise(channel as u32 + 1, frames);
        (0..frames)
            .map(|n| {
                let time = n as f64 / f64::from(rate);
                let pitch = 220.0 * (1.0 + 0.25 * ((2.0 * time).floor() % 4.0)) + 30.0 * channel as f64;
                let tone = (std::f64::consts::TAU * pitch * time).sin() * (-3.0 * (time % 0.5)).exp();
                0.4 * tone + 0.01 * hiss[n]
            })
            .collect()
    };
    (0..channels).map(channel).collect()
}

/// Writes a 24-bit WAV file.
pub fn write_wav(path: &Path, rate: u32, planes: &[Vec<f64>]) {
    let spec = hound::WavSpec {
        channels: planes.len() as u16,
        sample_rate: rate,
        bits_per_sample: 24,
        sample_format: hound::SampleFormat::Int,
    };
    let mut writer = hound::WavWriter::create(path, spec).expect("created");
    for frame in 0..planes[0].len() {
        for plane in planes {
            writer.write_sample((plane[frame] * 8_388_607.0).round() as i32).expect("written");
        }
    }
    writer.finalize().expect("finished");
}

/// Integer samples of a WAV file, one plane a channel.
pub fn read_wav(path: &Path) -> Vec<Vec<i32>> {
    let mut reader = hound::WavReader::open(path).unwrap_or_else(|error| panic!("{}: {error}", path.display()));
    let channels = usize::from(reader.spec().channels);
    let samples: Vec<i32> = reader.samples::<i32>().map(|sample| sample.expect("a sample")).collect();
    (0..channels).map(|channel| samples.iter().skip(channel).step_by(channels).copied().collect()).collect()
}

/// Makes a pack and returns its key.
pub fn make(folder: &Folder, arguments: &[&str]) -> Value {
    let mut all = vec!["listen", "pack", "stage.toml", "--json"];
    all.extend(arguments);
    let run = folder.run(&all);
    assert_eq!(run.code, Some(0), "{}", run.stderr);
    serde_json::from_str(&run.stdout).expect("the key")
}

/// The key's takes of a recording, numbered from 1, by what they are.
pub fn take<'a>(key: &'a Value, recording: usize, configuration: Option<&str>) -> &'a Value {
    let takes = key["recordings"][recording - 1]["takes"].as_array().expect("takes");
    takes
        .iter()
        .find(|take| take["configuration"].as_str() == configuration)
        .unwrap_or_else(|| panic!("{configuration:?} is not in {key}"))
}

/// Runs a program from outside and returns its standard output.
pub fn outside(program: &str, arguments: &[&str]) -> Vec<u8> {
    let output = Command::new(program)
        .args(arguments)
        .output()
        .unwrap_or_else(|error| panic!("{program} does not start ({error}): tools/run-tests installs it"));
    assert!(output.status.success(), "{program} {arguments:?}: {}", String::from_utf8_lossy(&output.stderr));
    output.stdout
}

/// Every file below a folder, sorted.
pub fn files(folder: &Path) -> Vec<PathBuf> {
    let mut found = Vec::new();
    for entry in std::fs::read_dir(folder).expect("a folder") {
        let path = entry.expect("an entry").path();
        if path.is_dir() { found.extend(files(&path)) } else { found.push(path) }
    }
    found.sort();
    found
}
