//! How much of each stated limit a stage uses at rest, while its tubes are cold, and where nothing is stated.

use super::{OperatingPoint, TubePoint};
use crate::circuit::{Role, Stage};
use crate::triode::TubeType;

/// A limit of a tube.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Limit {
    /// Plate dissipation, W.
    PlateDissipation,
    /// Plate to cathode in operation, V.
    PlateVoltage,
    /// Plate to cathode with the tube cold, V.
    PlateVoltageCold,
    /// Cathode current, A.
    CathodeCurrent,
    /// Heater to cathode, V.
    HeaterCathodeVoltage,
}

impl Limit {
    /// The limit's key in JSON.
    pub fn key(self) -> &'static str {
        match self {
            Limit::PlateDissipation => "plate_dissipation",
            Limit::PlateVoltage => "plate_voltage",
            Limit::PlateVoltageCold => "plate_voltage_cold",
            Limit::CathodeCurrent => "cathode_current",
            Limit::HeaterCathodeVoltage => "heater_cathode_voltage",
        }
    }

    /// Its unit.
    pub fn unit(self) -> &'static str {
        match self {
            Limit::PlateDissipation => "W",
            Limit::CathodeCurrent => "A",
            _ => "V",
        }
    }
}

/// What a tube is asked to stand, beside what its data sheet allows.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct TubeStress {
    /// Which tube.
    pub role: Role,
    /// Which limit.
    pub limit: Limit,
    /// What the stage asks, in the limit's unit.
    pub asked: f64,
    /// What is stated; `None` where nothing is, which is never the same as allowed.
    pub allowed: Option<f64>,
}

impl TubeStress {
    /// Part of the limit in use, %.
    pub fn used_percent(&self) -> Option<f64> {
        self.allowed.map(|allowed| 100.0 * self.asked / allowed)
    }
}

/// Every limit of every tube of `stage` at `point`. Heaters are taken to stand at ground.
pub fn tube_stresses(stage: &Stage, point: &OperatingPoint) -> Vec<TubeStress> {
    point.tubes.iter().flat_map(|tube| stresses(stage, tube)).collect()
}

fn stresses(stage: &Stage, tube: &TubePoint) -> Vec<TubeStress> {
    let Some(kind) = tube_type(stage, tube.role) else { return Vec::new() };
    let limits = kind.limits;
    let stress = |limit, asked, allowed| TubeStress { role: tube.role, limit, asked, allowed };
    vec![
        stress(Limit::PlateDissipation, tube.plate_dissipation(), limits.plate_dissipation),
        stress(Limit::PlateVoltage, tube.vpk, limits.plate_voltage),
        // Cold tubes draw nothing: nothing falls across supply and plate resistor.
        stress(Limit::PlateVoltageCold, stage.supply.voltage, limits.plate_voltage_cold),
        stress(Limit::CathodeCurrent, tube.cathode_current(), limits.cathode_current),
        stress(Limit::HeaterCathodeVoltage, tube.cathode.abs(), limits.heater_cathode_voltage),
    ]
}

/// The type that stands in a place.
pub fn tube_type(stage: &Stage, role: Role) -> Option<&TubeType> {
    match role {
        Role::Gain => Some(&stage.gain.tube),
        Role::Follower => stage.follower.as_ref().map(|f| &*f.tube),
    }
}

/// The most that a capacitor must stand before the tubes conduct, V: cold tubes draw nothing, so plates rise to the whole
/// supply and cathodes stay at ground. `None` for a part that is no capacitor of the stage.
pub fn cold_volts(stage: &Stage, key: &str) -> Option<f64> {
    let supply = stage.supply.voltage;
    match key {
        "supply.reservoir" => Some(supply),
        "gain.bypass" => Some(0.0),
        "coupling.capacitor" => Some(supply),
        "output.capacitor" => Some(if stage.follower.is_some() { 0.0 } else { supply }),
        "output.load.capacitance" => Some(0.0),
        _ => None,
    }
}
