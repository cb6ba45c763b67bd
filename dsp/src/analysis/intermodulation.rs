//! Intermodulation of two tones on a common period.

use num_complex::Complex64;

use super::refine::refined;
use super::steady_state::{NoSteadyState, bins, steady_state};
use crate::circuit::Network;
use crate::portable::magnitude;

/// Steps a cycle of the higher tone to begin with.
const STEPS_A_CYCLE: usize = 33;

/// A pair of tones.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum TonePair {
    /// 60 Hz and 7 kHz, 4:1, the pair of SMPTE RP 120.
    Smpte,
    /// 250 Hz and 8 kHz, 4:1, the pair of DIN 45403.
    Din,
    /// 19 and 20 kHz, equal (IEC 60268-3 difference-frequency distortion).
    Difference,
}

/// A pair's tones as multiples of the frequency of their common period.
struct Makeup {
    common: f64,
    low: usize,
    high: usize,
    /// Parts of the peak that belong to the low and to the high tone.
    shares: (f64, f64),
}

impl TonePair {
    /// Its key in JSON.
    pub fn key(self) -> &'static str {
        match self {
            TonePair::Smpte => "smpte",
            TonePair::Din => "din",
            TonePair::Difference => "difference",
        }
    }

    fn makeup(self) -> Makeup {
        match self {
            TonePair::Smpte => Makeup { common: 20.0, low: 3, high: 350, shares: (0.8, 0.2) },
            TonePair::Din => Makeup { common: 250.0, low: 1, high: 32, shares: (0.8, 0.2) },
            TonePair::Difference => Makeup { common: 1000.0, low: 19, high: 20, shares: (0.5, 0.5) },
        }
    }
}

/// What a pair of tones leaves at the output, as parts of the higher tone; `None` where a figure is not trusted.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Intermodulation {
    /// SMPTE and DIN: the root of the summed squares of the sidebands at ±1 and ±2 times the low tone, over the high one.
    Sidebands(Option<f64>),
    /// Difference tone: second order A(f2−f1)/2A(f2), third order (A(2f1−f2)+A(2f2−f1))/2A(f2).
    Difference {
        /// d2.
        second: Option<f64>,
        /// d3.
        third: Option<f64>,
    },
}

impl Intermodulation {
    /// Measures `network` with a pair whose sum peaks where a sine of `input_rms` volts would.
    ///
    /// # Errors
    /// [`NoSteadyState`] where shooting does not close the period.
    pub fn measure(network: &Network, pair: TonePair, input_rms: f64) -> Result<Intermodulation, NoSteadyState> {
        let makeup = pair.makeup();
        let wanted = products(pair, &makeup);
        let sums = |steps: usize| -> Result<Vec<Complex64>, NoSteadyState> {
            let input = two_tones(&makeup, steps, input_rms * std::f64::consts::SQRT_2);
            let period = steady_state(network, &input, makeup.common * steps as f64)?;
            Ok(bins(&period.output, &wanted))
        };
        let amplitudes = refined(makeup.high * STEPS_A_CYCLE, &sums)?;
        Ok(Intermodulation::from_amplitudes(
            pair,
            &amplitudes.into_iter().map(|a| a.settled().map(magnitude)).collect::<Vec<_>>(),
        ))
    }

    /// The figures of a pair from the sizes of its high tone and products, in the order of [`products`].
    fn from_amplitudes(pair: TonePair, sizes: &[Option<f64>]) -> Intermodulation {
        let over = |value: Option<f64>, scale: f64| Some(value? / (scale * sizes[0]?));
        match pair {
            TonePair::Smpte | TonePair::Din => {
                let squares: Option<f64> = sizes[1..].iter().map(|s| s.map(|s| s * s)).sum();
                Intermodulation::Sidebands(over(squares.map(f64::sqrt), 1.0))
            }
            TonePair::Difference => {
                let both = sizes[2].zip(sizes[3]).map(|(a, b)| a + b);
                Intermodulation::Difference { second: over(sizes[1], 2.0), third: over(both, 2.0) }
            }
        }
    }
}

/// Multiples of the common frequency that are looked at, the high tone first.
fn products(pair: TonePair, makeup: &Makeup) -> Vec<usize> {
    let (low, high) = (makeup.low, makeup.high);
    match pair {
        TonePair::Smpte | TonePair::Din => vec![high, high - low, high + low, high - 2 * low, high + 2 * low],
        TonePair::Difference => vec![high, high - low, 2 * low - high, 2 * high - low],
    }
}

fn two_tones(makeup: &Makeup, steps: usize, peak: f64) -> Vec<f64> {
    let sine = |multiple: usize, k: usize| {
        let place = (multiple * k) % steps;
        libm::sin(std::f64::consts::TAU * place as f64 / steps as f64)
    };
    let (low, high) = makeup.shares;
    (0..steps).map(|k| peak * (low * sine(makeup.low, k) + high * sine(makeup.high, k))).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    /// y = x + a·x² + b·x³ of a pair with amplitudes A (low) and B (high), by trigonometric identities:
    /// at f2: B·(1 + b·(3A²/2 + 3B²/4)); at f2±f1: a·A·B; at f2±2f1: (3/4)·b·A²·B; at 2f1−f2 and 2f2−f1: (3/4)·b·A²·B
    /// and (3/4)·b·A·B².
    #[test]
    fn a_polynomial_gives_its_closed_form() {
        let (a, b) = (0.02, 0.005);
        for pair in [TonePair::Smpte, TonePair::Din, TonePair::Difference] {
            let makeup = pair.makeup();
            let peak = 1.7;
            let steps = (makeup.high * STEPS_A_CYCLE) | 1;
            let bent: Vec<f64> =
                two_tones(&makeup, steps, peak).iter().map(|x| x + a * x * x + b * x * x * x).collect();
            let sizes: Vec<_> =
                bins(&bent, &products(pair, &makeup)).into_iter().map(|z| Some(magnitude(z))).collect();
            let (low, high) = (peak * makeup.shares.0, peak * makeup.shares.1);
            let carrier = high * (1.0 + b * (1.5 * low * low + 0.75 * high * high));
            let close = |got: f64, want: f64| assert!((got / want - 1.0).abs() < 1e-9, "{pair:?} {got} {want}");
            match Intermodulation::from_amplitudes(pair, &sizes) {
                Intermodulation::Sidebands(got) => {
                    let (first, second) = (a * low * high, 0.75 * b * low * low * high);
                    close(got.unwrap(), (2.0 * first * first + 2.0 * second * second).sqrt() / carrier);
                }
                Intermodulation::Difference { second, third } => {
                    close(second.unwrap(), a * low * high / (2.0 * carrier));
                    let sum = 0.75 * b * low * high * (low + high);
                    close(third.unwrap(), sum / (2.0 * carrier));
                }
            }
        }
    }
}
