//! The configurations that `[compare]` lists and `[[configuration]]` sets make of one stage.

use super::assignment::Assignment;
use super::compare::{self, CompareList};
use super::names;
use super::problem::Problem;
use super::sets;
use super::tree::{Span, Table};

/// Most configurations of one stage file.
pub const MOST_CONFIGURATIONS: usize = 256;

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
        self.assignments.iter().map(Assignment::shown).collect()
    }

    /// The tree with this configuration's changes.
    pub fn apply(&self, root: &Table) -> Table {
        let mut changed = root.clone();
        for set in &self.assignments {
            set.apply(&mut changed);
        }
        changed
    }
}

/// The configurations in the order of the file, and what is wrong with them.
pub fn variants(root: &Table, problems: &mut Vec<Problem>) -> Vec<Variant> {
    let found = problems.len();
    let lists = compare::lists(root, problems);
    let mut sets = sets::variants(root, problems);
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
