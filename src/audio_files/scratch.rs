//! Sound that waits on disk between two passes, without rounding.

use std::fs::File;
use std::io::{Read, Seek, Write};
use std::path::{Path, PathBuf};

use super::{AudioError, interrupt, samples};

/// Frames of f64 in a file without a name: on Unix it is gone however the program ends.
pub struct Scratch {
    folder: PathBuf,
    file: File,
    channels: usize,
    frames: u64,
    bytes: Vec<u8>,
}

impl Scratch {
    /// An empty scratch file on the disk of `folder`, eight bytes a sample: the output folder is a good place, as a
    /// system's folder for temporaries may lie in memory.
    ///
    /// # Errors
    /// The file cannot be made.
    pub fn new_in(folder: &Path, channels: usize) -> Result<Self, AudioError> {
        let file = tempfile::tempfile_in(folder).map_err(AudioError::write(folder))?;
        Ok(Scratch { folder: folder.to_owned(), file, channels, frames: 0, bytes: Vec::new() })
    }

    /// Appends a block, one plane a channel, all of one length.
    ///
    /// # Panics
    /// If `planes.len()` is not the number of channels or the planes differ in length.
    ///
    /// # Errors
    /// The disk is full or fails; the user interrupts.
    pub fn write(&mut self, planes: &[impl AsRef<[f64]>]) -> Result<(), AudioError> {
        interrupt::check()?;
        let frames = frames_of(planes, self.channels);
        samples::encode(planes, &mut self.bytes, f64::to_le_bytes);
        self.file.write_all(&self.bytes).map_err(AudioError::write(&self.folder))?;
        self.frames += frames as u64;
        Ok(())
    }

    /// Turns to reading, from the start.
    ///
    /// # Errors
    /// The disk fails.
    pub fn into_reader(mut self) -> Result<ScratchReader, AudioError> {
        self.file.rewind().map_err(AudioError::read(&self.folder))?;
        let Scratch { folder, file, channels, frames, bytes, .. } = self;
        Ok(ScratchReader { folder, file, channels, left: frames, bytes })
    }
}

/// The frames of a scratch file, read once.
pub struct ScratchReader {
    folder: PathBuf,
    file: File,
    channels: usize,
    left: u64,
    bytes: Vec<u8>,
}

impl ScratchReader {
    /// Replaces the planes' contents with the next block and returns its frames, 0 at the end.
    ///
    /// # Panics
    /// If `planes.len()` is not the number of channels.
    ///
    /// # Errors
    /// The disk fails; the user interrupts.
    pub fn read(&mut self, planes: &mut [Vec<f64>], max_frames: usize) -> Result<usize, AudioError> {
        interrupt::check()?;
        assert_eq!(planes.len(), self.channels, "one plane a channel");
        let frames = (max_frames as u64).min(self.left) as usize;
        self.bytes.resize(frames * self.channels * 8, 0);
        self.file.read_exact(&mut self.bytes).map_err(AudioError::read(&self.folder))?;
        samples::decode(&self.bytes, planes, f64::from_le_bytes);
        self.left -= frames as u64;
        Ok(frames)
    }
}

/// The common length of a block's planes.
pub(super) fn frames_of(planes: &[impl AsRef<[f64]>], channels: usize) -> usize {
    assert_eq!(planes.len(), channels, "one plane a channel");
    let frames = planes.first().map_or(0, |plane| plane.as_ref().len());
    assert!(planes.iter().all(|plane| plane.as_ref().len() == frames), "planes of one length");
    frames
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn sound_comes_back_bit_for_bit_and_leaves_no_file() {
        let folder = tempfile::tempdir().unwrap();
        let mut scratch = Scratch::new_in(folder.path(), 2).unwrap();
        scratch.write(&[[0.1, -1.0 / 3.0], [f64::MIN_POSITIVE, -2.5]]).unwrap();
        scratch.write(&[[7e-9], [0.25]]).unwrap();
        #[cfg(unix)]
        assert_eq!(std::fs::read_dir(folder.path()).unwrap().count(), 0, "the scratch file has no name");
        let mut reader = scratch.into_reader().unwrap();
        let mut planes = [Vec::new(), Vec::new()];
        assert_eq!(reader.read(&mut planes, 2).unwrap(), 2);
        assert_eq!(planes, [[0.1, -1.0 / 3.0], [f64::MIN_POSITIVE, -2.5]]);
        assert_eq!(reader.read(&mut planes, 2).unwrap(), 1);
        assert_eq!(planes, [[7e-9], [0.25]]);
        assert_eq!(reader.read(&mut planes, 2).unwrap(), 0);
    }
}
