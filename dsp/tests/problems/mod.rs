//! Named stages for tests and benches: the six with independent answers, and variations on them.

#![allow(dead_code, reason = "each test and bench uses its own part")]

pub mod random;
pub mod signals;

use std::path::PathBuf;
use std::sync::Arc;

use platewright_dsp::circuit::*;
use platewright_dsp::triode::*;
use serde::Deserialize;
use serde_json::Value;

/// A stage of `tests/known-answers` with its answers.
pub struct Known {
    pub name: String,
    pub stage: Stage,
    pub answers: Value,
}

/// The six stages with independent answers.
pub fn known() -> Vec<Known> {
    (1..=6).map(known_answer).collect()
}

/// One of them, counted from 1.
pub fn known_answer(number: usize) -> Known {
    // Tests of the program use this module too.
    let home = PathBuf::from(env!("CARGO_MANIFEST_DIR"));
    let places = ["tests/known-answers", "../tests/known-answers"].map(|place| home.join(place));
    let folder = places.into_iter().find(|place| place.is_dir()).unwrap();
    let read = |ending: &str| std::fs::read_to_string(folder.join(format!("known{number}.{ending}"))).unwrap();
    let file: File = toml::from_str(&read("toml")).unwrap();
    Known {
        name: format!("known {number}"),
        stage: file.stage(),
        answers: serde_json::from_str(&read("json")).unwrap(),
    }
}

/// A medium-µ tube of the library's own law, knee included.
pub fn medium_mu() -> Arc<TubeType> {
    let law = TwoSection {
        g: 2.01e-3,
        mu: 25.5,
        gamma: 1.20,
        c: 1.342,
        share: 0.338,
        mu_ratio: 0.531,
        offset: -0.893,
        knee: 6.0,
    };
    tube("medium mu", Law::TwoSection(law), GridLaw::BORROWED, [1.6e-12, 1.5e-12, 5e-13])
}

/// A capacitor-coupled stage with a follower and a bypass that can be switched out.
pub fn two_tube_stage(engaged: bool) -> Stage {
    Stage {
        supply: Supply { voltage: 290.0, resistance: 2700.0, reservoir: 39e-6, ripple: None },
        source: Source { resistance: 330.0, full_scale: 2.0 },
        input: Input {
            pot: Some(Pot { resistance: 47e3, position: 0.45, taper: Taper::Linear }),
            grid_leak: None,
            grid_stopper: 910.0,
        },
        gain: Gain {
            tube: medium_mu(),
            plate_resistor: 33e3,
            cathode_resistor: 820.0,
            bypass: Some(Bypass { capacitance: 150e-6, esr: 0.12, engaged, trickle_resistor: Some(27e3) }),
        },
        follower: Some(Follower {
            tube: medium_mu(),
            coupling: Coupling::Capacitor {
                capacitor: 330e-9,
                grid_stopper: 560.0,
                grid_leak: 680e3,
                returns_to: LeakReturn::BiasJunction,
            },
            bias_resistor: Some(750.0),
            tail_resistor: 12e3,
        }),
        output: Output {
            capacitor: 3.3e-6,
            bleed: 270e3,
            load_resistance: 47e3,
            load_capacitance: Some(470e-12),
            full_scale: None,
        },
    }
}

/// Every topology that a stage file can ask for, by name.
pub fn topologies() -> Vec<(String, Stage)> {
    let mut out = Vec::new();
    let base = two_tube_stage(true);
    for position in [0.0, 0.5, 1.0] {
        let mut stage = base.clone();
        stage.input.pot.as_mut().unwrap().position = position;
        out.push((format!("pot at {position}"), stage));
    }
    let mut add = |name: &str, change: &dyn Fn(&mut Stage)| {
        let mut stage = base.clone();
        change(&mut stage);
        out.push((name.to_string(), stage));
    };
    add("bypass out, trickle", &|s| s.gain.bypass.as_mut().unwrap().engaged = false);
    add("bypass out, no trickle", &|s| {
        let bypass = s.gain.bypass.as_mut().unwrap();
        bypass.engaged = false;
        bypass.trickle_resistor = None;
    });
    add("no bypass part", &|s| s.gain.bypass = None);
    add("no ESR", &|s| s.gain.bypass.as_mut().unwrap().esr = 0.0);
    add("no stoppers", &|s| {
        s.input.grid_stopper = 0.0;
        if let Some(Follower { coupling: Coupling::Capacitor { grid_stopper, .. }, .. }) = &mut s.follower {
            *grid_stopper = 0.0;
        }
    });
    add("leak to ground, no bias resistor", &|s| {
        let follower = s.follower.as_mut().unwrap();
        follower.bias_resistor = None;
        if let Coupling::Capacitor { returns_to, .. } = &mut follower.coupling {
            *returns_to = LeakReturn::Ground;
        }
    });
    add("direct coupling", &|s| {
        let follower = s.follower.as_mut().unwrap();
        follower.bias_resistor = None;
        follower.tail_resistor = 33e3;
        follower.coupling = Coupling::Direct { grid_stopper: 390.0 };
    });
    add("no follower", &|s| s.follower = None);
    add("no follower, no bypass part", &|s| {
        s.follower = None;
        s.gain.bypass = None;
    });
    add("grid leak alone, no load capacitance", &|s| {
        s.input.pot = None;
        s.input.grid_leak = Some(1e6);
        s.output.load_capacitance = None;
    });
    out
}

fn tube(name: &str, law: Law, grid: GridLaw, [grid_cathode, grid_plate, plate_cathode]: [f64; 3]) -> Arc<TubeType> {
    Arc::new(TubeType {
        name: name.to_string(),
        section: Section { law, grid, capacitance: Capacitances { grid_cathode, grid_plate, plate_cathode } },
        ensemble: Vec::new(),
        limits: Limits::default(),
        heater: None,
        basing: None,
        from_library: false,
    })
}

#[derive(Deserialize)]
struct File {
    supply: SupplyTable,
    source: SourceTable,
    input: InputTable,
    gain: GainTable,
    coupling: Option<CouplingTable>,
    follower: Option<FollowerTable>,
    output: OutputTable,
    tube: Vec<TubeTable>,
}

#[derive(Deserialize)]
struct SupplyTable {
    voltage: f64,
    resistance: f64,
    reservoir: f64,
}

#[derive(Deserialize)]
struct SourceTable {
    resistance: f64,
    full_scale: f64,
}

#[derive(Deserialize)]
struct InputTable {
    pot: Option<PotTable>,
    grid_leak: Option<f64>,
    grid_stopper: f64,
}

#[derive(Deserialize)]
struct PotTable {
    resistance: f64,
    position: f64,
}

#[derive(Deserialize)]
struct GainTable {
    tube: String,
    plate_resistor: f64,
    cathode_resistor: f64,
    bypass: Option<BypassTable>,
}

#[derive(Deserialize)]
struct BypassTable {
    capacitance: f64,
    esr: f64,
    engaged: bool,
    trickle_resistor: Option<f64>,
}

#[derive(Deserialize)]
struct CouplingTable {
    kind: String,
    capacitor: Option<f64>,
    grid_stopper: f64,
    grid_leak: Option<f64>,
    returns_to: Option<String>,
}

#[derive(Deserialize)]
struct FollowerTable {
    tube: String,
    bias_resistor: Option<f64>,
    tail_resistor: f64,
}

#[derive(Deserialize)]
struct OutputTable {
    capacitor: f64,
    bleed: f64,
    load: LoadTable,
}

#[derive(Deserialize)]
struct LoadTable {
    resistance: f64,
    capacitance: Option<f64>,
}

#[derive(Deserialize)]
struct TubeTable {
    r#type: String,
    model: String,
    parameters: toml::Table,
    capacitance: CapacitanceTable,
}

#[derive(Deserialize)]
struct CapacitanceTable {
    grid_cathode: f64,
    grid_plate: f64,
    plate_cathode: f64,
}

impl TubeTable {
    fn tube(&self) -> Arc<TubeType> {
        let p = |key: &str| self.parameters.get(key).and_then(|v| v.as_float()).unwrap_or(0.0);
        let law = match self.model.as_str() {
            "koren" => Law::Koren(Koren { mu: p("mu"), ex: p("Ex"), kg1: p("Kg1"), kp: p("Kp"), kvb: p("Kvb") }),
            "dempwolf-zoelzer" => {
                Law::DempwolfZoelzer(DempwolfZoelzer { g: p("G"), mu: p("mu"), gamma: p("gamma"), c: p("C") })
            }
            _ => Law::TwoSection(TwoSection {
                g: p("G"),
                mu: p("mu"),
                gamma: p("gamma"),
                c: p("C"),
                share: p("share"),
                mu_ratio: p("mu_ratio"),
                offset: p("offset"),
                knee: p("knee"),
            }),
        };
        let grid = GridLaw { gg: p("Gg"), xi: p("xi"), cg: p("Cg"), ig0: p("Ig0") };
        let c = &self.capacitance;
        tube(&self.r#type, law, grid, [c.grid_cathode, c.grid_plate, c.plate_cathode])
    }
}

impl File {
    fn stage(&self) -> Stage {
        let tube = |name: &str| self.tube.iter().find(|t| t.r#type == name).unwrap().tube();
        let coupling = |c: &CouplingTable| match c.kind.as_str() {
            "direct" => Coupling::Direct { grid_stopper: c.grid_stopper },
            _ => Coupling::Capacitor {
                capacitor: c.capacitor.unwrap(),
                grid_stopper: c.grid_stopper,
                grid_leak: c.grid_leak.unwrap(),
                returns_to: match c.returns_to.as_deref() {
                    Some("ground") => LeakReturn::Ground,
                    _ => LeakReturn::BiasJunction,
                },
            },
        };
        let (s, o, g) = (&self.supply, &self.output, &self.gain);
        Stage {
            supply: Supply { voltage: s.voltage, resistance: s.resistance, reservoir: s.reservoir, ripple: None },
            source: Source { resistance: self.source.resistance, full_scale: self.source.full_scale },
            input: Input {
                pot: self.input.pot.as_ref().map(|p| Pot {
                    resistance: p.resistance,
                    position: p.position,
                    taper: Taper::Linear,
                }),
                grid_leak: self.input.grid_leak,
                grid_stopper: self.input.grid_stopper,
            },
            gain: Gain {
                tube: tube(&g.tube),
                plate_resistor: g.plate_resistor,
                cathode_resistor: g.cathode_resistor,
                bypass: g.bypass.as_ref().map(|b| Bypass {
                    capacitance: b.capacitance,
                    esr: b.esr,
                    engaged: b.engaged,
                    trickle_resistor: b.trickle_resistor,
                }),
            },
            follower: self.follower.as_ref().map(|f| Follower {
                tube: tube(&f.tube),
                coupling: coupling(self.coupling.as_ref().unwrap()),
                bias_resistor: f.bias_resistor,
                tail_resistor: f.tail_resistor,
            }),
            output: Output {
                capacitor: o.capacitor,
                bleed: o.bleed,
                load_resistance: o.load.resistance,
                load_capacitance: o.load.capacitance,
                full_scale: None,
            },
        }
    }
}
