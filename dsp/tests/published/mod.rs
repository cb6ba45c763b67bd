//! Published tables of `tests/published`, and the stages that they were taken in.

#![allow(dead_code, reason = "each test uses its own part")]

use std::path::PathBuf;
use std::sync::Arc;

use platewright_dsp::analysis::{Cycle, OperatingPoint, SmallSignal, TubePoint};
use platewright_dsp::circuit::*;
use platewright_dsp::triode::{TubeType, library};

/// A row of a table by its column names.
pub struct Row {
    names: Arc<Vec<String>>,
    cells: Vec<String>,
}

impl Row {
    /// A cell as it stands.
    pub fn text(&self, name: &str) -> &str {
        let column = self.names.iter().position(|other| other == name).unwrap_or_else(|| panic!("column {name}"));
        &self.cells[column]
    }

    /// A cell as a number, `None` where it is empty.
    pub fn maybe(&self, name: &str) -> Option<f64> {
        let text = self.text(name);
        (!text.is_empty()).then(|| text.parse().unwrap_or_else(|_| panic!("{name}: {text}")))
    }

    /// A cell that holds a number.
    pub fn number(&self, name: &str) -> f64 {
        self.maybe(name).unwrap_or_else(|| panic!("{name} is empty"))
    }

    /// Whether the table itself doubts the row.
    pub fn doubted(&self) -> bool {
        let provenance = self.text("provenance");
        provenance.contains("doubtful") || provenance.contains("off its own trend")
    }
}

/// The rows of a file in `tests/published`; lines that begin with # are its source.
pub fn table(file: &str) -> Vec<Row> {
    let path = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("../tests/published").join(file);
    let mut reader = csv::ReaderBuilder::new().comment(Some(b'#')).from_path(path).unwrap();
    let names = Arc::new(reader.headers().unwrap().iter().map(str::to_owned).collect::<Vec<_>>());
    let row = |record: csv::StringRecord| Row {
        names: Arc::clone(&names),
        cells: record.iter().map(str::to_owned).collect(),
    };
    reader.records().map(|record| row(record.unwrap())).collect()
}

/// A library type.
pub fn tube(name: &str) -> Arc<TubeType> {
    library::find(name).unwrap_or_else(|| panic!("{name} is not in the library"))
}

/// Absolute errors in percent, small to large.
#[derive(Default)]
pub struct Errors(Vec<f64>);

impl Errors {
    /// Adds the error of `got` from `published`.
    pub fn add(&mut self, got: f64, published: f64) -> f64 {
        let error = 100.0 * (got / published - 1.0);
        self.0.push(error.abs());
        error
    }

    /// How many.
    pub fn count(&self) -> usize {
        self.0.len()
    }

    /// The error that `part` of all do not exceed.
    pub fn quantile(&self, part: f64) -> f64 {
        let mut sorted = self.0.clone();
        sorted.sort_by(f64::total_cmp);
        let place = part * (sorted.len() - 1) as f64;
        let (below, above) = (sorted[place.floor() as usize], sorted[place.ceil() as usize]);
        below + (above - below) * place.fract()
    }

    /// The median.
    pub fn median(&self) -> f64 {
        self.quantile(0.5)
    }

    /// The largest.
    pub fn worst(&self) -> f64 {
        self.quantile(1.0)
    }
}

/// One resistance-coupled stage of the charts: self bias, the next stage's grid resistor as load, capacitors that pass
/// everything.
#[derive(Clone, Copy)]
pub struct Coupled {
    pub supply: f64,
    pub plate_resistor: f64,
    pub cathode_resistor: f64,
    pub next_grid_resistor: f64,
    pub bypassed: bool,
}

impl Coupled {
    /// The stage as a network.
    pub fn network(&self, tube: &Arc<TubeType>) -> Network {
        let bypass = Bypass { capacitance: 1e-2, esr: 0.0, engaged: self.bypassed, trickle_resistor: None };
        let stage = Stage {
            supply: Supply { voltage: self.supply, resistance: 1.0, reservoir: 1e-2, ripple: None },
            source: Source { resistance: 1.0, full_scale: 1.0 },
            input: Input { pot: None, grid_leak: Some(1e6), grid_stopper: 0.0 },
            gain: Gain {
                tube: Arc::clone(tube),
                plate_resistor: self.plate_resistor,
                cathode_resistor: self.cathode_resistor,
                bypass: Some(bypass),
            },
            follower: None,
            // Bleed and load together are the next grid's resistor.
            output: Output {
                capacitor: 1e-4,
                bleed: 2.0 * self.next_grid_resistor,
                load_resistance: 2.0 * self.next_grid_resistor,
                load_capacitance: None,
                full_scale: None,
            },
        };
        Network::of(&stage)
    }

    /// Operating point of the tube.
    pub fn point(&self, tube: &Arc<TubeType>) -> TubePoint {
        OperatingPoint::solve(&self.network(tube), None).unwrap().tubes[0]
    }

    /// Gain at 1 kHz.
    pub fn gain(&self, tube: &Arc<TubeType>) -> f64 {
        let network = self.network(tube);
        let point = OperatingPoint::solve(&network, None).unwrap();
        platewright_dsp::portable::magnitude(SmallSignal::new(&network, &point).at(1000.0).unwrap().gain)
    }

    /// THD_F at 1 kHz where the output is `output_rms` volts, found by the secant rule on the input level.
    pub fn thd_at(&self, tube: &Arc<TubeType>, output_rms: f64) -> f64 {
        let network = self.network(tube);
        let mut level = output_rms / self.gain(tube);
        for _ in 0..30 {
            let cycle = Cycle::of(&network, 1000.0, level).unwrap();
            let ratio = output_rms / cycle.output_rms();
            if (ratio - 1.0).abs() < 1e-5 {
                return cycle.thd();
            }
            level *= ratio;
        }
        panic!("no level gives {output_rms} V");
    }
}
