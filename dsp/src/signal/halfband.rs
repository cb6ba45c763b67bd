//! Halfband filters: their design, and one stage that doubles or halves the rate of four lanes.
//!
//! A halfband filter of K pairs has 4K − 1 taps: ½ in the middle, K equal pairs at the odd distances, zeros between.
//! Its delay is 2K − 1 samples of the higher rate.

use super::window::{kaiser, kaiser_beta};
use crate::lanes::{F64x4, Kernel, Lanes};

/// Outputs computed side by side, so that one output's sum need not wait for the last addition of its own.
const GROUP: usize = 4;

/// The taps at the distances 1, 3, 5, … from the middle, for unit gain at 0 Hz.
pub(super) fn design(pairs: usize, window_db: f64) -> Vec<f64> {
    let beta = kaiser_beta(window_db);
    let end = 2.0 * pairs as f64;
    let mut taps: Vec<f64> = (0..pairs)
        .map(|k| {
            let distance = (2 * k + 1) as f64;
            let sign = if k % 2 == 0 { 1.0 } else { -1.0 };
            sign / (std::f64::consts::PI * distance) * kaiser(beta, distance / end)
        })
        .collect();
    let sum: f64 = taps.iter().sum();
    taps.iter_mut().for_each(|tap| *tap *= 0.25 / sum);
    taps
}

/// The frames a filter looks back on, followed by room for new ones.
struct Window {
    frames: Vec<F64x4>,
    history: usize,
    end: usize,
}

impl Window {
    fn new(history: usize, room: usize) -> Self {
        Window { frames: vec![F64x4::default(); history + room], history, end: history }
    }

    /// Where the next `count` frames are to be written.
    fn room(&mut self, count: usize) -> &mut [F64x4] {
        if self.end + count > self.frames.len() {
            self.frames.copy_within(self.end - self.history..self.end, 0);
            self.end = self.history;
        }
        &mut self.frames[self.end..self.end + count]
    }

    /// Takes in the `count` frames written to `room` and returns them with the history before them.
    fn accept(&mut self, count: usize) -> &[F64x4] {
        let start = self.end - self.history;
        self.end += count;
        &self.frames[start..self.end]
    }

    fn clear(&mut self) {
        self.frames.fill(F64x4::default());
        self.end = self.history;
    }
}

/// One doubling of the rate.
pub(super) struct Doubler {
    taps: Vec<f64>,
    window: Window,
    kernel: Kernel,
}

impl Doubler {
    /// A stage that takes at most `room` frames at once.
    pub(super) fn new(taps: &[f64], room: usize, kernel: Kernel) -> Self {
        // The zeros between the samples halve the level; taps twice as large make up for it.
        let taps: Vec<f64> = taps.iter().map(|tap| 2.0 * tap).collect();
        let window = Window::new(2 * taps.len() - 1, room);
        Doubler { taps, window, kernel }
    }

    pub(super) fn room(&mut self, frames: usize) -> &mut [F64x4] {
        self.window.room(frames)
    }

    /// Doubles the frames written to `room`; `output` is twice as long.
    pub(super) fn run(&mut self, output: &mut [F64x4]) {
        let window = self.window.accept(output.len() / 2);
        #[cfg(target_arch = "x86_64")]
        if runs_avx2(self.kernel) {
            // SAFETY: the line above asked the CPU for AVX2.
            return unsafe { double_avx2(&self.taps, window, output) };
        }
        double(&self.taps, window, output);
    }

    pub(super) fn clear(&mut self) {
        self.window.clear();
    }
}

/// One halving of the rate.
pub(super) struct Halver {
    taps: Vec<f64>,
    window: Window,
    kernel: Kernel,
}

impl Halver {
    /// A stage that takes at most `room` frames at once and delays by `extra_delay` frames beyond its filter's own.
    pub(super) fn new(taps: Vec<f64>, room: usize, extra_delay: usize, kernel: Kernel) -> Self {
        let window = Window::new(4 * taps.len() - 2 + extra_delay, room);
        Halver { taps, window, kernel }
    }

    pub(super) fn room(&mut self, frames: usize) -> &mut [F64x4] {
        self.window.room(frames)
    }

    /// Halves the frames written to `room`; `output` is half as long.
    pub(super) fn run(&mut self, output: &mut [F64x4]) {
        let window = self.window.accept(2 * output.len());
        #[cfg(target_arch = "x86_64")]
        if runs_avx2(self.kernel) {
            // SAFETY: the line above asked the CPU for AVX2.
            return unsafe { halve_avx2(&self.taps, window, output) };
        }
        halve(&self.taps, window, output);
    }

    pub(super) fn clear(&mut self) {
        self.window.clear();
    }
}

#[cfg(target_arch = "x86_64")]
fn runs_avx2(kernel: Kernel) -> bool {
    kernel == Kernel::Avx2 && std::arch::is_x86_feature_detected!("avx2")
}

#[cfg(target_arch = "x86_64")]
#[target_feature(enable = "avx2")]
unsafe fn double_avx2(taps: &[f64], window: &[F64x4], output: &mut [F64x4]) {
    double(taps, window, output);
}

#[cfg(target_arch = "x86_64")]
#[target_feature(enable = "avx2")]
unsafe fn halve_avx2(taps: &[f64], window: &[F64x4], output: &mut [F64x4]) {
    halve(taps, window, output);
}

/// Even outputs are the filtered ones, odd outputs the middle tap: a sample of the input as it stands.
#[inline(always)]
fn double(taps: &[f64], window: &[F64x4], output: &mut [F64x4]) {
    let middle = &window[taps.len()..];
    let mut start = 0;
    let mut groups = output.chunks_exact_mut(2 * GROUP);
    for group in &mut groups {
        let filtered = interpolate::<GROUP>(taps, &window[start..]);
        for n in 0..GROUP {
            group[2 * n] = filtered[n];
            group[2 * n + 1] = middle[start + n];
        }
        start += GROUP;
    }
    for pair in groups.into_remainder().chunks_exact_mut(2) {
        pair[0] = interpolate::<1>(taps, &window[start..])[0];
        pair[1] = middle[start];
        start += 1;
    }
}

#[inline(always)]
fn interpolate<const N: usize>(taps: &[f64], window: &[F64x4]) -> [F64x4; N] {
    let pairs = taps.len();
    let mut sums = [F64x4::default(); N];
    for (k, &tap) in taps.iter().enumerate() {
        let tap = F64x4::splat(tap);
        let (before, after) = (&window[pairs - 1 - k..][..N], &window[pairs + k..][..N]);
        for n in 0..N {
            sums[n] = sums[n] + tap * (before[n] + after[n]);
        }
    }
    sums
}

#[inline(always)]
fn halve(taps: &[f64], window: &[F64x4], output: &mut [F64x4]) {
    let mut start = 0;
    let mut groups = output.chunks_exact_mut(GROUP);
    for group in &mut groups {
        group.copy_from_slice(&decimate::<GROUP>(taps, &window[start..]));
        start += 2 * GROUP;
    }
    for frame in groups.into_remainder() {
        *frame = decimate::<1>(taps, &window[start..])[0];
        start += 2;
    }
}

#[inline(always)]
fn decimate<const N: usize>(taps: &[f64], window: &[F64x4]) -> [F64x4; N] {
    let middle = 2 * taps.len() - 1;
    let half = F64x4::splat(0.5);
    let mut sums: [F64x4; N] = std::array::from_fn(|n| half * window[middle + 2 * n]);
    for (k, &tap) in taps.iter().enumerate() {
        let tap = F64x4::splat(tap);
        let before = &window[middle - 1 - 2 * k..][..2 * N - 1];
        let after = &window[middle + 1 + 2 * k..][..2 * N - 1];
        for n in 0..N {
            sums[n] = sums[n] + tap * (before[2 * n] + after[2 * n]);
        }
    }
    sums
}

#[cfg(test)]
mod tests {
    use super::*;

    /// The filter's gain at `frequency` cycles per sample of its higher rate.
    fn gain(taps: &[f64], frequency: f64) -> f64 {
        let turn = 2.0 * std::f64::consts::PI * frequency;
        let sides: f64 = taps.iter().enumerate().map(|(k, tap)| tap * libm::cos(turn * (2 * k + 1) as f64)).sum();
        0.5 + 2.0 * sides
    }

    #[test]
    fn halfband_is_one_at_0_hz_a_half_in_the_middle_and_mirrored() {
        let taps = design(9, 148.0);
        assert!((gain(&taps, 0.0) - 1.0).abs() < 1e-15);
        assert!((gain(&taps, 0.25) - 0.5).abs() < 1e-15);
        assert!((gain(&taps, 0.1) + gain(&taps, 0.4) - 1.0).abs() < 1e-15);
    }

    #[test]
    fn impulse_returns_the_taps_after_the_stated_delay() {
        let taps = design(3, 100.0);
        let mut stage = Doubler::new(&taps, 8, Kernel::Portable);
        stage.room(8).fill(F64x4::default());
        stage.room(8)[0] = F64x4::splat(1.0);
        let mut output = [F64x4::default(); 16];
        stage.run(&mut output);
        let delay = 2 * 3 - 1;
        assert_eq!(output[delay].0[2], 1.0);
        for (k, tap) in taps.iter().enumerate() {
            assert_eq!(output[delay - 1 - 2 * k].0[1], 2.0 * tap);
            assert_eq!(output[delay + 1 + 2 * k].0[3], 2.0 * tap);
        }
    }
}
