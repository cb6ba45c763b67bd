//! The sets of `[[configuration]]`.

use super::assignment::{Assignment, Target, targets};
use super::keys;
use super::overrides::Variant;
use super::problem::Problem;
use super::schema::{self, Kind};
use super::tree::{Entry, Node, Table, Value};

/// The named configurations in the order of the file, and what is wrong with them.
pub fn variants(root: &Table, problems: &mut Vec<Problem>) -> Vec<Variant> {
    let Some(Node { value: Value::List(items), .. }) = root.get("configuration") else { return Vec::new() };
    let mut variants = Vec::new();
    for item in items {
        let Some(table) = item.as_table() else { continue };
        let named = match table.get("name") {
            Some(node) => {
                super::value::text("configuration.name", "the configuration's name", node).map(|name| (name, node))
            }
            None => Err(Problem::new(
                &item.span,
                "`configuration.name` is missing",
                "this configuration has no name",
                "add name = \"…\"",
            )
            .missing()),
        };
        let assignments = match table.get("set").map(|node| &node.value) {
            Some(Value::Table(set)) => assignments(root, set, problems),
            _ => Vec::new(),
        };
        match named {
            Ok((name, node)) => {
                variants.push(Variant { name: name.to_owned(), name_span: node.span.clone(), assignments });
            }
            Err(problem) => problems.push(problem),
        }
    }
    variants
}

fn assignments(root: &Table, set: &Table, problems: &mut Vec<Problem>) -> Vec<Assignment> {
    let mut leaves = Vec::new();
    flatten_set(root, "", set, &mut leaves);
    leaves.sort_by_key(|(_, entry)| entry.key_span.start);
    let mut taken = Vec::new();
    let mut assignments = Vec::new();
    for (path, entry) in leaves {
        let Some(keys) = targets(root, &path, entry, &mut taken, problems) else { continue };
        for key in &keys {
            check_set_value(key, &entry.node, problems);
            assignments.push(key.assign(&entry.node));
        }
    }
    assignments
}

/// Leaves of a set: a table stands for the keys in it, except at a part, which takes a table, and where it brings a
/// table that the stage lacks.
fn flatten_set<'a>(root: &Table, path: &str, table: &'a Table, leaves: &mut Vec<(String, &'a Entry)>) {
    for entry in table.entries() {
        let full = keys::join(path, &entry.key);
        let kind = schema::find(&full).map(|key| key.kind);
        match &entry.node.value {
            Value::Table(inner) if !matches!(kind, Some(Kind::Part(..))) && !brings(root, &full, inner) => {
                flatten_set(root, &full, inner, leaves);
            }
            _ => leaves.push((full, entry)),
        }
    }
}

/// Whether `table` is a whole new table for `path`, where the stage has none.
fn brings(root: &Table, path: &str, table: &Table) -> bool {
    root.at(path).is_none() && schema::defining_key(path).is_some_and(|key| table.get(key).is_some())
}

fn check_set_value(key: &Target, node: &Node, problems: &mut Vec<Problem>) {
    match (schema::find(&key.path).map(|known| known.kind), &node.value) {
        (Some(Kind::Table), Value::Table(table)) => keys::check(&key.path, table, problems),
        (Some(Kind::Table), _) => {
            let title = format!("`{}` is {} where a table belongs", key.written, node.describe());
            problems.push(Problem::new(
                &node.span,
                title,
                "expected a table",
                format!("set a key of `{}`", key.path),
            ));
        }
        (Some(Kind::Part(..)), Value::Table(table)) => keys::check_part(&key.path, table, problems),
        _ => {}
    }
}
