//! Figures of a stage: operating point, small signal, steady state.

mod intermodulation;
mod noise;
mod operating_point;
mod ratings;
mod refine;
mod small_signal;
mod steady_state;
mod tone;

pub use intermodulation::{Intermodulation, TonePair};
pub use noise::{Noise, a_weighting, supply_transfer};
pub use operating_point::{Meter, OperatingPoint, PartStress, TubePoint};
pub use ratings::{Limit, TubeStress, cold_volts, tube_stresses, tube_type};
pub use small_signal::{Response, SmallSignal};
pub use steady_state::{NoSteadyState, Period, bins, harmonics, steady_state};
pub use tone::Tone;
