//! Figures as a person reads them in a terminal.

mod bench;
mod bench_sheet;
mod figures;
mod profile;
mod renders;
mod side_by_side;
mod spectrum;
pub mod units;
mod warnings;

use crate::figures::ConfigurationFigures;
use crate::plan::LevelUnit;

pub use bench_sheet::{bench_sheet, suggested};
pub use figures::{at_a_glance, meter_advice, operating_points};
pub use renders::renders;
pub use side_by_side::SideBySide;
pub use warnings::{undecided, warnings};

/// Columns that a table may fill.
pub const WIDTH: usize = 80;

/// What stands wherever the program leads to building.
pub const CAUTIONS: &str = "\
These stages run at hundreds of volts, enough to kill. Reservoirs stay charged after
switch-off: fit bleeders, switch off, wait, and check with a meter before touching.
One hand, dry, insulated probes; never work alone. Fuse the supply, earth the chassis.
Local codes and the judgement of a licensed practitioner come before this sheet.
";

/// A table for everything that was measured, and bars of the harmonics.
pub fn measured(configurations: &[ConfigurationFigures], unit: LevelUnit) -> Vec<String> {
    let tables = [
        profile::profile(configurations, unit),
        figures::tones(configurations, unit),
        bench::intermodulation(configurations, unit),
        bench::headroom(configurations, unit),
        bench::noise(configurations, unit),
        figures::responses(configurations),
        bench::frequency_sweep(configurations),
        bench::level_sweep(configurations, unit),
    ];
    let mut out: Vec<String> = tables.into_iter().flatten().map(|table| table.render(WIDTH)).collect();
    out.push(spectrum::spectrum(configurations));
    out
}
