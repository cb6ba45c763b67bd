//! A tube type as a stage file or the library gives it.

use super::{Currents, GridLaw, Law};

/// One triode section: the law and the capacitances that the engine steps.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Section {
    /// Plate-current law.
    pub law: Law,
    /// Grid-current law.
    pub grid: GridLaw,
    /// Capacitances between its electrodes.
    pub capacitance: Capacitances,
}

impl Section {
    /// Currents and slopes at `vgk` and `vpk` volts.
    pub fn currents(&self, vgk: f64, vpk: f64) -> Currents {
        self.law.currents(&self.grid, vgk, vpk)
    }
}

/// Capacitances between a triode's electrodes, farads; 0 where a part is left out.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Capacitances {
    /// Grid to cathode.
    pub grid_cathode: f64,
    /// Grid to plate.
    pub grid_plate: f64,
    /// Plate to cathode.
    pub plate_cathode: f64,
}

/// A type's limits; `None` is "not stated", which is never the same as "allowed".
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Limits {
    /// Plate voltage in operation, V.
    pub plate_voltage: Option<f64>,
    /// Plate voltage with the tube cold, V.
    pub plate_voltage_cold: Option<f64>,
    /// Plate dissipation of one section, W.
    pub plate_dissipation: Option<f64>,
    /// Cathode current, A.
    pub cathode_current: Option<f64>,
    /// Heater to cathode, V.
    pub heater_cathode_voltage: Option<f64>,
}

/// What the heater needs.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Heater {
    /// Volts.
    pub voltage: f64,
    /// Amperes.
    pub current: f64,
}

/// A tube type: the nominal section, equally good alternatives, and what a builder must know.
#[derive(Clone, Debug, PartialEq)]
pub struct TubeType {
    /// The type's name, as `gain.tube` writes it.
    pub name: String,
    /// The nominal section.
    pub section: Section,
    /// Equally good laws for the same published points (the same capacitances hold); empty where none are known.
    pub ensemble: Vec<(Law, GridLaw)>,
    /// Stated limits.
    pub limits: Limits,
    /// Heater, where stated.
    pub heater: Option<Heater>,
    /// Basing (the pin layout's standard name), where stated.
    pub basing: Option<String>,
    /// True for a type of the library, false for a user's own.
    pub from_library: bool,
}
