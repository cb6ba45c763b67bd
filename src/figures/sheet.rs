//! The bench sheet's readings and their bands.

use platewright_dsp::analysis::{OperatingPoint, Scatter, metered_volts, percentile};
use platewright_dsp::circuit::{Network, Node, Stage};
use rayon::prelude::*;

use super::{BandFigures, BenchSheetFigures, MeterFigures};

/// Builds that a band is taken from.
const BUILDS: u64 = 400;
/// Any number does; this one is kept so that a sheet stays the same.
const SEED: u64 = 1904;
/// Ends of a band, percentiles.
const BAND: (f64, f64) = (5.0, 95.0);
/// Resistors whose voltage tells a current.
const ACROSS: [&str; 4] =
    ["supply.resistance", "gain.cathode_resistor", "follower.bias_resistor", "follower.tail_resistor"];

/// Volts of one build; `None` where it has no such place.
type Readings = Vec<Option<f64>>;

/// The sheet of a stage for a meter whose nominal readings are `meter`.
pub fn of(stage: &Stage, network: &Network, point: &OperatingPoint, meter: &MeterFigures) -> BenchSheetFigures {
    let scatter = Scatter { one_bottle: one_bottle(stage), ..Scatter::FIVE_PERCENT };
    let nodes: Vec<Node> =
        meter.readings.iter().filter_map(|r| Node::ALL.into_iter().find(|n| n.name() == r.node)).collect();
    let builds: Vec<(Readings, Readings)> = (0..BUILDS)
        .into_par_iter()
        .map(|index| {
            let build = scatter.build(network, SEED, index);
            (metered_volts(&build, &nodes, meter.resistance), across(&build))
        })
        .collect();
    let node = |(at, reading): (usize, &super::ReadingFigures)| {
        let values: Vec<f64> = builds.iter().filter_map(|(nodes, _)| *nodes.get(at)?).collect();
        band(&reading.node, reading.metered, &values, reading.advice.clone())
    };
    let part = |(at, key): (usize, &&str)| {
        let expected = point.parts.iter().find(|p| p.key == *key)?.volts;
        let values: Vec<f64> = builds.iter().filter_map(|(_, across)| across[at]).collect();
        Some(band(key, Some(expected), &values, None))
    };
    BenchSheetFigures {
        meter_resistance: meter.resistance,
        builds: BUILDS as usize,
        seed: SEED,
        resistors_percent: 100.0 * scatter.resistors,
        supply_percent: 100.0 * scatter.supply,
        nodes: meter.readings.iter().enumerate().map(node).collect(),
        across: ACROSS.iter().enumerate().filter_map(part).collect(),
    }
}

/// Two places with one type are taken to be the sections of one bottle.
fn one_bottle(stage: &Stage) -> bool {
    stage.follower.as_ref().is_some_and(|follower| follower.tube.name == stage.gain.tube.name)
}

fn across(build: &Network) -> Vec<Option<f64>> {
    let point = OperatingPoint::solve(build, None);
    let volts = |key: &&str| Some(point.as_ref()?.parts.iter().find(|part| part.key == *key)?.volts);
    ACROSS.iter().map(volts).collect()
}

fn band(place: &str, expected: Option<f64>, values: &[f64], advice: Option<String>) -> BandFigures {
    let mut sorted = values.to_vec();
    sorted.sort_by(f64::total_cmp);
    let end = |percent: f64| (!sorted.is_empty()).then(|| percentile(&sorted, percent));
    BandFigures { place: place.to_owned(), expected, low: end(BAND.0), high: end(BAND.1), advice }
}
