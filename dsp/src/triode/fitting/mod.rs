//! Fitting a law to published figures or to measured points.
//!
//! A [`Task`] holds figures with their errors and what is believed of the parameters; [`Task::solve`] finds the nominal
//! law and [`Task::member`] one equally good law a seed. Everything here gives the same bits on every machine.

mod evidence;
mod least_squares;
mod points;
mod random;
mod space;
mod task;

pub use evidence::{Condition, Figure, Quantity, Specimen, Stage};
pub use points::{CurvePoint, FEWEST_POINTS, Fit, FitError, FitOptions, fit_points};
pub use random::Random;
pub use space::{Family, Prior, coordinates};
pub use task::{Set, Solution, Task};
