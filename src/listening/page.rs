//! The listener's page: one file that opens by a double click, its sound in scripts beside it.
//!
//! From a file a browser may neither fetch its neighbours nor route an `<audio>` element into the sound graph, but it
//! does run neighbouring scripts: each recording's takes stand in one as base64.

use base64::Engine;
use base64::engine::general_purpose::STANDARD;
use serde::Serialize;

use super::key::Key;

const PAGE: &str = include_str!("page/index.html");
const STYLE: &str = include_str!("page/style.css");
const SCRIPTS: [&str; 5] = [
    include_str!("page/sha256.js"),
    include_str!("page/player.js"),
    include_str!("page/sitting.js"),
    include_str!("page/sound.js"),
    include_str!("page/page.js"),
];

/// What the page knows of the pack: nothing that tells one take from another.
#[derive(Serialize)]
struct PageData<'a> {
    format: u32,
    pack: &'a str,
    seal: &'a str,
    trials: u32,
    recordings: Vec<PageRecording>,
}

#[derive(Serialize)]
struct PageRecording {
    number: usize,
    rate: u32,
    channels: usize,
    seconds: f64,
    letters: Vec<char>,
    script: String,
}

/// The page itself.
///
/// # Errors
/// None that a key gives.
pub fn index(key: &Key, seal: &str) -> Result<String, serde_json::Error> {
    let recordings = key.recordings.iter().map(|recording| PageRecording {
        number: recording.number,
        rate: recording.sample_rate,
        channels: recording.channels,
        seconds: recording.frames as f64 / f64::from(recording.sample_rate),
        letters: recording.takes.iter().map(|take| take.letter).collect(),
        script: script_name(recording.number),
    });
    let data = PageData {
        format: key.format,
        pack: &key.pack,
        seal,
        trials: key.trials,
        recordings: recordings.collect(),
    };
    // Hexadecimal, numbers, letters and names of our own: nothing here could end the script element early.
    let data = serde_json::to_string(&data)?;
    Ok(PAGE.replace("/*STYLE*/", STYLE).replace("/*DATA*/", &data).replace("/*SCRIPT*/", &SCRIPTS.join("\n")))
}

/// The name of a recording's sound script.
pub fn script_name(number: usize) -> String {
    format!("sound-{number}.js")
}

/// A recording's sound script: its takes, letter by letter.
pub fn sound_script<'a>(number: usize, takes: impl Iterator<Item = (char, &'a [u8])>) -> String {
    let mut script = format!("takesArrived({number}, {{\n");
    for (letter, flac) in takes {
        script.push_str(&format!("{letter}: \"{}\",\n", STANDARD.encode(flac)));
    }
    script.push_str("});\n");
    script
}
