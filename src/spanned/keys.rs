//! Keys that are not what they should be, and what was likely meant.

use super::problem::Problem;
use super::tree::Entry;

/// The problem of a key that is not among `known`, the only ones of its table.
pub fn unknown_among(full: &str, entry: &Entry, known: &[&str]) -> Problem {
    let (label, remedy) = match nearest(&entry.key, known.iter().copied()) {
        Some(near) => (format!("did you mean `{near}`?"), format!("write `{near}`, or take the key out")),
        None => ("no such key here".to_owned(), format!("the keys here are {}", known.join(", "))),
    };
    Problem::new(&entry.key_span, format!("unknown key `{full}`"), label, remedy)
}

/// The candidate that `wanted` most likely means, if any is near enough.
pub fn nearest<'a>(wanted: &str, candidates: impl IntoIterator<Item = &'a str>) -> Option<&'a str> {
    let wanted = normal(wanted);
    let allowed = (wanted.chars().count() / 3).clamp(1, 4);
    candidates
        .into_iter()
        .map(|candidate| (strsim::damerau_levenshtein(&wanted, &normal(candidate)), candidate))
        .filter(|(distance, _)| *distance <= allowed)
        .min_by_key(|(distance, _)| *distance)
        .map(|(_, candidate)| candidate)
}

/// Case and hyphens do not count when looking for what was meant; nor does anything past the length of a real name.
pub fn normal(key: &str) -> String {
    key.trim()
        .chars()
        .take(80)
        .flat_map(char::to_lowercase)
        .map(|c| if matches!(c, '-' | ' ') { '_' } else { c })
        .collect()
}

/// The dotted path of `key` in the table at `path`.
pub fn join(path: &str, key: &str) -> String {
    if path.is_empty() { key.to_owned() } else { format!("{path}.{key}") }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_nearest_key_is_found_and_a_far_one_is_not() {
        let known = ["plate_resistor", "cathode_resistor", "tube"];
        assert_eq!(nearest("plate_resister", known), Some("plate_resistor"));
        assert_eq!(nearest("Plate-Resistor", known), Some("plate_resistor"));
        assert_eq!(nearest("tubes", known), Some("tube"));
        assert_eq!(nearest("colour", known), None);
    }
}
