//! The one loop that takes sound through the lanes, for files and for excerpts.

use super::lanes::Lanes;
use crate::failure::Failure;

/// Frames that pass together.
pub const BLOCK: usize = 8192;

/// How much goes through.
pub struct Extent {
    /// Configurations of the lanes.
    pub configurations: usize,
    /// Channels of the sound.
    pub channels: usize,
    /// Frames that come out.
    pub frames: u64,
}

/// Fills a plane a channel and says how many frames there are; 0 at the end.
pub type Read<'a> = dyn FnMut(&mut [Vec<f64>]) -> Result<usize, Failure> + 'a;
/// Takes a configuration's next frames, a plane a channel, in volts.
pub type Take<'a> = dyn FnMut(usize, &mut [Vec<f64>]) -> Result<(), Failure> + 'a;

/// Steps sound through `lanes`. `read` fills one plane a channel and returns the frames, 0 once the sound has ended:
/// silence follows until the last frame has come out. `take` gets each configuration's volts, block by block, from the
/// first frame of the sound on; it may use up the planes' contents.
///
/// # Errors
/// Those of `read` and `take`.
pub fn step(lanes: &mut Lanes, extent: &Extent, read: &mut Read<'_>, take: &mut Take<'_>) -> Result<(), Failure> {
    let mut input = vec![Vec::new(); extent.channels];
    let mut output = vec![vec![Vec::new(); extent.channels]; extent.configurations];
    let (mut late, mut left) = (lanes.latency(), extent.frames);
    while left > 0 {
        let mut frames = read(&mut input)?;
        if frames == 0 {
            frames = BLOCK.min(usize::try_from(left).unwrap_or(BLOCK) + late);
            input.iter_mut().for_each(|channel| {
                channel.clear();
                channel.resize(frames, 0.0);
            });
        }
        lanes.process(&input, frames, &mut output);
        let skipped = late.min(frames);
        let kept = usize::try_from(left).unwrap_or(usize::MAX).min(frames - skipped);
        late -= skipped;
        left -= kept as u64;
        for (configuration, channels) in output.iter_mut().enumerate() {
            channels.iter_mut().for_each(|channel| {
                channel.truncate(skipped + kept);
                channel.drain(..skipped);
            });
            take(configuration, channels)?;
        }
    }
    Ok(())
}
