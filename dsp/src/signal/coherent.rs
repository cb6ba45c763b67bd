//! Exact spectra of periodic sequences: amplitude and phase of harmonics by direct sums, for any number of samples.

use num_complex::Complex64;

/// Sines and cosines of the whole turn in `samples` steps.
#[derive(Clone, Debug)]
pub struct CoherentTable {
    turn: Vec<Complex64>,
}

impl CoherentTable {
    /// A table for sequences of `samples` samples.
    ///
    /// # Panics
    /// If `samples == 0`.
    pub fn new(samples: usize) -> Self {
        assert!(samples > 0, "a sequence has samples");
        CoherentTable { turn: (0..samples).map(|step| direction(step, samples)).collect() }
    }

    /// The peak amplitude and phase of the part of `samples` that makes `cycles` whole turns in it, referred to a
    /// sine: A·sin(2π·cycles·k/n + φ) gives A·e^{jφ}. Below half the number of samples the result is exact to the
    /// rounding of the samples; 0 cycles give twice the mean as the imaginary part.
    ///
    /// # Panics
    /// If `samples.len()` is not the table's.
    pub fn component(&self, samples: &[f64], cycles: usize) -> Complex64 {
        let count = self.turn.len();
        assert_eq!(samples.len(), count, "as many samples as the table is for");
        let stride = cycles % count;
        let (mut re, mut im) = (CarefulSum::default(), CarefulSum::default());
        let mut step = 0;
        for &sample in samples {
            re.add(sample * self.turn[step].im);
            im.add(sample * self.turn[step].re);
            step += stride;
            if step >= count {
                step -= count;
            }
        }
        Complex64::new(re.total(), im.total()) * (2.0 / count as f64)
    }

    /// The components at the given multiples of `cycles`.
    ///
    /// # Panics
    /// If `samples.len()` is not the table's.
    pub fn harmonics(
        &self,
        samples: &[f64],
        cycles: usize,
        orders: impl IntoIterator<Item = usize>,
    ) -> Vec<Complex64> {
        orders.into_iter().map(|order| self.component(samples, order * cycles)).collect()
    }
}

/// The harmonics of a sequence that holds `cycles` whole periods: peak amplitude and phase referred to a sine, see
/// [`CoherentTable::component`]; order 1 is the fundamental.
///
/// # Panics
/// If `samples` is empty.
pub fn harmonics(samples: &[f64], cycles: usize, orders: impl IntoIterator<Item = usize>) -> Vec<Complex64> {
    CoherentTable::new(samples.len()).harmonics(samples, cycles, orders)
}

/// The mean of a sequence, added up without loss; 0 for none.
pub fn mean(samples: &[f64]) -> f64 {
    let mut sum = CarefulSum::default();
    samples.iter().for_each(|&sample| sum.add(sample));
    sum.total() / samples.len().max(1) as f64
}

/// cos + j·sin of 2π·step/count, each to its last bit or nearly so: the angle is brought within an eighth of a turn by
/// whole numbers before it is rounded.
fn direction(step: usize, count: usize) -> Complex64 {
    // Eighths of a turn, and what is left, in 1/(8·count) turns.
    let (eighth, rest) = (8 * step / count, 8 * step % count);
    let within = if eighth % 2 == 0 { rest } else { count - rest };
    let angle = std::f64::consts::FRAC_PI_4 * (within as f64 / count as f64);
    let (sin, cos) = libm::sincos(angle);
    match eighth % 8 {
        0 => Complex64::new(cos, sin),
        1 => Complex64::new(sin, cos),
        2 => Complex64::new(-sin, cos),
        3 => Complex64::new(-cos, sin),
        4 => Complex64::new(-cos, -sin),
        5 => Complex64::new(-sin, -cos),
        6 => Complex64::new(sin, -cos),
        _ => Complex64::new(cos, -sin),
    }
}

/// A sum that carries its rounding errors along (Neumaier, "Rundungsfehleranalyse einiger Verfahren zur Summation
/// endlicher Summen", ZAMM 54, 1974).
#[derive(Default)]
struct CarefulSum {
    sum: f64,
    lost: f64,
}

impl CarefulSum {
    fn add(&mut self, value: f64) {
        let sum = self.sum + value;
        self.lost +=
            if self.sum.abs() >= value.abs() { (self.sum - sum) + value } else { (value - sum) + self.sum };
        self.sum = sum;
    }

    fn total(&self) -> f64 {
        self.sum + self.lost
    }
}

#[cfg(test)]
mod tests {
    #![allow(clippy::disallowed_methods, reason = "a test may differ in the last bit from machine to machine")]

    use super::*;

    /// The largest error of a directly computed sequence with known parts.
    fn largest_error(count: usize, cycles: usize) -> f64 {
        let parts: Vec<Complex64> = (1..=10)
            .map(|n| Complex64::from_polar(10_f64.powf(-1.4 * f64::from(n - 1)), 0.7 * f64::from(n * n)))
            .collect();
        let mut samples = vec![0.0; count];
        for (n, part) in parts.iter().enumerate() {
            for (k, sample) in samples.iter_mut().enumerate() {
                *sample += (part * direction((n + 1) * cycles * k % count, count)).im;
            }
        }
        let found = harmonics(&samples, cycles, 1..=10);
        parts.iter().zip(found).map(|(part, found)| (part - found).norm()).fold(0.0, f64::max)
    }

    #[test]
    fn harmonics_are_found_to_the_rounding_of_the_samples() {
        for (count, cycles) in [(385, 1), (769, 1), (384, 1), (1001, 7), (21, 1), (48_000, 1000)] {
            let error = largest_error(count, cycles);
            // One unit in the last place of the fundamental, which is 1.
            assert!(error < 2.3e-16, "{count} samples, {cycles} cycles: {error}");
        }
    }

    #[test]
    fn phase_is_referred_to_a_sine() {
        let cosine: Vec<f64> = (0..385).map(|k| direction(k, 385).re).collect();
        let found = harmonics(&cosine, 1, [1])[0];
        assert!((found - Complex64::new(0.0, 1.0)).norm() < 1e-16, "a cosine is a sine at 90°: {found}");
    }

    #[test]
    fn offset_does_not_reach_the_harmonics() {
        let samples: Vec<f64> = (0..385).map(|k| 256.0 + direction(3 * k % 385, 385).im).collect();
        let found = harmonics(&samples, 1, [1, 2, 3, 4]);
        for (order, expected) in [(1, 0.0), (2, 0.0), (3, 1.0), (4, 0.0)] {
            // The samples themselves are rounded to 2⁻⁴⁵ of a volt or so.
            assert!((found[order - 1] - expected).norm() < 1e-14, "order {order}");
        }
        assert!((mean(&samples) - 256.0).abs() < 1e-13);
    }

    /// scipy.fft would give the same: the sum in the definition of the discrete Fourier transform, with std's sine.
    #[test]
    fn component_is_the_discrete_fourier_transform() {
        let samples: Vec<f64> = (0..97).map(|k| f64::from(k * k % 31) - 15.0).collect();
        for cycles in [0, 1, 5, 48] {
            let sum: Complex64 = (0..97)
                .map(|k| samples[k] * Complex64::cis(-std::f64::consts::TAU * (cycles * k) as f64 / 97.0))
                .sum();
            let expected = Complex64::i() * sum * (2.0 / 97.0);
            assert!(
                (CoherentTable::new(97).component(&samples, cycles) - expected).norm() < 1e-12,
                "{cycles} cycles"
            );
        }
    }
}
