//! The pictures, each a function from figures to SVG.
//!
//! The toolkit is the project's own rather than a plotting crate: labels have to stand clear of each other, colours have
//! to follow the page's light and dark themes by CSS class, and a reader must be able to tell lines apart without colour.

mod axis;
mod cycle;
mod frame;
mod harmonics;
mod levels;
mod plates;
mod recording;
mod response;

pub use cycle::{cycles, transfer};
pub use harmonics::spectrum;
pub use levels::{harmonics_over_level, thd_over_level};
pub use plates::plates;
pub use recording::histogram;
pub use response::{impedances, response};

use crate::figures::ConfigurationFigures;

/// Configurations that share a plot: four colours, dashes and marks.
pub const TOGETHER: usize = 4;

/// A configuration with its letter.
#[derive(Clone, Copy)]
pub struct Lettered<'a> {
    pub index: usize,
    pub letter: &'a str,
    pub figures: &'a ConfigurationFigures,
}

/// Class of a configuration's line.
fn line_class(index: usize) -> &'static str {
    ["line c0", "line c1", "line c2", "line c3"][index % TOGETHER]
}

/// Class of a configuration's name.
fn name_class(index: usize) -> &'static str {
    ["name c0", "name c1", "name c2", "name c3"][index % TOGETHER]
}

/// Class of a configuration's marks.
fn mark_class(index: usize) -> &'static str {
    ["mark c0", "mark c1", "mark c2", "mark c3"][index % TOGETHER]
}

/// Joins the names of lines that end at the same place: nobody could tell them apart.
fn joined(ends: Vec<(String, &'static str, (f64, f64))>) -> Vec<(String, &'static str, (f64, f64))> {
    let mut out: Vec<(String, &'static str, (f64, f64))> = Vec::new();
    for (name, class, end) in ends {
        match out.iter_mut().find(|(_, _, other)| (other.1 - end.1).abs() < 1.5 && (other.0 - end.0).abs() < 4.0) {
            Some((names, shared, _)) => {
                *names = join(names, &name);
                *shared = "name";
            }
            None => out.push((name, class, end)),
        }
    }
    out
}

/// "A" and "B" are "A B"; "A in" and "B in" are "A B in".
fn join(names: &str, name: &str) -> String {
    match (names.rsplit_once(' '), name.rsplit_once(' ')) {
        (Some((letters, word)), Some((letter, other))) if word == other && word.len() > 1 => {
            format!("{letters} {letter} {word}")
        }
        _ => format!("{names} {name}"),
    }
}
