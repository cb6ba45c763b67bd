//! Names of configurations, and the file names made from them.

use std::collections::HashSet;

use super::schema::{self, Kind};
use super::tree::{Node, Value};

/// The name that a stage file without anything to compare gives its one configuration.
pub const AS_DRAWN: &str = "as drawn";

/// Longest file stem, bytes: file systems allow 255, and an ending and a number must fit.
const LONGEST_STEM: usize = 120;

/// A value for a person: "47k", "12AU7", "in". A text stays as it is written; 47000 becomes "47k".
pub fn shown_value(path: &str, node: &Node) -> String {
    match &node.value {
        Value::Switch(on) if path == "gain.bypass.engaged" => (if *on { "in" } else { "out" }).to_owned(),
        Value::Switch(on) => on.to_string(),
        Value::Text(text) => text.clone(),
        Value::Number { value, written } => match schema::find(path).map(|key| key.kind) {
            Some(Kind::Part(quantity, _) | Kind::Number(quantity)) => quantity.show(*value),
            _ => written.clone(),
        },
        Value::Table(table) => match table.get("value") {
            Some(value) => shown_value(path, value),
            None => table.entries().iter().map(|entry| pair(&entry.key, &entry.node)).collect::<Vec<_>>().join(" "),
        },
        Value::List(_) | Value::Time => node.describe().to_owned(),
    }
}

fn pair(key: &str, node: &Node) -> String {
    format!("{key} {}", shown_value("", node))
}

/// How one value of one `[compare]` list enters the name: a tube by its type, the bypass switch as "bypass in" or
/// "bypass out", anything else as its last key and the value. Keys that are linked by + and come out the same say it
/// once: one tube in both places is "12AU7", one value in two stoppers "grid_stopper 560".
pub fn label(paths: &[String], node: &Node) -> String {
    let mut parts: Vec<String> = Vec::new();
    for path in paths {
        let value = shown_value(path, node);
        let part = match schema::find(path).map(|key| key.kind) {
            Some(Kind::Tube) => value,
            _ if path == "gain.bypass.engaged" => format!("bypass {value}"),
            _ => format!("{} {value}", schema::last(path)),
        };
        if !parts.contains(&part) {
            parts.push(part);
        }
    }
    parts.join(", ")
}

/// File stems for names, in order: safe on every file system, and no two alike even where case does not count.
pub fn file_stems<'a>(names: impl IntoIterator<Item = &'a str>) -> Vec<String> {
    let mut taken = HashSet::new();
    names
        .into_iter()
        .map(|name| {
            let stem = safe_stem(name);
            let mut candidate = stem.clone();
            let mut number = 2;
            while !taken.insert(candidate.to_lowercase()) {
                candidate = format!("{stem} {number}");
                number += 1;
            }
            candidate
        })
        .collect()
}

/// The name with everything replaced that some file system or shell minds. Letters and digits of any script stay.
fn safe_stem(name: &str) -> String {
    let mut stem = String::new();
    for c in name.trim().chars() {
        let safe =
            if c.is_alphanumeric() || matches!(c, ' ' | ',' | '.' | '-' | '+' | '_' | '(' | ')') { c } else { '_' };
        if stem.len() + safe.len_utf8() > LONGEST_STEM {
            break;
        }
        stem.push(safe);
    }
    // A leading dot hides a file, a leading hyphen looks like an option, a last dot or space is dropped by Windows.
    let mut stem = stem.trim_end_matches([' ', '.']).to_owned();
    if stem.starts_with(['.', '-']) {
        stem.replace_range(..1, "_");
    }
    if stem.is_empty() || is_reserved(&stem) {
        stem.insert(0, '_');
    }
    stem
}

/// Device names that Windows keeps for itself, with or without an ending.
fn is_reserved(stem: &str) -> bool {
    let base = stem.split('.').next().unwrap_or(stem).trim_end().to_ascii_uppercase();
    let numbered = |prefix: &str| {
        base.strip_prefix(prefix).is_some_and(|rest| rest.len() == 1 && rest.chars().all(|c| c.is_ascii_digit()))
    };
    matches!(base.as_str(), "CON" | "PRN" | "AUX" | "NUL") || numbered("COM") || numbered("LPT")
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn names_that_are_safe_stay_as_they_are() {
        assert_eq!(
            file_stems(["12AU7, bypass in", "as drawn", "plate_resistor 47k"]),
            ["12AU7, bypass in", "as drawn", "plate_resistor 47k"]
        );
    }

    #[test]
    fn names_are_made_safe() {
        let cases = [
            ("../../etc/passwd", "_._.._etc_passwd"),
            ("a/b\\c:d", "a_b_c_d"),
            ("-rf", "_rf"),
            (".hidden", "_hidden"),
            ("dot.", "dot"),
            ("...", "_"),
            ("nul", "_nul"),
            ("COM1.wav", "_COM1.wav"),
            ("Röhre 真空管", "Röhre 真空管"),
            ("\u{202e}\u{1b}x", "__x"),
            ("   ", "_"),
        ];
        for (name, stem) in cases {
            assert_eq!(safe_stem(name), stem, "{name:?}");
        }
        assert!(safe_stem(&"ö".repeat(500)).len() <= LONGEST_STEM);
    }

    #[test]
    fn clashes_are_numbered_whatever_their_case() {
        assert_eq!(file_stems(["a/b", "A_B", "a_b 2", "a:b"]), ["a_b", "A_B 2", "a_b 2 2", "a_b 3"]);
    }
}
