//! The operating point of stages that nobody would draw: 1 Ω and 10 MΩ in any place, supplies from 5 V to 1000 V.

mod problems;

use platewright_dsp::analysis::OperatingPoint;
use platewright_dsp::circuit::{Network, Node, Stage, Terminal};
use platewright_dsp::wave::{Engine, Machine};
use platewright_dsp::{F64x4, Kernel};
use problems::random::{Random, Values, any_stage};

fn at(network: &Network, point: &OperatingPoint, terminal: Terminal) -> f64 {
    let Some(_) = terminal else { return 0.0 };
    let node = Node::ALL.into_iter().find(|&n| network.place(n) == Some(terminal)).unwrap();
    point.volts(node).unwrap()
}

/// The largest sum of currents into a node beside the sum of their sizes, once what rounding beside the supply's
/// volts can make through each resistance is taken off. A node that carries less than 10 nA counts as one that does.
fn kirchhoff_miss(network: &Network, point: &OperatingPoint) -> f64 {
    let nodes = network.nodes;
    let (mut sum, mut size, mut rounding) = (vec![0.0f64; nodes], vec![1e-8; nodes], vec![0.0; nodes]);
    let supply = (0..network.sources.len()).map(|k| network.constant_volts(k)).fold(1.0, f64::max);
    let mut flow = |from: Terminal, to: Terminal, amps: f64, siemens: f64| {
        for (end, amps) in [(from, -amps), (to, amps)] {
            if let Some(node) = end {
                sum[node] += amps;
                size[node] += amps.abs();
                rounding[node] += 4.0 * f64::EPSILON * supply * siemens;
            }
        }
    };
    for part in &network.resistors {
        let (from, to) = (at(network, point, part.from), at(network, point, part.to));
        flow(part.from, part.to, (from - to) / part.value, 1.0 / part.value);
    }
    for (index, source) in network.sources.iter().enumerate() {
        let (from, to) = (network.constant_volts(index), at(network, point, source.node));
        flow(None, source.node, (from - to) / source.resistance, 1.0 / source.resistance);
    }
    for triode in &network.triodes {
        let cathode = at(network, point, triode.cathode);
        let (vgk, vpk) = (at(network, point, triode.grid) - cathode, at(network, point, triode.plate) - cathode);
        let currents = triode.section.currents(vgk, vpk);
        flow(triode.grid, triode.cathode, currents.grid, 0.0);
        flow(triode.plate, triode.cathode, currents.plate, 0.0);
    }
    (0..nodes).map(|n| (sum[n].abs() - rounding[n]).max(0.0) / size[n]).fold(0.0, f64::max)
}

fn check(index: usize, stage: &Stage) -> (f64, f64) {
    let network = Network::of(stage);
    let point =
        OperatingPoint::solve(&network, None).unwrap_or_else(|| panic!("stage {index} is not solved: {stage:?}"));
    let miss = kirchhoff_miss(&network, &point);
    let machine = Machine::new(stage, 384e3).unwrap_or_else(|e| panic!("stage {index}: {e}: {stage:?}"));
    let mut engine = Engine::new(&[machine], Kernel::detect()).unwrap_or_else(|e| panic!("stage {index}: {e:?}"));
    let quiet = [F64x4::default(); 200];
    engine.process(&quiet, &mut [F64x4::default(); 200]);
    // Grids 40 V above their cathodes (no tube lives there) lie past the tables, which go straight on.
    if point.tubes.iter().any(|t| t.vgk > 40.0) {
        return (miss, 0.0);
    }
    let apart = |(tube, volts): (usize, &[f64])| {
        let rest = point.tubes[tube];
        (volts[0] - rest.vgk).abs().max((volts[1] - rest.vpk).abs())
    };
    let apart = engine.root_volts(0).chunks(2).enumerate().map(apart).fold(0.0, f64::max);
    (miss, apart)
}

#[test]
fn two_thousand_extreme_stages_are_solved() {
    let mut random = Random(20);
    let (mut worst_miss, mut worst_apart) = (0.0f64, 0.0f64);
    for index in 0..2000 {
        let stage = any_stage(&mut random, Values::Extreme);
        let (miss, apart) = check(index, &stage);
        worst_miss = worst_miss.max(miss);
        worst_apart = worst_apart.max(apart);
        assert!(miss < 1e-9, "stage {index}: currents miss by {miss:e}: {stage:?}");
        assert!(apart < 1e-3, "stage {index}: tabulated and computed rest lie {apart:e} V apart: {stage:?}");
    }
    println!("Kirchhoff within {worst_miss:.1e}, tabulated rest within {worst_apart:.1e} V of the computed");
}
