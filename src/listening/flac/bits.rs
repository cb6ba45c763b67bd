//! Bits on their way into bytes, highest first, and the checksums over them.

/// A growing row of bits.
#[derive(Default)]
pub struct Bits {
    bytes: Vec<u8>,
    /// Bits that do not fill a byte yet, lowest `pending` ones.
    rest: u64,
    pending: u32,
}

impl Bits {
    /// Appends the lowest `count` bits of `value`.
    ///
    /// # Panics
    /// If `count > 32`.
    pub fn put(&mut self, value: u32, count: u32) {
        assert!(count <= 32, "at most 32 bits at a time");
        let value = u64::from(value) & ((1 << count) - 1);
        self.rest = self.rest << count | value;
        self.pending += count;
        while self.pending >= 8 {
            self.pending -= 8;
            self.bytes.push((self.rest >> self.pending) as u8);
        }
        self.rest &= (1 << self.pending) - 1;
    }

    /// Appends a signed number in two's complement.
    pub fn put_signed(&mut self, value: i64, count: u32) {
        self.put(value as u32, count);
    }

    /// Appends so many zeros and a one.
    pub fn put_unary(&mut self, mut zeros: u64) {
        while zeros >= 32 {
            self.put(0, 32);
            zeros -= 32;
        }
        self.put(1, zeros as u32 + 1);
    }

    /// Fills the last byte with zeros.
    pub fn align(&mut self) {
        self.put(0, (8 - self.pending) % 8);
    }

    /// The whole bytes so far.
    pub fn bytes(&self) -> &[u8] {
        &self.bytes
    }

    /// The whole bytes.
    pub fn into_bytes(self) -> Vec<u8> {
        self.bytes
    }
}

/// The checksum of a frame's header: x⁸ + x² + x + 1.
pub fn crc8(bytes: &[u8]) -> u8 {
    bytes.iter().fold(0, |crc, byte| {
        (0..8).fold(crc ^ byte, |crc: u8, _| if crc & 0x80 == 0 { crc << 1 } else { crc << 1 ^ 0x07 })
    })
}

/// The checksum of a whole frame: x¹⁶ + x¹⁵ + x² + 1.
pub fn crc16(bytes: &[u8]) -> u16 {
    bytes.iter().fold(0, |crc, byte| {
        let crc = crc ^ u16::from(*byte) << 8;
        (0..8).fold(crc, |crc: u16, _| if crc & 0x8000 == 0 { crc << 1 } else { crc << 1 ^ 0x8005 })
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn bits_line_up() {
        let mut bits = Bits::default();
        bits.put(0b101, 3);
        bits.put_signed(-1, 5);
        bits.put_unary(35);
        bits.put_signed(-2, 25);
        bits.align();
        assert_eq!(bits.bytes(), [0b1011_1111, 0, 0, 0, 0, 0b0001_1111, 0xFF, 0xFF, 0b1111_0000]);
    }

    /// The check values of both polynomials with a zero start over "123456789" (CRC-8/SMBUS, CRC-16/UMTS).
    #[test]
    fn checksums_have_their_check_values() {
        assert_eq!(crc8(b"123456789"), 0xF4);
        assert_eq!(crc16(b"123456789"), 0xFEE8);
    }
}
