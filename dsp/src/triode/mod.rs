//! Triodes: their laws, the tables that make the laws fast, and the tube library.

pub mod fitting;
mod law;
pub mod library;
mod lookup;
mod numbers;
mod spline;
mod table;
mod tube;

pub use law::{Currents, DempwolfZoelzer, GridLaw, Koren, Law, ThreeSection, TwoSection};
pub(crate) use lookup::Lookup;
pub(crate) use numbers::{TubeNumbers, gather};
pub(crate) use table::{LaneCurrents, LawKind, Tables, TabulatedSection, currents};
pub use tube::{Capacitances, Heater, Limits, Section, TubeType};
