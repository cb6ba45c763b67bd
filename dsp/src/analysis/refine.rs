//! Figures of a period made finer until they stand still.

use num_complex::Complex64;

use super::steady_state::NoSteadyState;
use crate::portable::{magnitude, ratio};

/// Doublings of the steps before an amplitude that still moves is given up.
const DOUBLINGS: usize = 5;
/// Most that an extrapolated amplitude may differ from the finest sum it was made of, dB.
const WANTED_DB: f64 = 0.02;
/// Amplitudes smaller than this beside the largest are not trusted: down to here the figures follow the independent
/// answers within 0.01 dB, below it they part from them as double precision runs out.
const FLOOR_DB: f64 = -220.0;

/// An amplitude with what is known of it.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Amplitude {
    /// It stands still as the steps are made finer.
    Settled(Complex64),
    /// 220 dB below the largest: too small for the arithmetic, and for anyone.
    Negligible,
    /// It still moves by more than 0.02 dB after the last doubling of the steps.
    Unsettled,
}

impl Amplitude {
    /// The amplitude where it can be trusted.
    pub fn settled(self) -> Option<Complex64> {
        match self {
            Amplitude::Settled(amplitude) => Some(amplitude),
            Amplitude::Negligible | Amplitude::Unsettled => None,
        }
    }
}

/// Complex amplitudes from `sums(steps)`, extrapolated to infinitely many steps.
///
/// The trapezoidal rule's error falls as the square of the step, so two counts give the limit (Richardson).
///
/// # Errors
/// Whatever `sums` gives.
pub(crate) fn refined(
    first_steps: usize,
    sums: &dyn Fn(usize) -> Result<Vec<Complex64>, NoSteadyState>,
) -> Result<Vec<Amplitude>, NoSteadyState> {
    let mut steps = first_steps | 1;
    let mut coarse = sums(steps)?;
    let mut doublings = 0;
    loop {
        let finer = 2 * steps - 1;
        let fine = sums(finer)?;
        let better = extrapolated((steps, &coarse), (finer, &fine));
        let judged = judge(&better, &fine);
        if doublings == DOUBLINGS || !judged.contains(&Amplitude::Unsettled) {
            return Ok(judged);
        }
        (steps, coarse) = (finer, fine);
        doublings += 1;
    }
}

fn extrapolated((n, coarse): (usize, &[Complex64]), (m, fine): (usize, &[Complex64])) -> Vec<Complex64> {
    let finer = m as f64 / n as f64;
    let square = finer * finer;
    coarse.iter().zip(fine).map(|(c, f)| (f * square - c) / (square - 1.0)).collect()
}

fn judge(better: &[Complex64], fine: &[Complex64]) -> Vec<Amplitude> {
    let floor = better.iter().fold(0.0, |a: f64, b| a.max(magnitude(*b))) * ratio(FLOOR_DB);
    let judge = |(b, f): (&Complex64, &Complex64)| match magnitude(*b) {
        size if size <= floor => Amplitude::Negligible,
        size if magnitude(b - f) <= (ratio(WANTED_DB) - 1.0) * size => Amplitude::Settled(*b),
        _ => Amplitude::Unsettled,
    };
    better.iter().zip(fine).map(judge).collect()
}
