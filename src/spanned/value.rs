//! One value of the tree as the kind that is wanted.

use super::problem::Problem;
use super::quantity::{OR_WIRE, Quantity, RESISTOR};
use super::tree::{Node, Value};
use crate::iec60062;

/// The number at `path`, in SI units.
///
/// # Errors
/// A [`Problem`] where it is no number, not finite, or outside the quantity's range.
pub fn number(path: &str, doc: &str, quantity: &Quantity, node: &Node) -> Result<f64, Problem> {
    let expected = format!("expected {}", quantity.expectation());
    let how = format!("{doc}: write it like {}", quantity.example);
    let value = match &node.value {
        Value::Number { value, .. } if value.is_nan() => {
            return Err(Problem::new(&node.span, format!("`{path}` is not a number (NaN)"), expected, how));
        }
        Value::Number { value, written } if value.is_infinite() => {
            let title = if written.contains("inf") {
                format!("`{path}` is infinite")
            } else {
                format!("`{path}`: {} is larger than any number", shorten(written))
            };
            return Err(Problem::new(&node.span, title, expected, how));
        }
        Value::Number { value, .. } => *value,
        Value::Text(text) => iec60062::parse(text).map_err(|reason| {
            let title = format!("`{path}`: \"{}\" is not a value: {reason}", shorten(text));
            Problem::new(&node.span, title, expected.clone(), how.clone())
        })?,
        _ => {
            let title = format!("`{path}` is {} where a number belongs", node.describe());
            return Err(Problem::new(&node.span, title, expected, how));
        }
    };
    if quantity.allows(value) {
        return Ok(value);
    }
    let title = format!("`{path}` is {}, which is {}", quantity.show_with_unit(value), wrongness(quantity, value));
    Err(Problem::new(&node.span, title, expected, remedy(quantity, value).unwrap_or(how)))
}

fn wrongness(quantity: &Quantity, value: f64) -> &'static str {
    match value {
        _ if value > quantity.high => "too large",
        _ if value == 0.0 && quantity.unit == "Ω" => "a wire",
        _ if value == 0.0 => "nothing",
        _ if value < 0.0 && quantity.low >= 0.0 => "negative",
        _ => "too small",
    }
}

fn remedy(quantity: &Quantity, value: f64) -> Option<String> {
    let text = match quantity.unit {
        "Ω" if value == 0.0 && quantity.low == RESISTOR.low => {
            "only grid stoppers and the bypass capacitor's esr may be 0R; give the part its value, or leave out a key that \
             need not be there"
        }
        "Ω" if value < 0.0 => "a resistor is never negative: take the sign away",
        "Ω" if value < OR_WIRE.low.max(quantity.low) => "m is milli and M is mega: was \"1M\" meant?",
        "F" if value > quantity.high => "plain numbers are farads: write \"330n\" or \"330u\"",
        "F" if value == 0.0 => "give the capacitor its value, or leave out a key that need not be there",
        "" if quantity.name == "tolerance" && value > 1.0 => "a tolerance is a fraction: 0.05 is 5 %",
        "" if quantity.name == "fraction" && value > 1.0 => {
            "a position is a fraction of the whole turn: 0.45 is 45 %"
        }
        _ => return None,
    };
    Some(text.to_owned())
}

/// The text at `path`.
///
/// # Errors
/// A [`Problem`] where it is something else, or blank.
pub fn text<'a>(path: &str, doc: &str, node: &'a Node) -> Result<&'a str, Problem> {
    let remedy = format!("{doc}: write it between quotation marks");
    match node.as_text() {
        Some(text) if !text.trim().is_empty() => Ok(text),
        Some(_) => Err(Problem::new(&node.span, format!("`{path}` is blank"), "expected a text", remedy)),
        None => {
            let title = format!("`{path}` is {} where a text belongs", node.describe());
            Err(Problem::new(&node.span, title, "expected a text", remedy))
        }
    }
}

/// Which of `words` stands at `path`, by its place in the list.
///
/// # Errors
/// A [`Problem`] where it is none of them, "not yet" where it is one of `later`.
pub fn choice(path: &str, words: &[&str], later: &[&str], node: &Node) -> Result<usize, Problem> {
    let expected =
        format!("expected {}", words.iter().map(|word| format!("\"{word}\"")).collect::<Vec<_>>().join(" or "));
    let remedy = expected.replacen("expected", "write", 1);
    let later_word = match &node.value {
        Value::Text(text) if later.contains(&text.as_str()) => Some(format!("\"{text}\"")),
        Value::Table(_) if !later.is_empty() => Some("a table".to_owned()),
        _ => None,
    };
    if let Some(word) = later_word {
        let title = format!("`{path}` as {word} is not available yet");
        return Err(Problem::new(&node.span, title, format!("{expected}: not yet"), remedy));
    }
    let Some(text) = node.as_text() else {
        let title = format!("`{path}` is {} where a word belongs", node.describe());
        return Err(Problem::new(&node.span, title, expected, remedy));
    };
    words.iter().position(|word| *word == text).ok_or_else(|| {
        let title = format!("`{path}`: \"{}\" is not one of its words", shorten(text));
        let remedy = match super::keys::nearest(text, words.iter().copied()) {
            Some(near) => format!("did you mean \"{near}\"?"),
            None => remedy,
        };
        Problem::new(&node.span, title, expected, remedy)
    })
}

/// true or false at `path`.
///
/// # Errors
/// A [`Problem`] where it is anything else.
pub fn switch(path: &str, node: &Node) -> Result<bool, Problem> {
    match node.value {
        Value::Switch(on) => Ok(on),
        _ => {
            let title = format!("`{path}` is {} where a switch belongs", node.describe());
            Err(Problem::new(
                &node.span,
                title,
                "expected true or false",
                "write true or false, without quotation marks",
            ))
        }
    }
}

/// The first forty characters: enough to know it by.
pub fn shorten(text: &str) -> String {
    match text.char_indices().nth(40) {
        Some((at, _)) => format!("{}…", &text[..at]),
        None => text.to_owned(),
    }
}
