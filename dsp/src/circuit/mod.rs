//! A stage, and the network of parts and nodes that it makes.

mod network;
pub(crate) mod nodal;
mod stage;

pub use network::{Drive, LOAD_KEYS, Network, Node, Part, ResistiveSource, Role, Terminal, TriodePlace};
pub use stage::{
    Bypass, Coupling, Follower, Gain, Input, LeakReturn, Output, Pot, Ripple, Source, Stage, Supply, Taper,
};
