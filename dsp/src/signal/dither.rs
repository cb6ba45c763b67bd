//! Triangular dither: noise of two steps' width that makes the rounding error of 16 bits independent of the sound.
//!
//! Lipshitz, Wannamaker & Vanderkooy, "Quantization and dither: a theoretical survey", JAES 40 (1992).

/// A repeatable source of dither for one channel.
#[derive(Clone, Debug)]
pub struct TriangularDither {
    state: u64,
}

impl TriangularDither {
    /// The dither of a channel; unlike channels get unlike noise, and every run the same.
    pub fn for_channel(channel: usize) -> Self {
        let mut seeds = TriangularDither { state: channel as u64 };
        TriangularDither { state: seeds.bits() }
    }

    /// The next value in steps of the format: between −1 and 1, variance 1/6.
    pub fn next_value(&mut self) -> f64 {
        self.uniform() - self.uniform()
    }

    /// Adds dither for a format with the given step (2⁻¹⁵ for 16 bits) to a block.
    pub fn add(&mut self, samples: &mut [f64], step: f64) {
        samples.iter_mut().for_each(|sample| *sample += step * self.next_value());
    }

    /// From 0 up to but not including 1, in steps of 2⁻⁵³.
    fn uniform(&mut self) -> f64 {
        (self.bits() >> 11) as f64 / (1_u64 << 53) as f64
    }

    /// SplitMix64: Steele, Lea & Flood, "Fast splittable pseudorandom number generators", OOPSLA 2014.
    fn bits(&mut self) -> u64 {
        self.state = self.state.wrapping_add(0x9E37_79B9_7F4A_7C15);
        let mut z = self.state;
        z = (z ^ (z >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
        z ^ (z >> 31)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const COUNT: usize = 200_000;

    /// Known answer of SplitMix64 with seed 0 (from memory: the first outputs of the reference code).
    #[test]
    fn generator_gives_its_published_sequence() {
        let mut dither = TriangularDither { state: 0 };
        assert_eq!([dither.bits(), dither.bits()], [0xE220_A839_7B1D_CDAF, 0x6E78_9E6A_A1B9_65F4]);
    }

    #[test]
    fn values_are_triangular() {
        let mut dither = TriangularDither::for_channel(0);
        let values: Vec<f64> = (0..COUNT).map(|_| dither.next_value()).collect();
        let mean = values.iter().sum::<f64>() / COUNT as f64;
        let variance = values.iter().map(|value| value * value).sum::<f64>() / COUNT as f64;
        // Half of a triangle's area lies within 1 − 1/√2 of its middle.
        let middle = values.iter().filter(|value| value.abs() < 1.0 - 0.5_f64.sqrt()).count() as f64 / COUNT as f64;
        assert!(mean.abs() < 0.005 && (variance - 1.0 / 6.0).abs() < 0.002, "mean {mean}, variance {variance}");
        assert!((middle - 0.5).abs() < 0.005 && values.iter().all(|value| value.abs() < 1.0), "middle {middle}");
    }

    #[test]
    fn channels_differ_and_runs_do_not() {
        let run = |channel| {
            let mut dither = TriangularDither::for_channel(channel);
            (0..1000).map(|_| dither.next_value()).collect::<Vec<_>>()
        };
        assert_eq!(run(0), run(0));
        let correlation = run(0).iter().zip(run(1)).map(|(a, b)| a * b).sum::<f64>() / 1000.0;
        assert!(correlation.abs() < 0.02, "correlation {correlation}");
    }

    /// With dither the mean rounded value is the value itself, between two steps too.
    #[test]
    fn rounding_loses_no_level_on_average() {
        let mut dither = TriangularDither::for_channel(3);
        let mut samples = vec![0.3; COUNT];
        dither.add(&mut samples, 1.0);
        let mean = samples.iter().map(|sample| sample.round()).sum::<f64>() / COUNT as f64;
        assert!((mean - 0.3).abs() < 0.005, "mean {mean}");
    }
}
