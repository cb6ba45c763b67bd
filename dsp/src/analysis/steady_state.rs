//! The periodic steady state of a stage under a tone, found by shooting.
//!
//! Bias shifts take many seconds to settle, so nothing is waited for: the state that repeats after one period is found
//! by Newton's method on the engine's own state (Aprille & Trick, "Steady-state analysis of nonlinear circuits with
//! periodic inputs", Proc. IEEE 60, 1972).

use num_complex::Complex64;

use crate::circuit::Network;
use crate::linear::Matrix;
use crate::signal::CoherentTable;
use crate::triode::Section;
use crate::wave::{Modes, PADDED, Rest, Sensitivity, Single, SingleState};

/// Volts on any capacitor by which a period may miss its beginning.
const CLOSED: f64 = 1e-8;
/// Shooting steps before a level is called hard and approached from below.
const SHOOTING_LIMIT: usize = 12;
/// Halvings of the stride in level before the tone is given up.
const HARDEST_STRIDE: f64 = 1.0 / 64.0;

/// One period of a stage's steady state, sampled at equal steps.
#[derive(Clone, Debug, PartialEq)]
pub struct Period {
    /// Volts at `o`, one value a step.
    pub output: Vec<f64>,
    /// Root voltages at every step: vgk and vpk, tube after tube.
    pub root_volts: Vec<[f64; 4]>,
    /// Shooting steps taken.
    pub shots: usize,
}

/// Why there is no steady state to show.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum NoSteadyState {
    /// The network has no solution.
    Network,
    /// Shooting did not close the period.
    NotClosed,
}

impl std::fmt::Display for NoSteadyState {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self {
            NoSteadyState::Network => write!(f, "the stage settles at no operating point"),
            NoSteadyState::NotClosed => write!(f, "no state was found that repeats after one period"),
        }
    }
}

impl std::error::Error for NoSteadyState {}

/// The steady state of `network` under the periodic input `volts`, one value a step of `1/rate` seconds.
///
/// The number of steps must be odd: each tube's three capacitances make a loop whose trapezoidal state alternates in
/// sign, and an even count would find any size of it periodic.
///
/// # Errors
/// [`NoSteadyState`].
///
/// # Panics
/// If `volts.len()` is even.
pub fn steady_state(network: &Network, volts: &[f64], rate: f64) -> Result<Period, NoSteadyState> {
    assert!(volts.len() % 2 == 1, "an odd number of steps");
    let sections: Vec<Section> = network.triodes.iter().map(|t| t.section).collect();
    let law = |tube: usize, vgk: f64, vpk: f64| sections[tube].currents(vgk, vpk);
    let rest = Rest::solve(network, None, &law).map_err(|_| NoSteadyState::Network)?;
    let modes = Modes::derive(network, rate, &rest).ok_or(NoSteadyState::Network)?;
    let padded = PADDED.into_iter().find(|&n| n >= modes.count()).ok_or(NoSteadyState::Network)?;
    match (modes.ports(), padded) {
        (2, 6) => shoot::<2, 6>(&modes, &rest, &sections, volts),
        (2, 8) => shoot::<2, 8>(&modes, &rest, &sections, volts),
        (2, 10) => shoot::<2, 10>(&modes, &rest, &sections, volts),
        (2, 12) => shoot::<2, 12>(&modes, &rest, &sections, volts),
        (4, 6) => shoot::<4, 6>(&modes, &rest, &sections, volts),
        (4, 8) => shoot::<4, 8>(&modes, &rest, &sections, volts),
        (4, 10) => shoot::<4, 10>(&modes, &rest, &sections, volts),
        (4, 12) => shoot::<4, 12>(&modes, &rest, &sections, volts),
        _ => Err(NoSteadyState::Network),
    }
}

struct Shooting<'a, const PORTS: usize, const MODES: usize> {
    machine: Single<'a, PORTS, MODES>,
    modes: &'a Modes,
    volts: &'a [f64],
    period: Period,
}

fn shoot<const PORTS: usize, const MODES: usize>(
    modes: &Modes,
    rest: &Rest,
    sections: &[Section],
    volts: &[f64],
) -> Result<Period, NoSteadyState> {
    let mut state = Single::<PORTS, MODES>::at_rest(&rest.volts);
    let period = Period { output: vec![0.0; volts.len()], root_volts: vec![[0.0; 4]; volts.len()], shots: 0 };
    let mut shooting = Shooting { machine: Single::new(modes, sections), modes, volts, period };
    // Straight to the level first; where that fails, up from silence in strides that grow and shrink with success.
    let (mut reached, mut stride) = (0.0, 1.0);
    while reached < 1.0 {
        let level = f64::min(reached + stride, 1.0);
        let mut trial = state.clone();
        if shooting.close(&mut trial, level) {
            (state, reached) = (trial, level);
            stride *= 2.0;
        } else {
            stride *= 0.5;
            if stride < HARDEST_STRIDE {
                return Err(NoSteadyState::NotClosed);
            }
        }
    }
    Ok(shooting.period)
}

impl<const PORTS: usize, const MODES: usize> Shooting<'_, PORTS, MODES> {
    /// Shoots at `level` times the input until the period closes; false where it does not.
    fn close(&mut self, state: &mut SingleState<PORTS, MODES>, level: f64) -> bool {
        let mut last_miss = f64::INFINITY;
        for _ in 0..SHOOTING_LIMIT {
            self.period.shots += 1;
            let start = state.modes;
            let mut sensitivity = identity();
            self.run(state, level, &mut sensitivity);
            let Some(step) = newton_step::<MODES>(self.modes.count(), &start, &state.modes, &sensitivity) else {
                return false;
            };
            for k in 0..MODES {
                state.modes[k] = start[k] + step[k];
            }
            let miss = self.in_volts(&step);
            if miss < CLOSED {
                return true;
            }
            if !miss.is_finite() || miss > 1e6 + 1e3 * last_miss {
                return false;
            }
            last_miss = miss;
        }
        false
    }

    fn run(&mut self, state: &mut SingleState<PORTS, MODES>, level: f64, sensitivity: &mut Sensitivity<MODES>) {
        for (k, &volts) in self.volts.iter().enumerate() {
            self.period.output[k] = self.machine.step(state, level * volts, Some(&mut *sensitivity));
            self.period.root_volts[k][..PORTS].copy_from_slice(&state.volts[0]);
        }
    }

    /// The largest change of a capacitor's wave that a change of the modes makes, V.
    fn in_volts(&self, step: &[f64; MODES]) -> f64 {
        let waves = self.modes.wave_by_mode.times_vector(&step[..self.modes.count()]);
        waves.iter().fold(0.0, |a: f64, b| if b.is_nan() { f64::INFINITY } else { a.max(b.abs()) })
    }
}

fn identity<const N: usize>() -> [[f64; N]; N] {
    std::array::from_fn(|r| std::array::from_fn(|c| if r == c { 1.0 } else { 0.0 }))
}

/// (I − M)⁻¹ · (end − start).
fn newton_step<const MODES: usize>(
    count: usize,
    start: &[f64; MODES],
    end: &[f64; MODES],
    sensitivity: &Sensitivity<MODES>,
) -> Option<[f64; MODES]> {
    let mut matrix = Matrix::identity(count);
    for row in 0..count {
        for column in 0..count {
            matrix[(row, column)] -= sensitivity[row][column];
        }
    }
    let gap: Vec<f64> = (0..count).map(|k| end[k] - start[k]).collect();
    let solution = matrix.solve_vector(&gap)?;
    Some(std::array::from_fn(|k| solution.get(k).copied().unwrap_or(0.0)))
}

/// Complex peak amplitudes of harmonics 1…`orders` of one period, sine reference: A·sin(ωt + φ) reads A·e^{jφ}.
pub fn harmonics(period: &[f64], orders: usize) -> Vec<Complex64> {
    bins(period, &(1..=orders).collect::<Vec<_>>())
}

/// Complex peak amplitudes of one period at the given multiples of its frequency, sine reference.
pub fn bins(period: &[f64], multiples: &[usize]) -> Vec<Complex64> {
    let table = CoherentTable::new(period.len());
    multiples.iter().map(|&multiple| table.component(period, multiple)).collect()
}
