//! The operating point: the DC solution of the stage's own network.

use crate::circuit::{Network, Node, Role, Terminal};
use crate::triode::Currents;
use crate::wave::{Rest, RootCounts};

/// A stage at rest.
#[derive(Clone, Debug)]
pub struct OperatingPoint {
    /// Gain tube, then follower.
    pub tubes: Vec<TubePoint>,
    /// What every resistor and capacitor stands, in the order of the network.
    pub parts: Vec<PartStress>,
    /// How the solution was found.
    pub counts: RootCounts,
    volts: Vec<f64>,
    places: Vec<(Node, Terminal)>,
}

/// A triode at rest.
#[derive(Clone, Copy, Debug)]
pub struct TubePoint {
    /// Which tube.
    pub role: Role,
    /// Grid to cathode, V.
    pub vgk: f64,
    /// Plate to cathode, V.
    pub vpk: f64,
    /// Plate to ground, V.
    pub plate: f64,
    /// Grid to ground, V.
    pub grid: f64,
    /// Cathode to ground, V.
    pub cathode: f64,
    /// Currents and slopes.
    pub currents: Currents,
}

impl TubePoint {
    /// Power turned into heat at the plate, W.
    pub fn plate_dissipation(&self) -> f64 {
        self.vpk * self.currents.plate
    }

    /// Mutual conductance, S.
    pub fn gm(&self) -> f64 {
        self.currents.plate_by_vgk
    }

    /// Plate resistance, Ω; infinite where the tube is cut off.
    pub fn rp(&self) -> f64 {
        1.0 / self.currents.plate_by_vpk
    }

    /// Amplification factor.
    pub fn mu(&self) -> f64 {
        self.currents.plate_by_vgk / self.currents.plate_by_vpk
    }

    /// Cathode current, A.
    pub fn cathode_current(&self) -> f64 {
        self.currents.plate + self.currents.grid
    }
}

/// What a part stands at rest.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct PartStress {
    /// The stage file's key; both halves of a pot are one part.
    pub key: &'static str,
    /// Heat, W; 0 for a capacitor.
    pub watts: f64,
    /// Voltage across it, V, without sign.
    pub volts: f64,
}

/// A meter from a node to ground.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Meter {
    /// The node it touches.
    pub node: Node,
    /// Its input resistance, Ω.
    pub resistance: f64,
}

impl OperatingPoint {
    /// The DC solution of `network`, with `meter` attached where one is given. `None` where no solution is found.
    pub fn solve(network: &Network, meter: Option<Meter>) -> Option<OperatingPoint> {
        let load = match meter {
            Some(meter) => Some((network.place(meter.node)?, meter.resistance)),
            None => None,
        };
        let law = |tube: usize, vgk: f64, vpk: f64| network.triodes[tube].section.currents(vgk, vpk);
        let rest = Rest::solve(network, load, &law).ok()?;
        let places = Node::ALL.into_iter().filter_map(|n| Some((n, network.place(n)?))).collect();
        let mut point =
            OperatingPoint { tubes: Vec::new(), parts: Vec::new(), counts: rest.counts, volts: rest.nodes, places };
        point.tubes = point.tube_points(network);
        point.parts = point.part_stresses(network);
        Some(point)
    }

    /// Volts at a node; `None` where the stage has no such node.
    pub fn volts(&self, node: Node) -> Option<f64> {
        self.places.iter().find(|(n, _)| *n == node).map(|(_, place)| self.at(*place))
    }

    fn at(&self, terminal: Terminal) -> f64 {
        terminal.map_or(0.0, |node| self.volts[node])
    }

    fn tube_points(&self, network: &Network) -> Vec<TubePoint> {
        let point = |t: &crate::circuit::TriodePlace| {
            let (plate, grid, cathode) = (self.at(t.plate), self.at(t.grid), self.at(t.cathode));
            let (vgk, vpk) = (grid - cathode, plate - cathode);
            let currents = t.section.currents(vgk, vpk);
            TubePoint { role: t.role, vgk, vpk, plate, grid, cathode, currents }
        };
        network.triodes.iter().map(point).collect()
    }

    fn part_stresses(&self, network: &Network) -> Vec<PartStress> {
        let mut out: Vec<PartStress> = Vec::new();
        let mut add = |key: &'static str, volts: f64, watts: f64| match out.iter_mut().find(|p| p.key == key) {
            Some(part) => {
                part.volts += volts;
                part.watts += watts;
            }
            None => out.push(PartStress { key, watts, volts }),
        };
        for (index, source) in network.sources.iter().enumerate() {
            let volts = network.constant_volts(index) - self.at(source.node);
            add(source.key, volts.abs(), volts * volts / source.resistance);
        }
        for part in &network.resistors {
            let volts = self.at(part.from) - self.at(part.to);
            add(part.key, volts.abs(), volts * volts / part.value);
        }
        // A tube's own capacitances are no parts that anyone buys.
        for part in network.capacitors.iter().filter(|c| !c.key.contains(".tube.")) {
            add(part.key, (self.at(part.from) - self.at(part.to)).abs(), 0.0);
        }
        out
    }
}
