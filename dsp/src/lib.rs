//! Tube line stages as networks, waves and figures.
//!
//! A [`circuit::Stage`] holds a stage's values. The library turns it into a network of named parts and nodes, steps
//! it as a wave digital filter, and measures it. It reads no files, prints nothing and starts no threads; the program
//! `platewright` owns every side effect.
//!
//! Layers point one way: `wave` builds on `triode` and `circuit`, `analysis` on `wave` and on `signal`, which stands
//! alone.

pub mod analysis;
mod chain;
pub mod circuit;
mod lanes;
mod linear;
pub mod portable;
pub mod signal;
pub mod triode;
pub mod wave;

pub use num_complex::Complex64;

pub use chain::Chain;
pub use lanes::{F64x4, Kernel, LANES, Lanes};
