//! The lists of `[compare]`.

use std::collections::HashSet;

use super::assignment::{Target, targets};
use super::keys;
use super::names;
use super::problem::Problem;
use super::schema::{self, Kind};
use super::tree::{Entry, Node, Table, Value};

/// One list of `[compare]` with the keys that it sets together.
pub struct CompareList<'a> {
    /// Its keys.
    pub keys: Vec<Target>,
    /// Its values, at least one.
    pub values: &'a [Node],
}

/// The lists in the order of the file, and what is wrong with them.
pub fn lists<'a>(root: &'a Table, problems: &mut Vec<Problem>) -> Vec<CompareList<'a>> {
    let Some(compare) = root.table_at("compare") else { return Vec::new() };
    let mut leaves = Vec::new();
    flatten("", compare, &mut leaves);
    leaves.sort_by_key(|(_, entry)| entry.key_span.start);
    let mut lists = Vec::new();
    let mut taken: Vec<Target> = Vec::new();
    for (path, entry) in leaves {
        let Some(keys) = targets(root, &path, entry, &mut taken, problems) else { continue };
        match compare_values(&path, entry, problems) {
            Some(values) if keys.iter().all(|key| one_value(key, values, problems)) => {
                lists.push(CompareList { keys, values })
            }
            _ => {}
        }
    }
    lists
}

/// Bare dotted keys and sub-tables of `[compare]` come as tables in tables.
fn flatten<'a>(path: &str, table: &'a Table, leaves: &mut Vec<(String, &'a Entry)>) {
    for entry in table.entries() {
        let full = keys::join(path, &entry.key);
        match &entry.node.value {
            Value::Table(inner) => flatten(&full, inner, leaves),
            _ => leaves.push((full, entry)),
        }
    }
}

fn compare_values<'a>(path: &str, entry: &'a Entry, problems: &mut Vec<Problem>) -> Option<&'a [Node]> {
    let remedy = format!(
        "write \"{path}\" = [ … ] with the values to compare; a single change belongs in [[configuration]]"
    );
    let Value::List(values) = &entry.node.value else {
        let title = format!("`compare`: \"{path}\" is {} where a list belongs", entry.node.describe());
        problems.push(Problem::new(&entry.node.span, title, "expected a list of values", remedy));
        return None;
    };
    if values.is_empty() {
        let title = format!("`compare`: the list of \"{path}\" is empty");
        problems.push(Problem::new(&entry.node.span, title, "expected at least one value", remedy));
        return None;
    }
    let found = problems.len();
    let mut seen = HashSet::new();
    for value in values {
        if matches!(value.value, Value::List(_)) {
            continue;
        }
        let label = names::label(&[path.to_owned()], value);
        if !seen.insert(label.clone()) {
            let title = format!("`compare`: \"{path}\" has the value {} twice", names::shown_value(path, value));
            problems.push(Problem::new(&value.span, title, "already in this list", "take one of them out"));
        }
    }
    (problems.len() == found).then_some(values)
}

/// Whether each value can stand at the key at all; whether it is a good one is seen when the stage is checked.
fn one_value(key: &Target, values: &[Node], problems: &mut Vec<Problem>) -> bool {
    let found = problems.len();
    if let Some(Kind::Table) = schema::find(&key.path).map(|known| known.kind) {
        let inside: Vec<String> = schema::children(&key.path).map(|child| format!("`{}`", child.path)).collect();
        let title = format!("`compare`: \"{}\" is a table, not a value", key.written);
        let remedy = format!("compare one of {}", inside.join(", "));
        problems.push(Problem::new(&key.span, title, "expected a key with a value", remedy));
    }
    for value in values {
        if let Value::Table(table) = &value.value {
            keys::check_part(&key.path, table, problems);
        }
    }
    problems.len() == found
}
