//! Samples as they lie in a file, and as numbers whose full scale is 1.0.

use std::fmt;
use std::str::FromStr;

/// How samples are coded in a recording.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Coding {
    U8,
    I16,
    I24,
    I32,
    F32,
}

/// The sample formats that are written.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum SampleFormat {
    /// 16-bit integers.
    I16,
    /// 24-bit integers.
    I24,
    /// 32-bit integers.
    I32,
    /// 32-bit float.
    F32,
}

/// 2³¹: every integer is read as if it filled the upper bits of 32.
const FULL_SCALE: f64 = 2_147_483_648.0;

impl Coding {
    pub(super) fn bytes(self) -> usize {
        match self {
            Coding::U8 => 1,
            Coding::I16 => 2,
            Coding::I24 => 3,
            Coding::I32 | Coding::F32 => 4,
        }
    }

    /// Replaces the planes' contents with the frames in `bytes`, one plane a channel. Every value is exact.
    pub(super) fn decode(self, bytes: &[u8], planes: &mut [Vec<f64>]) {
        let integer = |bits: [u8; 4]| f64::from(i32::from_le_bytes(bits)) / FULL_SCALE;
        match self {
            Coding::U8 => decode(bytes, planes, |[a]: [u8; 1]| (f64::from(a) - 128.0) / 128.0),
            Coding::I16 => decode(bytes, planes, |[a, b]: [u8; 2]| integer([0, 0, a, b])),
            Coding::I24 => decode(bytes, planes, |[a, b, c]: [u8; 3]| integer([0, a, b, c])),
            Coding::I32 => decode(bytes, planes, integer),
            Coding::F32 => decode(bytes, planes, |bits: [u8; 4]| f64::from(f32::from_le_bytes(bits))),
        }
    }
}

/// Takes interleaved bytes apart into planes.
pub(super) fn decode<const BYTES: usize>(
    bytes: &[u8],
    planes: &mut [Vec<f64>],
    value: impl Fn([u8; BYTES]) -> f64,
) {
    let frame_bytes = planes.len() * BYTES;
    for (channel, plane) in planes.iter_mut().enumerate() {
        let sample = |frame: &[u8]| value(std::array::from_fn(|k| frame[channel * BYTES + k]));
        plane.clear();
        plane.extend(bytes.chunks_exact(frame_bytes).map(sample));
    }
}

impl SampleFormat {
    /// Bytes of one sample.
    pub fn bytes(self) -> usize {
        match self {
            SampleFormat::I16 => 2,
            SampleFormat::I24 => 3,
            SampleFormat::I32 | SampleFormat::F32 => 4,
        }
    }

    /// One least significant bit; 0 for float.
    pub fn step(self) -> f64 {
        match self {
            SampleFormat::I16 => 1.0 / 32_768.0,
            SampleFormat::I24 => 1.0 / 8_388_608.0,
            SampleFormat::I32 => 1.0 / FULL_SCALE,
            SampleFormat::F32 => 0.0,
        }
    }

    /// Replaces `bytes` with the frames of `planes`, planes of one length, one a channel: every sample rounded to the
    /// nearest value; integers stop at their ends, float goes on.
    pub(super) fn encode(self, planes: &[impl AsRef<[f64]>], bytes: &mut Vec<u8>) {
        match self {
            SampleFormat::I16 => encode(planes, bytes, |sample| {
                let [a, b, ..] = integer(sample, 15).to_le_bytes();
                [a, b]
            }),
            SampleFormat::I24 => encode(planes, bytes, |sample| {
                let [a, b, c, _] = integer(sample, 23).to_le_bytes();
                [a, b, c]
            }),
            SampleFormat::I32 => encode(planes, bytes, |sample| integer(sample, 31).to_le_bytes()),
            SampleFormat::F32 => encode(planes, bytes, |sample| (sample as f32).to_le_bytes()),
        }
    }
}

/// Interleaves planes of one length as bytes.
pub(super) fn encode<const BYTES: usize>(
    planes: &[impl AsRef<[f64]>],
    bytes: &mut Vec<u8>,
    coded: impl Fn(f64) -> [u8; BYTES],
) {
    let frame_bytes = planes.len() * BYTES;
    let frames = planes.first().map_or(0, |plane| plane.as_ref().len());
    bytes.resize(frames * frame_bytes, 0);
    for (channel, plane) in planes.iter().enumerate() {
        for (frame, &sample) in bytes.chunks_exact_mut(frame_bytes).zip(plane.as_ref()) {
            frame[channel * BYTES..][..BYTES].copy_from_slice(&coded(sample));
        }
    }
}

/// The nearest integer with `bits` bits beside its sign; a tie goes to the even one.
fn integer(sample: f64, bits: u32) -> i32 {
    // 1.5 × 2⁵²: adding it leaves no bits for a fraction, so the addition itself rounds, without a library call.
    const ROUNDER: f64 = 6_755_399_441_055_744.0;
    let scale = (1_u64 << bits) as f64;
    let clipped = (sample * scale).clamp(-scale, scale - 1.0);
    ((clipped + ROUNDER) - ROUNDER) as i32
}

impl fmt::Display for SampleFormat {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(match self {
            SampleFormat::I16 => "i16",
            SampleFormat::I24 => "i24",
            SampleFormat::I32 => "i32",
            SampleFormat::F32 => "f32",
        })
    }
}

impl FromStr for SampleFormat {
    type Err = String;

    fn from_str(text: &str) -> Result<Self, String> {
        [SampleFormat::I16, SampleFormat::I24, SampleFormat::I32, SampleFormat::F32]
            .into_iter()
            .find(|format| format.to_string() == text)
            .ok_or_else(|| format!("`{text}` is no sample format; expected i16, i24, i32 or f32"))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn written(format: SampleFormat, sample: f64) -> Vec<u8> {
        let mut bytes = Vec::new();
        format.encode(&[[sample]], &mut bytes);
        bytes
    }

    #[test]
    fn samples_round_to_nearest_and_stop_at_the_ends() {
        let i16_of = |sample| i16::from_le_bytes(written(SampleFormat::I16, sample).try_into().unwrap());
        let step = SampleFormat::I16.step();
        assert_eq!(i16_of(0.49 * step), 0);
        assert_eq!(i16_of(-0.51 * step), -1);
        assert_eq!(i16_of(2.5 * step), 2);
        assert_eq!((i16_of(1.0), i16_of(-1.0), i16_of(7.0), i16_of(-7.0)), (32767, -32768, 32767, -32768));
        assert_eq!(written(SampleFormat::I24, -1.0), [0, 0, 0x80]);
        assert_eq!(written(SampleFormat::I24, 1.0), [0xFF, 0xFF, 0x7F]);
        assert_eq!(written(SampleFormat::I32, 2.0), i32::MAX.to_le_bytes());
        assert_eq!(written(SampleFormat::F32, 2.0), 2.0_f32.to_le_bytes());
    }

    #[test]
    fn every_16_bit_value_and_the_ends_of_the_others_survive_reading_and_writing() {
        let mut planes = [Vec::new()];
        for value in i16::MIN..=i16::MAX {
            Coding::I16.decode(&value.to_le_bytes(), &mut planes);
            assert_eq!(written(SampleFormat::I16, planes[0][0]), value.to_le_bytes());
        }
        for value in [i32::MIN, i32::MIN + 1, -1, 0, 1, i32::MAX - 1, i32::MAX] {
            Coding::I32.decode(&value.to_le_bytes(), &mut planes);
            assert_eq!(written(SampleFormat::I32, planes[0][0]), value.to_le_bytes());
        }
        for bytes in [[0, 0, 0x80], [0xFF, 0xFF, 0x7F], [1, 0, 0], [0xFF, 0xFF, 0xFF]] {
            Coding::I24.decode(&bytes, &mut planes);
            assert_eq!(written(SampleFormat::I24, planes[0][0]), bytes);
        }
    }

    #[test]
    fn frames_are_taken_apart_by_channel() {
        let mut planes = [vec![9.0], vec![9.0]];
        Coding::U8.decode(&[0, 128, 192, 255], &mut planes);
        assert_eq!(planes, [[-1.0, 0.5], [0.0, 127.0 / 128.0]]);
    }
}
