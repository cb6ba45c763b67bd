//! The tree of a profile file as a checked profile.

use super::{Profile, ProfileLevel, Target, Want};
use crate::spanned::keys::{join, unknown_among};
use crate::spanned::problem::Problem;
use crate::spanned::quantity::{FREQUENCY, Quantity, quantity};
use crate::spanned::tree::{Entry, Node, Span, Table};
use crate::spanned::{self, FileKind, value};

/// Keys of `[profile]`.
const KEYS: [&str; 4] = ["tone", "level", "output_level", "harmonics"];
/// What may be wanted of a harmonic, one of them.
const WANTS: [&str; 3] = ["wanted", "at_most", "at_least"];
/// Keys of a harmonic.
const HARMONIC_KEYS: [&str; 5] = ["wanted", "at_most", "at_least", "within", "weight"];
/// Orders that are measured.
const ORDERS: std::ops::RangeInclusive<usize> = 2..=10;

const LEVEL: Quantity = quantity("level", "V rms", 1e-9, 1e4, "0.5");
const SIZE: Quantity = quantity("size", "dBc", -300.0, 20.0, "-46");
const WITHIN: Quantity = Quantity { zero: true, ..quantity("difference", "dB", 0.0, 300.0, "1") };
const WEIGHT: Quantity = quantity("weight", "", 1e-9, 1e9, "2");

/// The profile in `text`.
///
/// # Errors
/// Everything that is wrong with it.
pub fn check(kind: &FileKind, text: &str) -> Result<Profile, Vec<Problem>> {
    let root = spanned::parse(kind, text).map_err(|problem| vec![problem])?;
    let mut checker = Checker { end: text.trim_end().len(), problems: Vec::new() };
    let profile = checker.profile(&root);
    match profile {
        Some(profile) if checker.problems.is_empty() => Ok(profile),
        _ => Err(checker.problems),
    }
}

struct Checker {
    /// End of the text: where a table that is missing would have been.
    end: usize,
    problems: Vec<Problem>,
}

impl Checker {
    fn profile(&mut self, root: &Table) -> Option<Profile> {
        self.keys("", root, &["profile"]);
        let Some(node) = root.get("profile") else {
            if self.problems.is_empty() {
                let end = self.end..self.end;
                self.missing(&end, "[profile]", "write [profile] with tone and level, then [profile.harmonics]");
            }
            return None;
        };
        let table = self.table("profile", node, "write the line [profile] and the keys below it")?;
        self.keys("profile", table, &KEYS);
        let misspelt = !self.problems.is_empty();
        let tone = self.tone(node, table);
        let level = self.level(node, table);
        let harmonics = self.harmonics(node, table);
        if misspelt {
            // What is missing may only be missing because it is misspelt.
            self.problems.retain(|problem| !problem.missing);
        }
        Some(Profile { tone: tone?, level: level?, harmonics: harmonics? })
    }

    fn tone(&mut self, node: &Node, table: &Table) -> Option<f64> {
        if table.get("tone").is_none() {
            self.missing(&node.span, "`profile.tone`", "add tone = 1000 (frequency of the tone, Hz)");
        }
        self.number(table, "profile", "tone", "frequency of the tone", &FREQUENCY)
    }

    fn level(&mut self, node: &Node, table: &Table) -> Option<ProfileLevel> {
        let input = self.number(table, "profile", "level", "level at the input", &LEVEL);
        let output = self.number(table, "profile", "output_level", "level at the output", &LEVEL);
        match (table.entry("level"), table.entry("output_level")) {
            (Some(_), None) => input.map(ProfileLevel::Input),
            (None, Some(_)) => output.map(ProfileLevel::Output),
            (Some(level), Some(output)) => {
                let title = "both `profile.level` and `profile.output_level` are there";
                self.one_too_many(output, level, title);
                None
            }
            (None, None) => {
                let title = "neither `profile.level` nor `profile.output_level` is there";
                let remedy = "add level = 0.5 (V rms at the input), or output_level = 2 (V rms at the output)";
                self.problems.push(Problem::new(&node.span, title, "expected one of them", remedy).missing());
                None
            }
        }
    }

    fn harmonics(&mut self, node: &Node, table: &Table) -> Option<Vec<Target>> {
        const ADD: &str = "write [profile.harmonics] and below it 2 = { wanted = -46 }";
        let Some(harmonics) = table.get("harmonics") else {
            self.missing(&node.span, "`profile.harmonics`", ADD);
            return None;
        };
        let entries = self.table("profile.harmonics", harmonics, ADD)?.entries();
        if entries.is_empty() {
            let title = "the profile wants no harmonic";
            self.problems.push(Problem::new(
                &harmonics.span,
                title,
                "expected at least one order from 2 to 10",
                ADD,
            ));
        }
        let mut targets: Vec<Target> = entries.iter().filter_map(|entry| self.harmonic(entry)).collect();
        targets.sort_by_key(|target| target.order);
        Some(targets)
    }

    fn harmonic(&mut self, entry: &Entry) -> Option<Target> {
        let path = join("profile.harmonics", &entry.key);
        let order = self.order(&path, entry)?;
        let example = format!("write {order} = {{ wanted = -46 }}");
        let table = self.table(&path, &entry.node, &example)?;
        self.keys(&path, table, &HARMONIC_KEYS);
        let want = self.want(&path, entry, table);
        let within = self.number(table, &path, "within", "what it may be off before it counts", &WITHIN);
        let weight = self.weight(table, &path);
        Some(Target { order, want: want?, within_db: within.unwrap_or(0.0), weight: weight.unwrap_or(1.0) })
    }

    fn order(&mut self, path: &str, entry: &Entry) -> Option<usize> {
        let order = entry.key.parse::<usize>().ok().filter(|order| order.to_string() == entry.key);
        let (title, remedy) = match order {
            Some(order) if ORDERS.contains(&order) => return Some(order),
            Some(1) => {
                let title = format!("`{path}`: H1 is the fundamental, over which the others are given");
                (title, "take the line out; its level is set by level or output_level")
            }
            Some(_) => (format!("`{path}` is not measured"), "take the line out, or write another order"),
            None => (format!("unknown key `{path}`"), "write the order as a plain number, such as 2"),
        };
        self.problems.push(Problem::new(&entry.key_span, title, "expected orders 2 to 10", remedy));
        None
    }

    fn want(&mut self, path: &str, entry: &Entry, table: &Table) -> Option<Want> {
        let size = |checker: &mut Self, key: &str| checker.number(table, path, key, "size of the harmonic", &SIZE);
        let values = WANTS.map(|key| size(self, key));
        let there: Vec<(usize, &Entry)> =
            WANTS.iter().enumerate().filter_map(|(at, key)| Some((at, table.entry(key)?))).collect();
        match there[..] {
            [] => {
                let title = format!("`{path}` says nothing that is wanted");
                let remedy = "add wanted = -46, at_most = -46 or at_least = -46 (dBc)";
                let label = "expected wanted, at_most or at_least";
                self.problems.push(Problem::new(&entry.key_span, title, label, remedy).missing());
                None
            }
            [(at, _)] => {
                let make = [Want::Exactly, Want::AtMost, Want::AtLeast][at];
                values[at].map(make)
            }
            [(_, first), (_, second), ..] => {
                let title = format!("both `{}` and `{}` are there in `{path}`", first.key, second.key);
                self.one_too_many(second, first, title);
                None
            }
        }
    }

    fn weight(&mut self, table: &Table, path: &str) -> Option<f64> {
        let node = table.get("weight")?;
        let result = value::number(&join(path, "weight"), "how much a miss counts", &WEIGHT, node);
        let explained = result.map_err(|problem| Problem {
            remedy: "write a weight above 0; to leave the harmonic out of the distance, take its line out"
                .to_owned(),
            ..problem
        });
        self.keep(explained)
    }

    fn number(&mut self, table: &Table, path: &str, key: &str, doc: &str, quantity: &Quantity) -> Option<f64> {
        let node = table.get(key)?;
        let result = value::number(&join(path, key), doc, quantity, node);
        self.keep(result)
    }

    fn table<'t>(&mut self, path: &str, node: &'t Node, remedy: &str) -> Option<&'t Table> {
        if node.as_table().is_none() {
            let title = format!("`{path}` is {} where a table belongs", node.describe());
            self.problems.push(Problem::new(&node.span, title, "expected a table", remedy));
        }
        node.as_table()
    }

    fn keys(&mut self, path: &str, table: &Table, known: &[&str]) {
        for entry in table.entries().iter().filter(|entry| !known.contains(&entry.key.as_str())) {
            self.problems.push(unknown_among(&join(path, &entry.key), entry, known));
        }
    }

    fn missing(&mut self, span: &Span, what: &str, remedy: &str) {
        self.problems
            .push(Problem::new(span, format!("{what} is missing"), format!("expected {what}"), remedy).missing());
    }

    fn one_too_many(&mut self, second: &Entry, first: &Entry, title: impl Into<String>) {
        let problem = Problem::new(&second.key_span, title, "one or the other is expected", "keep one of them");
        self.problems.push(problem.beside(&first.key_span, "the other one"));
    }

    fn keep<T>(&mut self, result: Result<T, Problem>) -> Option<T> {
        result.map_err(|problem| self.problems.push(problem)).ok()
    }
}
