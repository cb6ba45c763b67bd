//! Answers that came back: read, and held against the pack and their own chain of hashes.
//!
//! The page chains every entry to all before it. The chain shows what was changed in an editor or by accident; whoever
//! runs the page's own code can make another, so it proves no more than that.

use std::path::{Path, PathBuf};

use serde::{Deserialize, Serialize};

use super::key::Key;
use super::secret::sha256_hex;
use crate::failure::{Failure, RequestError};
use crate::terminal;

/// The version of the answers' format.
const FORMAT: u32 = 1;
/// More than any sitting gives, bytes.
const LARGEST_FILE: u64 = 16_000_000;

/// One file of answers.
#[derive(Clone, Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Answers {
    format: u32,
    pack: String,
    seal: String,
    /// Drawn when the page was opened: tells one sitting from another.
    pub sitting: String,
    /// When the page was opened.
    began: String,
    /// The nickname; none where the listener gave none.
    pub listener: Option<String>,
    entries: Vec<Link>,
    last: String,
    #[serde(skip)]
    path: PathBuf,
}

/// An entry and the hash over it and all before it.
#[derive(Clone, Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct Link {
    entry: Entry,
    hash: String,
}

/// What a listener did. Fields stand in the order in which the page writes them: the chain is over their JSON text.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(tag = "kind", rename_all = "kebab-case", deny_unknown_fields)]
pub enum Entry {
    /// A "which is which" run began; its order had been drawn.
    Run { run: u32, recording: usize, first: String, second: String, trials: u32, at_ms: u64 },
    /// A trial: what X was, and what the listener took it for.
    Trial { run: u32, trial: u32, x: String, choice: String, at_ms: u64 },
    /// The run's last trial is done.
    End { run: u32, at_ms: u64 },
    /// The run was given up.
    BrokenOff { run: u32, done: u32, at_ms: u64 },
    /// A preference between two takes, or "none".
    Preference { recording: usize, first: String, second: String, choice: String, note: String, at_ms: u64 },
}

/// A choice of neither.
pub const NO_PREFERENCE: &str = "none";

impl Answers {
    /// Reads a file.
    ///
    /// # Errors
    /// [`RequestError`] where it cannot be read or is no file of answers.
    pub fn read(path: &Path) -> Result<Answers, Failure> {
        let name = terminal::path(path);
        let refuse = |problem: String, remedy: &str| RequestError::new(format!("{name}: {problem}"), remedy);
        let size = std::fs::metadata(path).map(|metadata| metadata.len());
        if size.is_ok_and(|size| size > LARGEST_FILE) {
            return Err(refuse("too large for answers".to_owned(), "name the file that the page saved").into());
        }
        let text = std::fs::read_to_string(path)
            .map_err(|error| refuse(format!("cannot be read: {error}"), "name the file that the page saved"))?;
        let mut answers: Answers = serde_json::from_str(&text).map_err(|error| {
            refuse(format!("no answers of a listening page: {error}"), "name the file as the page saved it")
        })?;
        if answers.format != FORMAT {
            let problem = format!("answers of format {}, and this version reads {FORMAT}", answers.format);
            return Err(refuse(problem, "use the version of platewright that made the pack").into());
        }
        answers.path = path.to_owned();
        Ok(answers)
    }

    /// The file.
    pub fn path(&self) -> &Path {
        &self.path
    }

    /// What happened, in order.
    pub fn entries(&self) -> impl Iterator<Item = &Entry> {
        self.entries.iter().map(|link| &link.entry)
    }

    /// Holds the answers against the pack whose key and seal these are, and against themselves.
    ///
    /// # Errors
    /// [`RequestError`] where they belong to another pack, or were altered.
    pub fn check(&self, key: &Key, seal: &str) -> Result<(), RequestError> {
        let name = terminal::path(&self.path);
        if self.pack != key.pack {
            return Err(RequestError::new(
                format!("{name}: answers of another pack ({}, not {})", short(&self.pack), short(&key.pack)),
                "tally them with the folder of their own pack",
            ));
        }
        if self.seal != seal {
            return Err(RequestError::new(
                format!("{name}: keep/key.json is not the key that the page was sealed with"),
                "put the key back as it was when the pack was made",
            ));
        }
        let altered = |what: String| {
            let remedy = "ask the listener for the file as the page saved it";
            RequestError::new(format!("{name}: altered after the page saved it: {what}"), remedy)
        };
        self.check_chain().map_err(altered)?;
        self.check_sense(key).map_err(altered)
    }

    fn check_chain(&self) -> Result<(), String> {
        let lines = ["platewright answers 1", &self.pack, &self.seal, &self.sitting, &self.began];
        let mut hash = sha256_hex(lines.join("\n").as_bytes());
        for (index, link) in self.entries.iter().enumerate() {
            hash = sha256_hex(format!("{hash}\n{}", json(&link.entry)?).as_bytes());
            if hash != link.hash {
                return Err(format!("entry {} does not fit its hash", index + 1));
            }
        }
        let last = sha256_hex(format!("{hash}\n{}", json(&self.listener)?).as_bytes());
        if last == self.last { Ok(()) } else { Err("the last hash does not fit".to_owned()) }
    }

    /// What the page could never have written.
    fn check_sense(&self, key: &Key) -> Result<(), String> {
        let mut open: Option<(u32, &str, &str, u32)> = None;
        for entry in self.entries() {
            match entry {
                Entry::Run { run, recording, first, second, trials, .. } => {
                    check_pair(key, *recording, first, second)?;
                    if *trials != key.trials || open.is_some() {
                        return Err(format!("run {run} is not one of {} trials after another", key.trials));
                    }
                    open = Some((*run, first, second, 0));
                }
                Entry::Trial { run, trial, x, choice, .. } => {
                    let Some((of, first, second, done)) = &mut open else {
                        return Err(format!("trial {trial} stands outside a run"));
                    };
                    *done += 1;
                    let known = |letter: &str| letter == *first || letter == *second;
                    if of != run || done != trial || *trial > key.trials || !known(x) || !known(choice) {
                        return Err(format!("trial {trial} of run {run} does not belong there"));
                    }
                }
                Entry::End { run, .. } => match open.take() {
                    Some((of, .., done)) if of == *run && done == key.trials => {}
                    _ => return Err(format!("run {run} ends without all its trials")),
                },
                Entry::BrokenOff { run, .. } if open.is_some() => {
                    return Err(format!("run {run} is broken off within another"));
                }
                Entry::BrokenOff { .. } => {}
                Entry::Preference { recording, first, second, choice, .. } => {
                    check_pair(key, *recording, first, second)?;
                    if choice != first && choice != second && choice != NO_PREFERENCE {
                        return Err(format!("a preference for \"{}\"", terminal::plain(choice)));
                    }
                }
            }
        }
        match open {
            Some((run, ..)) => Err(format!("run {run} has no end")),
            None => Ok(()),
        }
    }
}

fn check_pair(key: &Key, recording: usize, first: &str, second: &str) -> Result<(), String> {
    let known = key.recording(recording);
    let places = known.map(|known| (known.place(first), known.place(second)));
    match places {
        Some((Some(a), Some(b))) if a != b => Ok(()),
        _ => Err(format!("a pair of takes that the pack does not hold, in recording {recording}")),
    }
}

/// Compact JSON as the page's own JSON.stringify writes it.
fn json<T: Serialize>(value: &T) -> Result<String, String> {
    serde_json::to_string(value).map_err(|error| error.to_string())
}

/// The head of a hash, for a person.
fn short(hash: &str) -> String {
    terminal::plain(&hash.chars().take(8).collect::<String>()).into_owned()
}
