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
use crate::wave::{Amplitudes, Modes, PADDED, Rest, Sensitivity, Single};

/// Volts on any capacitor by which a period may miss its beginning.
const CLOSED: f64 = 1e-8;
/// Volts sought all the same, as long as every shot gains a digit: harmonics at −200 dBc are made of them.
const WELL_CLOSED: f64 = 1e-10;
/// Shooting steps before a level is called hard and approached from below.
const SHOOTING_LIMIT: usize = 12;
/// Volts below which a shot's sensitivities serve the next shots too: what they have changed by is as small again.
const NEAR: f64 = 1e-3;
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
    /// Capacitor waves at the beginning, counted from rest, V.
    start: Vec<f64>,
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
    find(network, volts, rate, None)
}

/// The same, sought first near a period already found of the same network: at another number of steps, or another level.
///
/// # Errors
/// [`NoSteadyState`].
///
/// # Panics
/// If `volts.len()` is even.
pub fn steady_state_near(
    network: &Network,
    volts: &[f64],
    rate: f64,
    known: &Period,
) -> Result<Period, NoSteadyState> {
    find(network, volts, rate, Some(known))
}

fn find(network: &Network, volts: &[f64], rate: f64, known: Option<&Period>) -> Result<Period, NoSteadyState> {
    assert!(volts.len() % 2 == 1, "an odd number of steps");
    let sections: Vec<Section> = network.triodes.iter().map(|t| t.section).collect();
    let law = |tube: usize, vgk: f64, vpk: f64| sections[tube].currents(vgk, vpk);
    let rest = Rest::solve(network, None, &law).map_err(|_| NoSteadyState::Network)?;
    let modes = Modes::derive(network, rate, &rest).ok_or(NoSteadyState::Network)?;
    let padded = PADDED.into_iter().find(|&n| n >= modes.count()).ok_or(NoSteadyState::Network)?;
    let task = Task { modes: &modes, rest: &rest, sections: &sections, volts, known };
    match (modes.ports(), padded) {
        (2, 6) => shoot::<2, 6>(&task),
        (2, 8) => shoot::<2, 8>(&task),
        (2, 10) => shoot::<2, 10>(&task),
        (2, 12) => shoot::<2, 12>(&task),
        (4, 6) => shoot::<4, 6>(&task),
        (4, 8) => shoot::<4, 8>(&task),
        (4, 10) => shoot::<4, 10>(&task),
        (4, 12) => shoot::<4, 12>(&task),
        _ => Err(NoSteadyState::Network),
    }
}

/// What is to be found.
struct Task<'a> {
    modes: &'a Modes,
    rest: &'a Rest,
    sections: &'a [Section],
    volts: &'a [f64],
    known: Option<&'a Period>,
}

struct Shooting<'a, const PORTS: usize, const MODES: usize> {
    machine: Single<'a, PORTS, MODES>,
    modes: &'a Modes,
    volts: &'a [f64],
    period: Period,
}

fn shoot<const PORTS: usize, const MODES: usize>(task: &Task<'_>) -> Result<Period, NoSteadyState> {
    let steps = task.volts.len();
    let period =
        Period { output: vec![0.0; steps], root_volts: vec![task.rest.volts; steps], shots: 0, start: Vec::new() };
    let machine = Single::new(task.modes, task.sections);
    let mut shooting = Shooting::<PORTS, MODES> { machine, modes: task.modes, volts: task.volts, period };
    if let Some(known) = task.known {
        let mut state = padded(&task.modes.mode_by_wave.times_vector(&known.start));
        for (k, volts) in shooting.period.root_volts.iter_mut().enumerate() {
            *volts = known.root_volts[k * known.root_volts.len() / steps];
        }
        if shooting.close(&mut state, 1.0) {
            return Ok(shooting.period);
        }
    }
    shooting.period.root_volts.fill(task.rest.volts);
    // Straight to the level first; where that fails, up from silence in strides that grow and shrink with success.
    let mut state: Amplitudes<MODES> = [0.0; MODES];
    let (mut reached, mut stride) = (0.0, 1.0);
    let mut good_volts = shooting.period.root_volts.clone();
    while reached < 1.0 {
        let level = f64::min(reached + stride, 1.0);
        let mut trial = state;
        if shooting.close(&mut trial, level) {
            (state, reached) = (trial, level);
            good_volts.clone_from(&shooting.period.root_volts);
            stride *= 2.0;
        } else {
            shooting.period.root_volts.clone_from(&good_volts);
            stride *= 0.5;
            if stride < HARDEST_STRIDE {
                return Err(NoSteadyState::NotClosed);
            }
        }
    }
    Ok(shooting.period)
}

fn padded<const MODES: usize>(values: &[f64]) -> Amplitudes<MODES> {
    std::array::from_fn(|k| values.get(k).copied().unwrap_or(0.0))
}

impl<const PORTS: usize, const MODES: usize> Shooting<'_, PORTS, MODES> {
    /// Shoots at `level` times the input until the period closes; false where it does not.
    fn close(&mut self, state: &mut Amplitudes<MODES>, level: f64) -> bool {
        let mut last_miss = f64::INFINITY;
        let mut sensitivity = identity();
        for _ in 0..SHOOTING_LIMIT {
            self.period.shots += 1;
            let start = *state;
            if last_miss < NEAR {
                self.run(state, level, None);
            } else {
                sensitivity = identity();
                self.run(state, level, Some(&mut sensitivity));
            }
            let Some(step) = newton_step::<MODES>(self.modes.count(), &start, state, &sensitivity) else {
                return false;
            };
            for k in 0..MODES {
                state[k] = start[k] + step[k];
            }
            let miss = largest(&self.waves(&step));
            if miss < WELL_CLOSED || (miss < CLOSED && miss > 0.1 * last_miss) {
                self.period.start = self.waves(&start);
                return true;
            }
            if !miss.is_finite() || miss > 1e6 + 1e3 * last_miss {
                return false;
            }
            last_miss = miss;
        }
        false
    }

    /// One period from `state`, which it moves to the period's end.
    ///
    /// The root's voltages are guessed from those of the last shot at the same step, moved by a parabola through what the
    /// last three steps of this one differ by.
    fn run(&mut self, state: &mut Amplitudes<MODES>, level: f64, mut sensitivity: Option<&mut Sensitivity<MODES>>) {
        let mut moved = [[0.0; PORTS]; 3];
        for (k, &volts) in self.volts.iter().enumerate() {
            let last = self.period.root_volts[k];
            let guess = std::array::from_fn(|p| last[p] + 3.0 * (moved[0][p] - moved[1][p]) + moved[2][p]);
            let (output, root) = self.machine.step(state, level * volts, &guess, sensitivity.as_deref_mut());
            self.period.output[k] = output;
            self.period.root_volts[k][..PORTS].copy_from_slice(&root);
            moved = [std::array::from_fn(|p| root[p] - last[p]), moved[0], moved[1]];
        }
    }

    /// The capacitors' waves that amplitudes of the modes make, V.
    fn waves(&self, amplitudes: &Amplitudes<MODES>) -> Vec<f64> {
        self.modes.wave_by_mode.times_vector(&amplitudes[..self.modes.count()])
    }
}

/// The largest size; infinite where one is NaN.
fn largest(values: &[f64]) -> f64 {
    values.iter().fold(0.0, |a: f64, b| if b.is_nan() { f64::INFINITY } else { a.max(b.abs()) })
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
    Some(padded(&solution))
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
