//! WAV files in and out, and folders of outputs that appear whole or not at all.
//!
//! Reading: [`Recording::open`] checks a file completely, [`Recording::blocks`] streams it. Writing:
//! [`OutputPlan::check`] looks, [`OutputPlan::create`] makes the folder, [`OutputFolder::stage`] gives temporaries,
//! [`OutputFolder::commit`] puts all of them in place. Sound between two passes waits in a [`Scratch`].
//!
//! The container is read and written here rather than by a crate: recorders and pipes leave lengths open, long
//! recordings are RF64, and the crate for WAV reads neither and leaves out the pad byte after an odd length.

mod error;
pub mod interrupt;
mod output_folder;
mod recording;
mod samples;
mod scratch;
mod wav_header;
mod wav_output;

#[cfg(test)]
mod tests;

pub use error::AudioError;
pub use output_folder::{OutputFolder, OutputPlan, StagedFile};
pub use recording::Recording;
pub use samples::SampleFormat;
pub use scratch::Scratch;
pub use wav_output::WavOutput;
