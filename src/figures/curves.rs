//! Curves that the page draws: plate curves with the load line, and one cycle at three levels.

use platewright_dsp::analysis::{Cycle, OperatingPoint, TubePoint, tube_type};
use platewright_dsp::circuit::{Network, Role, Stage};
use platewright_dsp::triode::Section;
use rayon::prelude::*;

use super::{CurvesFigures, CycleFigures, GridCurveFigures, PathFigures, PlateFigures};

/// The tone, Hz.
const TONE: f64 = 1000.0;
/// Every how many of a cycle's 385 steps one is kept.
const KEPT: usize = 5;
/// Points of a plate curve.
const POINTS: usize = 49;
/// Most plate curves below that of 0 V.
const CURVES: usize = 9;
/// Steps between grid voltages that a tube manual might choose, V.
const STEPS: [f64; 9] = [0.1, 0.2, 0.5, 1.0, 2.0, 5.0, 10.0, 20.0, 50.0];
/// A curve is drawn where it reaches this part of the diagram's height.
const VISIBLE: f64 = 0.03;

/// The curves of a stage whose figures are taken at `level` V rms.
pub fn of(stage: &Stage, network: &Network, point: &OperatingPoint, level: f64) -> CurvesFigures {
    let cycles: Vec<CycleFigures> =
        levels(level, stage.source.full_scale).into_par_iter().map(|level| cycle(network, level)).collect();
    let plates = point.tubes.iter().enumerate().map(|(tube, at)| {
        let paths: Vec<&PathFigures> = cycles.iter().filter_map(|c| c.paths.get(tube)).collect();
        plate(stage, &network.triodes[tube].section, at, &paths)
    });
    CurvesFigures { plates: plates.collect(), cycles }
}

/// The level of the figures, full scale, and 12 dB over both, rising.
fn levels(level: f64, full_scale: f64) -> Vec<f64> {
    let middle = if (level / full_scale - 1.0).abs() < 0.01 { full_scale / 4.0 } else { full_scale };
    let mut levels = vec![level, middle, 4.0 * level.max(middle)];
    levels.sort_by(f64::total_cmp);
    levels
}

fn cycle(network: &Network, input_rms: f64) -> CycleFigures {
    let Ok(cycle) = Cycle::of(network, TONE, input_rms) else {
        return CycleFigures { input_rms, output: Vec::new(), paths: Vec::new() };
    };
    let path = |path: &[(f64, f64, f64)]| PathFigures {
        volts: path.iter().step_by(KEPT).map(|(_, vpk, _)| short(*vpk)).collect(),
        amperes: path.iter().step_by(KEPT).map(|(_, _, amperes)| short(*amperes)).collect(),
    };
    CycleFigures {
        input_rms,
        output: cycle.output.iter().step_by(KEPT).copied().map(short).collect(),
        paths: cycle.tubes.iter().map(|tube| path(&tube.path)).collect(),
    }
}

fn plate(stage: &Stage, section: &Section, at: &TubePoint, paths: &[&PathFigures]) -> PlateFigures {
    let amperes = at.currents.plate;
    let ohms = load(stage, at.role);
    let (at_no_current, at_no_volts) = (at.vpk + amperes * ohms, amperes + at.vpk / ohms);
    let largest = |of: fn(&PathFigures) -> &Vec<f64>, least: f64| {
        paths.iter().flat_map(|p| of(p)).fold(least, |a: f64, b| a.max(*b))
    };
    let top_volts = largest(|p| &p.volts, (2.0 * at.vpk).min(at_no_current));
    let top_amperes = largest(|p| &p.amperes, (2.2 * amperes).min(at_no_volts));
    let step = top_volts / (POINTS - 1) as f64;
    let plate_volts: Vec<f64> = (0..POINTS).map(|k| short(step * k as f64)).collect();
    let kind = tube_type(stage, at.role);
    PlateFigures {
        role: at.role.name().to_owned(),
        tube: kind.map_or_else(String::new, |kind| kind.name.clone()),
        curves: grid_curves(section, &plate_volts, top_amperes),
        plate_volts,
        load_line: [[0.0, short(at_no_volts)], [short(at_no_current), 0.0]],
        at_rest: [at.vpk, amperes],
        dissipation: kind.and_then(|kind| kind.limits.plate_dissipation),
    }
}

/// Resistance that the tube's own current passes at rest, Ω, the supply's left out: the reservoir holds node B.
fn load(stage: &Stage, role: Role) -> f64 {
    match role {
        Role::Gain => stage.gain.plate_resistor + stage.gain.cathode_resistor,
        Role::Follower => stage.follower.as_ref().map_or(1.0, |f| f.tail_resistor + f.bias_resistor.unwrap_or(0.0)),
    }
}

fn grid_curves(section: &Section, plate_volts: &[f64], top_amperes: f64) -> Vec<GridCurveFigures> {
    let top_volts = plate_volts.last().copied().unwrap_or(0.0);
    let visible = |grid: f64| section.currents(grid, top_volts).plate > VISIBLE * top_amperes;
    let most = |step: f64| (1..=CURVES + 1).take_while(|&k| visible(-step * k as f64)).count();
    let step = STEPS.into_iter().find(|&step| most(step) <= CURVES).unwrap_or(STEPS[STEPS.len() - 1]);
    let curve = |k: usize| {
        let grid_volts = -step * k as f64;
        let amperes = plate_volts.iter().map(|&volts| short(section.currents(grid_volts, volts).plate)).collect();
        GridCurveFigures { grid_volts, amperes }
    };
    (0..=most(step)).map(curve).collect()
}

/// Six digits: a curve needs no more, and the file stays small.
fn short(value: f64) -> f64 {
    format!("{value:.5e}").parse().unwrap_or(value)
}
