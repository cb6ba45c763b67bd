//! One channel of a block: constant, as it is, or as the Rice-coded errors of a fixed polynomial predictor.

use super::bits::Bits;

/// The highest order of the format's fixed predictors.
const HIGHEST_ORDER: usize = 4;
/// A block is cut into up to 2⁶ partitions, each with its own Rice parameter.
const FINEST_PARTITION: u32 = 6;
/// The longest Rice parameter that is used; 31 means something else.
const LONGEST_PARAMETER: u32 = 30;
/// Bits of a subframe's header, of the residual's header, and of a partition's parameter.
const HEADER: u64 = 8;
const RESIDUAL_HEADER: u64 = 6;
const PARAMETER: u32 = 5;

/// A channel, encoded as far as its length is known.
pub struct Subframe {
    /// Bits of a sample.
    width: u32,
    way: Way,
    bits: u64,
}

enum Way {
    Constant(i64),
    Verbatim(Vec<i64>),
    Fixed { warm_up: Vec<i64>, errors: Vec<u64>, partition_order: u32, parameters: Vec<u32> },
}

impl Subframe {
    /// The shortest way to store samples of so many bits; `samples` is not empty.
    pub fn of(samples: &[i64], width: u32) -> Subframe {
        if samples.iter().all(|sample| *sample == samples[0]) {
            return Subframe { width, way: Way::Constant(samples[0]), bits: HEADER + u64::from(width) };
        }
        let verbatim = HEADER + samples.len() as u64 * u64::from(width);
        let (order, errors) = best_errors(samples);
        let (partition_order, parameters, coded) = best_partition(&errors, order, samples.len());
        let bits = HEADER + order as u64 * u64::from(width) + RESIDUAL_HEADER + coded;
        if bits >= verbatim {
            return Subframe { width, way: Way::Verbatim(samples.to_vec()), bits: verbatim };
        }
        let warm_up = samples[..order].to_vec();
        Subframe { width, way: Way::Fixed { warm_up, errors, partition_order, parameters }, bits }
    }

    /// How long it is.
    pub fn bits(&self) -> u64 {
        self.bits
    }

    /// Appends it.
    pub fn put(&self, bits: &mut Bits) {
        // A zero, six bits for the kind, and no wasted bits.
        let kind = |bits: &mut Bits, code: u32| bits.put(code << 1, 8);
        match &self.way {
            Way::Constant(value) => {
                kind(bits, 0);
                bits.put_signed(*value, self.width);
            }
            Way::Verbatim(samples) => {
                kind(bits, 1);
                samples.iter().for_each(|sample| bits.put_signed(*sample, self.width));
            }
            Way::Fixed { warm_up, errors, partition_order, parameters } => {
                kind(bits, 0b00_1000 | warm_up.len() as u32);
                warm_up.iter().for_each(|sample| bits.put_signed(*sample, self.width));
                // Parameters of five bits: four do not reach far enough for 24-bit sound.
                bits.put(1, 2);
                bits.put(*partition_order, 4);
                put_partitions(bits, errors, warm_up.len(), parameters);
            }
        }
    }
}

/// The order whose errors are smallest in sum, and those errors folded to 0, −1, 1, −2, 2 … → 0, 1, 2, 3, 4 …
fn best_errors(samples: &[i64]) -> (usize, Vec<u64>) {
    let mut errors = samples.to_vec();
    let mut best: Option<(u64, usize, Vec<i64>)> = None;
    for order in 0..=HIGHEST_ORDER.min(samples.len() - 1) {
        if order > 0 {
            errors = errors.windows(2).map(|pair| pair[1] - pair[0]).collect();
        }
        let sum = errors.iter().map(|error| error.unsigned_abs()).sum::<u64>();
        if best.as_ref().is_none_or(|(least, ..)| sum < *least) {
            best = Some((sum, order, errors.clone()));
        }
    }
    let (_, order, errors) = best.unwrap_or((0, 0, samples.to_vec()));
    (order, errors.into_iter().map(|error| (error << 1 ^ error >> 63) as u64).collect())
}

/// The errors of partition `index` of 2^`partition_order`: the first is short by the warm-up.
fn partition(errors: &[u64], order: usize, partition_order: u32, index: usize) -> &[u64] {
    let length = (errors.len() + order) >> partition_order;
    let start = (index * length).saturating_sub(order);
    &errors[start..(index + 1) * length - order]
}

/// The partition order, its parameters, and the bits of parameters and errors together.
fn best_partition(errors: &[u64], order: usize, block: usize) -> (u32, Vec<u32>, u64) {
    let possible = |p: &u32| block.is_multiple_of(1 << p) && block >> p > order;
    let cut = |partition_order: u32| {
        let best = |index| best_parameter(partition(errors, order, partition_order, index));
        let found: Vec<(u32, u64)> = (0..1 << partition_order).map(best).collect();
        let bits = found.iter().map(|(_, bits)| bits + u64::from(PARAMETER)).sum::<u64>();
        (bits, partition_order, found.into_iter().map(|(parameter, _)| parameter).collect::<Vec<_>>())
    };
    let best = (0..=FINEST_PARTITION).filter(possible).map(cut).min();
    best.map_or((0, vec![0], u64::MAX), |(bits, partition_order, parameters)| (partition_order, parameters, bits))
}

/// The Rice parameter for some errors and the bits that they then take, each a run of zeros, a one, and the parameter's
/// count of bits.
fn best_parameter(errors: &[u64]) -> (u32, u64) {
    let mean = errors.iter().sum::<u64>() / errors.len().max(1) as u64;
    let near = (u64::BITS - mean.leading_zeros()).min(LONGEST_PARAMETER);
    let bits = |parameter: u32| {
        let zeros: u64 = errors.iter().map(|error| error >> parameter).sum();
        zeros + errors.len() as u64 * (u64::from(parameter) + 1)
    };
    let candidates = near.saturating_sub(1)..=near;
    candidates
        .map(|parameter| (bits(parameter), parameter))
        .min()
        .map_or((0, u64::MAX), |(bits, parameter)| (parameter, bits))
}

fn put_partitions(bits: &mut Bits, errors: &[u64], order: usize, parameters: &[u32]) {
    let partition_order = parameters.len().trailing_zeros();
    for (index, parameter) in parameters.iter().enumerate() {
        bits.put(*parameter, PARAMETER);
        for error in partition(errors, order, partition_order, index) {
            bits.put_unary(error >> parameter);
            bits.put(*error as u32, *parameter);
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn lengths_are_as_promised() {
        let cubic: Vec<i64> = (0..4096).map(|k: i64| k * k * k % 8_000_000).collect();
        // Marsaglia's xorshift32, as loud as 24 bits go: nothing is saved by predicting it.
        let mut state = 1_u32;
        let mut next = || {
            state ^= state << 13;
            state ^= state >> 17;
            state ^= state << 5;
            i64::from(state as i32 >> 8)
        };
        let noise: Vec<i64> = (0..4096).map(|_| next()).collect();
        let ramp: Vec<i64> = (0..1000).map(|k| 7 * k).collect();
        for (samples, fixed) in
            [(vec![5; 4096], false), (cubic, true), (noise, false), (ramp, true), (vec![1, 2], true)]
        {
            let subframe = Subframe::of(&samples, 24);
            assert_eq!(matches!(subframe.way, Way::Fixed { .. }), fixed);
            let mut bits = Bits::default();
            subframe.put(&mut bits);
            bits.align();
            assert_eq!(bits.bytes().len() as u64, subframe.bits().div_ceil(8));
        }
    }

    #[test]
    fn a_parabola_leaves_nothing_to_the_third_order() {
        let (order, errors) = best_errors(&(0..100).map(|k| 3 * k * k - 20 * k).collect::<Vec<i64>>());
        assert_eq!((order, errors.iter().sum::<u64>()), (3, 0));
    }
}
