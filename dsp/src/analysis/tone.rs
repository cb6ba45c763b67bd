//! A tone through the stage: gain and harmonics, each with how far it can be trusted.

use std::cell::RefCell;

use num_complex::Complex64;

use super::refine::{Amplitude, refined};
use super::steady_state::{NoSteadyState, Period, harmonics, steady_state, steady_state_near};
use crate::circuit::Network;
use crate::portable::{decibels, degrees, magnitude};

/// Steps a period to begin with; the trapezoidal rule then reads the tenth harmonic within some 0.005 dB.
const FIRST_STEPS: usize = 385;
/// Steps a cycle of the highest harmonic to begin with, at least.
const STEPS_AN_ORDER: usize = 38;
/// Highest harmonic that the THD sums.
pub const THD_ORDERS: usize = 10;

/// What a sine of one level and frequency becomes.
#[derive(Clone, Debug, PartialEq)]
pub struct Tone {
    /// Frequency, Hz.
    pub frequency: f64,
    /// Level at `in`, V rms.
    pub input_rms: f64,
    /// Complex peak amplitudes at `o`, fundamental first, sine reference, V.
    pub harmonics: Vec<Amplitude>,
}

impl Tone {
    /// Measures `network` with a sine of `input_rms` volts at `frequency` Hz, to harmonic `orders`.
    ///
    /// The steps of a period are doubled and the harmonics extrapolated to none (the trapezoidal rule's error falls as
    /// the square of the step) until extrapolation moves no harmonic by more than 0.02 dB.
    ///
    /// # Errors
    /// [`NoSteadyState`] where shooting does not close the period.
    pub fn measure(
        network: &Network,
        frequency: f64,
        input_rms: f64,
        orders: usize,
    ) -> Result<Tone, NoSteadyState> {
        // Each finer period is sought from the one before.
        let found: RefCell<Option<Period>> = RefCell::new(None);
        let sums = |steps: usize| -> Result<Vec<Complex64>, NoSteadyState> {
            let input = sine(steps, input_rms * std::f64::consts::SQRT_2);
            let rate = frequency * steps as f64;
            let period = match found.take() {
                Some(coarser) => steady_state_near(network, &input, rate, &coarser)?,
                None => steady_state(network, &input, rate)?,
            };
            let sums = harmonics(&period.output, orders);
            found.replace(Some(period));
            Ok(sums)
        };
        let harmonics = refined(FIRST_STEPS.max(orders * STEPS_AN_ORDER), &sums)?;
        Ok(Tone { frequency, input_rms, harmonics })
    }

    /// Size of harmonic `order` over the fundamental, dB.
    pub fn dbc(&self, order: usize) -> Option<f64> {
        let (h, first) = (self.harmonic(order)?, self.harmonic(1)?);
        let over_fundamental = magnitude(h) / magnitude(first);
        (over_fundamental > 0.0).then(|| decibels(over_fundamental))
    }

    /// Phase of harmonic `order` relative to the fundamental, φn − n·φ1, degrees from 0 to 360.
    pub fn relative_phase(&self, order: usize) -> Option<f64> {
        let (h, first) = (self.harmonic(order)?, self.harmonic(1)?);
        let relative = (degrees(h) - order as f64 * degrees(first)).rem_euclid(360.0);
        // A phase just below 0 may round up to a full turn.
        Some(if relative >= 360.0 { 0.0 } else { relative })
    }

    /// Fundamental at `o`, V rms.
    pub fn output_rms(&self) -> Option<f64> {
        Some(magnitude(self.harmonic(1)?) / std::f64::consts::SQRT_2)
    }

    /// Gain of the fundamental from `in` to `o`, dB.
    pub fn gain_db(&self) -> Option<f64> {
        Some(decibels(self.output_rms()? / self.input_rms))
    }

    /// THD_F: the root of the summed squares of the harmonics from the second to the tenth, over the fundamental (IEC 60268-3).
    pub fn thd_f(&self) -> Option<f64> {
        Some(self.distortion()? / magnitude(self.harmonic(1)?))
    }

    /// THD_R: the same over fundamental and harmonics together (IEC 60268-3).
    pub fn thd_r(&self) -> Option<f64> {
        let distortion = self.distortion()?;
        Some(distortion / libm::hypot(magnitude(self.harmonic(1)?), distortion))
    }

    fn harmonic(&self, order: usize) -> Option<Complex64> {
        self.harmonics.get(order - 1)?.settled()
    }

    /// √ΣH² of the second to the tenth harmonic; `None` where one that may matter has not settled.
    fn distortion(&self) -> Option<f64> {
        let summed = self.harmonics.get(1..)?.iter().take(THD_ORDERS - 1);
        if summed.clone().any(|h| *h == Amplitude::Unsettled) {
            return None;
        }
        let squares: Vec<f64> = summed.filter_map(|h| h.settled()).map(|h| h.norm_sqr()).collect();
        (!squares.is_empty()).then(|| squares.iter().sum::<f64>().sqrt())
    }
}

fn sine(steps: usize, peak: f64) -> Vec<f64> {
    (0..steps).map(|k| peak * libm::sin(std::f64::consts::TAU * k as f64 / steps as f64)).collect()
}
