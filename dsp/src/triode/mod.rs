//! Triodes: their laws, the tables that make the laws fast, and the tube library.

mod law;
mod tube;

pub use law::{Currents, DempwolfZoelzer, GridLaw, Koren, Law, TwoSection};
pub use tube::{Capacitances, Heater, Limits, Section, TubeType};
