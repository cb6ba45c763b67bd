//! Listening packs: takes that differ by the stage alone, the page that plays them blind, and the tally of answers.
//!
//! [`pack`] renders an excerpt through every configuration ([`passage`]), puts polarity, DC, loudness and ends right
//! ([`correction`]), writes it as FLAC ([`flac`]) under letters that tell nothing ([`secret`]), and sets the page
//! beside it ([`page`]). What the letters stand for is in the key alone ([`key`]). [`answers`] reads what comes back,
//! [`mod@tally`] counts it, [`statistics`] says what chance would do.

mod answers;
mod conclusion;
mod correction;
mod flac;
mod key;
mod maker;
mod matching;
mod pack;
mod page;
mod passage;
mod secret;
mod stage_response;
mod statistics;
mod tally;
mod trials;

pub use pack::{INDEX, PackFigures, PackJob};
pub use tally::{Comparison, Counts, Tally, tally};
pub use trials::plan_trials;
