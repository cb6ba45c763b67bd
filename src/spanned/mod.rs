//! TOML files that a person writes, read so that every complaint points at its line.
//!
//! The text becomes a tree whose keys and values know their place ([`tree`]); [`value`] takes one value as the kind that
//! is wanted; a [`problem::Problem`] is a complaint with its place, and a [`problem::Diagnosis`] shows all of a file's.

pub mod keys;
pub mod problem;
pub mod quantity;
pub mod read;
pub mod tree;
pub mod value;

use problem::Problem;
use toml::de::DeTable;
use tree::Table;

/// A kind of file, as messages speak of it.
#[derive(Clone, Copy, Debug)]
pub struct FileKind {
    /// "stage file".
    pub name: &'static str,
    /// What to do where there is none: the end of a sentence.
    pub start: &'static str,
    /// What to check where the file cannot be of this kind.
    pub mistaken: &'static str,
}

/// The tree of `text`, a file of `kind`.
///
/// # Errors
/// The [`Problem`] where it is not TOML.
pub fn parse(kind: &FileKind, text: &str) -> Result<Table, Problem> {
    match DeTable::parse(text) {
        Ok(parsed) => Ok(Table::from_toml(parsed.get_ref())),
        Err(error) => {
            let span = error.span().unwrap_or(text.len()..text.len());
            let remedy = format!(
                "a {} is TOML: [table] lines, and below them one key = value on a line, texts between quotation marks",
                kind.name
            );
            let title = format!("this is not TOML: {}", error.message());
            Err(Problem::new(&span, title, "the reading stops here", remedy))
        }
    }
}
