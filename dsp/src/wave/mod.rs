//! The wave digital filter: ports, adaptor, modes, root, and the engine that steps them.

mod adaptor;
mod coefficients;
mod engine;
mod machine;
mod modes;
mod quad;
pub(crate) mod rest;
pub(crate) mod root;
mod single;

pub use engine::{Engine, EngineError};
pub(crate) use machine::PADDED;
pub use machine::{Machine, Shape, WaveError};
pub use modes::Modes;
pub(crate) use rest::Rest;
pub use root::RootCounts;
pub(crate) use single::{Amplitudes, Sensitivity, Single};
