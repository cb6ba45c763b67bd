//! Counting answers: right ones by listener and together, and preferences.

use std::collections::HashMap;
use std::path::{Path, PathBuf};

use serde::Serialize;

use super::answers::{Answers, Entry, NO_PREFERENCE};
use super::conclusion;
use super::key::{FORMAT, Key};
use super::secret::sha256_hex;
use super::statistics::{at_least, clopper_pearson, needed, sign_test};
use crate::failure::{Failure, RequestError};
use crate::terminal;

/// Confidence of the intervals.
const CONFIDENCE: f64 = 0.95;

/// Everything that was counted.
#[derive(Clone, Debug, Serialize)]
pub struct Tally {
    /// Version of this format.
    pub schema: u32,
    /// The pack's id.
    pub pack: String,
    /// Listeners, in the order of their files.
    pub listeners: Vec<String>,
    /// Every pair that anybody compared.
    pub comparisons: Vec<Comparison>,
    /// Runs given up, which count nowhere.
    pub broken_off: u32,
}

/// Two configurations compared.
#[derive(Clone, Debug, Serialize)]
pub struct Comparison {
    /// One.
    pub one: String,
    /// The other.
    pub other: String,
    /// Trials of all listeners together; `null` where nobody did any.
    pub together: Option<Counts>,
    /// Trials listener by listener.
    pub each: Vec<ListenerCounts>,
    /// Preferences; `null` where nobody stated any.
    pub preference: Option<Preference>,
    /// What may be concluded and what not.
    pub conclusion: String,
}

/// Right answers among trials.
#[derive(Clone, Copy, Debug, PartialEq, Serialize)]
pub struct Counts {
    /// Runs.
    pub runs: u32,
    /// Trials.
    pub trials: u32,
    /// Right answers.
    pub correct: u32,
    /// The probability that guessing gives as many or more.
    pub by_guessing: f64,
    /// Right answers needed for 95 %: guessing reaches them once in 20 times at most; `null` where not even all are enough.
    pub needed_95: Option<u32>,
    /// The same for 99 %.
    pub needed_99: Option<u32>,
    /// The 95 % interval of the probability of a right answer (Clopper & Pearson).
    pub interval_95: [f64; 2],
}

/// The counts of one listener.
#[derive(Clone, Debug, Serialize)]
pub struct ListenerCounts {
    /// Who.
    pub listener: String,
    /// What.
    #[serde(flatten)]
    pub counts: Counts,
}

/// Preferences between two configurations.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Preference {
    /// How often the one was preferred.
    pub one: u32,
    /// How often the other.
    pub other: u32,
    /// How often neither: left out of the test.
    pub ties: u32,
    /// The probability of a split at least as uneven by chance (two-sided sign test).
    pub by_chance: f64,
    /// What listeners wrote.
    pub notes: Vec<Note>,
}

/// What a listener wrote about two takes.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Note {
    /// Who.
    pub listener: String,
    /// The recording's file name.
    pub recording: String,
    /// What was preferred; `null` is neither.
    pub preferred: Option<String>,
    /// The words.
    pub note: String,
}

/// Counts the answers in `files` with the key of the pack in `folder`.
///
/// # Errors
/// [`RequestError`] where the folder is no pack, or a file is no answers of this pack, altered, or there twice.
pub fn tally(folder: &Path, files: &[PathBuf]) -> Result<Tally, Failure> {
    let (key, seal) = read_key(folder)?;
    let answers: Vec<Answers> = files.iter().map(|file| Answers::read(file)).collect::<Result<_, _>>()?;
    answers.iter().try_for_each(|answers| answers.check(&key, &seal))?;
    refuse_repeated(&answers)?;
    Ok(count(&key, &answers))
}

fn read_key(folder: &Path) -> Result<(Key, String), RequestError> {
    let path = folder.join("keep/key.json");
    let name = terminal::path(folder);
    let no_pack = |why: String| {
        RequestError::new(
            format!("{name} is no listening pack: {why}"),
            "name the folder that `platewright listen pack` made, with keep/ in it",
        )
    };
    let bytes = std::fs::read(&path).map_err(|error| no_pack(format!("keep/key.json cannot be read: {error}")))?;
    let key: Key =
        serde_json::from_slice(&bytes).map_err(|error| no_pack(format!("keep/key.json is no key: {error}")))?;
    if key.format != FORMAT {
        return Err(no_pack(format!("its key is of format {}, and this version reads {FORMAT}", key.format)));
    }
    if key.id() != key.pack {
        return Err(RequestError::new(
            format!("{name}: keep/key.json was altered: its takes do not give its id"),
            "put the key back as it was when the pack was made",
        ));
    }
    Ok((key, sha256_hex(&bytes)))
}

fn refuse_repeated(answers: &[Answers]) -> Result<(), RequestError> {
    let mut seen: HashMap<&str, &Path> = HashMap::new();
    for answers in answers {
        if let Some(earlier) = seen.insert(&answers.sitting, answers.path()) {
            return Err(RequestError::new(
                format!(
                    "{} repeats the sitting of {}: its answers would count twice",
                    terminal::path(answers.path()),
                    terminal::path(earlier)
                ),
                "name the later of the two alone",
            ));
        }
    }
    Ok(())
}

/// One run, in terms of what its letters stood for.
struct Run {
    pair: Pair,
    listener: String,
    correct: u32,
    trials: u32,
}

/// Two names, in the order of the key.
#[derive(Clone, Debug, PartialEq, Eq, Hash)]
struct Pair {
    one: String,
    other: String,
}

/// What a preference was for, in terms of the pair.
struct Stated {
    pair: Pair,
    preferred: Option<String>,
    note: Note,
}

fn count(key: &Key, answers: &[Answers]) -> Tally {
    let order = name_order(key);
    let (mut runs, mut stated, mut broken_off) = (Vec::new(), Vec::new(), 0);
    let mut listeners: Vec<String> = Vec::new();
    for answers in answers {
        let listener = listener_name(answers);
        if !listeners.contains(&listener) {
            listeners.push(listener.clone());
        }
        runs.extend(runs_of(key, &order, answers, &listener));
        stated.extend(stated_in(key, &order, answers, &listener));
        broken_off += answers.entries().filter(|entry| matches!(entry, Entry::BrokenOff { .. })).count() as u32;
    }
    let mut pairs: Vec<Pair> = Vec::new();
    for (index, one) in order.iter().enumerate() {
        pairs.extend(order[index + 1..].iter().map(|other| Pair { one: one.clone(), other: other.clone() }));
    }
    let compared = |pair: &Pair| runs.iter().any(|r| r.pair == *pair) || stated.iter().any(|s| s.pair == *pair);
    let comparisons = pairs.iter().filter(|pair| compared(pair)).map(|pair| comparison(pair, &runs, &stated));
    Tally { schema: 1, pack: key.pack.clone(), listeners, comparisons: comparisons.collect(), broken_off }
}

/// Names by what they stood for in the first recording's letters would betray nothing here, but a stable order reads
/// better: alphabetical, the recording itself last.
fn name_order(key: &Key) -> Vec<String> {
    let mut takes: Vec<_> = key.recordings.iter().flat_map(|recording| &recording.takes).collect();
    takes.sort_by_key(|take| (take.configuration.is_none(), take.name()));
    let mut names: Vec<String> = takes.iter().map(|take| take.name().to_owned()).collect();
    names.dedup();
    names
}

fn listener_name(answers: &Answers) -> String {
    let nickname = answers.listener.as_deref().map(str::trim).filter(|name| !name.is_empty());
    let stem = || answers.path().file_stem().map_or_else(String::new, |stem| stem.to_string_lossy().into_owned());
    nickname.map_or_else(stem, str::to_owned)
}

fn name_of(key: &Key, recording: usize, letter: &str) -> Option<String> {
    let recording = key.recording(recording)?;
    Some(recording.takes[recording.place(letter)?].name().to_owned())
}

fn pair_of(order: &[String], a: String, b: String) -> Pair {
    let place = |name: &String| order.iter().position(|other| other == name);
    if place(&a) <= place(&b) { Pair { one: a, other: b } } else { Pair { one: b, other: a } }
}

/// Finished runs; the answers have been checked, so a run's trials follow it.
fn runs_of(key: &Key, order: &[String], answers: &Answers, listener: &str) -> Vec<Run> {
    let mut runs: Vec<Run> = Vec::new();
    for entry in answers.entries() {
        match entry {
            Entry::Run { recording, first, second, trials, .. } => {
                let names = name_of(key, *recording, first).zip(name_of(key, *recording, second));
                if let Some((a, b)) = names {
                    let pair = pair_of(order, a, b);
                    runs.push(Run { pair, listener: listener.to_owned(), correct: 0, trials: *trials });
                }
            }
            Entry::Trial { x, choice, .. } if x == choice => {
                if let Some(run) = runs.last_mut() {
                    run.correct += 1;
                }
            }
            _ => {}
        }
    }
    runs
}

/// The last preference that a sitting states about each pair of each recording.
fn stated_in(key: &Key, order: &[String], answers: &Answers, listener: &str) -> Vec<Stated> {
    let mut found: Vec<((usize, Pair), Stated)> = Vec::new();
    for entry in answers.entries() {
        let Entry::Preference { recording, first, second, choice, note, .. } = entry else { continue };
        let names = name_of(key, *recording, first).zip(name_of(key, *recording, second));
        let (Some((a, b)), Some(of)) = (names, key.recording(*recording)) else { continue };
        let pair = pair_of(order, a, b);
        let preferred = if choice == NO_PREFERENCE { None } else { name_of(key, *recording, choice) };
        let note = Note {
            listener: listener.to_owned(),
            recording: of.name.clone(),
            preferred: preferred.clone(),
            note: note.clone(),
        };
        let place = (*recording, pair.clone());
        found.retain(|(earlier, _)| *earlier != place);
        found.push((place, Stated { pair, preferred, note }));
    }
    found.into_iter().map(|(_, stated)| stated).collect()
}

fn comparison(pair: &Pair, runs: &[Run], stated: &[Stated]) -> Comparison {
    let runs: Vec<&Run> = runs.iter().filter(|run| run.pair == *pair).collect();
    let mut listeners: Vec<&String> = Vec::new();
    for run in &runs {
        if !listeners.contains(&&run.listener) {
            listeners.push(&run.listener);
        }
    }
    let each: Vec<ListenerCounts> = listeners
        .into_iter()
        .filter_map(|listener| {
            let own: Vec<&Run> = runs.iter().copied().filter(|run| run.listener == *listener).collect();
            Some(ListenerCounts { listener: listener.clone(), counts: counts(&own)? })
        })
        .collect();
    let stated: Vec<&Stated> = stated.iter().filter(|stated| stated.pair == *pair).collect();
    let together = counts(&runs);
    let preference = preference(pair, &stated);
    let conclusion =
        conclusion::sentence(pair.one.as_str(), pair.other.as_str(), together, &each, preference.as_ref());
    Comparison { one: pair.one.clone(), other: pair.other.clone(), together, each, preference, conclusion }
}

fn counts(runs: &[&Run]) -> Option<Counts> {
    let trials: u32 = runs.iter().map(|run| run.trials).sum();
    let correct: u32 = runs.iter().map(|run| run.correct).sum();
    (trials > 0).then(|| {
        let (low, high) = clopper_pearson(correct, trials, CONFIDENCE);
        Counts {
            runs: runs.len() as u32,
            trials,
            correct,
            by_guessing: at_least(correct, trials, 0.5),
            needed_95: needed(trials, 0.05),
            needed_99: needed(trials, 0.01),
            interval_95: [low, high],
        }
    })
}

fn preference(pair: &Pair, stated: &[&Stated]) -> Option<Preference> {
    if stated.is_empty() {
        return None;
    }
    let count = |name: Option<&str>| stated.iter().filter(|s| s.preferred.as_deref() == name).count() as u32;
    let (one, other) = (count(Some(&pair.one)), count(Some(&pair.other)));
    let notes =
        stated.iter().map(|stated| stated.note.clone()).filter(|note| !note.note.trim().is_empty()).collect();
    Some(Preference { one, other, ties: count(None), by_chance: sign_test(one, other), notes })
}
