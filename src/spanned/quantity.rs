//! What a value measures: its unit, what is plausible, and how it is shown.

use crate::iec60062::{self, Letters};

/// A kind of value with the range that a file can mean. The ranges are wide: they are there to catch a farad where a
/// microfarad was meant, not to judge a design.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Quantity {
    /// "resistance".
    pub name: &'static str,
    /// "Ω"; empty for a plain number.
    pub unit: &'static str,
    /// Smallest plausible value.
    pub low: f64,
    /// Largest plausible value.
    pub high: f64,
    /// Whether 0 is allowed below `low`.
    pub zero: bool,
    /// How it might be written.
    pub example: &'static str,
}

/// A quantity with its range.
pub const fn quantity(
    name: &'static str,
    unit: &'static str,
    low: f64,
    high: f64,
    example: &'static str,
) -> Quantity {
    Quantity { name, unit, low, high, zero: false, example }
}

const fn or_zero(quantity: Quantity) -> Quantity {
    Quantity { zero: true, ..quantity }
}

/// A resistor that cannot be a wire.
pub const RESISTOR: Quantity = quantity("resistance", "Ω", 1e-2, 1e12, "\"33k\"");
/// A grid stopper or a capacitor's series resistance: 0R is a wire.
pub const OR_WIRE: Quantity = or_zero(quantity("resistance", "Ω", 1e-6, 1e12, "\"0R33\""));
/// A capacitor.
pub const CAPACITOR: Quantity = quantity("capacitance", "F", 1e-15, 10.0, "\"220n\"");
/// A capacitance between electrodes.
pub const ELECTRODES: Quantity = or_zero(quantity("capacitance", "F", 1e-18, 1e-6, "\"1p6\""));
/// A voltage that has to be there.
pub const VOLTAGE: Quantity = quantity("voltage", "V", 1e-6, 1e5, "290");
/// A current.
pub const CURRENT: Quantity = quantity("current", "A", 1e-9, 1e3, "\"20m\"");
/// A frequency.
pub const FREQUENCY: Quantity = quantity("frequency", "Hz", 1e-3, 1e7, "100");
/// A power.
pub const POWER: Quantity = quantity("power", "W", 1e-6, 1e5, "2");
/// A part's tolerance as a fraction.
pub const TOLERANCE: Quantity = quantity("tolerance", "", 0.0, 1.0, "0.05");
/// Anything from 0 to 1.
pub const FRACTION: Quantity = quantity("fraction", "", 0.0, 1.0, "0.45");
/// The file format's number.
pub const FORMAT: Quantity = quantity("format", "", 1.0, 1.0, "1");

/// A positive parameter of a tube law.
pub const fn parameter(low: f64, high: f64, example: &'static str) -> Quantity {
    quantity("parameter", "", low, high, example)
}

/// A parameter of a tube law that may be 0.
pub const fn parameter_or_zero(low: f64, high: f64, example: &'static str) -> Quantity {
    or_zero(quantity("parameter", "", low, high, example))
}

impl Quantity {
    /// Whether `value` is plausible.
    pub fn allows(&self, value: f64) -> bool {
        (value >= self.low && value <= self.high) || (self.zero && value == 0.0)
    }

    /// "a resistance from 0R01 to 1T (Ω)".
    pub fn expectation(&self) -> String {
        let article = if self.name.starts_with(['a', 'e', 'i', 'o', 'u']) { "an" } else { "a" };
        let zero = if self.zero && self.low > 0.0 { "0 or " } else { "" };
        let unit = if self.unit.is_empty() { String::new() } else { format!(" {}", self.unit) };
        if self.low == self.high {
            return format!("{}", self.low);
        }
        format!("{article} {}, {zero}{} to {}{unit}", self.name, bound(self.low), bound(self.high))
    }

    /// The value for a person, without its unit: as designers write ohms and farads ("820", "4k7", "390n") where that
    /// says it exactly, as a plain number otherwise.
    pub fn show(&self, value: f64) -> String {
        let letters = match self.unit {
            "Ω" => Some(Letters::Resistance),
            "F" => Some(Letters::Capacitance),
            _ => None,
        };
        // A letter that only stands for the decimal point says less than the point.
        let exact = letters.and_then(|letters| iec60062::format_exact(value, letters));
        exact.filter(|text| !text.contains(['R', 'F'])).unwrap_or_else(|| format!("{value}"))
    }

    /// Any value for a person, with its unit: "-47k Ω", "330 F", "0.5".
    pub fn show_with_unit(&self, value: f64) -> String {
        let sign = if value < 0.0 { "-" } else { "" };
        format!("{sign}{} {}", self.show(value.abs()), self.unit).trim_end().to_owned()
    }
}

fn bound(value: f64) -> String {
    if value == 0.0 || (1e-3..1e6).contains(&value.abs()) { format!("{value}") } else { format!("{value:e}") }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn expectations_read_as_sentences() {
        assert_eq!(RESISTOR.expectation(), "a resistance, 0.01 to 1e12 Ω");
        assert_eq!(OR_WIRE.expectation(), "a resistance, 0 or 1e-6 to 1e12 Ω");
        assert_eq!(FRACTION.expectation(), "a fraction, 0 to 1");
    }

    #[test]
    fn zero_is_a_wire_only_where_it_says_so() {
        assert!(
            !RESISTOR.allows(0.0) && OR_WIRE.allows(0.0) && !OR_WIRE.allows(-1.0) && !RESISTOR.allows(f64::NAN)
        );
    }

    #[test]
    fn values_are_shown_as_parts_carry_them() {
        assert_eq!(RESISTOR.show(47e3), "47k");
        assert_eq!(CAPACITOR.show(390e-9), "390n");
        assert_eq!(RESISTOR.show(12345.0), "12345");
        assert_eq!(RESISTOR.show(820.0), "820");
        assert_eq!(RESISTOR.show(0.12), "0.12");
        assert_eq!(VOLTAGE.show(290.0), "290");
        assert_eq!(RESISTOR.show_with_unit(-47e3), "-47k Ω");
        assert_eq!(CAPACITOR.show_with_unit(330.0), "330 F");
        assert_eq!(FRACTION.show_with_unit(45.0), "45");
    }
}
