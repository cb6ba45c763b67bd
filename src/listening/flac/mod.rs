//! Takes as FLAC files (RFC 9639), 24 bit, all of one size, without tags.
//!
//! Written here, in whole numbers throughout, so that the bytes do not depend on the CPU: only the format's fixed
//! predictors are used, about a tenth larger than adaptive ones. The crate that encodes FLAC (flacenc 0.5.1) works in
//! floating point, and on loud 24-bit sound it wrote files that no decoder read.

mod bits;
mod frame;
mod subframe;

use md5::{Digest, Md5};

use frame::BLOCK_FRAMES;

/// Bits of a sample.
const BITS: u32 = 24;
/// Bytes of a metadata block's header.
const BLOCK_HEADER: usize = 4;
/// The kinds of metadata blocks that are written, and the mark of the last.
const STREAM_INFORMATION: u8 = 0;
const PADDING: u8 = 1;
const LAST: u8 = 0x80;

/// Encoded takes of one size, in the order given: one plane a channel, all of one length, one or two channels.
pub fn encode_alike(takes: &[Vec<Vec<i32>>], rate: u32) -> Vec<Vec<u8>> {
    use rayon::prelude::*;
    let streams: Vec<Stream> = takes.par_iter().map(|take| Stream::of(take)).collect();
    let largest = streams.iter().map(|stream| stream.frames.len()).max().unwrap_or(0);
    streams.iter().map(|stream| stream.file(rate, largest - stream.frames.len())).collect()
}

/// A take's frames, and what the head of its file says of them.
struct Stream {
    channels: usize,
    samples: u64,
    frames: Vec<u8>,
    smallest: usize,
    largest: usize,
    md5: [u8; 16],
}

impl Stream {
    fn of(take: &[Vec<i32>]) -> Stream {
        let length = take.first().map_or(0, Vec::len);
        let mut stream = Stream {
            channels: take.len(),
            samples: length as u64,
            frames: Vec::new(),
            smallest: usize::MAX,
            largest: 0,
            md5: md5(take),
        };
        for (number, start) in (0..length).step_by(BLOCK_FRAMES).enumerate() {
            let end = (start + BLOCK_FRAMES).min(length);
            let block: Vec<&[i32]> = take.iter().map(|plane| &plane[start..end]).collect();
            let frame = frame::encode(number as u32, &block);
            stream.smallest = stream.smallest.min(frame.len());
            stream.largest = stream.largest.max(frame.len());
            stream.frames.extend(frame);
        }
        stream
    }

    /// The whole file, with so many bytes of padding.
    fn file(&self, rate: u32, padding: usize) -> Vec<u8> {
        let mut file = b"fLaC".to_vec();
        let information = self.information(rate);
        file.extend(block_header(STREAM_INFORMATION, information.len()));
        file.extend(information);
        // The largest take has a padding block too, an empty one: all files are built alike.
        file.extend(block_header(LAST | PADDING, padding));
        file.resize(file.len() + padding, 0);
        file.extend(&self.frames);
        file
    }

    fn information(&self, rate: u32) -> Vec<u8> {
        let mut bytes = Vec::new();
        bytes.extend([BLOCK_FRAMES as u16; 2].iter().flat_map(|size| size.to_be_bytes()));
        for size in [self.smallest, self.largest] {
            bytes.extend(&(size as u32).to_be_bytes()[1..]);
        }
        let packed = u64::from(rate) << 44
            | (self.channels as u64 - 1) << 41
            | u64::from(BITS - 1) << 36
            | self.samples & ((1 << 36) - 1);
        bytes.extend(packed.to_be_bytes());
        bytes.extend(self.md5);
        bytes
    }
}

fn block_header(kind: u8, length: usize) -> [u8; BLOCK_HEADER] {
    let [_, a, b, c] = (length as u32).to_be_bytes();
    [kind, a, b, c]
}

/// The MD5 of the samples as the format wants it: interleaved, 24 bit, lowest byte first.
fn md5(take: &[Vec<i32>]) -> [u8; 16] {
    let mut digest = Md5::new();
    let frames = take.first().map_or(0, Vec::len);
    let mut bytes = Vec::with_capacity(frames * take.len() * 3);
    for frame in 0..frames {
        for plane in take {
            bytes.extend(&plane[frame].to_le_bytes()[..3]);
        }
    }
    digest.update(&bytes);
    digest.finalize().into()
}

#[cfg(test)]
#[allow(clippy::disallowed_methods, reason = "test signals need not be the same on every CPU")]
mod tests {
    use super::*;

    #[test]
    fn files_are_of_one_size_and_built_alike() {
        let loud: Vec<i32> = (0..10_000).map(|k| ((f64::from(k) * 0.1).sin() * 8e6) as i32).collect();
        let quiet: Vec<i32> = loud.iter().map(|sample| sample / 1000).collect();
        let files = encode_alike(&[vec![loud, quiet.clone()], vec![quiet.clone(), quiet]], 44_100);
        assert_eq!(files[0].len(), files[1].len());
        for file in &files {
            assert!(file.starts_with(b"fLaC"));
            assert_eq!((file[4], file[42]), (STREAM_INFORMATION, LAST | PADDING));
        }
    }
}
