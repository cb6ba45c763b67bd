//! The cost of the way up and the way down, in ns for each channel and base-rate sample, best of several runs.
//!
//! `cargo bench -p platewright-dsp --bench oversampling`

use std::time::Instant;

use platewright_dsp::signal::Oversampling;
use platewright_dsp::{F64x4, Kernel, LANES};

const BLOCK: usize = 128;
const BLOCKS: usize = 400;
const RUNS: usize = 7;

fn main() {
    for kernel in [Kernel::detect(), Kernel::Portable] {
        for factor in [2, 4, 8, 16, 64] {
            let best = (0..RUNS).map(|_| one_run(factor, kernel)).fold(f64::INFINITY, f64::min);
            println!("{factor:2} x, {kernel:?}: {best:.1} ns a channel and base-rate sample, up and down");
        }
    }
}

fn one_run(factor: usize, kernel: Kernel) -> f64 {
    let oversampling = Oversampling::new(factor).expect("a power of two");
    let (mut up, mut down) = (oversampling.upsampler(kernel), oversampling.downsampler(kernel));
    let mut base = vec![F64x4([0.1, -0.2, 0.3, 0.05]); BLOCK];
    let mut fast = vec![F64x4::default(); BLOCK * factor];
    let start = Instant::now();
    for _ in 0..BLOCKS {
        up.process(&base, &mut fast);
        down.process(&fast, &mut base);
    }
    let elapsed_ns = start.elapsed().as_secs_f64() * 1e9;
    std::hint::black_box(&base);
    elapsed_ns / (BLOCKS * BLOCK * LANES) as f64
}
