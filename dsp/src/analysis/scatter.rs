//! How parts and tubes scatter: seeded builds of one stage, and what lies between two percentiles of them.

use super::{Meter, OperatingPoint};
use crate::circuit::{Network, Node};

/// What differs from build to build. Widening it is a matter of more fields here and lines in [`Scatter::build`].
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Scatter {
    /// Every resistor lies uniformly within this part of its value.
    pub resistors: f64,
    /// The supply voltage lies uniformly within this part of its value.
    pub supply: f64,
    /// Plate current at the same voltages, as a factor.
    pub emission: TubeScatter,
    /// Amplification factor, as a factor.
    pub mu: TubeScatter,
    /// Whether both tubes are sections of one bottle, and so more alike than two bottles.
    pub one_bottle: bool,
}

/// How a property of tubes scatters around 1.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct TubeScatter {
    /// Standard deviation over all sections.
    pub deviation: f64,
    /// Nothing is lower.
    pub low: f64,
    /// Nothing is higher.
    pub high: f64,
    /// Median of the difference between the two sections of a bottle.
    pub within_bottle: f64,
}

impl Scatter {
    /// 5 % parts on a supply within 5 %, and tubes as 60 measured sections of ECC88 scatter (the measured sections of
    /// which the library's plate curves are the medians: seven makers mixed; emission 0.74 to 1.30, 13 %; µ 0.82 to 1.16,
    /// 10 %; within a bottle 5 and 1.3 % in the median; the two are not correlated).
    pub const FIVE_PERCENT: Scatter = Scatter {
        resistors: 0.05,
        supply: 0.05,
        emission: TubeScatter { deviation: 0.13, low: 0.74, high: 1.30, within_bottle: 0.05 },
        mu: TubeScatter { deviation: 0.10, low: 0.82, high: 1.16, within_bottle: 0.013 },
        one_bottle: true,
    };

    /// Build number `index` of the series `seed`. A build depends on nothing but these two, so builds may be made in
    /// any order.
    pub fn build(&self, nominal: &Network, seed: u64, index: u64) -> Network {
        let mut chance = Chance::new(seed, index);
        let mut network = nominal.clone();
        let mut factors: Vec<(&'static str, f64)> = Vec::new();
        // Both halves of a pot are one part and move together.
        let mut of_part = |key: &'static str, chance: &mut Chance| match factors.iter().find(|(k, _)| *k == key) {
            Some((_, factor)) => *factor,
            None => {
                let factor = 1.0 + self.resistors * chance.symmetric();
                factors.push((key, factor));
                factor
            }
        };
        for part in &mut network.resistors {
            part.value *= of_part(part.key, &mut chance);
        }
        for source in &mut network.sources {
            source.resistance *= of_part(source.key, &mut chance);
        }
        network.scale_supply(1.0 + self.supply * chance.symmetric());
        let (emission, mu) =
            (self.emission.pair(self.one_bottle, &mut chance), self.mu.pair(self.one_bottle, &mut chance));
        for (tube, triode) in network.triodes.iter_mut().enumerate() {
            triode.section.law = triode.section.law.scaled(emission[tube.min(1)], mu[tube.min(1)]);
        }
        network
    }
}

/// For a normal distribution the median of |x − y| is 0.6745·√2 standard deviations.
const MEDIAN_DIFFERENCE: f64 = 0.6745 * std::f64::consts::SQRT_2;

impl TubeScatter {
    /// Factors of the two tubes.
    fn pair(&self, one_bottle: bool, chance: &mut Chance) -> [f64; 2] {
        let section = (self.within_bottle / MEDIAN_DIFFERENCE).min(self.deviation);
        let bottle = libm::sqrt(self.deviation * self.deviation - section * section);
        let first = chance.normal();
        let second = if one_bottle { first } else { chance.normal() };
        [first, second].map(|of_bottle| {
            let factor = 1.0 + bottle * of_bottle + section * chance.normal();
            factor.clamp(self.low, self.high)
        })
    }
}

/// What a meter of `meter_ohms` reads at each of `nodes` in one build, V; `None` where a node is missing or the build
/// settles nowhere.
pub fn metered_volts(build: &Network, nodes: &[Node], meter_ohms: f64) -> Vec<Option<f64>> {
    let read = |&node: &Node| {
        let meter = Meter { node, resistance: meter_ohms };
        OperatingPoint::solve(build, Some(meter))?.volts(node)
    };
    nodes.iter().map(read).collect()
}

/// Seeded chance that is the same on every machine.
struct Chance(u64);

impl Chance {
    fn new(seed: u64, index: u64) -> Chance {
        let mut chance = Chance(seed);
        chance.0 = chance.bits() ^ index.wrapping_mul(0xD1B5_4A32_D192_ED03);
        chance
    }

    /// SplitMix64: Steele, Lea & Flood, "Fast splittable pseudorandom number generators", OOPSLA 2014.
    fn bits(&mut self) -> u64 {
        self.0 = self.0.wrapping_add(0x9E37_79B9_7F4A_7C15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
        z ^ (z >> 31)
    }

    /// Above 0 and below 1.
    fn uniform(&mut self) -> f64 {
        ((self.bits() >> 12) as f64 + 0.5) / (1_u64 << 52) as f64
    }

    /// Uniform from −1 to 1.
    fn symmetric(&mut self) -> f64 {
        2.0 * self.uniform() - 1.0
    }

    /// Normal, mean 0, deviation 1 (Box & Muller, Ann. Math. Stat. 29, 1958).
    fn normal(&mut self) -> f64 {
        let radius = libm::sqrt(-2.0 * libm::log(self.uniform()));
        radius * libm::cos(std::f64::consts::TAU * self.uniform())
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::analysis::median;

    /// The scatter is drawn as it was measured: deviation, ends and the difference within a bottle. Clamping at the ends
    /// takes a little off the deviation.
    #[test]
    fn tubes_scatter_as_measured() {
        let scatter = Scatter::FIVE_PERCENT.emission;
        let pairs: Vec<[f64; 2]> =
            (0..20_000).map(|index| scatter.pair(true, &mut Chance::new(7, index))).collect();
        let mean = pairs.iter().map(|p| p[0]).sum::<f64>() / pairs.len() as f64;
        let variance = pairs.iter().map(|p| (p[0] - mean).powi(2)).sum::<f64>() / pairs.len() as f64;
        assert!((mean - 1.0).abs() < 0.01, "{mean}");
        assert!((0.115..0.135).contains(&variance.sqrt()), "{}", variance.sqrt());
        assert!(pairs.iter().flatten().all(|f| (0.74..=1.30).contains(f)));
        let apart: Vec<f64> = pairs.iter().map(|p| (p[0] - p[1]).abs()).collect();
        let middle = median(&apart).unwrap();
        assert!((0.045..0.052).contains(&middle), "{middle}");
        let strangers: Vec<f64> = (0..20_000)
            .map(|index| scatter.pair(false, &mut Chance::new(7, index)))
            .map(|p| (p[0] - p[1]).abs())
            .collect();
        assert!(median(&strangers).unwrap() > 2.0 * middle);
    }

    #[test]
    fn chance_is_even() {
        let mut chance = Chance::new(1, 2);
        let draws: Vec<f64> = (0..100_000).map(|_| chance.uniform()).collect();
        let mean = draws.iter().sum::<f64>() / draws.len() as f64;
        assert!((mean - 0.5).abs() < 0.005, "{mean}");
        assert!((median(&draws).unwrap() - 0.5).abs() < 0.005);
    }
}
