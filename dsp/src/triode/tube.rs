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
    /// The section of a tube whose plate current is `emission` times and whose µ is `mu_factor` times the nominal, with
    /// `sections` of them in parallel: plate current, grid current and capacitances add, µ and voltages do not.
    ///
    /// The factors are those that measured tubes scatter by: of the law's own perveance and µ, each alone. Grid current
    /// and capacitances do not follow emission.
    pub fn scaled(&self, emission: f64, mu_factor: f64, sections: u8) -> Section {
        let count = f64::from(sections);
        // The Dempwolf & Zölzer law takes the grid's current from the plate's, so both must count the sections alike.
        let law = self.law.scaled(emission * count, mu_factor);
        let GridLaw { gg, xi, cg, ig0 } = self.grid;
        let grid = GridLaw { gg: gg * count, xi, cg, ig0: ig0 * count };
        let Capacitances { grid_cathode, grid_plate, plate_cathode } = self.capacitance;
        let capacitance = Capacitances {
            grid_cathode: grid_cathode * count,
            grid_plate: grid_plate * count,
            plate_cathode: plate_cathode * count,
        };
        Section { law, grid, capacitance }
    }

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

#[cfg(test)]
mod tests {
    use super::*;
    use crate::triode::{DempwolfZoelzer, Koren, library};

    fn sections() -> Vec<Section> {
        let grid = GridLaw { ig0: 4e-8, ..GridLaw::BORROWED };
        let of = |law: Law| Section { law, grid, capacitance: Capacitances::default() };
        let own = library::names().filter_map(library::find).map(|tube| tube.section);
        let published = [
            of(Law::DempwolfZoelzer(DempwolfZoelzer { g: 2.242e-3, mu: 103.2, gamma: 1.26, c: 3.4 })),
            of(Law::Koren(Koren { mu: 100.0, ex: 1.4, kg1: 1060.0, kp: 600.0, kvb: 300.0 })),
        ];
        own.chain(published).collect()
    }

    /// Textbook: n tubes in parallel have n times the current and gm, an nth of rp and the same µ.
    #[test]
    fn sections_in_parallel_add_their_currents_and_capacitances() {
        for section in sections() {
            for (vgk, vpk) in [(-1.0, 150.0), (-4.0, 250.0), (0.5, 60.0)] {
                let (one, two) = (section.currents(vgk, vpk), section.scaled(1.0, 1.0, 2).currents(vgk, vpk));
                let twice = |a: f64, b: f64| (b - 2.0 * a).abs() <= 1e-12 * b.abs();
                assert!(twice(one.plate, two.plate) && twice(one.grid, two.grid), "{section:?}");
                assert!(twice(one.plate_by_vgk, two.plate_by_vgk) && twice(one.plate_by_vpk, two.plate_by_vpk));
            }
            let doubled = section.scaled(1.0, 1.0, 2).capacitance;
            assert_eq!(doubled.grid_plate, 2.0 * section.capacitance.grid_plate);
        }
    }

    /// Emission scales the cathode's current at the same voltages; the grid's share of it stays.
    #[test]
    fn emission_scales_the_plate_current_and_leaves_mu() {
        for section in sections() {
            let (one, more) = (section.currents(-1.0, 150.0), section.scaled(1.3, 1.0, 1).currents(-1.0, 150.0));
            assert!(((more.plate + more.grid) / (one.plate + one.grid) - 1.3).abs() < 1e-4, "{section:?}");
            let mu = |c: Currents| c.plate_by_vgk / c.plate_by_vpk;
            assert!((mu(more) / mu(one) - 1.0).abs() < 1e-4);
            assert_eq!(more.grid, one.grid);
        }
    }

    /// A µ factor moves µ by that factor and, with the grid moved to keep the plate current, nothing else by much.
    #[test]
    fn mu_factor_scales_mu() {
        for section in sections().iter().filter(|section| !matches!(section.law, Law::Koren(_))) {
            // Plate voltage up by the same factor keeps every section's own drive; far above the knee the
            // currents must agree.
            let (one, more) = (section.currents(-2.0, 300.0), section.scaled(1.0, 1.1, 1).currents(-2.0, 330.0));
            let knee = 2e-3;
            assert!((more.plate / one.plate - 1.0).abs() < knee, "{section:?}");
            assert!((more.plate_by_vpk * 1.1 / one.plate_by_vpk - 1.0).abs() < 5.0 * knee, "{section:?}");
        }
    }
}
