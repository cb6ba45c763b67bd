//! What reaches a person's terminal: text without hidden signs, and output that survives a closed pipe.

use std::borrow::Cow;
use std::io::{self, IsTerminal, Write};
use std::path::Path;

use crate::failure::{Failure, WorkError};

/// The text with control characters and direction marks written out, so that a name cannot move the cursor, colour
/// the screen or turn the line around.
pub fn plain(text: &str) -> Cow<'_, str> {
    if !text.contains(is_hidden) {
        return Cow::Borrowed(text);
    }
    let mut shown = String::with_capacity(text.len() + 16);
    for c in text.chars() {
        if is_hidden(c) {
            shown.extend(c.escape_unicode());
        } else {
            shown.push(c);
        }
    }
    Cow::Owned(shown)
}

/// A path as [`plain`] text.
pub fn path(path: &Path) -> String {
    plain(&path.to_string_lossy()).into_owned()
}

/// Control characters, line and paragraph separators, and the marks, embeddings, overrides and isolates of the Unicode
/// bidirectional algorithm (UAX #9).
fn is_hidden(c: char) -> bool {
    c.is_control()
        || matches!(c, '\u{61c}' | '\u{200e}' | '\u{200f}' | '\u{2028}'..='\u{202e}' | '\u{2066}'..='\u{2069}' | '\u{feff}')
}

/// Whether messages may be coloured: standard error is a terminal and NO_COLOR is unset or empty.
pub fn colour() -> bool {
    io::stderr().is_terminal() && std::env::var_os("NO_COLOR").is_none_or(|value| value.is_empty())
}

/// Writes to standard output.
///
/// # Errors
/// [`Failure::ReaderGone`] where the other end of a pipe has closed, [`WorkError::Write`] for any other trouble.
pub fn print(text: &str) -> Result<(), Failure> {
    let mut out = io::stdout().lock();
    match out.write_all(text.as_bytes()).and_then(|()| out.flush()) {
        Ok(()) => Ok(()),
        Err(error) if error.kind() == io::ErrorKind::BrokenPipe => Err(Failure::ReaderGone),
        Err(source) => Err(WorkError::Write { what: "standard output".to_owned(), source }.into()),
    }
}

/// Writes a message to standard error; a closed standard error is no trouble of anyone's.
pub fn message(text: &str) {
    let _ = writeln!(io::stderr().lock(), "{text}");
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn hidden_signs_are_written_out() {
        assert_eq!(plain("warm ♥ Röhre 真空管"), "warm ♥ Röhre 真空管");
        assert_eq!(plain("a\u{1b}[31mb"), "a\\u{1b}[31mb");
        assert_eq!(plain("\u{202e}evil\u{2066}"), "\\u{202e}evil\\u{2066}");
        assert_eq!(plain("line\nbreak\t"), "line\\u{a}break\\u{9}");
    }
}
