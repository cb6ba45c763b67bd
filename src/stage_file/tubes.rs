//! Tube types: those of the library and the user's own `[[tube]]` tables.

use std::sync::Arc;

use platewright_dsp::triode::{
    Capacitances, DempwolfZoelzer, GridLaw, Heater, Koren, Law, Limits, Section, TubeType, TwoSection,
};

use super::keys;
use super::problem::Problem;
use super::quantity::Quantity;
use super::schema::{self, Kind, MODELS, Parameter};
use super::tree::{Node, Table, Value};
use super::value;

/// Where tube types come from that the stage file does not bring itself.
pub struct Library<'a> {
    /// The type of a name.
    pub find: &'a dyn Fn(&str) -> Option<Arc<TubeType>>,
    /// Every name, for the nearest one.
    pub names: &'a [String],
}

/// The types that a stage file can name.
pub struct Tubes<'a> {
    library: &'a Library<'a>,
    own: Vec<(String, Option<Arc<TubeType>>)>,
}

impl<'a> Tubes<'a> {
    /// The `[[tube]]`s of the file beside the library; `notes` takes what a user should know about them.
    pub fn read(
        root: &Table,
        library: &'a Library<'a>,
        problems: &mut Vec<Problem>,
        notes: &mut Vec<String>,
    ) -> Self {
        let mut tubes = Self { library, own: Vec::new() };
        if let Some(Node { value: Value::List(items), .. }) = root.get("tube") {
            for item in items {
                if let Value::Table(table) = &item.value {
                    tubes.add(item, table, problems, notes);
                }
            }
        }
        tubes
    }

    fn add(&mut self, item: &Node, table: &Table, problems: &mut Vec<Problem>, notes: &mut Vec<String>) {
        let mut reader = TubeReader { table, item, problems };
        let Some(name) = reader.name() else { return };
        let span = table.get("type").map_or(item.span.clone(), |node| node.span.clone());
        // Under any of its names, and in upper or lower case: two types that only case tells apart would be a trap.
        if let Some(known) = (self.library.find)(&name).map(|tube| tube.name.clone()) {
            let title = format!("`tube.type`: \"{name}\" is a type of the library");
            let remedy = format!("give your own tube another name, such as \"my {name}\"");
            reader.problems.push(Problem::new(&span, title, format!("the library has {known}"), remedy));
        }
        if self.own.iter().any(|(own, _)| *own == name) {
            let title = format!("`tube.type`: \"{name}\" is there twice");
            reader.problems.push(Problem::new(&span, title, "this name is taken", "give each type its own name"));
        }
        let tube = reader.read(&name, notes);
        // A type that is wrong still has its name: what uses it is not wrong as well.
        self.own.push((name, tube.map(Arc::new)));
    }

    /// The type that the value at `path` names.
    ///
    /// # Errors
    /// A [`Problem`] where nothing has that name; `Ok(None)` where the type exists but is wrong itself.
    pub fn find(&self, path: &str, doc: &str, node: &Node) -> Result<Option<Arc<TubeType>>, Problem> {
        let name = value::text(path, doc, node)?;
        if let Some((_, tube)) = self.own.iter().find(|(own, _)| own == name) {
            return Ok(tube.clone());
        }
        if let Some(tube) = (self.library.find)(name) {
            return Ok(Some(tube));
        }
        let known =
            || self.own.iter().map(|(own, _)| own.as_str()).chain(self.library.names.iter().map(String::as_str));
        let title = format!("`{path}`: there is no tube type \"{}\"", value::shorten(name));
        let (label, remedy) = match keys::nearest(name, known()) {
            Some(near) => {
                (format!("did you mean \"{near}\"?"), format!("write \"{near}\", or describe your own as [[tube]]"))
            }
            None => {
                let all: Vec<&str> = known().take(40).collect();
                let all = if all.is_empty() { "none".to_owned() } else { all.join(", ") };
                ("no such type".to_owned(), format!("known types: {all}; or describe your own as [[tube]]"))
            }
        };
        Err(Problem::new(&node.span, title, label, remedy))
    }
}

/// Reads one `[[tube]]`.
struct TubeReader<'a> {
    table: &'a Table,
    item: &'a Node,
    problems: &'a mut Vec<Problem>,
}

impl TubeReader<'_> {
    fn name(&mut self) -> Option<String> {
        let Some(node) = self.table.get("type") else {
            self.miss("tube.type", "add type = \"…\", the name that `gain.tube` uses");
            return None;
        };
        let result = value::text("tube.type", "the type's name", node).map(str::to_owned);
        self.keep(result)
    }

    fn read(&mut self, name: &str, notes: &mut Vec<String>) -> Option<TubeType> {
        let found = self.problems.len();
        let model = self.model();
        let nominal = model.and_then(|model| self.nominal(model));
        let ensemble = model.map(|model| self.ensemble(model)).unwrap_or_default();
        let capacitance = Capacitances {
            grid_cathode: self.number("tube.capacitance.grid_cathode").unwrap_or(0.0),
            grid_plate: self.number("tube.capacitance.grid_plate").unwrap_or(0.0),
            plate_cathode: self.number("tube.capacitance.plate_cathode").unwrap_or(0.0),
        };
        let limits = Limits {
            plate_voltage: self.number("tube.limits.plate_voltage"),
            plate_voltage_cold: self.number("tube.limits.plate_voltage_cold"),
            plate_dissipation: self.number("tube.limits.plate_dissipation"),
            cathode_current: self.number("tube.limits.cathode_current"),
            heater_cathode_voltage: self.number("tube.limits.heater_cathode_voltage"),
        };
        let heater = self.heater();
        let basing =
            self.table.get("basing").map(|node| value::text("tube.basing", "name of the pin layout", node));
        let basing = basing.and_then(|result| self.keep(result.map(str::to_owned)));
        let (law, grid) = nominal?;
        if self.problems.len() > found {
            return None;
        }
        if grid.is_none() {
            notes.push(format!(
                "tube \"{}\" states no grid current (Gg, xi, Cg): that of a measured 12AX7 is borrowed",
                crate::terminal::plain(name)
            ));
        }
        let section = Section { law, grid: grid.unwrap_or(GridLaw::BORROWED), capacitance };
        Some(TubeType { name: name.to_owned(), section, ensemble, limits, heater, basing, from_library: false })
    }

    fn model(&mut self) -> Option<usize> {
        let Some(node) = self.table.get("model") else {
            let words = MODELS.map(|word| format!("\"{word}\"")).join(", ");
            self.miss("tube.model", &format!("add model = one of {words}"));
            return None;
        };
        let result = value::choice("tube.model", &MODELS, &[], node);
        self.keep(result)
    }

    fn nominal(&mut self, model: usize) -> Option<(Law, Option<GridLaw>)> {
        match self.table.get("parameters") {
            Some(node) => self.parameters(model, "tube.parameters", node),
            None => {
                let keys: Vec<&str> = plate_parameters(model).iter().map(|parameter| parameter.key).collect();
                self.miss("tube.parameters", &format!("add parameters = {{ … }} with {}", keys.join(", ")));
                None
            }
        }
    }

    fn ensemble(&mut self, model: usize) -> Vec<(Law, GridLaw)> {
        let Some(node) = self.table.get("ensemble") else { return Vec::new() };
        let Value::List(members) = &node.value else {
            let title = format!("`tube.ensemble` is {} where a list belongs", node.describe());
            let remedy = "write ensemble = [ { … }, { … } ] with the same keys as parameters";
            self.problems.push(Problem::new(&node.span, title, "expected a list of parameter sets", remedy));
            return Vec::new();
        };
        members
            .iter()
            .filter_map(|member| self.parameters(model, "tube.ensemble", member))
            .map(|(law, grid)| (law, grid.unwrap_or(GridLaw::BORROWED)))
            .collect()
    }

    /// The laws of one parameter set; no grid law where the set leaves out all its keys and may.
    fn parameters(&mut self, model: usize, path: &str, node: &Node) -> Option<(Law, Option<GridLaw>)> {
        let plate = plate_parameters(model);
        let has_ig0 = MODELS[model] != "two-section";
        let known: Vec<&str> = plate
            .iter()
            .chain(schema::GRID)
            .chain(has_ig0.then_some(&schema::IG0))
            .map(|parameter| parameter.key)
            .collect();
        let Value::Table(table) = &node.value else {
            let title = format!("`{path}` is {} where a table belongs", node.describe());
            let remedy = format!("write {{ … }} with {}", known.join(", "));
            self.problems.push(Problem::new(&node.span, title, "expected a table of parameters", remedy));
            return None;
        };
        for entry in table.entries().iter().filter(|entry| !known.contains(&entry.key.as_str())) {
            self.problems.push(keys::unknown_among(&keys::join(path, &entry.key), entry, &known));
        }
        let mut set = ParameterSet { path, node, table, problems: self.problems };
        let values: Option<Vec<f64>> = set.all(plate);
        let states_grid =
            MODELS[model] == "koren" || known.iter().skip(plate.len()).any(|key| table.get(key).is_some());
        let grid = if states_grid { Some(set.grid(MODELS[model])) } else { None };
        let law = law(model, &values?)?;
        match grid {
            None => Some((law, None)),
            Some(grid) => grid.map(|grid| (law, Some(grid))),
        }
    }

    fn heater(&mut self) -> Option<Heater> {
        let standing = self.table.get("heater")?;
        standing.as_table()?;
        let (voltage, current) = (self.number("tube.heater.voltage"), self.number("tube.heater.current"));
        for key in ["voltage", "current"] {
            if self.table.at(&format!("heater.{key}")).is_none() {
                let path = format!("tube.heater.{key}");
                let label = format!("this heater has no `{key}`");
                let remedy = "give both voltage and current, or leave the heater out";
                self.problems
                    .push(Problem::new(&standing.span, format!("`{path}` is missing"), label, remedy).missing());
            }
        }
        Some(Heater { voltage: voltage?, current: current? })
    }

    /// The number at a path of the schema, where it stands.
    fn number(&mut self, path: &str) -> Option<f64> {
        let node = self.table.at(path.strip_prefix("tube.")?)?;
        let key = schema::find(path)?;
        let Kind::Number(quantity) = key.kind else { return None };
        let result = value::number(path, key.doc, &quantity, node);
        self.keep(result)
    }

    fn keep<T>(&mut self, result: Result<T, Problem>) -> Option<T> {
        result.map_err(|problem| self.problems.push(problem)).ok()
    }

    fn miss(&mut self, path: &str, remedy: &str) {
        let label = format!("this tube has no `{}`", schema::last(path));
        self.problems.push(Problem::new(&self.item.span, format!("`{path}` is missing"), label, remedy).missing());
    }
}

/// Reads one table of law parameters.
struct ParameterSet<'a> {
    path: &'a str,
    node: &'a Node,
    table: &'a Table,
    problems: &'a mut Vec<Problem>,
}

impl ParameterSet<'_> {
    fn all(&mut self, parameters: &[Parameter]) -> Option<Vec<f64>> {
        let values: Vec<Option<f64>> =
            parameters.iter().map(|parameter| self.one(parameter.key, &parameter.quantity)).collect();
        values.into_iter().collect()
    }

    fn grid(&mut self, model: &str) -> Option<GridLaw> {
        let values = self.all(schema::GRID);
        let ig0 = match model {
            "koren" => self.one(schema::IG0.key, &schema::IG0.quantity),
            "dempwolf-zoelzer" if self.table.get("Ig0").is_some() => {
                self.one(schema::IG0.key, &schema::IG0.quantity)
            }
            _ => Some(0.0),
        };
        let [gg, xi, cg] = values?[..] else { return None };
        Some(GridLaw { gg, xi, cg, ig0: ig0? })
    }

    fn one(&mut self, key: &str, quantity: &Quantity) -> Option<f64> {
        let path = keys::join(self.path, key);
        let Some(node) = self.table.get(key) else {
            let label = format!("this set has no `{key}`");
            let remedy = format!("add {key} = …, such as {}", quantity.example);
            self.problems
                .push(Problem::new(&self.node.span, format!("`{path}` is missing"), label, remedy).missing());
            return None;
        };
        value::number(&path, "a parameter of the law", quantity, node)
            .map_err(|problem| self.problems.push(problem))
            .ok()
    }
}

fn plate_parameters(model: usize) -> &'static [Parameter] {
    match MODELS[model] {
        "two-section" => schema::TWO_SECTION,
        "dempwolf-zoelzer" => schema::DEMPWOLF_ZOELZER,
        _ => schema::KOREN,
    }
}

fn law(model: usize, values: &[f64]) -> Option<Law> {
    Some(match (MODELS[model], values) {
        ("two-section", &[g, mu, gamma, c, share, mu_ratio, offset, knee]) => {
            Law::TwoSection(TwoSection { g, mu, gamma, c, share, mu_ratio, offset, knee })
        }
        ("dempwolf-zoelzer", &[g, mu, gamma, c]) => Law::DempwolfZoelzer(DempwolfZoelzer { g, mu, gamma, c }),
        ("koren", &[mu, ex, kg1, kp, kvb]) => Law::Koren(Koren { mu, ex, kg1, kp, kvb }),
        _ => return None,
    })
}
