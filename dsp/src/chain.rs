//! Sound through stages: up to the engine's rate, through the engine, and down again.

use crate::lanes::{F64x4, Kernel};
use crate::signal::{Downsampler, Oversampling, Upsampler};
use crate::wave::{Engine, EngineError, Machine, RootCounts};

/// Base-rate frames that pass together.
const PIECE: usize = 256;

/// Up to four stages between a recording's rate in and the same rate out.
///
/// The output comes [`latency_frames`](Chain::latency_frames) behind the input: pass as many frames of silence after the
/// end and drop as many from the head to be aligned to the sample.
pub struct Chain {
    oversampling: Oversampling,
    up: Upsampler,
    engine: Engine,
    down: Downsampler,
    raised: Vec<F64x4>,
    stepped: Vec<F64x4>,
}

impl Chain {
    /// A chain at rest, one lane a machine; every machine's rate must be the base rate times the oversampling.
    ///
    /// # Errors
    /// As [`Engine::new`].
    pub fn new(machines: &[Machine], oversampling: Oversampling, kernel: Kernel) -> Result<Chain, EngineError> {
        let room = PIECE * oversampling.factor();
        Ok(Chain {
            oversampling,
            up: oversampling.upsampler(kernel),
            engine: Engine::new(machines, kernel)?,
            down: oversampling.downsampler(kernel),
            raised: vec![F64x4::default(); room],
            stepped: vec![F64x4::default(); room],
        })
    }

    /// How far the output comes behind the input, in base-rate frames.
    pub fn latency_frames(&self) -> usize {
        self.oversampling.latency_frames()
    }

    /// Takes volts at `in` to volts at `o`; the same sound in other blocks gives the same bits.
    ///
    /// # Panics
    /// If `input.len() != output.len()`.
    pub fn process(&mut self, input: &[F64x4], output: &mut [F64x4]) {
        assert_eq!(input.len(), output.len(), "as many frames out as in");
        for (input, output) in input.chunks(PIECE).zip(output.chunks_mut(PIECE)) {
            let steps = input.len() * self.oversampling.factor();
            self.up.process(input, &mut self.raised[..steps]);
            self.engine.process(&self.raised[..steps], &mut self.stepped[..steps]);
            self.down.process(&self.stepped[..steps], output);
        }
    }

    /// Back to rest and silence.
    pub fn reset(&mut self) {
        self.up.reset();
        self.engine.reset();
        self.down.reset();
    }

    /// How the roots of `lane` were found since the last reset.
    pub fn counts(&self, lane: usize) -> RootCounts {
        self.engine.counts(lane)
    }

    /// The engine, for moved switches and pots.
    pub fn engine_mut(&mut self) -> &mut Engine {
        &mut self.engine
    }
}
