//! Fitting a law to points that someone measured: plate volts, grid volts, plate current, perhaps grid current.

use super::evidence::{Condition, Figure, Quantity};
use super::least_squares::{Bounds, minimise};
use super::space::{Family, Prior, coordinates};
use super::task::{Set, Task};
use crate::triode::{GridLaw, Law, Section};

/// One measured point.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct CurvePoint {
    /// Plate to cathode, V.
    pub vpk: f64,
    /// Grid to cathode, V.
    pub vgk: f64,
    /// Plate current, A.
    pub plate: f64,
    /// Grid current where it was measured, A.
    pub grid: Option<f64>,
}

/// How to fit.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct FitOptions {
    /// Which law.
    pub family: Family,
    /// Reading error, part of the reading, one standard deviation.
    pub relative_error: f64,
    /// What the meter resolves, A.
    pub resolution: f64,
    /// Fits in the ensemble.
    pub members: usize,
    /// Decides every random draw.
    pub seed: u64,
}

impl Default for FitOptions {
    /// The library's own law, readings within 2 % and 1 µA, forty members: the band between
    /// the least and the most of them then holds the truth some nineteen times in twenty.
    fn default() -> Self {
        FitOptions { family: Family::TwoSection, relative_error: 0.02, resolution: 1e-6, members: 40, seed: 1 }
    }
}

/// What came of it.
#[derive(Clone, Debug, PartialEq)]
pub struct Fit {
    /// The nominal law.
    pub law: Law,
    /// The grid's law: fitted where grid current was measured, else borrowed.
    pub grid: GridLaw,
    /// True where no point told anything of the grid.
    pub grid_borrowed: bool,
    /// Equally good laws.
    pub ensemble: Vec<Law>,
    /// What the nominal law says at each point, plate current, A.
    pub fitted: Vec<f64>,
    /// Parameters that the points do not pin, by the name a stage file gives them.
    pub unpinned: Vec<&'static str>,
}

/// Why there is no fit.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum FitError {
    /// Fewer points than [`FEWEST_POINTS`].
    TooFew {
        /// How many there are.
        given: usize,
    },
    /// A point, counted from 0, holds a number that is not finite, or a negative plate voltage.
    BadPoint {
        /// Which.
        index: usize,
    },
    /// No point has a plate current that the meter resolves.
    NoCurrent,
}

impl std::fmt::Display for FitError {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self {
            FitError::TooFew { given } => {
                write!(f, "{given} points do not make a tube: give at least {FEWEST_POINTS}")
            }
            FitError::BadPoint { index } => {
                write!(f, "point {}: volts and amperes must be finite, the plate not negative", index + 1)
            }
            FitError::NoCurrent => write!(f, "no point has a plate current to speak of"),
        }
    }
}

impl std::error::Error for FitError {}

/// The fewest points that are worth fitting.
pub const FEWEST_POINTS: usize = 4;

/// A parameter whose ensemble is this much of what was believed beforehand has learnt nothing.
const LEARNT_NOTHING: f64 = 0.6;
/// Believed beforehand of the logarithms of perveance and µ: anything; pinned means within this, one standard deviation.
const PINNED: f64 = 0.1;

/// Fits a law to `points`, each equally trusted.
///
/// # Errors
/// [`FitError`] where the points cannot be fitted.
pub fn fit_points(points: &[CurvePoint], options: &FitOptions) -> Result<Fit, FitError> {
    check(points, options)?;
    let grid = grid_law(points);
    let task = Task {
        family: options.family,
        priors: options.family.priors(),
        grid: grid.unwrap_or(GridLaw::BORROWED),
        sets: vec![Set { figures: points.iter().map(|point| figure(point, options)).collect(), specimen: false }],
    };
    let nominal = task.solve();
    let member = |k: usize| task.member(options.seed.wrapping_add(k as u64)).law;
    let ensemble: Vec<Law> = (0..options.members).map(member).collect();
    let tube = Section { law: nominal.law, grid: task.grid, capacitance: Default::default() };
    Ok(Fit {
        law: nominal.law,
        grid: task.grid,
        grid_borrowed: grid.is_none(),
        fitted: points.iter().map(|point| tube.currents(point.vgk, point.vpk).plate).collect(),
        unpinned: unpinned(&task.priors, &ensemble),
        ensemble,
    })
}

fn check(points: &[CurvePoint], options: &FitOptions) -> Result<(), FitError> {
    if points.len() < FEWEST_POINTS {
        return Err(FitError::TooFew { given: points.len() });
    }
    let good = |p: &CurvePoint| {
        let numbers = [p.vpk, p.vgk, p.plate, p.grid.unwrap_or_default()];
        numbers.iter().all(|number| number.is_finite()) && p.vpk >= 0.0
    };
    if let Some(index) = points.iter().position(|point| !good(point)) {
        return Err(FitError::BadPoint { index });
    }
    let flows = |point: &CurvePoint| point.plate > options.resolution;
    if points.iter().any(flows) { Ok(()) } else { Err(FitError::NoCurrent) }
}

fn figure(point: &CurvePoint, options: &FitOptions) -> Figure {
    let error = libm::hypot(options.relative_error * point.plate, options.resolution);
    let condition = Condition::Bias { vpk: point.vpk, vgk: point.vgk };
    Figure { condition, quantity: Quantity::PlateCurrent, published: point.plate, error }
}

/// Grid amperes from which a reading says something of the law.
const GRID_FLOOR: f64 = 0.1e-6;

/// The grid's law where at least three points show grid current, fitted by itself.
fn grid_law(points: &[CurvePoint]) -> Option<GridLaw> {
    let seen: Vec<(f64, f64)> = points.iter().filter_map(|point| Some((point.vgk, point.grid?))).collect();
    if seen.iter().filter(|(_, current)| *current > GRID_FLOOR).count() < 3 {
        return None;
    }
    let law = |at: &[f64]| GridLaw { gg: libm::exp(at[0]), xi: at[1], cg: libm::exp(at[2]), ig0: 0.0 };
    let borrowed = GridLaw::BORROWED;
    let start = [libm::log(borrowed.gg), borrowed.xi, libm::log(borrowed.cg)];
    let bounds = [(1e-6, 1e-1), (0.0, 0.0), (1.0, 50.0)];
    let mut bounds = bounds.map(|(low, high): (f64, f64)| Bounds { low: libm::log(low), high: libm::log(high) });
    bounds[1] = Bounds { low: 0.8, high: 2.5 };
    let residuals = |at: &[f64], out: &mut Vec<f64>| {
        let law = law(at);
        out.clear();
        out.extend(
            seen.iter()
                .map(|&(vgk, current)| (law.current(vgk).0 - current) / libm::hypot(0.03 * current, GRID_FLOOR)),
        );
        // Few points leave the exponent and the sharpness free: hold them loosely to the measured 12AX7's.
        out.extend([(at[1] - start[1]) / 0.2, (at[2] - start[2]) / 0.5]);
    };
    Some(law(&minimise(residuals, &start, &bounds, 100).at))
}

/// The parameters in which the ensemble scatters about as much as was believed without any point.
fn unpinned(priors: &[Prior], ensemble: &[Law]) -> Vec<&'static str> {
    let points: Vec<Vec<f64>> = ensemble.iter().map(coordinates).collect();
    let scatter = |j: usize| {
        let count = points.len() as f64;
        let mean = points.iter().map(|point| point[j]).sum::<f64>() / count;
        let square: f64 = points.iter().map(|point| (point[j] - mean) * (point[j] - mean)).sum();
        (square / count).sqrt()
    };
    let loose = |(j, prior): (usize, &Prior)| {
        let most = if prior.spread.is_finite() { LEARNT_NOTHING * prior.spread } else { PINNED };
        (scatter(j) > most).then_some(prior.name)
    };
    priors.iter().enumerate().filter_map(loose).collect()
}
