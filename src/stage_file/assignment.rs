//! Which keys a configuration may change, and the change itself.

use super::keys;
use super::names;
use super::problem::Problem;
use super::schema::{self, Kind, STAGE_TABLES, Status};
use super::tree::{Entry, Node, Span, Table, Value};

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

impl Assignment {
    /// The key and the value for a person.
    pub fn shown(&self) -> (String, String) {
        (self.written.clone(), names::shown_value(&self.path, &self.node))
    }

    /// Makes the change in the tree.
    pub fn apply(&self, root: &mut Table) {
        let is_part = matches!(schema::find(&self.path).map(|key| key.kind), Some(Kind::Part(..)));
        if let Some(standing) = root.at_mut(&self.path) {
            if is_part {
                merge_part(standing, &self.node, &self.key_span)
            } else {
                *standing = self.node.clone()
            }
            return;
        }
        if let Some(Node { value: Value::Table(table), .. }) = root.at_mut(schema::parent(&self.path)) {
            table.set(schema::last(&self.path), self.key_span.clone(), self.node.clone());
        }
    }
}

/// A key that may be overridden.
#[derive(Clone, Debug)]
pub struct Target {
    /// The path as written.
    pub written: String,
    /// Where it is written.
    pub span: Span,
    /// Path of the key, or of the part whose own key it is.
    pub path: String,
    /// The part's own key: tolerance, watts or volts.
    part_key: Option<String>,
}

impl Target {
    /// The change to `node`.
    pub fn assign(&self, node: &Node) -> Assignment {
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

/// The keys that a written key names, linked by +; a key that has been taken already is a problem.
pub fn targets(
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
