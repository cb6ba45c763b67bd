//! The shape of a type's data file: what is known, how well, and from where.

use serde::{Deserialize, Serialize};

use crate::triode::{Capacitances, GridLaw, Heater, Law, Limits, Section, ThreeSection, TubeType, TwoSection};

/// One type of the library, as its data file gives it.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Record {
    /// The type's name.
    pub name: String,
    /// Other names that the same tube is sold under.
    #[serde(default)]
    pub aliases: Vec<String>,
    /// Triode sections in one bottle, 1 or 2.
    pub sections: u8,
    /// The pin layout's standard name.
    pub basing: Stated<String>,
    /// Heater, both ways where it is tapped.
    pub heater: HeaterRecord,
    /// Capacitances.
    pub capacitance: CapacitanceRecord,
    /// Ratings of one section.
    pub limits: LimitsRecord,
    /// The law's parameters and their equally good alternatives.
    pub fit: FitRecord,
    /// The published figures, each beside what the law says.
    #[serde(default)]
    pub evidence: Vec<Evidence>,
}

/// How well a figure is known.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize, Deserialize)]
pub enum Sure {
    /// Read in a copy of the source.
    #[serde(rename = "seen")]
    Seen,
    /// Recalled: good to a few percent.
    #[serde(rename = "from memory")]
    FromMemory,
}

/// A figure with where it comes from, or the plain statement that nothing says.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(untagged)]
pub enum Stated<T> {
    /// A value and its source.
    Value {
        /// The value, SI units.
        value: T,
        /// How sure it is.
        sure: Sure,
        /// Who states it.
        source: String,
    },
    /// No source states it: never to be read as "allowed".
    Not(NotStated),
}

/// The words "not stated".
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize, Deserialize)]
pub enum NotStated {
    /// The only one.
    #[serde(rename = "not stated")]
    NotStated,
}

impl<T> Stated<T> {
    /// No source states it.
    pub const NOT: Stated<T> = Stated::Not(NotStated::NotStated);

    /// The value, where one is stated.
    pub fn value(&self) -> Option<&T> {
        match self {
            Stated::Value { value, .. } => Some(value),
            Stated::Not(_) => None,
        }
    }
}

/// Heater volts and amperes.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct HeaterRecord {
    /// V (the halves in parallel where it is tapped).
    pub voltage: f64,
    /// A.
    pub current: f64,
    /// V and A with the halves of a tapped heater in series.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub series: Option<SeriesHeater>,
    /// How sure.
    pub sure: Sure,
    /// Who states it.
    pub source: String,
}

/// A tapped heater with its halves in series.
#[derive(Clone, Copy, Debug, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct SeriesHeater {
    /// V.
    pub voltage: f64,
    /// A.
    pub current: f64,
}

/// Capacitances between one section's electrodes, farads.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct CapacitanceRecord {
    /// Grid to cathode, F.
    pub grid_cathode: f64,
    /// Grid to plate, F.
    pub grid_plate: f64,
    /// Plate to cathode, F.
    pub plate_cathode: f64,
    /// How sure.
    pub sure: Sure,
    /// Who states them.
    pub source: String,
}

/// Ratings of one section.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct LimitsRecord {
    /// Plate voltage in operation, V.
    pub plate_voltage: Stated<f64>,
    /// Plate voltage of the cold tube, V.
    pub plate_voltage_cold: Stated<f64>,
    /// Plate dissipation, W.
    pub plate_dissipation: Stated<f64>,
    /// Cathode current, A.
    pub cathode_current: Stated<f64>,
    /// Heater to cathode, V either way.
    pub heater_cathode_voltage: Stated<f64>,
    /// Resistance in the grid circuit with cathode bias, Ω.
    pub grid_circuit_resistance: Stated<f64>,
}

/// The law's parameters.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct FitRecord {
    /// What the parameters rest on beside the published figures below.
    pub rests_on: String,
    /// The nominal set.
    pub nominal: Parameters,
    /// Grid current.
    pub grid: GridRecord,
    /// Equally good sets under the priors, each a fit of its own.
    pub ensemble: Vec<Parameters>,
    /// The same with the priors widened to the stated ranges alone: what the figures by themselves allow.
    #[serde(default)]
    pub ensemble_without_priors: Vec<Parameters>,
}

/// Parameters of the two-section law, or of the three-section law where there is a third.
#[derive(Clone, Copy, Debug, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Parameters {
    /// Perveance, A/V^γ.
    #[serde(rename = "G")]
    pub g: f64,
    /// µ of the first section.
    pub mu: f64,
    /// Exponent γ.
    pub gamma: f64,
    /// Sharpness, 1/V.
    #[serde(rename = "C")]
    pub c: f64,
    /// Part of the second section, 0…1.
    pub share: f64,
    /// Second µ over the first.
    pub mu_ratio: f64,
    /// Offset, V.
    pub offset: f64,
    /// Knee, V.
    pub knee: f64,
    /// Part of the third section, 0…1.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub third_share: Option<f64>,
    /// Third µ over the first.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub third_mu_ratio: Option<f64>,
}

/// Grid-current law and its evidence.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct GridRecord {
    /// Perveance, A/V^ξ.
    #[serde(rename = "Gg")]
    pub gg: f64,
    /// Exponent ξ.
    pub xi: f64,
    /// Sharpness, 1/V.
    #[serde(rename = "Cg")]
    pub cg: f64,
    /// True where the law is another type's, for want of evidence.
    pub borrowed: bool,
    /// How sure.
    pub sure: Sure,
    /// Whose law it is.
    pub source: String,
}

/// A set of published figures of one quantity, each beside what the nominal law says.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Evidence {
    /// What was published.
    pub what: String,
    /// The quantity and its unit.
    pub quantity: String,
    /// How sure.
    pub sure: Sure,
    /// Who published it.
    pub source: String,
    /// Plate-current factor between the nominal law and the specimens measured here; 1 elsewhere.
    pub emission: f64,
    /// µ factor between the nominal law and the specimens measured here; 1 elsewhere.
    pub mu_factor: f64,
    /// Volts by which the grids of the specimens measured here act higher than they were set; 0 elsewhere.
    pub grid_offset: f64,
    /// What each number of `at` is.
    pub at: Vec<String>,
    /// Error of the rows that the fit used; none where it used none.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub fitted: Option<Errors>,
    /// Error of the rows kept out of the fit.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub kept_out: Option<Errors>,
    /// The figures.
    pub rows: Vec<Row>,
}

/// Size of a set of errors.
#[derive(Clone, Copy, Debug, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Errors {
    /// How many rows.
    pub rows: usize,
    /// Median of the absolute error, percent.
    pub median_percent: f64,
    /// Largest absolute error, percent.
    pub worst_percent: f64,
}

/// One published figure.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Row {
    /// The conditions, as named by the set's `at`.
    pub at: Vec<f64>,
    /// As published.
    pub published: f64,
    /// As the nominal law has it.
    pub law: f64,
    /// Whether the fit used it.
    pub fitted: bool,
    /// A doubt about the row, where there is one.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub note: Option<String>,
}

impl Parameters {
    /// The parameters as a law.
    pub fn law(&self) -> Law {
        let Parameters { g, mu, gamma, c, share, mu_ratio, offset, knee, third_share, third_mu_ratio } = *self;
        let two = TwoSection { g, mu, gamma, c, share, mu_ratio, offset, knee };
        match (third_share, third_mu_ratio) {
            (Some(third_share), Some(third_mu_ratio)) => {
                Law::ThreeSection(ThreeSection { two, third_share, third_mu_ratio })
            }
            _ => Law::TwoSection(two),
        }
    }

    /// The parameters of a law of the library's own; `None` for a published law.
    pub fn of(law: &Law) -> Option<Parameters> {
        let (two, third) = match *law {
            Law::TwoSection(two) => (two, None),
            Law::ThreeSection(three) => (three.two, Some((three.third_share, three.third_mu_ratio))),
            Law::DempwolfZoelzer(_) | Law::Koren(_) => return None,
        };
        let TwoSection { g, mu, gamma, c, share, mu_ratio, offset, knee } = two;
        let (third_share, third_mu_ratio) = third.unzip();
        Some(Parameters { g, mu, gamma, c, share, mu_ratio, offset, knee, third_share, third_mu_ratio })
    }
}

impl GridRecord {
    /// The record as a law; the library's own has no constant grid current.
    pub fn law(&self) -> GridLaw {
        GridLaw { gg: self.gg, xi: self.xi, cg: self.cg, ig0: 0.0 }
    }
}

impl LimitsRecord {
    fn limits(&self) -> Limits {
        Limits {
            plate_voltage: self.plate_voltage.value().copied(),
            plate_voltage_cold: self.plate_voltage_cold.value().copied(),
            plate_dissipation: self.plate_dissipation.value().copied(),
            cathode_current: self.cathode_current.value().copied(),
            heater_cathode_voltage: self.heater_cathode_voltage.value().copied(),
        }
    }
}

impl Record {
    /// The type as a stage uses it.
    pub fn tube_type(&self) -> TubeType {
        let grid = self.fit.grid.law();
        let CapacitanceRecord { grid_cathode, grid_plate, plate_cathode, .. } = self.capacitance;
        let capacitance = Capacitances { grid_cathode, grid_plate, plate_cathode };
        TubeType {
            name: self.name.clone(),
            section: Section { law: self.fit.nominal.law(), grid, capacitance },
            ensemble: self.fit.ensemble.iter().map(|set| (set.law(), grid)).collect(),
            limits: self.limits.limits(),
            heater: Some(Heater { voltage: self.heater.voltage, current: self.heater.current }),
            basing: self.basing.value().cloned(),
            from_library: true,
        }
    }
}
