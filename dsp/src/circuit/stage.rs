//! A tube line stage as plain values: what a stage file says once it has been checked.

use std::sync::Arc;

use crate::triode::TubeType;

/// One configuration of a stage, every value in SI units.
#[derive(Clone, Debug, PartialEq)]
pub struct Stage {
    /// Supply behind its resistance, with the reservoir that makes node B.
    pub supply: Supply,
    /// What drives the stage.
    pub source: Source,
    /// Pot, grid leak and grid stopper of the gain tube.
    pub input: Input,
    /// The gain tube and its parts.
    pub gain: Gain,
    /// The cathode follower, where there is one.
    pub follower: Option<Follower>,
    /// Output coupling and load.
    pub output: Output,
}

/// The supply.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Supply {
    /// Supply voltage before its resistance, V.
    pub voltage: f64,
    /// Series resistance to node B, Ω.
    pub resistance: f64,
    /// Reservoir from node B to ground, F.
    pub reservoir: f64,
    /// Ripple on the supply voltage, where it is stated.
    pub ripple: Option<Ripple>,
}

/// Ripple on the supply voltage, ahead of the supply's resistance: a sine.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Ripple {
    /// V rms.
    pub rms: f64,
    /// Hz: twice that of the mains behind a full-wave rectifier.
    pub frequency: f64,
}

/// The source.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Source {
    /// Source resistance, Ω.
    pub resistance: f64,
    /// V rms of a 0 dBFS sine; a sample of 1.0 is √2 times this.
    pub full_scale: f64,
}

/// What stands between the source and the gain tube's grid.
#[derive(Clone, Debug, PartialEq)]
pub struct Input {
    /// Level pot, where there is one.
    pub pot: Option<Pot>,
    /// Grid leak from the wiper to ground, Ω.
    pub grid_leak: Option<f64>,
    /// Grid stopper, Ω; 0 is a wire.
    pub grid_stopper: f64,
}

/// A pot as a divider.
#[derive(Clone, Debug, PartialEq)]
pub struct Pot {
    /// Whole track, Ω.
    pub resistance: f64,
    /// Rotation, 0…1.
    pub position: f64,
    /// How rotation becomes a fraction of the track.
    pub taper: Taper,
}

/// A pot's taper.
#[derive(Clone, Debug, PartialEq)]
pub enum Taper {
    /// Fraction equals rotation.
    Linear,
}

impl Pot {
    /// Fraction of the track between the wiper and ground, 0…1.
    pub fn fraction(&self) -> f64 {
        match self.taper {
            Taper::Linear => self.position,
        }
    }
}

/// The gain tube and its parts.
#[derive(Clone, Debug, PartialEq)]
pub struct Gain {
    /// Tube type.
    pub tube: Arc<TubeType>,
    /// Plate resistor, Ω.
    pub plate_resistor: f64,
    /// Cathode resistor, Ω.
    pub cathode_resistor: f64,
    /// The bypass branch, where the stage has one.
    pub bypass: Option<Bypass>,
}

/// The bypass branch beside the cathode resistor.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Bypass {
    /// Capacitance, F.
    pub capacitance: f64,
    /// Series resistance of the capacitor, Ω; 0 is a wire.
    pub esr: f64,
    /// Whether the switch is closed.
    pub engaged: bool,
    /// What keeps the capacitor charged while the switch is open, Ω; none leaves it floating.
    pub trickle_resistor: Option<f64>,
}

/// The cathode follower.
#[derive(Clone, Debug, PartialEq)]
pub struct Follower {
    /// Tube type.
    pub tube: Arc<TubeType>,
    /// How its grid is fed.
    pub coupling: Coupling,
    /// Between cathode and junction, Ω; none makes the junction the cathode.
    pub bias_resistor: Option<f64>,
    /// From the junction to ground, Ω.
    pub tail_resistor: f64,
}

/// How the follower's grid is fed.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Coupling {
    /// Through a capacitor, with a grid leak.
    Capacitor {
        /// Coupling capacitor, F.
        capacitor: f64,
        /// Grid stopper, Ω; 0 is a wire.
        grid_stopper: f64,
        /// Grid leak, Ω.
        grid_leak: f64,
        /// Where the leak ends.
        returns_to: LeakReturn,
    },
    /// Straight from the plate.
    Direct {
        /// Grid stopper, Ω; 0 is a wire.
        grid_stopper: f64,
    },
}

/// Where the follower's grid leak ends.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum LeakReturn {
    /// The junction of bias resistor and tail.
    BiasJunction,
    /// Ground.
    Ground,
}

/// Output coupling and load.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Output {
    /// Output capacitor, F.
    pub capacitor: f64,
    /// Bleed resistor from the output to ground, Ω.
    pub bleed: f64,
    /// Load resistance, Ω.
    pub load_resistance: f64,
    /// Load capacitance, F.
    pub load_capacitance: Option<f64>,
    /// V rms written as 0 dBFS, where the file sets it.
    pub full_scale: Option<f64>,
}
