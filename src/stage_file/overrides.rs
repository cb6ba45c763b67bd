//! `[compare]` lists and `[[configuration]]` sets: which keys they may change, and the configurations they make.

use std::collections::HashSet;

use super::keys;
use super::names;
use super::problem::Problem;
use super::schema::{self, Kind, STAGE_TABLES, Status};
use super::tree::{Entry, Node, Span, Table, Value};

/// Most configurations of one stage file.
pub const MOST_CONFIGURATIONS: usize = 256;

/// One key that a configuration changes.
#[derive(Clone, Debug)]
pub struct Assignment {
    /// Path of the key; a part's own keys ("gain.plate_resistor.watts") have become a table at the part.
    path: String,
    /// The path as written.
    written: String,
    key_span: Span,
    node: Node,
}

/// One configuration before its stage has been checked.
#[derive(Clone, Debug)]
pub struct Variant {
    /// Its name.
    pub name: String,
    /// Where the name comes from.
    pub name_span: Span,
    /// What it changes.
    pub assignments: Vec<Assignment>,
}

impl Variant {
    /// Keys and values for a person.
    pub fn settings(&self) -> Vec<(String, String)> {
        let shown = |set: &Assignment| (set.written.clone(), names::shown_value(&set.path, &set.node));
        self.assignments.iter().map(shown).collect()
    }

    /// The tree with this configuration's changes.
    pub fn apply(&self, root: &Table) -> Table {
        let mut changed = root.clone();
        for set in &self.assignments {
            set_at(&mut changed, set);
        }
        changed
    }
}

/// The configurations in the order of the file, and what is wrong with them.
pub fn variants(root: &Table, problems: &mut Vec<Problem>) -> Vec<Variant> {
    let found = problems.len();
    let lists = compare_lists(root, problems);
    let mut sets = configuration_sets(root, problems);
    let product = match lists.len() {
        0 => 0,
        _ => lists.iter().fold(1_usize, |product, list| product.saturating_mul(list.values.len())),
    };
    // Counted before anything is built: ten lists of ten values are ten thousand million configurations.
    if product.saturating_add(sets.len()) > MOST_CONFIGURATIONS {
        problems.push(too_many(root, product, sets.len()));
    }
    if problems.len() > found {
        return Vec::new();
    }
    let mut variants = combine(&lists);
    variants.append(&mut sets);
    if variants.is_empty() {
        variants.push(Variant { name: names::AS_DRAWN.to_owned(), name_span: 0..0, assignments: Vec::new() });
    }
    problems.extend(duplicate_names(&variants));
    variants
}

/// One list of `[compare]` with the keys that it sets together.
struct CompareList<'a> {
    keys: Vec<Target>,
    values: &'a [Node],
}

/// A key that may be overridden.
#[derive(Clone, Debug)]
struct Target {
    written: String,
    span: Span,
    /// Path of the key, or of the part whose own key it is.
    path: String,
    /// The part's own key: tolerance, watts or volts.
    part_key: Option<String>,
}

impl Target {
    fn assign(&self, node: &Node) -> Assignment {
        let node = match &self.part_key {
            None => node.clone(),
            Some(key) => {
                let mut table = Table::default();
                table.set(key, self.span.clone(), node.clone());
                Node { span: node.span.clone(), value: Value::Table(table) }
            }
        };
        Assignment { path: self.path.clone(), written: self.written.clone(), key_span: self.span.clone(), node }
    }

    fn id(&self) -> (&str, Option<&str>) {
        (&self.path, self.part_key.as_deref())
    }
}

fn combine(lists: &[CompareList<'_>]) -> Vec<Variant> {
    let mut variants: Vec<Variant> = Vec::new();
    for (at, list) in lists.iter().enumerate() {
        let paths: Vec<String> = list.keys.iter().map(|key| key.written.clone()).collect();
        let choices = list.values.iter().map(|node| Variant {
            name: names::label(&paths, node),
            name_span: node.span.clone(),
            assignments: list.keys.iter().map(|key| key.assign(node)).collect(),
        });
        variants = if at == 0 {
            choices.collect()
        } else {
            let choices: Vec<Variant> = choices.collect();
            variants.iter().flat_map(|before| choices.iter().map(move |choice| joined(before, choice))).collect()
        };
    }
    variants
}

fn joined(before: &Variant, choice: &Variant) -> Variant {
    Variant {
        name: format!("{}, {}", before.name, choice.name),
        name_span: choice.name_span.clone(),
        assignments: before.assignments.iter().chain(&choice.assignments).cloned().collect(),
    }
}

fn compare_lists<'a>(root: &'a Table, problems: &mut Vec<Problem>) -> Vec<CompareList<'a>> {
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

/// The keys that a written key names, linked by +; a key that has been taken already is a problem.
fn targets(
    root: &Table,
    written: &str,
    entry: &Entry,
    taken: &mut Vec<Target>,
    problems: &mut Vec<Problem>,
) -> Option<Vec<Target>> {
    let mut found = Vec::new();
    for path in written.split('+').map(str::trim) {
        match target(root, path, &entry.key_span) {
            Err(problem) => problems.push(problem),
            Ok(target) => {
                if let Some(earlier) = taken.iter().find(|earlier| earlier.id() == target.id()) {
                    problems.push(set_twice(path, &target.span, &earlier.span));
                } else {
                    taken.push(target.clone());
                    found.push(target);
                }
            }
        }
    }
    (found.len() == written.split('+').count()).then_some(found)
}

fn set_twice(path: &str, span: &Span, earlier: &Span) -> Problem {
    let problem = Problem::new(
        span,
        format!("`{path}` is set twice"),
        "set here again",
        "leave it in one place, or link keys by +",
    );
    if earlier == span { problem } else { problem.beside(earlier, "first set here") }
}

fn target(root: &Table, path: &str, span: &Span) -> Result<Target, Problem> {
    let whole = |path: &str, part_key: Option<&str>| Target {
        written: path.to_owned(),
        span: span.clone(),
        path: part_key.map_or(path, |_| schema::parent(path)).to_owned(),
        part_key: part_key.filter(|key| *key != "value").map(str::to_owned),
    };
    let Some(key) = schema::find(path) else {
        let part = schema::find(schema::parent(path)).filter(|key| matches!(key.kind, Kind::Part(..)));
        let part_key = schema::PART_KEYS.iter().map(|(key, _)| *key).find(|key| *key == schema::last(path));
        return match (part, part_key) {
            (Some(part), Some(part_key)) => {
                stands(root, part.path, path, span).map(|()| whole(path, Some(part_key)))
            }
            _ => Err(unknown_path(path, span)),
        };
    };
    if key.status == Status::NotYet {
        let title = format!("`{path}` is not available yet");
        return Err(Problem::new(span, title, format!("{}: not yet", key.doc), "take it out until then"));
    }
    let table = path.split('.').next().unwrap_or(path);
    if !STAGE_TABLES.contains(&table) || !path.contains('.') {
        let title = format!("`{path}` cannot be changed by a configuration");
        let remedy = format!("write a key of {}, such as \"gain.plate_resistor\"", STAGE_TABLES.join(", "));
        return Err(Problem::new(span, title, "expected a key of the stage's own tables", remedy));
    }
    stands(root, path, path, span).map(|()| whole(path, None))
}

/// Whether the table of `path` stands in the file.
fn stands(root: &Table, path: &str, written: &str, span: &Span) -> Result<(), Problem> {
    let table = schema::parent(path);
    if root.table_at(table).is_some() {
        return Ok(());
    }
    let shown = if table.contains('.') { format!("`{table}`") } else { format!("[{table}] table") };
    Err(Problem::new(
        span,
        format!("`{written}` is to be changed, but the stage has no {shown}"),
        format!("this stage has no {shown}"),
        format!("add {shown} to the stage, or take this key out"),
    ))
}

fn unknown_path(path: &str, span: &Span) -> Problem {
    // A key below a later key is as late as that one.
    let later = schema::KEYS.iter().find(|key| {
        key.status == Status::NotYet && path.strip_prefix(key.path).is_some_and(|rest| rest.starts_with('.'))
    });
    if let Some(key) = later {
        let title = format!("`{path}` is not available yet");
        return Problem::new(span, title, format!("{}: not yet", key.doc), "take it out until then");
    }
    let known = schema::KEYS
        .iter()
        .filter(|key| key.status == Status::Now && !matches!(key.kind, Kind::Table) && key.path.contains('.'))
        .filter(|key| STAGE_TABLES.iter().any(|table| key.path.starts_with(table)))
        .map(|key| key.path);
    let same_name = known.clone().find(|key| schema::last(key) == path);
    let (label, remedy) = match same_name.or_else(|| keys::nearest(path, known)) {
        Some(near) => (format!("did you mean `{near}`?"), format!("write \"{near}\", or take it out")),
        None => ("no such key".to_owned(), "write table and key, such as \"gain.plate_resistor\"".to_owned()),
    };
    Problem::new(span, format!("unknown key `{path}`"), label, remedy)
}

fn configuration_sets(root: &Table, problems: &mut Vec<Problem>) -> Vec<Variant> {
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

fn set_at(root: &mut Table, set: &Assignment) {
    let is_part = matches!(schema::find(&set.path).map(|key| key.kind), Some(Kind::Part(..)));
    if let Some(standing) = root.at_mut(&set.path) {
        if is_part {
            merge_part(standing, &set.node, &set.key_span)
        } else {
            *standing = set.node.clone()
        }
        return;
    }
    if let Some(Node { value: Value::Table(table), .. }) = root.at_mut(schema::parent(&set.path)) {
        table.set(schema::last(&set.path), set.key_span.clone(), set.node.clone());
    }
}

/// A plain value over a part's table keeps its ratings; a table over a plain value keeps the value.
fn merge_part(standing: &mut Node, new: &Node, key_span: &Span) {
    match (&mut standing.value, &new.value) {
        (Value::Table(table), Value::Table(changes)) => {
            for entry in changes.entries() {
                table.set(&entry.key, entry.key_span.clone(), entry.node.clone());
            }
        }
        (Value::Table(table), _) => table.set("value", key_span.clone(), new.clone()),
        (_, Value::Table(changes)) if changes.get("value").is_none() => {
            let mut table = changes.clone();
            table.set("value", standing.span.clone(), standing.clone());
            *standing = Node { span: new.span.clone(), value: Value::Table(table) };
        }
        _ => *standing = new.clone(),
    }
}

fn too_many(root: &Table, product: usize, sets: usize) -> Problem {
    let span = root.get("compare").or(root.get("configuration")).map_or(0..0, |node| node.span.clone());
    let count = match (product, sets) {
        (usize::MAX, _) => "more than can be counted".to_owned(),
        (0, sets) => format!("{sets}"),
        (product, 0) => format!("{product} combinations"),
        (product, sets) => format!("{product} combinations and {sets} more"),
    };
    Problem::new(
        &span,
        format!("there are too many configurations: {count}"),
        format!("expected at most {MOST_CONFIGURATIONS} configurations in all"),
        "shorten the lists, link keys by +, or name the ones you want as [[configuration]]",
    )
}

fn duplicate_names(variants: &[Variant]) -> Vec<Problem> {
    let mut problems = Vec::new();
    for (at, variant) in variants.iter().enumerate() {
        if let Some(earlier) = variants[..at].iter().find(|earlier| earlier.name == variant.name) {
            let title = format!("two configurations have the name \"{}\"", super::value::shorten(&variant.name));
            let problem = Problem::new(
                &variant.name_span,
                title,
                "this name is taken",
                "give each configuration its own name",
            );
            problems.push(problem.beside(&earlier.name_span, "taken here"));
        }
    }
    problems
}
