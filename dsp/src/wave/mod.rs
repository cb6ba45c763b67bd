//! The wave digital filter: ports, adaptor, modes, root, and the engine that steps them.

mod adaptor;
mod engine;
mod machine;
mod modes;
mod quad;
pub(crate) mod root;
mod single;

pub use engine::{Engine, EngineError};
pub use machine::{Machine, Shape, WaveError};
pub(crate) use machine::{PADDED, rest};
pub use modes::Modes;
pub use root::RootCounts;
pub(crate) use single::{Sensitivity, Single, SingleState};
