//! The file as a tree in which every key and value knows its place in the text.

use std::ops::Range;

use toml::de::{DeArray, DeFloat, DeInteger, DeTable, DeValue};

/// Bytes of the file's text.
pub type Span = Range<usize>;

/// A value and its place.
#[derive(Clone, Debug)]
pub struct Node {
    /// Place of the value; of a `[table]`, its header.
    pub span: Span,
    /// The value.
    pub value: Value,
}

/// A TOML value as far as these files need it.
#[derive(Clone, Debug)]
pub enum Value {
    /// A string.
    Text(String),
    /// An integer or a float, with what was written ("1e400" reads as infinite).
    Number { value: f64, written: String },
    /// true or false.
    Switch(bool),
    /// A date or time, which no key takes.
    Time,
    /// A list.
    List(Vec<Node>),
    /// A table.
    Table(Table),
}

/// A table in the order of the file.
#[derive(Clone, Debug, Default)]
pub struct Table {
    entries: Vec<Entry>,
}

/// One key of a table.
#[derive(Clone, Debug)]
pub struct Entry {
    /// The key, unquoted.
    pub key: String,
    /// Place of the key.
    pub key_span: Span,
    /// Its value.
    pub node: Node,
}

impl Table {
    /// The table of a parsed document.
    pub fn from_toml(table: &DeTable<'_>) -> Self {
        let mut entries: Vec<Entry> = table
            .iter()
            .map(|(key, value)| Entry {
                key: key.get_ref().to_string(),
                key_span: key.span(),
                node: Node { span: value.span(), value: Value::from_toml(value.get_ref()) },
            })
            .collect();
        // The parser keeps its keys sorted by name; a person reads them as written.
        entries.sort_by_key(|entry| entry.key_span.start);
        Self { entries }
    }

    /// The entries in the order of the file.
    pub fn entries(&self) -> &[Entry] {
        &self.entries
    }

    /// The entry of `key`.
    pub fn entry(&self, key: &str) -> Option<&Entry> {
        self.entries.iter().find(|entry| entry.key == key)
    }

    /// The value of `key`.
    pub fn get(&self, key: &str) -> Option<&Node> {
        self.entry(key).map(|entry| &entry.node)
    }

    /// The value at a dotted path.
    pub fn at(&self, path: &str) -> Option<&Node> {
        match path.split_once('.') {
            None => self.get(path),
            Some((first, rest)) => self.get(first)?.as_table()?.at(rest),
        }
    }

    /// The table at a dotted path.
    pub fn table_at(&self, path: &str) -> Option<&Table> {
        self.at(path)?.as_table()
    }

    /// The value at a dotted path, for change.
    pub fn at_mut(&mut self, path: &str) -> Option<&mut Node> {
        let (first, rest) = path.split_once('.').map_or((path, None), |(first, rest)| (first, Some(rest)));
        let node = &mut self.entries.iter_mut().find(|entry| entry.key == first)?.node;
        let Some(rest) = rest else { return Some(node) };
        match &mut node.value {
            Value::Table(table) => table.at_mut(rest),
            _ => None,
        }
    }

    /// Sets `key`, in place where it stands already.
    pub fn set(&mut self, key: &str, key_span: Span, node: Node) {
        match self.entries.iter_mut().find(|entry| entry.key == key) {
            Some(entry) => *entry = Entry { key: key.to_owned(), key_span, node },
            None => self.entries.push(Entry { key: key.to_owned(), key_span, node }),
        }
    }

    /// A copy with these keys alone.
    pub fn only(&self, keys: &[&str]) -> Self {
        Self { entries: self.entries.iter().filter(|entry| keys.contains(&entry.key.as_str())).cloned().collect() }
    }
}

impl Node {
    /// The table, where it is one.
    pub fn as_table(&self) -> Option<&Table> {
        match &self.value {
            Value::Table(table) => Some(table),
            _ => None,
        }
    }

    /// The text, where it is one.
    pub fn as_text(&self) -> Option<&str> {
        match &self.value {
            Value::Text(text) => Some(text),
            _ => None,
        }
    }

    /// What it is, for a message: "a list".
    pub fn describe(&self) -> &'static str {
        match self.value {
            Value::Text(_) => "a text",
            Value::Number { .. } => "a number",
            Value::Switch(_) => "true or false",
            Value::Time => "a date or time",
            Value::List(_) => "a list",
            Value::Table(_) => "a table",
        }
    }
}

impl Value {
    fn from_toml(value: &DeValue<'_>) -> Self {
        match value {
            DeValue::String(text) => Self::Text(text.to_string()),
            DeValue::Integer(integer) => {
                Self::Number { value: integer_value(integer), written: integer.to_string() }
            }
            DeValue::Float(float) => Self::Number { value: float_value(float), written: float.to_string() },
            DeValue::Boolean(on) => Self::Switch(*on),
            DeValue::Datetime(_) => Self::Time,
            DeValue::Array(list) => Self::List(list_nodes(list)),
            DeValue::Table(table) => Self::Table(Table::from_toml(table)),
        }
    }
}

fn list_nodes(list: &DeArray<'_>) -> Vec<Node> {
    list.iter().map(|item| Node { span: item.span(), value: Value::from_toml(item.get_ref()) }).collect()
}

/// An integer of any size as the nearest number.
fn integer_value(integer: &DeInteger<'_>) -> f64 {
    let digits = integer.as_str();
    match i64::from_str_radix(digits, integer.radix()) {
        Ok(value) => value as f64,
        Err(_) if integer.radix() == 10 => digits.parse().unwrap_or(f64::NAN),
        Err(_) => u128::from_str_radix(digits, integer.radix()).map_or(f64::INFINITY, |value| value as f64),
    }
}

fn float_value(float: &DeFloat<'_>) -> f64 {
    float.as_str().parse().unwrap_or(f64::NAN)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn spans_cover_what_a_person_would_point_at() {
        let text = "a = 1\n[gain]\ntube = \"12AU7\"\nbypass = { esr = 0.1 }\n[[tube]]\ntype = \"X\"\n[[tube]]\nb.c = [1,\n 2]\n";
        let parsed = DeTable::parse(text).expect("valid TOML");
        let tree = Table::from_toml(parsed.get_ref());
        let shown = |span: &Span| text[span.clone()].to_owned();
        assert_eq!(tree.entries().iter().map(|e| e.key.as_str()).collect::<Vec<_>>(), ["a", "gain", "tube"]);
        assert_eq!(shown(&tree.at("gain").expect("there").span), "[gain]");
        assert_eq!(shown(&tree.at("gain.tube").expect("there").span), "\"12AU7\"");
        assert_eq!(shown(&tree.at("gain.bypass").expect("there").span), "{ esr = 0.1 }");
        let Value::List(tubes) = &tree.get("tube").expect("there").value else { panic!("a list") };
        assert_eq!(shown(&tubes[1].span), "[[tube]]");
        assert_eq!(shown(&tubes[1].as_table().expect("a table").at("b").expect("there").span), "b");
    }

    #[test]
    fn numbers_keep_what_was_written() {
        let text = "a = 1e400\nb = 0x10\nc = 1_000\nd = 99999999999999999999\ne = nan\nf = -inf\ng = 0x1_0";
        let parsed = DeTable::parse(text).expect("valid TOML");
        let tree = Table::from_toml(parsed.get_ref());
        let number = |key: &str| match &tree.get(key).expect("there").value {
            Value::Number { value, written } => (*value, written.clone()),
            _ => panic!("a number"),
        };
        assert_eq!(number("a"), (f64::INFINITY, "1e400".to_owned()));
        assert_eq!(number("b").0, 16.0);
        assert_eq!(number("c").0, 1000.0);
        assert_eq!(number("d").0, 1e20);
        assert!(number("e").0.is_nan());
        assert_eq!(number("f").0, f64::NEG_INFINITY);
        assert_eq!(number("g").0, 16.0);
    }
}
