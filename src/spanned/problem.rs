//! Problems of a file, each with its place, and how a person sees them.

use std::collections::HashSet;

use annotate_snippets::{AnnotationKind, Group, Level, Renderer, Snippet};

use super::tree::Span;
use crate::terminal::plain;

/// Most problems shown at once; the rest are counted.
const SHOWN_AT_ONCE: usize = 8;

/// Longest sentence of a message, characters.
const LONGEST_SENTENCE: usize = 600;

/// One problem.
#[derive(Clone, Debug, PartialEq, Eq, Hash)]
pub struct Problem {
    /// Where it is.
    pub span: Span,
    /// What is wrong, with the key.
    pub title: String,
    /// What was expected, beside the place.
    pub label: String,
    /// What to do.
    pub remedy: String,
    /// Another place that belongs to it.
    pub other: Option<Box<(Span, String)>>,
    /// Said where only some configurations have it.
    pub note: Option<Box<str>>,
    /// Whether something is not there, which may only follow from a misspelt key elsewhere.
    pub missing: bool,
}

impl Problem {
    /// A problem at one place.
    pub fn new(span: &Span, title: impl Into<String>, label: impl Into<String>, remedy: impl Into<String>) -> Self {
        Self {
            span: span.clone(),
            title: title.into(),
            label: label.into(),
            remedy: remedy.into(),
            other: None,
            note: None,
            missing: false,
        }
    }

    /// The same, with another place that belongs to it.
    pub fn beside(mut self, span: &Span, label: impl Into<String>) -> Self {
        self.other = Some(Box::new((span.clone(), label.into())));
        self
    }

    /// Whether it is the same problem, whichever configurations have it.
    pub fn is_like(&self, other: &Self) -> bool {
        self.span == other.span && self.title == other.title
    }

    /// The same, as something that is not there.
    pub fn missing(mut self) -> Self {
        self.missing = true;
        self
    }
}

/// Everything found wrong in one file.
#[derive(Debug)]
pub struct Diagnosis {
    name: String,
    text: String,
    problems: Vec<Problem>,
}

impl Diagnosis {
    /// The problems of `text`, the file that a person knows as `name`; in the order of the file, none twice.
    pub fn new(name: &str, text: &str, problems: Vec<Problem>) -> Self {
        let mut seen = HashSet::new();
        let mut unique: Vec<Problem> =
            problems.into_iter().filter(|problem| seen.insert(problem.clone())).collect();
        unique.sort_by_key(|problem| problem.span.start);
        Self { name: plain(name).into_owned(), text: text.to_owned(), problems: unique }
    }

    /// The whole message.
    pub fn render(&self, colour: bool) -> String {
        let renderer = if colour { Renderer::styled() } else { Renderer::plain() };
        let mut blocks: Vec<String> =
            self.problems.iter().take(SHOWN_AT_ONCE).map(|problem| self.render_one(&renderer, problem)).collect();
        match self.problems.len().saturating_sub(SHOWN_AT_ONCE) {
            0 => {}
            1 => blocks.push("and one more problem".to_owned()),
            more => blocks.push(format!("and {more} more problems")),
        }
        blocks.join("\n\n")
    }

    fn render_one(&self, renderer: &Renderer, problem: &Problem) -> String {
        // Only the lines that matter are handed on: the file may be large, and hidden signs in them are written out.
        let excerpt = Excerpt::around(&self.text, problem);
        let mut snippet = Snippet::source(excerpt.text)
            .line_start(excerpt.first_line)
            .path(self.name.as_str())
            .annotation(AnnotationKind::Primary.span(excerpt.span).label(shown(&problem.label)));
        if let Some((span, label)) = excerpt.other {
            snippet = snippet.annotation(AnnotationKind::Context.span(span).label(shown(&label)));
        }
        let mut group: Group<'_> = Level::ERROR.primary_title(shown(&problem.title)).element(snippet);
        if let Some(note) = &problem.note {
            group = group.element(Level::NOTE.message(shown(note)));
        }
        group = group.element(Level::HELP.message(shown(&problem.remedy)));
        renderer.render(&[group])
    }
}

/// A sentence for a person: hidden signs written out, and cut where a key of the file has made it endless.
fn shown(sentence: &str) -> String {
    match sentence.char_indices().nth(LONGEST_SENTENCE) {
        Some((at, _)) => format!("{}…", plain(&sentence[..at])),
        None => plain(sentence).into_owned(),
    }
}

/// The lines of a problem, hidden signs written out, with the spans moved along.
struct Excerpt {
    text: String,
    first_line: usize,
    span: Span,
    other: Option<(Span, String)>,
}

impl Excerpt {
    fn around(text: &str, problem: &Problem) -> Self {
        let span = on_one_line(text, &problem.span);
        let other = problem.other.as_deref().map(|(span, label)| (on_one_line(text, span), label.clone()));
        let first = other.as_ref().map_or(span.start, |(other, _)| other.start.min(span.start));
        let last = other.as_ref().map_or(span.end, |(other, _)| other.end.max(span.end));
        let from = text[..first].rfind('\n').map_or(0, |at| at + 1);
        let to = text[last..].find('\n').map_or(text.len(), |at| last + at);
        let (shown, places) = write_out(&text[from..to]);
        let moved = |span: &Span| {
            let start = places[span.start - from];
            start..places[span.end - from].max(start)
        };
        Self {
            first_line: text[..from].matches('\n').count() + 1,
            span: moved(&span),
            other: other.map(|(span, label)| (moved(&span), label)),
            text: shown,
        }
    }
}

/// The span inside the text, on character borders, and cut at the end of its first line.
fn on_one_line(text: &str, span: &Span) -> Span {
    let mut start = span.start.min(text.len());
    while !text.is_char_boundary(start) {
        start -= 1;
    }
    let mut end = span.end.clamp(start, text.len());
    while !text.is_char_boundary(end) {
        end += 1;
    }
    let end = text[start..end].find('\n').map_or(end, |at| start + at);
    start..end
}

/// The text with hidden signs written out, and where each of its bytes has gone.
fn write_out(text: &str) -> (String, Vec<usize>) {
    let mut shown = String::with_capacity(text.len());
    let mut places = Vec::with_capacity(text.len() + 1);
    for c in text.chars() {
        places.extend(std::iter::repeat_n(shown.len(), c.len_utf8()));
        match c {
            '\n' => shown.push('\n'),
            '\t' => shown.push_str("    "),
            '\r' => {}
            other => shown.push_str(&plain(other.encode_utf8(&mut [0; 4]))),
        }
    }
    places.push(shown.len());
    (shown, places)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn diagnosis(text: &str, span: Span) -> String {
        Diagnosis::new("stage.toml", text, vec![Problem::new(&span, "wrong", "expected right", "do right")])
            .render(false)
    }

    #[test]
    fn a_message_names_file_line_and_remedy() {
        let shown = diagnosis("a = 1\nb = 2\n", 10..11);
        assert!(shown.contains("error: wrong"), "{shown}");
        assert!(shown.contains("stage.toml:2:5"), "{shown}");
        assert!(shown.contains("b = 2"), "{shown}");
        assert!(shown.contains("expected right") && shown.contains("do right"), "{shown}");
    }

    #[test]
    fn hidden_signs_of_the_file_stay_off_the_terminal() {
        let text = "title = \"\u{202e}\u{1b}[31m\tx\" \r\nb = 2\r\n";
        let shown = diagnosis(text, 8..text.find('\r').expect("there"));
        assert!(!shown.contains(['\u{202e}', '\u{1b}', '\t', '\r']), "{shown:?}");
    }

    #[test]
    fn any_span_can_be_shown() {
        let text = "é = 1\n\nü";
        for start in 0..text.len() + 3 {
            for end in start..text.len() + 3 {
                assert!(diagnosis(text, start..end).contains("stage.toml"));
            }
        }
        assert!(diagnosis("", 0..0).contains("stage.toml"));
    }

    #[test]
    fn a_flood_is_counted() {
        let text = "x = 1\n".repeat(40);
        let problems = (0..40).map(|at| Problem::new(&(at * 6..at * 6 + 1), "wrong", "", "")).collect();
        let shown = Diagnosis::new("stage.toml", &text, problems).render(false);
        assert_eq!(shown.matches("error: wrong").count(), SHOWN_AT_ONCE);
        assert!(shown.contains("and 32 more problems"));
    }
}
