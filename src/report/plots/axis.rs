//! Axes: from values to places, and where their ticks stand.

use crate::report::words;

/// How an axis is divided.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Scale {
    Linear,
    Logarithmic,
}

/// One axis.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Axis {
    pub scale: Scale,
    /// Values at the ends.
    pub low: f64,
    pub high: f64,
    /// Places of the ends.
    pub from: f64,
    pub to: f64,
}

impl Axis {
    pub fn linear((low, high): (f64, f64), (from, to): (f64, f64)) -> Axis {
        let high = if high > low { high } else { low + 1.0 };
        Axis { scale: Scale::Linear, low, high, from, to }
    }

    pub fn logarithmic((low, high): (f64, f64), (from, to): (f64, f64)) -> Axis {
        let low = low.max(1e-15);
        Axis { scale: Scale::Logarithmic, low, high: high.max(1.001 * low), from, to }
    }

    /// The place of a value; beyond the ends where the value is.
    pub fn at(&self, value: f64) -> f64 {
        let part = match self.scale {
            Scale::Linear => (value - self.low) / (self.high - self.low),
            Scale::Logarithmic => {
                let log = |v: f64| libm::log10(v.max(1e-30));
                (log(value) - log(self.low)) / (log(self.high) - log(self.low))
            }
        };
        self.from + part * (self.to - self.from)
    }

    /// Whether a value lies between the ends.
    pub fn holds(&self, value: f64) -> bool {
        let slack = 1e-9 * (self.high - self.low).abs();
        value >= self.low - slack && value <= self.high + slack
    }

    /// Ticks with their texts, about `count` of them.
    pub fn ticks(&self, count: usize) -> Vec<(f64, String)> {
        match self.scale {
            Scale::Linear => self.even_ticks(count),
            Scale::Logarithmic => self.decades(count),
        }
    }

    fn even_ticks(&self, count: usize) -> Vec<(f64, String)> {
        let step = round_step((self.high - self.low) / count.max(1) as f64);
        let first = (self.low / step - 1e-9).ceil() as i64;
        let last = (self.high / step + 1e-9).floor() as i64;
        let decimals = (-libm::floor(libm::log10(step) + 1e-9)).max(0.0) as usize;
        (first..=last).map(|k| (k as f64 * step, words::plain_number(k as f64 * step, decimals))).collect()
    }

    fn decades(&self, count: usize) -> Vec<(f64, String)> {
        let first = libm::floor(libm::log10(self.low) + 1e-9) as i32;
        let last = libm::ceil(libm::log10(self.high) - 1e-9) as i32;
        let spread = libm::log10(self.high / self.low);
        let stride = (spread / count.max(1) as f64).ceil().max(1.0) as i32;
        let between: &[f64] = match () {
            () if spread <= 1.2 => &[1.0, 2.0, 3.0, 5.0],
            () if spread * 2.0 < count as f64 => &[1.0, 3.0],
            () => &[1.0],
        };
        let mut ticks = Vec::new();
        for decade in (first..=last).filter(|decade| decade.rem_euclid(stride) == 0) {
            for factor in between {
                // Exact powers of ten, so that a tick reads 0.001 and not 0.00099….
                let value: f64 = format!("{factor}e{decade}").parse().unwrap_or(1.0);
                if self.holds(value) {
                    ticks.push((value, words::short_number(value)));
                }
            }
        }
        ticks
    }

    /// Lines between the decades, without text.
    pub fn minor(&self) -> Vec<f64> {
        if self.scale == Scale::Linear || libm::log10(self.high / self.low) > 7.5 {
            return Vec::new();
        }
        let first = libm::floor(libm::log10(self.low)) as i32;
        let last = libm::ceil(libm::log10(self.high)) as i32;
        (first..=last)
            .flat_map(|decade| (2..=9).map(move |factor| f64::from(factor) * libm::pow(10.0, f64::from(decade))))
            .filter(|value| self.holds(*value))
            .collect()
    }
}

/// The step of 1, 2 or 5 times a power of ten that is at least `rough`.
pub fn round_step(rough: f64) -> f64 {
    let size = libm::floor(libm::log10(rough.max(1e-15)));
    let unit: f64 = format!("1e{size}").parse().unwrap_or(1.0);
    [1.0, 2.0, 5.0, 10.0].into_iter().map(|k| k * unit).find(|step| *step >= rough * (1.0 - 1e-9)).unwrap_or(unit)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn ticks_stand_on_round_values() {
        let texts = |axis: &Axis, count| axis.ticks(count).into_iter().map(|(_, text)| text).collect::<Vec<_>>();
        let axis = Axis::linear((-0.2, 1.0), (0.0, 100.0));
        assert_eq!(texts(&axis, 6), ["−0.2", "0.0", "0.2", "0.4", "0.6", "0.8", "1.0"]);
        let axis = Axis::logarithmic((1.0, 1e6), (0.0, 100.0));
        assert_eq!(texts(&axis, 8), ["1", "10", "100", "1k", "10k", "100k", "1M"]);
        assert_eq!(axis.at(1e3), 50.0);
        let axis = Axis::logarithmic((0.001, 10.0), (0.0, 100.0));
        assert_eq!(texts(&axis, 5), ["0.001", "0.01", "0.1", "1", "10"]);
    }
}
