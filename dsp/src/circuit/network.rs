//! A stage as a network: named nodes, resistors, capacitors, sources and triodes.
//!
//! The network is data. A new topology adds lines to [`Network::of`]; nothing that steps or measures has to know.

use super::{Coupling, LeakReturn, Stage};
use crate::triode::Section;

/// A node of the stage, by the name that figures and bench sheets use.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Node {
    /// Behind the source resistance, where the input pot begins.
    A,
    /// The pot's wiper.
    Wiper,
    /// Grid of the gain tube.
    G1,
    /// Plate of the gain tube.
    P1,
    /// Cathode of the gain tube.
    K1,
    /// Between the bypass capacitor and its series resistance.
    BypassFoot,
    /// Between that resistance and the trickle resistor.
    BypassSwitch,
    /// The decoupled supply.
    B,
    /// Behind the coupling capacitor.
    X,
    /// Grid of the follower.
    G2,
    /// Junction of bias resistor and tail.
    J,
    /// Cathode of the follower.
    K2,
    /// The output.
    O,
}

impl Node {
    /// Every node a stage can have.
    pub const ALL: [Node; 13] = [
        Node::A,
        Node::Wiper,
        Node::G1,
        Node::P1,
        Node::K1,
        Node::BypassFoot,
        Node::BypassSwitch,
        Node::B,
        Node::X,
        Node::G2,
        Node::J,
        Node::K2,
        Node::O,
    ];

    /// The short name, as in "p1".
    pub fn name(self) -> &'static str {
        match self {
            Node::A => "a",
            Node::Wiper => "wiper",
            Node::G1 => "g1",
            Node::P1 => "p1",
            Node::K1 => "k1",
            Node::BypassFoot => "bypass foot",
            Node::BypassSwitch => "bypass switch",
            Node::B => "B",
            Node::X => "x",
            Node::G2 => "g2",
            Node::J => "j",
            Node::K2 => "k2",
            Node::O => "o",
        }
    }
}

/// One end of a part: the index of a node, or `None` for ground.
pub type Terminal = Option<usize>;

/// A two-terminal part with its place.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Part {
    /// The stage file's key, "gain.plate_resistor"; both halves of a pot carry the pot's.
    pub key: &'static str,
    /// One end.
    pub from: Terminal,
    /// The other end.
    pub to: Terminal,
    /// Ohms of a resistor, farads of a capacitor.
    pub value: f64,
}

/// What a source with resistance does.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Drive {
    /// The signal at `in`.
    Signal,
    /// A constant voltage, V.
    Constant(f64),
}

/// A voltage behind a resistance, from ground into a node.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct ResistiveSource {
    /// The stage file's key of the resistance.
    pub key: &'static str,
    /// The node that it feeds.
    pub node: Terminal,
    /// Resistance, Ω.
    pub resistance: f64,
    /// The voltage.
    pub drive: Drive,
}

/// Which of the two tubes.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Role {
    /// The gain tube.
    Gain,
    /// The cathode follower.
    Follower,
}

impl Role {
    /// The stage file's table.
    pub fn name(self) -> &'static str {
        match self {
            Role::Gain => "gain",
            Role::Follower => "follower",
        }
    }
}

/// A triode in its place.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct TriodePlace {
    /// Which tube.
    pub role: Role,
    /// Its law and capacitances.
    pub section: Section,
    /// Grid terminal.
    pub grid: Terminal,
    /// Plate terminal.
    pub plate: Terminal,
    /// Cathode terminal.
    pub cathode: Terminal,
}

/// The parts of a stage between numbered nodes. Wires have been merged away: no resistor here is 0 Ω.
#[derive(Clone, Debug, PartialEq)]
pub struct Network {
    /// Number of nodes, ground left out.
    pub nodes: usize,
    /// Resistors without those of the sources.
    pub resistors: Vec<Part>,
    /// Capacitors, the tubes' own included.
    pub capacitors: Vec<Part>,
    /// The signal source first, then the supply.
    pub sources: Vec<ResistiveSource>,
    /// Gain tube, then follower.
    pub triodes: Vec<TriodePlace>,
    places: [Option<Terminal>; Node::ALL.len()],
}

/// Keys of the parts that make up the load, left out where the output impedance is asked.
pub const LOAD_KEYS: [&str; 2] = ["output.load", "output.load.capacitance"];

impl Network {
    /// The network of `stage`.
    pub fn of(stage: &Stage) -> Network {
        let mut wiring = Wiring::default();
        wiring.input(stage);
        wiring.gain(stage);
        wiring.follower(stage);
        wiring.output(stage);
        wiring.finish()
    }

    /// Where a named node is: `None` when the stage has no such node, `Some(None)` when it is ground.
    pub fn place(&self, node: Node) -> Option<Terminal> {
        self.places[node as usize]
    }

    /// Multiplies every constant voltage, as a supply that is off its value would.
    pub(crate) fn scale_supply(&mut self, factor: f64) {
        for source in &mut self.sources {
            if let Drive::Constant(volts) = &mut source.drive {
                *volts *= factor;
            }
        }
    }

    /// The signal's index among the sources is 0; this is the constant voltage of source `index`, 0 for the signal.
    pub fn constant_volts(&self, index: usize) -> f64 {
        match self.sources[index].drive {
            Drive::Signal => 0.0,
            Drive::Constant(volts) => volts,
        }
    }
}

/// A part between named nodes, before wires are merged.
#[derive(Clone, Copy)]
struct Loose {
    key: &'static str,
    from: End,
    to: End,
    value: f64,
}

/// A named node, or ground.
type End = Option<Node>;

#[derive(Default)]
struct Wiring {
    resistors: Vec<Loose>,
    capacitors: Vec<Loose>,
    wires: Vec<(End, End)>,
    sources: Vec<(&'static str, Node, f64, Drive)>,
    triodes: Vec<(Role, Section, Node, Node, Node)>,
}

impl Wiring {
    fn resistor(&mut self, key: &'static str, from: Node, to: impl Into<End>, ohms: f64) {
        let to = to.into();
        if ohms == 0.0 {
            self.wires.push((Some(from), to));
        } else {
            self.resistors.push(Loose { key, from: Some(from), to, value: ohms });
        }
    }

    fn capacitor(&mut self, key: &'static str, from: Node, to: impl Into<End>, farads: f64) {
        if farads > 0.0 {
            self.capacitors.push(Loose { key, from: Some(from), to: to.into(), value: farads });
        }
    }

    fn triode(&mut self, role: Role, section: &Section, (grid, plate, cathode): (Node, Node, Node)) {
        let keys = match role {
            Role::Gain => ["gain.tube.grid_cathode", "gain.tube.grid_plate", "gain.tube.plate_cathode"],
            Role::Follower => {
                ["follower.tube.grid_cathode", "follower.tube.grid_plate", "follower.tube.plate_cathode"]
            }
        };
        let farads = section.capacitance;
        self.capacitor(keys[0], grid, cathode, farads.grid_cathode);
        self.capacitor(keys[1], grid, plate, farads.grid_plate);
        self.capacitor(keys[2], plate, cathode, farads.plate_cathode);
        self.triodes.push((role, *section, grid, plate, cathode));
    }

    fn input(&mut self, stage: &Stage) {
        self.sources.push(("source.resistance", Node::A, stage.source.resistance, Drive::Signal));
        match &stage.input.pot {
            Some(pot) => {
                let lower = pot.fraction();
                self.resistor("input.pot", Node::A, Node::Wiper, (1.0 - lower) * pot.resistance);
                self.resistor("input.pot", Node::Wiper, None, lower * pot.resistance);
            }
            None => self.wires.push((Some(Node::A), Some(Node::Wiper))),
        }
        if let Some(leak) = stage.input.grid_leak {
            self.resistor("input.grid_leak", Node::Wiper, None, leak);
        }
        self.resistor("input.grid_stopper", Node::Wiper, Node::G1, stage.input.grid_stopper);
    }

    fn gain(&mut self, stage: &Stage) {
        let (supply, gain) = (&stage.supply, &stage.gain);
        self.sources.push(("supply.resistance", Node::B, supply.resistance, Drive::Constant(supply.voltage)));
        self.capacitor("supply.reservoir", Node::B, None, supply.reservoir);
        self.resistor("gain.plate_resistor", Node::B, Node::P1, gain.plate_resistor);
        self.resistor("gain.cathode_resistor", Node::K1, None, gain.cathode_resistor);
        self.triode(Role::Gain, &gain.tube.section, (Node::G1, Node::P1, Node::K1));
        let Some(bypass) = gain.bypass else { return };
        let to_ground = if bypass.engaged { Some(0.0) } else { bypass.trickle_resistor };
        if let Some(ohms) = to_ground {
            self.capacitor("gain.bypass", Node::K1, Node::BypassFoot, bypass.capacitance);
            self.resistor("gain.bypass.esr", Node::BypassFoot, Node::BypassSwitch, bypass.esr);
            self.resistor("gain.bypass.trickle_resistor", Node::BypassSwitch, None, ohms);
        }
    }

    fn follower(&mut self, stage: &Stage) {
        let Some(follower) = &stage.follower else { return };
        self.resistor("follower.bias_resistor", Node::K2, Node::J, follower.bias_resistor.unwrap_or(0.0));
        self.resistor("follower.tail_resistor", Node::J, None, follower.tail_resistor);
        match follower.coupling {
            Coupling::Capacitor { capacitor, grid_stopper, grid_leak, returns_to } => {
                self.capacitor("coupling.capacitor", Node::P1, Node::X, capacitor);
                self.resistor("coupling.grid_stopper", Node::X, Node::G2, grid_stopper);
                let leak_end = match returns_to {
                    LeakReturn::BiasJunction => Some(Node::J),
                    LeakReturn::Ground => None,
                };
                self.resistor("coupling.grid_leak", Node::X, leak_end, grid_leak);
            }
            Coupling::Direct { grid_stopper } => {
                self.resistor("coupling.grid_stopper", Node::P1, Node::G2, grid_stopper);
            }
        }
        self.triode(Role::Follower, &follower.tube.section, (Node::G2, Node::B, Node::K2));
    }

    fn output(&mut self, stage: &Stage) {
        let output = &stage.output;
        let from = if stage.follower.is_some() { Node::K2 } else { Node::P1 };
        self.capacitor("output.capacitor", from, Node::O, output.capacitor);
        self.resistor("output.bleed", Node::O, None, output.bleed);
        self.resistor(LOAD_KEYS[0], Node::O, None, output.load_resistance);
        self.capacitor(LOAD_KEYS[1], Node::O, None, output.load_capacitance.unwrap_or(0.0));
    }

    /// Merges wired nodes, numbers what is left and drops parts whose two ends became one.
    fn finish(self) -> Network {
        let mut leader: Vec<usize> = (0..=Node::ALL.len()).collect();
        let slot = |end: End| end.map_or(GROUND, |node| node as usize);
        for &(from, to) in &self.wires {
            let (from, to) = (slot(from), slot(to));
            let (keep, merge) = (leader[from].max(leader[to]), leader[from].min(leader[to]));
            leader.iter_mut().filter(|entry| **entry == merge).for_each(|entry| *entry = keep);
        }
        let used = self.used_slots();
        let mut number = [None; Node::ALL.len() + 1];
        let mut nodes = 0;
        for node in Node::ALL.map(|node| node as usize).into_iter().filter(|&node| used[node]) {
            if leader[node] != GROUND && number[leader[node]].is_none() {
                number[leader[node]] = Some(nodes);
                nodes += 1;
            }
        }
        let terminal = |end: End| number[leader[slot(end)]];
        let settle = |parts: Vec<Loose>| {
            let place = |p: Loose| Part { key: p.key, from: terminal(p.from), to: terminal(p.to), value: p.value };
            parts.into_iter().map(place).filter(|part| part.from != part.to).collect()
        };
        let triode = |(role, section, grid, plate, cathode): (Role, Section, Node, Node, Node)| TriodePlace {
            role,
            section,
            grid: terminal(Some(grid)),
            plate: terminal(Some(plate)),
            cathode: terminal(Some(cathode)),
        };
        let source = |(key, node, resistance, drive): (&'static str, Node, f64, Drive)| ResistiveSource {
            key,
            node: terminal(Some(node)),
            resistance,
            drive,
        };
        Network {
            nodes,
            places: Node::ALL.map(|node| used[node as usize].then(|| terminal(Some(node)))),
            resistors: settle(self.resistors),
            capacitors: settle(self.capacitors),
            sources: self.sources.into_iter().map(source).collect(),
            triodes: self.triodes.into_iter().map(triode).collect(),
        }
    }

    fn used_slots(&self) -> [bool; Node::ALL.len() + 1] {
        let mut used = [false; Node::ALL.len() + 1];
        let mut mark = |end: End| used[end.map_or(GROUND, |node| node as usize)] = true;
        for part in self.resistors.iter().chain(&self.capacitors) {
            mark(part.from);
            mark(part.to);
        }
        for &(from, to) in &self.wires {
            mark(from);
            mark(to);
        }
        used
    }
}

/// Ground's slot while wires are merged: the highest, so that it leads every node wired to it.
const GROUND: usize = Node::ALL.len();
