//! A file's bytes as text that can be a file of the wanted kind, or the reason why not.

use std::fs::File;
use std::io::{self, Read};
use std::path::Path;

use super::FileKind;
use crate::failure::{Failure, RequestError};
use crate::terminal;

/// Largest file, bytes: a thousand times what one needs, and far below what would be slow to explain.
const LARGEST: u64 = 1 << 20;

/// The text of the file at `path`.
///
/// # Errors
/// [`RequestError`] where the file is missing, a folder, not readable, larger than 1 MiB, not UTF-8 text, or empty.
pub fn text(kind: &FileKind, path: &Path) -> Result<String, Failure> {
    let name = terminal::path(path);
    let refuse = |problem: String, remedy: &str| Failure::from(RequestError::new(problem, remedy));
    let file = File::open(path).map_err(|error| cannot_open(kind, &name, &error))?;
    if file.metadata().is_ok_and(|data| data.is_dir()) {
        return Err(is_folder(kind, &name));
    }
    let mut bytes = Vec::new();
    file.take(LARGEST + 1).read_to_end(&mut bytes).map_err(|error| cannot_open(kind, &name, &error))?;
    if bytes.len() as u64 > LARGEST {
        let problem = format!("{name} is larger than {} KiB, so it is no {}", LARGEST / 1024, kind.name);
        return Err(refuse(problem, kind.mistaken));
    }
    if bytes.contains(&0) {
        let problem = format!("{name} is a binary file; a {} is text (TOML)", kind.name);
        return Err(refuse(problem, kind.mistaken));
    }
    let text = String::from_utf8(bytes).map_err(|error| {
        let bytes = error.as_bytes();
        let line = bytes[..error.utf8_error().valid_up_to()].iter().filter(|byte| **byte == b'\n').count() + 1;
        refuse(format!("{name}, line {line}: not UTF-8 text"), "save the file as UTF-8 in the editor")
    })?;
    refuse_empty(kind, &name, &text)?;
    Ok(text)
}

/// Refuses a text that says nothing.
///
/// # Errors
/// [`RequestError`] where every line is blank or a comment.
pub fn refuse_empty(kind: &FileKind, name: &str, text: &str) -> Result<(), Failure> {
    let says_something = text
        .lines()
        .map(|line| line.trim_start_matches('\u{feff}').trim())
        .any(|line| !line.is_empty() && !line.starts_with('#'));
    if says_something {
        return Ok(());
    }
    let what = if text.trim().is_empty() { "is empty" } else { "holds nothing but comments" };
    Err(RequestError::new(format!("{} {what}", terminal::plain(name)), kind.start).into())
}

fn cannot_open(kind: &FileKind, name: &str, error: &io::Error) -> Failure {
    let (problem, remedy) = match error.kind() {
        io::ErrorKind::NotFound => (format!("there is no file {name}"), format!("check the name; {}", kind.start)),
        io::ErrorKind::IsADirectory => return is_folder(kind, name),
        io::ErrorKind::PermissionDenied => {
            (format!("{name} may not be read: {error}"), "change its permissions, or copy it".to_owned())
        }
        _ => (format!("{name} cannot be read: {error}"), "check the name".to_owned()),
    };
    RequestError::new(problem, remedy).into()
}

fn is_folder(kind: &FileKind, name: &str) -> Failure {
    RequestError::new(format!("{name} is a folder, not a {}", kind.name), format!("name the {} in it", kind.name))
        .into()
}
