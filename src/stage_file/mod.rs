//! The stage file: TOML text in, a checked stage for every configuration out.
//!
//! The text becomes a tree whose keys and values know their place ([`crate::spanned`]); one table of keys ([`schema`]) says what
//! may stand where; the changes of `[compare]` and `[[configuration]]` are applied to the tree ([`overrides`]), so that
//! a value of theirs that is wrong is shown where it was written; and each configuration is then checked as a whole
//! ([`build`]).

mod assignment;
mod build;
mod compare;
mod keys;
mod names;
mod overrides;
mod schema;
mod sets;
mod tubes;

use std::collections::BTreeMap;
use std::path::Path;

use platewright_dsp::circuit::Stage;

pub use build::PartRating;
pub use names::file_stems;
pub use tubes::Library;

use crate::failure::{Failure, RequestError};
use crate::spanned::{self, FileKind, problem, quantity, read, tree, value};
use problem::{Diagnosis, Problem};
use tree::{Node, Table};
use tubes::Tubes;

const KIND: FileKind = FileKind {
    name: "stage file",
    start: "`platewright new stage.toml` writes a commented example to start from",
    mistaken: "check the name: was a recording meant, which goes after --play?",
};

/// A stage file that has been read and checked.
#[derive(Clone, Debug)]
pub struct StageFile {
    /// Title, as written: show it through [`crate::terminal::plain`].
    pub title: Option<String>,
    /// The whole text.
    #[allow(dead_code, reason = "the report prints the file that its figures come from")]
    pub text: String,
    /// Every configuration, in the order of the file; at least one.
    pub configurations: Vec<Configuration>,
    /// What a user should know although nothing is wrong.
    pub notes: Vec<String>,
}

/// One configuration of the stage.
#[derive(Clone, Debug)]
pub struct Configuration {
    /// Its name, as written: show it through [`crate::terminal::plain`].
    pub name: String,
    /// The name made safe: the stem of its files, unlike every other's even where case does not count.
    pub file_stem: String,
    /// The keys that it changes and their values for a person, in order.
    #[allow(dead_code, reason = "the report lists what each configuration changes")]
    pub settings: Vec<(String, String)>,
    /// The stage with these values.
    pub stage: Stage,
    /// What parts state beside their values, by part: "gain.plate_resistor", "input.pot", "gain.bypass" (its
    /// capacitor), "output.load". Parts that state nothing are left out.
    pub ratings: BTreeMap<String, PartRating>,
}

impl StageFile {
    /// Reads and checks the file at `path`.
    ///
    /// # Errors
    /// [`RequestError`] where it cannot be read or anything in it is wrong.
    pub fn load(path: &Path, library: &Library<'_>) -> Result<Self, Failure> {
        let text = read::text(&KIND, path)?;
        Self::parse(&path.to_string_lossy(), text, library)
    }

    /// Checks `text`, the stage file that a person knows as `name`.
    ///
    /// # Errors
    /// [`RequestError`] where the text is empty or anything in it is wrong; many problems at once where they do not
    /// follow from each other.
    pub fn parse(name: &str, text: String, library: &Library<'_>) -> Result<Self, Failure> {
        read::refuse_empty(&KIND, name, &text)?;
        match check(&text, library) {
            Ok(checked) => Ok(Self { text, ..checked }),
            Err(problems) => Err(RequestError::File(Box::new(Diagnosis::new(name, &text, problems))).into()),
        }
    }
}

fn check(text: &str, library: &Library<'_>) -> Result<StageFile, Vec<Problem>> {
    let root = spanned::parse(&KIND, text).map_err(|problem| vec![problem])?;
    let end = text.trim_end().len();
    let mut problems = Vec::new();
    let mut notes = Vec::new();
    keys::check("", &root, &mut problems);
    check_head(&root, &mut problems);
    let misspelt = !problems.is_empty();
    let tubes = Tubes::read(&root, library, &mut problems, &mut notes);
    let variants = overrides::variants(&root, &mut problems);

    // Each configuration copies what it changes: the stage, not the tubes and lists beside it.
    let drawing = root.only(&schema::STAGE_TABLES);
    let results: Vec<_> =
        variants.iter().map(|variant| build::build(&variant.apply(&drawing), end, &tubes)).collect();
    // What is wrong with the stage as drawn is told even where every list changes it; what is missing a list may bring.
    let mut drawn = build::build(&drawing, end, &tubes).err().unwrap_or_default();
    drawn.retain(|problem| !problem.missing);
    let varied = gather(&variants, &results);
    problems.extend(varied.into_iter().filter(|problem| !drawn.iter().any(|known| known.is_like(problem))));
    problems.append(&mut drawn);
    if misspelt {
        // What is missing may only be missing because it is misspelt.
        problems.retain(|problem| !problem.missing);
    }
    if !problems.is_empty() {
        return Err(problems);
    }

    let stems = names::file_stems(variants.iter().map(|variant| variant.name.as_str()));
    let configurations = variants
        .iter()
        .zip(stems)
        .zip(results)
        .filter_map(|((variant, file_stem), built)| {
            let built = built.ok()?;
            let (name, settings) = (variant.name.clone(), variant.settings());
            Some(Configuration { name, file_stem, settings, stage: built.stage, ratings: built.ratings })
        })
        .collect();
    let title = root.get("title").and_then(Node::as_text).map(str::to_owned);
    Ok(StageFile { title, text: String::new(), configurations, notes })
}

fn check_head(root: &Table, problems: &mut Vec<Problem>) {
    if let Some(node) = root.get("format")
        && let Err(mut problem) = value::number("format", "version of this file format", &quantity::FORMAT, node)
    {
        problem.remedy = "this version reads format 1: write format = 1, or leave it out".to_owned();
        problems.push(problem);
    }
    if let Some(node) = root.get("title")
        && let Err(problem) = value::text("title", "a title for the report", node)
    {
        problems.push(problem);
    }
}

/// The problems of all configurations, each once; where only some have it, which.
fn gather(variants: &[overrides::Variant], results: &[Result<build::Built, Vec<Problem>>]) -> Vec<Problem> {
    let mut gathered: Vec<(Problem, Vec<usize>)> = Vec::new();
    for (at, problems) in results.iter().enumerate().filter_map(|(at, result)| Some((at, result.as_ref().err()?))) {
        for problem in problems {
            match gathered.iter_mut().find(|(known, _)| known == problem) {
                Some((_, places)) => places.push(at),
                None => gathered.push((problem.clone(), vec![at])),
            }
        }
    }
    let note = |places: &[usize]| {
        let first = value::shorten(&variants[places[0]].name);
        match places.len() {
            all if all == variants.len() => None,
            1 => Some(format!("in the configuration \"{first}\"").into()),
            2 => Some(format!("in the configuration \"{first}\" and one more").into()),
            more => Some(format!("in the configuration \"{first}\" and {} more", more - 1).into()),
        }
    };
    gathered.into_iter().map(|(problem, places)| Problem { note: note(&places), ..problem }).collect()
}

#[cfg(test)]
mod tests;
