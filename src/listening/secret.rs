//! What decides the letters: nothing that can be guessed without the maker's own files.

use sha2::{Digest, Sha256};

/// Letters for takes. A, B and X have a meaning of their own in the page; I, L, O, Q and U are easily misread; P and
/// Z are left to the keyboard.
const LETTERS: [char; 15] = ['K', 'M', 'N', 'R', 'S', 'T', 'V', 'W', 'Y', 'C', 'D', 'E', 'F', 'G', 'H'];

/// The most takes of one recording.
pub const MOST_TAKES: usize = LETTERS.len();

/// The SHA-256 of `bytes` in hexadecimal.
pub fn sha256_hex(bytes: &[u8]) -> String {
    hex(&Sha256::digest(bytes))
}

fn hex(bytes: &[u8]) -> String {
    bytes.iter().map(|byte| format!("{byte:02x}")).collect()
}

/// A secret that the stage file, the recordings' samples and the seed make together: the same of all three give the same
/// letters, and whoever lacks one of them cannot work the letters out, whatever the seed.
pub struct Secret([u8; 32]);

impl Secret {
    /// Of the stage file's text, a digest of every recording's samples, and the seed.
    pub fn new(stage_text: &str, recordings: &[[u8; 32]], seed: u64) -> Secret {
        let mut digest = Sha256::new();
        digest.update(b"platewright listening secret 1\n");
        digest.update(seed.to_le_bytes());
        digest.update((stage_text.len() as u64).to_le_bytes());
        digest.update(stage_text.as_bytes());
        recordings.iter().for_each(|recording| digest.update(recording));
        Secret(digest.finalize().into())
    }

    /// Something to put into the key, so that its hash cannot be found by trying the few keys there can be.
    pub fn nonce(&self) -> String {
        hex(&self.derive("nonce", 0))
    }

    /// Which letter each of `takes` takes of recording `number` gets.
    ///
    /// # Panics
    /// If `takes > MOST_TAKES`.
    pub fn letters(&self, number: usize, takes: usize) -> Vec<char> {
        let mut letters = LETTERS[..takes].to_vec();
        let purpose = format!("letters {number}");
        for (draw, last) in (1..letters.len()).rev().enumerate() {
            let bytes = self.derive(&purpose, draw);
            let drawn = bytes[..8].iter().fold(0_u64, |number, byte| number << 8 | u64::from(*byte));
            // The bias of the remainder is below 2⁻⁶⁰.
            letters.swap(last, (drawn % (last as u64 + 1)) as usize);
        }
        letters
    }

    fn derive(&self, purpose: &str, count: usize) -> [u8; 32] {
        let mut digest = Sha256::new();
        digest.update(self.0);
        digest.update(format!("{purpose} {count}"));
        digest.finalize().into()
    }
}

/// The digest of a recording's samples.
pub struct SampleDigest(Sha256);

impl SampleDigest {
    /// Of nothing yet, at a sample rate.
    pub fn new(sample_rate: u32) -> SampleDigest {
        let mut digest = Sha256::new();
        digest.update(sample_rate.to_le_bytes());
        SampleDigest(digest)
    }

    /// More samples, one plane a channel.
    pub fn add(&mut self, planes: &[Vec<f64>]) {
        planes.iter().flatten().for_each(|sample| self.0.update(sample.to_le_bytes()));
    }

    /// The digest.
    pub fn finish(self) -> [u8; 32] {
        self.0.finalize().into()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// FIPS 180-4's example: the SHA-256 of "abc".
    #[test]
    fn the_hash_is_sha256() {
        let expected = "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad";
        assert_eq!(sha256_hex(b"abc"), expected);
    }

    #[test]
    fn letters_depend_on_everything_and_are_dealt_evenly() {
        let letters = |text: &str, seed| Secret::new(text, &[[7; 32]], seed).letters(1, 4);
        assert_eq!(letters("a", 1), letters("a", 1));
        let mut places = [0; 4];
        for seed in 0..400 {
            let dealt = letters("a", seed);
            let mut sorted = dealt.clone();
            sorted.sort_unstable();
            assert_eq!(sorted, ['K', 'M', 'N', 'R']);
            places[dealt.iter().position(|letter| *letter == 'K').unwrap()] += 1;
        }
        // 100 each are expected, with a standard deviation of 8.7.
        assert!(places.iter().all(|count| (65..=135).contains(count)), "{places:?}");
        assert!((0..50).any(|seed| letters("a", seed) != letters("b", seed)));
    }
}
