//! Published figures, and what a law says in their place.

use crate::triode::Section;

/// How the tube was held when a figure was taken.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Condition {
    /// Both voltages to the cathode given, V.
    Bias {
        /// Plate to cathode.
        vpk: f64,
        /// Grid to cathode.
        vgk: f64,
    },
    /// Plate to cathode voltage given, V, the grid biased by a cathode resistor, Ω.
    CathodeResistor {
        /// Plate to cathode.
        vpk: f64,
        /// Cathode resistor.
        resistor: f64,
    },
    /// Plate to cathode voltage given, V, the grid set so that this current flows, A.
    Current {
        /// Plate to cathode.
        vpk: f64,
        /// Plate current.
        current: f64,
    },
    /// In a resistance-coupled stage with self bias, its cathode bypassed.
    Stage(Stage),
}

/// A resistance-coupled stage with self bias, its cathode bypassed.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Stage {
    /// Supply, V.
    pub supply: f64,
    /// Plate resistor, Ω.
    pub plate_resistor: f64,
    /// Cathode resistor, Ω.
    pub cathode_resistor: f64,
    /// The next stage's grid resistor, Ω; infinite where there is none.
    pub next_grid_resistor: f64,
}

/// What was published.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Quantity {
    /// Plate current, A.
    PlateCurrent,
    /// Amplification factor.
    Mu,
    /// Mutual conductance, S.
    Gm,
    /// Plate resistance, Ω.
    Rp,
    /// Voltage gain of the stage, sign left out.
    Gain,
}

/// How specimens that were measured differ from their type's nominal.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Specimen {
    /// Factor of the plate current.
    pub emission: f64,
    /// Factor of µ.
    pub mu_factor: f64,
    /// Volts by which the grid acts higher than it was set: contact potentials differ from bottle to bottle.
    pub grid_offset: f64,
}

impl Specimen {
    /// No difference.
    pub const NOMINAL: Specimen = Specimen { emission: 1.0, mu_factor: 1.0, grid_offset: 0.0 };
}

/// One published figure with its standard error, all in SI units.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Figure {
    /// How the tube was held.
    pub condition: Condition,
    /// What was read.
    pub quantity: Quantity,
    /// The figure.
    pub published: f64,
    /// What it may be off by, one standard deviation.
    pub error: f64,
}

/// Steps after which a one-dimensional search is as close as it gets.
const SEARCH_STEPS: usize = 80;

impl Condition {
    /// The same with `volts` added to a grid voltage that was set from outside.
    pub(super) fn shifted(self, volts: f64) -> Condition {
        match self {
            Condition::Bias { vpk, vgk } => Condition::Bias { vpk, vgk: vgk + volts },
            other => other,
        }
    }

    /// Grid and plate voltage to the cathode at which `tube` settles, V. Grid current is neglected: the figures here
    /// are taken with the grid negative.
    pub fn settle(&self, tube: &Section) -> (f64, f64) {
        match *self {
            Condition::Bias { vpk, vgk } => (vgk, vpk),
            Condition::CathodeResistor { vpk, resistor } => {
                let current = self_bias(tube, resistor, |_| (vpk, 0.0), vpk / resistor);
                (-current * resistor, vpk)
            }
            Condition::Stage(stage) => {
                let total = stage.plate_resistor + stage.cathode_resistor;
                let plate = |current: f64| (stage.supply - current * total, -total);
                let current = self_bias(tube, stage.cathode_resistor, plate, stage.supply / total);
                (-current * stage.cathode_resistor, stage.supply - current * total)
            }
            Condition::Current { vpk, current } => (grid_for(tube, vpk, current), vpk),
        }
    }
}

/// The current at which a cathode resistor biases the tube: the root of Ip(−R·I, plate(I)) − I, which only falls.
/// `plate` gives the plate voltage and its slope by the current; the root lies from 0 to `most`.
fn self_bias(tube: &Section, resistor: f64, plate: impl Fn(f64) -> (f64, f64), most: f64) -> f64 {
    let (mut low, mut high) = (0.0, most);
    let mut current = 0.5 * most;
    for _ in 0..SEARCH_STEPS {
        let (vpk, slope) = plate(current);
        let c = tube.currents(-current * resistor, vpk);
        let miss = c.plate - current;
        if miss > 0.0 {
            low = current;
        } else {
            high = current;
        }
        let newton = current - miss / (c.plate_by_vpk * slope - c.plate_by_vgk * resistor - 1.0);
        let next = if newton > low && newton < high { newton } else { 0.5 * (low + high) };
        if (next - current).abs() <= 1e-14 * most {
            return next;
        }
        current = next;
    }
    current
}

/// The grid voltage at which `current` flows with `vpk` on the plate.
fn grid_for(tube: &Section, vpk: f64, current: f64) -> f64 {
    let (mut low, mut high) = (-vpk.abs() - 10.0, 20.0);
    let mut vgk = 0.0;
    for _ in 0..SEARCH_STEPS {
        let c = tube.currents(vgk, vpk);
        let miss = c.plate - current;
        if miss > 0.0 {
            high = vgk;
        } else {
            low = vgk;
        }
        let newton = vgk - miss / c.plate_by_vgk;
        let next = if newton > low && newton < high { newton } else { 0.5 * (low + high) };
        if (next - vgk).abs() <= 1e-13 {
            return next;
        }
        vgk = next;
    }
    vgk
}

impl Quantity {
    /// What `tube` says of this quantity under `condition`.
    pub fn of(self, tube: &Section, condition: &Condition) -> f64 {
        let (vgk, vpk) = condition.settle(tube);
        let c = tube.currents(vgk, vpk);
        match self {
            Quantity::PlateCurrent => c.plate,
            Quantity::Mu => c.plate_by_vgk / c.plate_by_vpk,
            Quantity::Gm => c.plate_by_vgk,
            Quantity::Rp => 1.0 / c.plate_by_vpk,
            Quantity::Gain => {
                let load = match condition {
                    Condition::Stage(stage) => 1.0 / stage.plate_resistor + 1.0 / stage.next_grid_resistor,
                    _ => 0.0,
                };
                c.plate_by_vgk / (c.plate_by_vpk + load)
            }
        }
    }
}

impl Figure {
    /// What `tube` says in this figure's place.
    pub fn of(&self, tube: &Section) -> f64 {
        self.quantity.of(tube, &self.condition)
    }

    /// What the type's nominal `tube` says of a specimen that differs from it as given.
    pub fn of_specimen(&self, tube: &Section, specimen: &Specimen) -> f64 {
        let law = tube.law.scaled(specimen.emission, specimen.mu_factor);
        self.quantity.of(&Section { law, ..*tube }, &self.condition.shifted(specimen.grid_offset))
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::triode::{GridLaw, Koren, Law};

    fn tube(card: Koren) -> Section {
        Section { law: Law::Koren(card), grid: GridLaw::BORROWED, capacitance: Default::default() }
    }

    /// Koren's published 12AX7 card at 330 V, 100 kΩ and 1.5 kΩ: 1.07 mA, 221 V plate to cathode, −1.61 V, 1880 µS.
    #[test]
    fn the_published_koren_stage_settles_where_its_book_says() {
        let tube = tube(Koren { mu: 100.0, ex: 1.4, kg1: 1060.0, kp: 600.0, kvb: 300.0 });
        let stage = Stage {
            supply: 330.0,
            plate_resistor: 100e3,
            cathode_resistor: 1500.0,
            next_grid_resistor: f64::INFINITY,
        };
        let condition = Condition::Stage(stage);
        let (vgk, vpk) = condition.settle(&tube);
        let current = Quantity::PlateCurrent.of(&tube, &condition);
        assert!((vgk + 1.61).abs() < 0.005 && (vpk - 221.0).abs() < 0.5, "{vgk} {vpk}");
        assert!((current - 1.07e-3).abs() < 0.005e-3);
        assert!((Quantity::Gm.of(&tube, &condition) - 1880e-6).abs() < 5e-6);
        let again = Condition::Current { vpk, current };
        assert!((again.settle(&tube).0 - vgk).abs() < 1e-9);
        let biased = Condition::CathodeResistor { vpk, resistor: 1500.0 };
        assert!((biased.settle(&tube).0 - vgk).abs() < 1e-9);
    }

    /// Textbook: µ = gm·rp, and a stage's gain is µ·RL/(rp+RL).
    #[test]
    fn the_quantities_belong_together() {
        let tube = tube(Koren { mu: 21.5, ex: 1.3, kg1: 1180.0, kp: 84.0, kvb: 300.0 });
        let stage =
            Stage { supply: 300.0, plate_resistor: 100e3, cathode_resistor: 3000.0, next_grid_resistor: 220e3 };
        let of = |quantity: Quantity| quantity.of(&tube, &Condition::Stage(stage));
        let (mu, rp) = (of(Quantity::Mu), of(Quantity::Rp));
        assert!((mu / (of(Quantity::Gm) * rp) - 1.0).abs() < 1e-12);
        let load = 100e3 * 220e3 / 320e3;
        assert!((of(Quantity::Gain) / (mu * load / (rp + load)) - 1.0).abs() < 1e-12);
    }
}
