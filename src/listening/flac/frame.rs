//! One frame: a block of samples of every channel, and whichever way of storing two channels is the shortest.

use super::BITS;
use super::bits::{Bits, crc8, crc16};
use super::subframe::Subframe;

/// Frames of sound in a block; the last may be shorter.
pub const BLOCK_FRAMES: usize = 4096;

/// The format's codes for what the channels are.
const LEFT_SIDE: u32 = 8;
const SIDE_RIGHT: u32 = 9;
const MIDDLE_SIDE: u32 = 10;

/// The bytes of frame `number`, one plane a channel, one or two of them.
pub fn encode(number: u32, block: &[&[i32]]) -> Vec<u8> {
    let frames = block.first().map_or(0, |plane| plane.len());
    let (assignment, subframes) = match block {
        [left, right] => stereo(left, right),
        planes => (planes.len() as u32 - 1, planes.iter().map(|plane| Subframe::of(&wide(plane), BITS)).collect()),
    };
    let mut bits = Bits::default();
    // Sync code, blocks of a fixed size.
    bits.put(0xFFF8, 16);
    let usual = frames == BLOCK_FRAMES;
    bits.put(if usual { 0b1100 } else { 0b0111 }, 4);
    // The sample rate stands in the stream information.
    bits.put(0, 4);
    bits.put(assignment, 4);
    // 24 bit, and a reserved zero.
    bits.put(0b1100, 4);
    put_number(&mut bits, number);
    if !usual {
        bits.put(frames as u32 - 1, 16);
    }
    let header = crc8(bits.bytes());
    bits.put(u32::from(header), 8);
    for subframe in &subframes {
        subframe.put(&mut bits);
    }
    bits.align();
    let whole = crc16(bits.bytes());
    bits.put(u32::from(whole), 16);
    bits.into_bytes()
}

fn wide(plane: &[i32]) -> Vec<i64> {
    plane.iter().map(|sample| i64::from(*sample)).collect()
}

fn stereo(left: &[i32], right: &[i32]) -> (u32, Vec<Subframe>) {
    let pairs = || left.iter().zip(right).map(|(l, r)| (i64::from(*l), i64::from(*r)));
    let side: Vec<i64> = pairs().map(|(l, r)| l - r).collect();
    let middle: Vec<i64> = pairs().map(|(l, r)| (l + r) >> 1).collect();
    let left = Subframe::of(&wide(left), BITS);
    let right = Subframe::of(&wide(right), BITS);
    let side = Subframe::of(&side, BITS + 1);
    let middle = Subframe::of(&middle, BITS);
    let ways = [
        (left.bits() + right.bits(), 1),
        (left.bits() + side.bits(), LEFT_SIDE),
        (side.bits() + right.bits(), SIDE_RIGHT),
        (middle.bits() + side.bits(), MIDDLE_SIDE),
    ];
    let assignment = ways.into_iter().min().map_or(1, |(_, assignment)| assignment);
    let subframes = match assignment {
        LEFT_SIDE => vec![left, side],
        SIDE_RIGHT => vec![side, right],
        MIDDLE_SIDE => vec![middle, side],
        _ => vec![left, right],
    };
    (assignment, subframes)
}

/// A frame number as UTF-8 would write that character; the numbers here stay below 2²¹.
fn put_number(bits: &mut Bits, number: u32) {
    let follow = |shift: u32| 0x80 | number >> shift & 0x3F;
    match number {
        0..0x80 => bits.put(number, 8),
        0x80..0x800 => {
            bits.put(0xC0 | number >> 6, 8);
            bits.put(follow(0), 8);
        }
        0x800..0x1_0000 => {
            bits.put(0xE0 | number >> 12, 8);
            bits.put(follow(6), 8);
            bits.put(follow(0), 8);
        }
        _ => {
            bits.put(0xF0 | number >> 18 & 0x07, 8);
            for shift in [12, 6, 0] {
                bits.put(follow(shift), 8);
            }
        }
    }
}
