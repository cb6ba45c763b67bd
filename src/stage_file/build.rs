//! The tree of one configuration as a checked stage.

use std::collections::BTreeMap;
use std::sync::Arc;

use platewright_dsp::circuit::{
    Bypass, Coupling, Follower, Gain, Input, LeakReturn, Output, Pot, Ripple, Source, Stage, Supply, Taper,
};
use platewright_dsp::triode::TubeType;

use super::problem::Problem;
use super::quantity::{POWER, Quantity, TOLERANCE, VOLTAGE};
use super::schema::{self, Kind};
use super::tree::{Node, Table, Value};
use super::tubes::Tubes;
use super::value;

/// What a part's table states beside its value; `None` is "not stated".
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct PartRating {
    /// Tolerance as a fraction: 0.05 is 5 %.
    pub tolerance: Option<f64>,
    /// Rated power, W.
    pub watts: Option<f64>,
    /// Rated voltage, V.
    pub volts: Option<f64>,
}

/// A stage and what its parts state.
#[derive(Clone, Debug)]
pub struct Built {
    /// The stage.
    pub stage: Stage,
    /// Ratings by part, for those that state any.
    pub ratings: BTreeMap<String, PartRating>,
}

/// Checks the whole tree.
///
/// # Errors
/// Everything that is wrong with it; empty where only a tube type is wrong, which is a problem of its own table.
pub fn build(root: &Table, end: usize, tubes: &Tubes<'_>) -> Result<Built, Vec<Problem>> {
    let mut builder = Builder { root, end, tubes, problems: Vec::new(), ratings: BTreeMap::new() };
    let stage = builder.stage();
    match stage {
        Some(stage) if builder.problems.is_empty() => Ok(Built { stage, ratings: builder.ratings }),
        _ => Err(builder.problems),
    }
}

/// Reads values by path. A required value that is not there leaves a problem and 0 in its place; nothing is handed out
/// while there is a problem.
struct Builder<'a> {
    root: &'a Table,
    /// End of the text: where a table that is missing would have been.
    end: usize,
    tubes: &'a Tubes<'a>,
    problems: Vec<Problem>,
    ratings: BTreeMap<String, PartRating>,
}

impl Builder<'_> {
    fn stage(&mut self) -> Option<Stage> {
        let supply = self.supply();
        let source = self.source();
        let input = self.input();
        let gain = self.gain();
        let follower = self.follower();
        let output = self.output();
        Some(Stage { supply, source, input, gain: gain?, follower: follower?, output })
    }

    fn supply(&mut self) -> Supply {
        let voltage = self.required("supply.voltage");
        let resistance = self.required("supply.resistance");
        let reservoir = self.required("supply.reservoir");
        Supply { voltage, resistance, reservoir, ripple: self.ripple() }
    }

    /// The ripple where it is stated: its size and its frequency together.
    fn ripple(&mut self) -> Option<Ripple> {
        let stated = ["supply.ripple_rms", "supply.ripple_frequency"].iter().any(|path| self.has(path));
        stated.then(|| Ripple {
            rms: self.required("supply.ripple_rms"),
            frequency: self.required("supply.ripple_frequency"),
        })
    }

    fn source(&mut self) -> Source {
        Source { resistance: self.required("source.resistance"), full_scale: self.required("source.full_scale") }
    }

    fn input(&mut self) -> Input {
        let pot = self.has("input.pot").then(|| self.pot());
        let grid_leak = self.optional("input.grid_leak");
        if pot.is_none() && !self.has("input.grid_leak") {
            let span = self.root.get("input").map_or(self.end..self.end, |node| node.span.clone());
            let title =
                "the gain tube's grid has no way to ground: neither `input.pot` nor `input.grid_leak` is there";
            let remedy =
                "add grid_leak = \"1M\" or pot = { resistance = \"47k\", position = 0.5 } to [input], or both";
            self.problems.push(Problem::new(&span, title, "expected a pot or a grid leak", remedy).missing());
        }
        Input { pot, grid_leak, grid_stopper: self.optional("input.grid_stopper").unwrap_or(0.0) }
    }

    fn pot(&mut self) -> Pot {
        let resistance = self.required("input.pot.resistance");
        let position = self.required("input.pot.position");
        self.choice("input.pot.taper", false);
        Pot { resistance, position, taper: Taper::Linear }
    }

    fn gain(&mut self) -> Option<Gain> {
        let tube = self.tube("gain.tube");
        let plate_resistor = self.required("gain.plate_resistor");
        let cathode_resistor = self.required("gain.cathode_resistor");
        let bypass = self.has("gain.bypass").then(|| self.bypass());
        Some(Gain { tube: tube?, plate_resistor, cathode_resistor, bypass })
    }

    fn bypass(&mut self) -> Bypass {
        let capacitance = self.required("gain.bypass.capacitance");
        let esr = self.optional("gain.bypass.esr").unwrap_or(0.0);
        let engaged = match self.node("gain.bypass.engaged").map(|node| value::switch("gain.bypass.engaged", node))
        {
            Some(result) => self.keep(result).unwrap_or(true),
            None => true,
        };
        Bypass { capacitance, esr, engaged, trickle_resistor: self.optional("gain.bypass.trickle_resistor") }
    }

    /// The follower where there is one; `None` where it cannot be read.
    fn follower(&mut self) -> Option<Option<Follower>> {
        match (self.has("follower"), self.has("coupling")) {
            (false, false) => Some(None),
            (false, true) => self.one_without_the_other("coupling", "follower"),
            (true, false) => self.one_without_the_other("follower", "coupling"),
            (true, true) => {
                let coupling = self.coupling();
                let tube = self.tube("follower.tube");
                let bias_resistor = self.optional("follower.bias_resistor");
                let tail_resistor = self.required("follower.tail_resistor");
                Some(Some(Follower { tube: tube?, coupling: coupling?, bias_resistor, tail_resistor }))
            }
        }
    }

    fn one_without_the_other(&mut self, there: &str, absent: &str) -> Option<Option<Follower>> {
        let span = self.node(there).map_or(0..0, |node| node.span.clone());
        let title = format!("[{there}] is there without [{absent}]");
        let label = format!("expected a [{absent}] table as well");
        let remedy =
            format!("add [{absent}], or take [{there}] out: a follower needs both, a stage without one neither");
        self.problems.push(Problem::new(&span, title, label, remedy).missing());
        None
    }

    fn coupling(&mut self) -> Option<Coupling> {
        let kind = self.choice("coupling.kind", true)?;
        if schema::COUPLING_KINDS[kind] == "direct" {
            self.refuse_with_direct();
            return Some(Coupling::Direct { grid_stopper: self.optional("coupling.grid_stopper").unwrap_or(0.0) });
        }
        let capacitor = self.required("coupling.capacitor");
        let grid_stopper = self.optional("coupling.grid_stopper").unwrap_or(0.0);
        let grid_leak =
            if self.has("coupling.grid_leak") { self.required("coupling.grid_leak") } else { self.no_leak() };
        let returns_to = match self.choice("coupling.returns_to", true).map(|word| schema::LEAK_RETURNS[word]) {
            Some("ground") => LeakReturn::Ground,
            _ => LeakReturn::BiasJunction,
        };
        Some(Coupling::Capacitor { capacitor, grid_stopper, grid_leak, returns_to })
    }

    /// Direct coupling sets the follower's grid by the plate alone.
    fn refuse_with_direct(&mut self) {
        let Some(kind) = self.node("coupling.kind") else { return };
        let kind = kind.span.clone();
        for path in ["coupling.capacitor", "coupling.grid_leak", "coupling.returns_to", "follower.bias_resistor"] {
            let Some(node) = self.node(path) else { continue };
            let title = format!("`{path}` is there although the coupling is direct");
            let label = "direct coupling has no place for it".to_owned();
            let remedy = format!("take `{path}` out, or write kind = \"capacitor\"");
            let problem = Problem::new(&node.span, title, label, remedy).beside(&kind, "direct here");
            self.problems.push(problem);
        }
    }

    fn no_leak(&mut self) -> f64 {
        let span = self.node("coupling").map_or(0..0, |node| node.span.clone());
        let title = "the follower's grid has no way to ground: `coupling.grid_leak` is missing";
        let remedy = "add grid_leak = \"1M\" to [coupling], or couple directly with kind = \"direct\"";
        self.problems.push(Problem::new(&span, title, "expected a `grid_leak`", remedy).missing());
        0.0
    }

    fn output(&mut self) -> Output {
        let capacitor = self.required("output.capacitor");
        let bleed = self.required("output.bleed");
        let load_resistance = self.required("output.load.resistance");
        let load_capacitance = self.optional("output.load.capacitance");
        Output {
            capacitor,
            bleed,
            load_resistance,
            load_capacitance,
            full_scale: self.optional("output.full_scale"),
        }
    }

    fn has(&self, path: &str) -> bool {
        self.root.at(path).is_some()
    }

    fn node(&self, path: &str) -> Option<&Node> {
        self.root.at(path)
    }

    fn keep<T>(&mut self, result: Result<T, Problem>) -> Option<T> {
        result.map_err(|problem| self.problems.push(problem)).ok()
    }

    /// A number that has to be there; 0 where it is not.
    fn required(&mut self, path: &str) -> f64 {
        if self.has(path) {
            return self.optional(path).unwrap_or(0.0);
        }
        self.missing(path);
        0.0
    }

    /// A number or part where it stands and is right.
    fn optional(&mut self, path: &str) -> Option<f64> {
        let node = self.root.at(path)?;
        let key = schema::find(path)?;
        match (key.kind, &node.value) {
            (Kind::Part(quantity, name), Value::Table(table)) => {
                self.rated_part(path, key.doc, &quantity, name, node, table)
            }
            (Kind::Part(quantity, _) | Kind::Number(quantity), _) => {
                let result = value::number(path, key.doc, &quantity, node);
                self.keep(result)
            }
            _ => None,
        }
    }

    fn rated_part(
        &mut self,
        path: &str,
        doc: &str,
        quantity: &Quantity,
        name: &str,
        node: &Node,
        table: &Table,
    ) -> Option<f64> {
        let rating = PartRating {
            tolerance: self.rating(path, table, "tolerance", &TOLERANCE),
            watts: self.rating(path, table, "watts", &POWER),
            volts: self.rating(path, table, "volts", &VOLTAGE),
        };
        if rating != PartRating::default() {
            self.ratings.insert(name.to_owned(), rating);
        }
        let Some(node) = table.get("value") else {
            let title = format!("`{path}.value` is missing");
            let remedy = format!("add value = {} to the part's table", quantity.example);
            self.problems.push(Problem::new(&node.span, title, "this part has no `value`", remedy).missing());
            return None;
        };
        let result = value::number(path, doc, quantity, node);
        self.keep(result)
    }

    fn rating(&mut self, path: &str, table: &Table, key: &str, quantity: &Quantity) -> Option<f64> {
        let node = table.get(key)?;
        let result = value::number(&format!("{path}.{key}"), "what the part is rated for", quantity, node);
        self.keep(result)
    }

    fn choice(&mut self, path: &str, required: bool) -> Option<usize> {
        let Some(node) = self.root.at(path) else {
            if required {
                self.missing(path);
            }
            return None;
        };
        let Some(Kind::Choice(words, later)) = schema::find(path).map(|key| key.kind) else { return None };
        let result = value::choice(path, words, later, node);
        self.keep(result)
    }

    fn tube(&mut self, path: &str) -> Option<Arc<TubeType>> {
        let Some(node) = self.root.at(path) else {
            self.missing(path);
            return None;
        };
        let result = self.tubes.find(path, schema::find(path).map_or("", |key| key.doc), node);
        self.keep(result).flatten()
    }

    /// Leaves the problem that `path` is missing, or the table around it: once for all keys of a missing table.
    fn missing(&mut self, path: &str) {
        let table = schema::parent(path);
        let Some(standing) = self.root.at(table) else {
            self.missing_table(table);
            return;
        };
        // A table that is something else has a problem of its own already.
        if standing.as_table().is_none() {
            return;
        }
        let (key, span) = (schema::last(path), standing.span.clone());
        let (doc, example) =
            schema::find(path).map_or(("", String::new()), |found| (found.doc, example(found.kind)));
        let title = format!("`{path}` is missing");
        let label = if table.contains('.') { format!("`{table}`") } else { format!("[{table}]") };
        let remedy = format!("add {key} = {example} ({doc})");
        self.problems.push(Problem::new(&span, title, format!("{label} has no `{key}`"), remedy).missing());
    }

    fn missing_table(&mut self, table: &str) {
        let keys: Vec<&str> = schema::children(table)
            .filter(|key| key.status == schema::Status::Now)
            .map(|key| schema::last(key.path))
            .collect();
        let (shown, place) = match table.rsplit_once('.') {
            None => (format!("[{table}]"), None),
            Some((outer, _)) => (format!("`{table}`"), Some(outer)),
        };
        let outer = place.map(|outer| self.root.at(outer));
        let span = match outer {
            // One problem for [output] says it all.
            Some(None) => return self.missing_table(place.unwrap_or_default()),
            Some(Some(node)) => node.span.clone(),
            None => self.end..self.end,
        };
        let remedy = format!("add {shown} with its keys: {}", keys.join(", "));
        let doc = schema::find(table).map_or("", |key| key.doc);
        let problem =
            Problem::new(&span, format!("{shown} is missing"), format!("expected {shown}: {doc}"), remedy)
                .missing();
        if !self.problems.contains(&problem) {
            self.problems.push(problem);
        }
    }
}

fn example(kind: Kind) -> String {
    match kind {
        Kind::Part(quantity, _) | Kind::Number(quantity) => quantity.example.to_owned(),
        Kind::Choice(words, _) => words.iter().map(|word| format!("\"{word}\"")).collect::<Vec<_>>().join(" or "),
        Kind::Tube => "\"12AU7\"".to_owned(),
        Kind::Switch => "true".to_owned(),
        _ => "…".to_owned(),
    }
}
