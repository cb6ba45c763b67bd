//! Triodes: their laws, the tables that make the laws fast, and the tube library.

pub mod fitting;
mod law;
pub mod library;
mod lookup;
mod spline;
mod table;
mod tube;

pub use law::{Currents, DempwolfZoelzer, GridLaw, Koren, Law, ThreeSection, TwoSection};
pub(crate) use lookup::Lookup;
pub(crate) use table::{LaneCurrents, LawKind, Tables, TabulatedSection, TubeNumbers, currents, gather};
pub use tube::{Capacitances, Heater, Limits, Section, TubeType};
