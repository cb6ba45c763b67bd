//! Takes as FLAC files, 24 bit, all of one size, without tags.
//!
//! Only the format's fixed predictors are used, chosen by counting bits: whole numbers throughout, so the bytes do not
//! depend on the CPU. The encoder's adaptive predictors save about a tenth more and round by CPU.

use flacenc::bitsink::ByteSink;
use flacenc::component::{BitRepr, MetadataBlockData, Stream};
use flacenc::config::{Encoder, OrderSel};
use flacenc::error::Verify;
use flacenc::source::MemSource;

/// The type of a padding block in FLAC's list of metadata blocks.
const PADDING: u8 = 1;
/// The header of a metadata block, bytes.
const BLOCK_HEADER: usize = 4;
const BITS: usize = 24;
const BLOCK_FRAMES: usize = 4096;

/// Encoded takes of one size, in the order given, each with one plane a channel.
///
/// # Errors
/// What the encoder says: it takes 1 to 8 channels and rates to 96 kHz.
pub fn encode_alike(takes: &[Vec<Vec<i32>>], rate: u32) -> Result<Vec<Vec<u8>>, String> {
    let streams: Vec<Stream> = takes.iter().map(|take| encode(take, rate)).collect::<Result<_, _>>()?;
    let sizes: Vec<usize> = streams.iter().map(|stream| stream.count_bits().div_ceil(8)).collect();
    let largest = sizes.iter().copied().max().unwrap_or(0);
    let padded = |(mut stream, size): (Stream, usize)| {
        // The largest has a block of its own, if an empty one: all files are built alike.
        let padding = vec![0; largest - size];
        let block = MetadataBlockData::new_unknown(PADDING, &padding).map_err(|error| error.to_string())?;
        stream.add_metadata_block(block);
        bytes(&stream)
    };
    let files: Vec<Vec<u8>> = streams.into_iter().zip(sizes).map(padded).collect::<Result<_, _>>()?;
    debug_assert!(files.iter().all(|file| file.len() == largest + BLOCK_HEADER));
    Ok(files)
}

fn encode(take: &[Vec<i32>], rate: u32) -> Result<Stream, String> {
    let frames = take.first().map_or(0, Vec::len);
    let interleaved: Vec<i32> = (0..frames).flat_map(|k| take.iter().map(move |plane| plane[k])).collect();
    let mut config = Encoder::default();
    config.multithread = false;
    config.block_size = BLOCK_FRAMES;
    config.subframe_coding.use_lpc = false;
    config.subframe_coding.fixed.order_sel = OrderSel::BitCount;
    let config = config.into_verified().map_err(|(_, error)| error.to_string())?;
    let source = MemSource::from_samples(&interleaved, take.len(), BITS, rate as usize);
    flacenc::encode_with_fixed_block_size(&config, source, BLOCK_FRAMES).map_err(|error| error.to_string())
}

fn bytes(stream: &Stream) -> Result<Vec<u8>, String> {
    let mut sink = ByteSink::new();
    stream.write(&mut sink).map_err(|error| error.to_string())?;
    Ok(sink.into_inner())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn files_are_of_one_size_and_repeatable() {
        let tone = |k: i32| (f64::from(k) * 0.1).sin() * 4e6;
        let loud: Vec<i32> = (0..10_000).map(|k| tone(k) as i32).collect();
        let quiet: Vec<i32> = loud.iter().map(|sample| sample / 1000).collect();
        let takes = [vec![loud.clone(), quiet.clone()], vec![quiet.clone(), quiet]];
        let files = encode_alike(&takes, 44_100).unwrap();
        assert_eq!(files[0].len(), files[1].len());
        assert!(files.iter().all(|file| file.starts_with(b"fLaC")));
        assert_eq!(encode_alike(&takes, 44_100).unwrap(), files);
    }
}
