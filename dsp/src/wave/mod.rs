//! The wave digital filter: ports, adaptor, modes, root, and the engine that steps them.

mod adaptor;
mod engine;
mod machine;
mod modes;
mod quad;
mod root;

pub use engine::{Engine, EngineError};
pub use machine::{Machine, Shape, WaveError};
pub use modes::Modes;
pub use root::RootCounts;
