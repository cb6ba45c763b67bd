//! Every key of the file against the schema: unknown ones with the nearest known one, later ones with "not yet".

use super::problem::Problem;
use super::schema::{self, Key, Kind, Status};
use super::tree::{Entry, Node, Table, Value};
use crate::spanned::keys::normal;
pub use crate::spanned::keys::{join, nearest, unknown_among};

/// Problems of the keys in `table`, which stands at `path` ("" is the top of the file), and below it.
pub fn check(path: &str, table: &Table, problems: &mut Vec<Problem>) {
    for entry in table.entries() {
        let full = join(path, &entry.key);
        match schema::find(&full) {
            None => problems.push(unknown(path, entry)),
            Some(key) if key.status == Status::NotYet => problems.extend(not_yet(key, table, entry)),
            Some(key) => check_shape(key, &entry.node, problems),
        }
    }
}

fn check_shape(key: &Key, node: &Node, problems: &mut Vec<Problem>) {
    match (key.kind, &node.value) {
        (Kind::Table, Value::Table(table)) => check(key.path, table, problems),
        (Kind::Overrides, Value::Table(_)) => {}
        (Kind::Table | Kind::Overrides, _) => problems.push(not_a_table(key, node)),
        (Kind::Tables, Value::List(items)) => {
            for item in items {
                match &item.value {
                    Value::Table(table) => check(key.path, table, problems),
                    _ => problems.push(not_tables(key, item)),
                }
            }
        }
        (Kind::Tables, _) => problems.push(not_tables(key, node)),
        (Kind::Part(..), Value::Table(table)) => check_part(key.path, table, problems),
        _ => {}
    }
}

/// Problems of the keys in a part's own table.
pub fn check_part(path: &str, table: &Table, problems: &mut Vec<Problem>) {
    let known = schema::PART_KEYS.map(|(key, _)| key);
    for entry in table.entries().iter().filter(|entry| !known.contains(&entry.key.as_str())) {
        problems.push(unknown_among(&join(path, &entry.key), entry, &known));
    }
}

fn unknown(path: &str, entry: &Entry) -> Problem {
    let known: Vec<&str> =
        schema::children(path).filter(|key| key.status == Status::Now).map(|key| schema::last(key.path)).collect();
    let full = join(path, &entry.key);
    if nearest(&entry.key, known.iter().copied()).is_none()
        && let Some(elsewhere) = elsewhere(&entry.key)
    {
        let remedy = format!("move it to where `{elsewhere}` belongs, or take it out");
        return Problem::new(
            &entry.key_span,
            format!("unknown key `{full}`"),
            format!("did you mean `{elsewhere}`?"),
            remedy,
        );
    }
    unknown_among(&full, entry, &known)
}

/// A key of the same name in another table of the stage.
fn elsewhere(key: &str) -> Option<&'static str> {
    let name = normal(key);
    let same = schema::KEYS.iter().find(|known| known.status == Status::Now && schema::last(known.path) == name)?;
    (same.path != name).then_some(same.path)
}

/// "not yet", or that two keys stand where one is enough.
fn not_yet(key: &Key, table: &Table, entry: &Entry) -> Option<Problem> {
    let present =
        alternative(key.path).and_then(|other| table.entry(schema::last(other)).map(|found| (other, found)));
    if let Some((other, found)) = present {
        let title = format!("both `{other}` and `{}` are there", key.path);
        let remedy = format!("keep `{other}`: `{}` is not available yet", key.path);
        return Some(
            Problem::new(&entry.key_span, title, "one or the other is expected", remedy)
                .beside(&found.key_span, "the other one"),
        );
    }
    let mut remedy = "take it out: this version does not know what to do with it".to_owned();
    if let Some(other) = alternative(key.path) {
        remedy = format!("use `{other}` until then");
    }
    Some(Problem::new(
        &entry.key_span,
        format!("`{}` is not available yet", key.path),
        format!("{}: not yet", key.doc),
        remedy,
    ))
}

/// The key of today that a later key stands instead of.
fn alternative(later: &str) -> Option<&'static str> {
    match later {
        "gain.plate_load" => Some("gain.plate_resistor"),
        "gain.bias" => Some("gain.cathode_resistor"),
        "follower.tail" => Some("follower.tail_resistor"),
        _ => None,
    }
}

fn not_a_table(key: &Key, node: &Node) -> Problem {
    let title = format!("`{}` is {} where a table belongs", key.path, node.describe());
    let remedy = if key.path.contains('.') {
        let keys: Vec<&str> = schema::children(key.path).map(|child| schema::last(child.path)).collect();
        format!("write `{} = {{ … }}` with {}", schema::last(key.path), keys.join(", "))
    } else {
        format!("write the line [{}] and the keys below it", key.path)
    };
    Problem::new(&node.span, title, format!("expected a table: {}", key.doc), remedy)
}

fn not_tables(key: &Key, node: &Node) -> Problem {
    let title = format!("`{}` is {} where a list of tables belongs", key.path, node.describe());
    let remedy = format!("write the line [[{}]] with double brackets above each", key.path);
    Problem::new(&node.span, title, format!("expected [[{}]]", key.path), remedy)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_key_in_the_wrong_table_is_sent_to_the_right_one() {
        assert_eq!(elsewhere("plate_resistor"), Some("gain.plate_resistor"));
        assert_eq!(elsewhere("colour"), None);
    }
}
