//! Where a stage uses a published law beyond what it was made for.

use super::cycle::Cycle;
use super::ratings::tube_type;
use super::{NoSteadyState, OperatingPoint};
use crate::circuit::{Network, Role, Stage};
use crate::triode::Law;

/// Plate-to-cathode volts below which the published laws are used beyond what they were made for.
pub const PUBLISHED_LAW_VOLTS: f64 = 10.0;

/// A tube whose law is used beyond its reach.
#[derive(Clone, Debug, PartialEq)]
pub struct BeyondLaw {
    /// Which tube.
    pub role: Role,
    /// Its type.
    pub tube: String,
    /// Least plate-to-cathode volts.
    pub plate_volts: f64,
}

impl std::fmt::Display for BeyondLaw {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        write!(
            f,
            "{:.1} V plate to cathode; the law of {} was made for {PUBLISHED_LAW_VOLTS:.0} V and more",
            self.plate_volts, self.tube
        )
    }
}

/// Tubes that stand below [`PUBLISHED_LAW_VOLTS`] at rest.
pub fn beyond_law_at_rest(stage: &Stage, point: &OperatingPoint) -> Vec<BeyondLaw> {
    point.tubes.iter().filter_map(|tube| beyond(stage, tube.role, tube.vpk)).collect()
}

/// Tubes that a sine of `input_rms` volts at `frequency` Hz takes below [`PUBLISHED_LAW_VOLTS`]; empty, and nothing is
/// stepped, where no tube has a published law.
///
/// # Errors
/// [`NoSteadyState`] where shooting does not close the period.
pub fn beyond_law_under_tone(
    stage: &Stage,
    network: &Network,
    frequency: f64,
    input_rms: f64,
) -> Result<Vec<BeyondLaw>, NoSteadyState> {
    if !network.triodes.iter().any(|place| published(&place.section.law)) {
        return Ok(Vec::new());
    }
    let cycle = Cycle::of(network, frequency, input_rms)?;
    Ok(cycle.tubes.iter().filter_map(|tube| beyond(stage, tube.role, tube.least_plate_volts)).collect())
}

fn beyond(stage: &Stage, role: Role, plate_volts: f64) -> Option<BeyondLaw> {
    let kind = tube_type(stage, role)?;
    (published(&kind.section.law) && plate_volts < PUBLISHED_LAW_VOLTS).then(|| BeyondLaw {
        role,
        tube: kind.name.clone(),
        plate_volts,
    })
}

fn published(law: &Law) -> bool {
    matches!(law, Law::DempwolfZoelzer(_) | Law::Koren(_))
}
