//! From one sample rate to another, by any ratio of whole numbers: a polyphase windowed sinc.
//!
//! Output sample k stands at the time k·from/to of the input: the two are aligned at their first samples.

use std::fmt;
use std::sync::Arc;

use super::window::{kaiser, kaiser_beta};
use crate::lanes::{F64x4, Kernel, LANES, Lanes};

/// The lowest sample rate, Hz.
pub const MIN_RATE: u32 = 8000;

/// The highest sample rate, Hz.
pub const MAX_RATE: u32 = 192_000;

/// Zero crossings of the sinc on each side: flat to 0.4535 of the lower rate, images of that band below −140 dB.
const ZERO_CROSSINGS: f64 = 56.0;

/// The Kaiser window's nominal rejection, dB: Kaiser's formula asks for 53 zero crossings, so the 56 leave some to spare.
const WINDOW_DB: f64 = 150.0;

/// The sum of a filter runs in this many partial sums of four lanes.
const SUMS: usize = 4;

/// Taps come in multiples of this.
const STRIDE: usize = SUMS * LANES;

/// Up to so many taps a filter's phases are tabulated (8 MB); beyond, each is worked out where it is needed.
const MOST_TABULATED: usize = 1 << 20;

/// Points a zero crossing of the table from which phases are worked out; the error of a cubic between them is about
/// h⁴·π⁴/5·3/128 = 7e-12, far below the filter's own.
const POINTS_A_CROSSING: f64 = 512.0;

/// A sample rate outside [`MIN_RATE`] to [`MAX_RATE`].
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct BadRate(pub u32);

impl fmt::Display for BadRate {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "a sample rate of {} Hz is not possible: choose {MIN_RATE} to {MAX_RATE} Hz", self.0)
    }
}

impl std::error::Error for BadRate {}

/// One channel on its way from one sample rate to another.
///
/// Pass the input in blocks of any length to [`process`](Self::process), then call [`finish`](Self::finish). The
/// output has exactly [`output_frames`](Self::output_frames) samples and its bits do not depend on the blocks. Equal
/// rates return the input bit for bit. Clones share their filter: make one resampler and clone it for each channel.
#[derive(Clone)]
pub struct Resampler {
    filter: Arc<Filter>,
    kernel: Kernel,
    /// The input that is still needed, from `half − 1` samples before `position` on.
    pending: Vec<f64>,
    /// Room for a filter phase that is worked out.
    row: Vec<f64>,
    /// Offset in `pending` of the first tap of the next output.
    next: usize,
    /// The next output's time beyond a whole input sample, in 1/`up` samples.
    phase: usize,
    received: u64,
    produced: u64,
}

impl Resampler {
    /// A resampler in its initial state.
    ///
    /// # Errors
    /// A rate lies outside [`MIN_RATE`] to [`MAX_RATE`].
    pub fn new(from: u32, to: u32, kernel: Kernel) -> Result<Self, BadRate> {
        for rate in [from, to] {
            if !(MIN_RATE..=MAX_RATE).contains(&rate) {
                return Err(BadRate(rate));
            }
        }
        let filter = Arc::new(Filter::new(from, to));
        let mut resampler = Resampler {
            kernel,
            pending: Vec::new(),
            row: vec![0.0; filter.taps()],
            filter,
            next: 0,
            phase: 0,
            received: 0,
            produced: 0,
        };
        resampler.reset();
        Ok(resampler)
    }

    /// The output's length for an input of `input_frames`: their ratio rounded, halves up.
    pub fn output_frames(&self, input_frames: u64) -> u64 {
        let (up, down) = (self.filter.up as u128, self.filter.down as u128);
        ((2 * u128::from(input_frames) * up + down) / (2 * down)) as u64
    }

    /// Takes a block of any length and appends to `output` what can be told by now.
    pub fn process(&mut self, input: &[f64], output: &mut Vec<f64>) {
        self.received += input.len() as u64;
        self.pending.extend_from_slice(input);
        self.produce(u64::MAX, output);
    }

    /// Appends the rest of the output and returns to the initial state.
    pub fn finish(&mut self, output: &mut Vec<f64>) {
        self.pending.resize(self.pending.len() + self.filter.half + 1, 0.0);
        self.produce(self.output_frames(self.received), output);
        self.reset();
    }

    fn reset(&mut self) {
        self.pending.clear();
        self.pending.resize(self.filter.half - 1, 0.0);
        (self.next, self.phase, self.received, self.produced) = (0, 0, 0, 0);
    }

    /// Appends outputs up to `last` in all, as far as the pending input reaches.
    fn produce(&mut self, last: u64, output: &mut Vec<f64>) {
        let Filter { up, down, .. } = *self.filter;
        let taps = self.filter.taps();
        while self.produced < last && self.next + taps <= self.pending.len() {
            let row = self.filter.phase(self.phase, &mut self.row);
            output.push(sum_of_products(self.kernel, row, &self.pending[self.next..self.next + taps]));
            self.produced += 1;
            self.phase += down;
            self.next += self.phase / up;
            self.phase %= up;
        }
        let used = self.next.min(self.pending.len());
        self.pending.drain(..used);
        self.next -= used;
    }
}

/// The low-pass filter of a ratio `up`/`down` in lowest terms.
struct Filter {
    up: usize,
    down: usize,
    /// Taps on each side of an output sample, in input samples.
    half: usize,
    shape: Shape,
}

enum Shape {
    /// One row of taps for each phase.
    Phases(Vec<f64>),
    /// The impulse response from one point before its middle on, so many points an input sample.
    Points { values: Vec<f64>, density: f64 },
}

impl Filter {
    fn new(from: u32, to: u32) -> Self {
        let common = greatest_common_divisor(from, to);
        let (up, down) = ((to / common) as usize, (from / common) as usize);
        // Cycles an input sample, doubled: 1 on the way up, less on the way down.
        let cutoff = (up as f64 / down as f64).min(1.0);
        let half = ((ZERO_CROSSINGS / cutoff).ceil() as usize).next_multiple_of(STRIDE / 2);
        let response = |time: f64| {
            let beta = kaiser_beta(WINDOW_DB);
            cutoff * sinc(cutoff * time) * kaiser(beta, time / half as f64)
        };
        let shape = if up * 2 * half <= MOST_TABULATED {
            let time = |phase: usize, tap: usize| phase as f64 / up as f64 + (half - 1) as f64 - tap as f64;
            let row = |phase| (0..2 * half).map(move |tap| response(time(phase, tap)));
            Shape::Phases((0..up).flat_map(row).collect())
        } else {
            let density = (POINTS_A_CROSSING * cutoff).ceil();
            let points = half * density as usize + 4;
            Shape::Points { values: (0..points).map(|k| response((k as f64 - 1.0) / density)).collect(), density }
        };
        Filter { up, down, half, shape }
    }

    fn taps(&self) -> usize {
        2 * self.half
    }

    /// The taps of a phase, oldest input first.
    fn phase<'a>(&'a self, phase: usize, row: &'a mut [f64]) -> &'a [f64] {
        match &self.shape {
            Shape::Phases(rows) => &rows[phase * self.taps()..][..self.taps()],
            Shape::Points { values, density } => {
                let first = phase as f64 / self.up as f64 + (self.half - 1) as f64;
                for (tap, value) in row.iter_mut().enumerate() {
                    *value = between_points(values, (first - tap as f64).abs() * density);
                }
                row
            }
        }
    }
}

/// The cubic through the four points around `place`; `values` begins one point before place 0.
fn between_points(values: &[f64], place: f64) -> f64 {
    let whole = place.floor();
    let x = place - whole;
    let [a, b, c, d] = std::array::from_fn(|k| values[whole as usize + k]);
    // Lagrange's form for the places −1, 0, 1, 2.
    let (x0, x1, x2) = (x + 1.0, x - 1.0, x - 2.0);
    x0 * x2 * x1 * b / 2.0 - x0 * x * x2 * c / 2.0 + x0 * x * x1 * d / 6.0 - x * x1 * x2 * a / 6.0
}

/// sin(πx)/(πx), exactly 0 at the other whole numbers.
fn sinc(x: f64) -> f64 {
    if x == 0.0 {
        return 1.0;
    }
    let whole = libm::rint(x);
    let sine = libm::sin(std::f64::consts::PI * (x - whole));
    let sign = if whole % 2.0 == 0.0 { 1.0 } else { -1.0 };
    sign * sine / (std::f64::consts::PI * x)
}

fn greatest_common_divisor(a: u32, b: u32) -> u32 {
    if b == 0 { a } else { greatest_common_divisor(b, a % b) }
}

fn sum_of_products(kernel: Kernel, taps: &[f64], samples: &[f64]) -> f64 {
    #[cfg(target_arch = "x86_64")]
    if kernel == Kernel::Avx2 && std::arch::is_x86_feature_detected!("avx2") {
        // SAFETY: the line above asked the CPU for AVX2.
        return unsafe { sum_of_products_avx2(taps, samples) };
    }
    let _ = kernel;
    sum_of_products_in_lanes(taps, samples)
}

#[cfg(target_arch = "x86_64")]
#[target_feature(enable = "avx2")]
unsafe fn sum_of_products_avx2(taps: &[f64], samples: &[f64]) -> f64 {
    sum_of_products_in_lanes(taps, samples)
}

#[inline(always)]
fn sum_of_products_in_lanes(taps: &[f64], samples: &[f64]) -> f64 {
    let mut sums = [F64x4::splat(0.0); SUMS];
    for (taps, samples) in taps.chunks_exact(STRIDE).zip(samples.chunks_exact(STRIDE)) {
        for (k, sum) in sums.iter_mut().enumerate() {
            let four = |values: &[f64]| F64x4(std::array::from_fn(|lane| values[k * LANES + lane]));
            *sum = *sum + four(taps) * four(samples);
        }
    }
    let [a, b, c, d] = ((sums[0] + sums[1]) + (sums[2] + sums[3])).0;
    (a + b) + (c + d)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn cubic_between_points_returns_cubics() {
        let cubic = |x: f64| 2.0 * x * x * x - 3.0 * x * x + 0.5 * x - 7.0;
        let values: Vec<f64> = (0..8).map(|k| cubic(f64::from(k) - 1.0)).collect();
        for place in [0.0, 0.25, 1.0, 2.9, 4.5] {
            assert!((between_points(&values, place) - cubic(place)).abs() < 1e-12, "at {place}");
        }
    }

    #[test]
    fn phases_worked_out_agree_with_phases_from_the_formula() {
        // 44101 and 48000 have no common divisor: too many phases for a table.
        let filter = Filter::new(44101, 48000);
        assert!(matches!(filter.shape, Shape::Points { .. }));
        let mut row = vec![0.0; filter.taps()];
        for phase in [0, 1, 777, 24_000, 47_999] {
            filter.phase(phase, &mut row);
            for (tap, value) in row.iter().enumerate() {
                let time = phase as f64 / 48000.0 + (filter.half - 1) as f64 - tap as f64;
                let exact = sinc(time) * kaiser(kaiser_beta(WINDOW_DB), time / filter.half as f64);
                assert!((value - exact).abs() < 1e-11, "phase {phase}, tap {tap}");
            }
        }
    }
}
