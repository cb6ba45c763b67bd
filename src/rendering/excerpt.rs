//! A part of a recording through every configuration, in memory and in volts.

use std::ops::Range;

use platewright_dsp::Kernel;

use super::progress::Progress;
use super::stepping::{self, BLOCK, Extent};
use super::{lanes_for, oversampling};
use crate::audio_files::Recording;
use crate::failure::Failure;
use crate::plan::Sound;
use crate::stage_file::Configuration;

/// Channels of one take, one plane each.
pub type Planes = Vec<Vec<f64>>;

/// The volts at `o` of the frames in `range`, configuration by configuration. The stage hears up to `lead_in` frames of
/// what comes before, so that its bias stands where the music has put it.
///
/// # Errors
/// The recording cannot be read, a stage cannot be stepped, or the user interrupts.
pub fn excerpt(
    configurations: &[Configuration],
    recording: &Recording,
    sound: &Sound,
    kernel: Kernel,
    range: Range<u64>,
    lead_in: u64,
) -> Result<Vec<Planes>, Failure> {
    let factor = oversampling(sound, recording)?;
    let mut lanes = lanes_for(configurations, recording, sound, factor, kernel)?;
    let channels = recording.channels();
    let lead_in = lead_in.min(range.start);
    let extent =
        Extent { configurations: configurations.len(), channels, frames: lead_in + range.end - range.start };
    let progress = Progress::new("rendering", extent.frames);
    let mut blocks = recording.blocks()?;
    blocks.skip(range.start - lead_in)?;
    let mut volts = vec![vec![Vec::new(); channels]; configurations.len()];
    let mut read = |planes: &mut [Vec<f64>]| -> Result<usize, Failure> {
        let frames = blocks.read(planes, BLOCK)?;
        progress.add(frames as u64);
        Ok(frames)
    };
    let mut take = |configuration: usize, planes: &mut [Vec<f64>]| -> Result<(), Failure> {
        for (kept, plane) in volts[configuration].iter_mut().zip(planes) {
            kept.append(plane);
        }
        Ok(())
    };
    stepping::step(&mut lanes, &extent, &mut read, &mut take)?;
    progress.done();
    volts.iter_mut().flatten().for_each(|plane| drop(plane.drain(..lead_in as usize)));
    Ok(volts)
}

/// The samples of `range` as recorded.
///
/// # Errors
/// The recording cannot be read, or the user interrupts.
pub fn recorded(recording: &Recording, range: Range<u64>) -> Result<Planes, Failure> {
    let channels = recording.channels();
    let mut blocks = recording.blocks()?;
    blocks.skip(range.start)?;
    let mut kept = vec![Vec::new(); channels];
    let mut planes = vec![Vec::new(); channels];
    let mut left = (range.end - range.start) as usize;
    while left > 0 {
        let frames = blocks.read(&mut planes, BLOCK.min(left))?;
        if frames == 0 {
            break;
        }
        left -= frames;
        kept.iter_mut().zip(&mut planes).for_each(|(kept, plane)| kept.append(plane));
    }
    Ok(kept)
}
