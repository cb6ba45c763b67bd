//! The engine as callers see it: up to four machines of one shape, stepped together.

use super::machine::{Machine, Shape};
use super::quad::{Quad, Step};
use super::root::RootCounts;
use crate::lanes::{F64x4, Kernel, LANES};

/// Up to four stages stepped together, each lane with its own coefficients, tables and state.
pub struct Engine {
    quad: Box<dyn Step>,
    kernel: Kernel,
    shape: Shape,
    lanes: usize,
}

/// Why machines cannot be stepped together.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum EngineError {
    /// No machine, or more than four.
    LaneCount,
    /// The machines differ in shape.
    UnlikeShapes,
    /// More modes than are compiled.
    TooManyModes,
}

impl Engine {
    /// An engine at rest, one lane a machine; a lane left over repeats the first.
    ///
    /// # Errors
    /// [`EngineError`] where `machines` is empty, longer than [`LANES`], or of unlike shapes.
    pub fn new(machines: &[Machine], kernel: Kernel) -> Result<Engine, EngineError> {
        let first = machines.first().ok_or(EngineError::LaneCount)?;
        if machines.len() > LANES {
            return Err(EngineError::LaneCount);
        }
        let shape = first.shape();
        if machines.iter().any(|m| m.shape() != shape) {
            return Err(EngineError::UnlikeShapes);
        }
        let filled = std::array::from_fn(|lane| machines.get(lane).unwrap_or(first).clone());
        let quad: Box<dyn Step> = match (shape.ports, shape.modes) {
            (2, 6) => Box::new(Quad::<2, 6>::new(filled)),
            (2, 8) => Box::new(Quad::<2, 8>::new(filled)),
            (2, 10) => Box::new(Quad::<2, 10>::new(filled)),
            (2, 12) => Box::new(Quad::<2, 12>::new(filled)),
            (4, 6) => Box::new(Quad::<4, 6>::new(filled)),
            (4, 8) => Box::new(Quad::<4, 8>::new(filled)),
            (4, 10) => Box::new(Quad::<4, 10>::new(filled)),
            (4, 12) => Box::new(Quad::<4, 12>::new(filled)),
            _ => return Err(EngineError::TooManyModes),
        };
        Ok(Engine { quad, kernel: kernel.supported(), shape, lanes: machines.len() })
    }

    /// Lanes in use.
    pub fn lanes(&self) -> usize {
        self.lanes
    }

    /// Steps through `input` (volts at `in`) into `output` (volts at `o`).
    ///
    /// # Panics
    /// If `input.len() != output.len()`.
    pub fn process(&mut self, input: &[F64x4], output: &mut [F64x4]) {
        assert_eq!(input.len(), output.len(), "as many output steps as input steps");
        match self.kernel {
            Kernel::Portable => self.quad.portable(input, output),
            #[cfg(target_arch = "x86_64")]
            // SAFETY: `new` kept `Kernel::Avx2` only where the CPU has it.
            Kernel::Avx2 => unsafe { self.quad.avx2(input, output) },
            #[cfg(not(target_arch = "x86_64"))]
            Kernel::Avx2 => self.quad.portable(input, output),
        }
    }

    /// Puts another machine of the same shape into `lane`, as a moved switch or pot does: capacitors keep their charge.
    ///
    /// # Errors
    /// [`EngineError::UnlikeShapes`] where the machine's shape is another, [`EngineError::LaneCount`] where there is no
    /// such lane.
    pub fn refill(&mut self, lane: usize, machine: &Machine) -> Result<(), EngineError> {
        if lane >= self.lanes {
            return Err(EngineError::LaneCount);
        }
        if machine.shape() != self.shape {
            return Err(EngineError::UnlikeShapes);
        }
        self.quad.refill(lane, machine);
        Ok(())
    }

    /// Back to the state of rest.
    pub fn reset(&mut self) {
        self.quad.reset();
    }

    /// How the roots of `lane` were found since the last reset.
    pub fn counts(&self, lane: usize) -> RootCounts {
        self.quad.counts(lane)
    }

    /// Grid-to-cathode and plate-to-cathode volts of `lane` after the last step, tube after tube.
    pub fn root_volts(&self, lane: usize) -> Vec<f64> {
        self.quad.root_volts(lane)
    }
}
