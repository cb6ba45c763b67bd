//! One cycle of a tone as a level search looks at it: harmonics and what the tubes go through.

use num_complex::Complex64;

use super::steady_state::{NoSteadyState, harmonics, steady_state};
use crate::circuit::{Network, Role};
use crate::portable::magnitude;

/// Steps of a cycle: the tenth harmonic reads within some 0.005 dB, the fundamental within 0.0001 dB.
const STEPS: usize = 385;
/// Harmonics that are summed.
const ORDERS: usize = 10;

/// One cycle of a sine through a stage.
#[derive(Clone, Debug, PartialEq)]
pub struct Cycle {
    /// Level at `in`, V rms.
    pub input_rms: f64,
    /// Complex peak amplitudes at `o`, fundamental first, V.
    pub harmonics: Vec<Complex64>,
    /// What each tube goes through, gain tube first.
    pub tubes: Vec<TubeCycle>,
    /// Volts at `o`, one value a step.
    pub output: Vec<f64>,
}

/// What a tube goes through in a cycle.
#[derive(Clone, Debug, PartialEq)]
pub struct TubeCycle {
    /// Which tube.
    pub role: Role,
    /// Largest grid current without its constant part, A.
    pub peak_grid_current: f64,
    /// Least plate current, A.
    pub least_plate_current: f64,
    /// Largest plate-to-cathode voltage, V.
    pub peak_plate_volts: f64,
    /// Least plate-to-cathode voltage, V.
    pub least_plate_volts: f64,
    /// Grid-to-cathode volts, plate-to-cathode volts and plate amperes at every step: the tone's path.
    pub path: Vec<(f64, f64, f64)>,
}

impl Cycle {
    /// The steady state of `network` under a sine of `input_rms` volts at `frequency` Hz.
    ///
    /// # Errors
    /// [`NoSteadyState`] where shooting does not close the period.
    pub fn of(network: &Network, frequency: f64, input_rms: f64) -> Result<Cycle, NoSteadyState> {
        let peak = input_rms * std::f64::consts::SQRT_2;
        let sine = |k: usize| peak * libm::sin(std::f64::consts::TAU * k as f64 / STEPS as f64);
        let input: Vec<f64> = (0..STEPS).map(sine).collect();
        let period = steady_state(network, &input, frequency * STEPS as f64)?;
        let tubes = (0..network.triodes.len()).map(|tube| tube_cycle(network, tube, &period.root_volts)).collect();
        Ok(Cycle { input_rms, harmonics: harmonics(&period.output, ORDERS), tubes, output: period.output })
    }

    /// THD_F.
    pub fn thd(&self) -> f64 {
        let squares: f64 = self.harmonics[1..].iter().map(|h| h.norm_sqr()).sum();
        squares.sqrt() / magnitude(self.harmonics[0])
    }

    /// Fundamental at `o`, V rms.
    pub fn output_rms(&self) -> f64 {
        magnitude(self.harmonics[0]) / std::f64::consts::SQRT_2
    }

    /// Gain of the fundamental as a factor.
    pub fn gain(&self) -> f64 {
        self.output_rms() / self.input_rms
    }
}

fn tube_cycle(network: &Network, tube: usize, root_volts: &[[f64; 4]]) -> TubeCycle {
    let place = &network.triodes[tube];
    let constant = place.section.grid.ig0;
    let mut cycle = TubeCycle {
        role: place.role,
        peak_grid_current: 0.0,
        least_plate_current: f64::INFINITY,
        peak_plate_volts: f64::NEG_INFINITY,
        least_plate_volts: f64::INFINITY,
        path: Vec::with_capacity(root_volts.len()),
    };
    for volts in root_volts {
        let (vgk, vpk) = (volts[2 * tube], volts[2 * tube + 1]);
        let currents = place.section.currents(vgk, vpk);
        cycle.peak_grid_current = cycle.peak_grid_current.max(currents.grid - constant);
        cycle.least_plate_current = cycle.least_plate_current.min(currents.plate);
        cycle.peak_plate_volts = cycle.peak_plate_volts.max(vpk);
        cycle.least_plate_volts = cycle.least_plate_volts.min(vpk);
        cycle.path.push((vgk, vpk, currents.plate));
    }
    cycle
}
