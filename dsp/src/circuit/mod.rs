//! A stage, and the network of parts and nodes that it makes.

mod stage;

pub use stage::{Bypass, Coupling, Follower, Gain, Input, LeakReturn, Output, Pot, Source, Stage, Supply, Taper};
