//! Numbers with the digits a designer reads and the unit beside them.

use platewright_dsp::portable::decibels as decibels_of;

use crate::plan::LevelUnit;

/// Volts: millivolts below a tenth, microvolts below a tenth of those.
pub fn volts(value: f64) -> String {
    match value.abs() {
        // Less than half a microvolt is what rounding leaves of 0 V.
        size if size < 0.5e-6 => "0 V".to_owned(),
        size if size >= 0.0995 => short(value, "V"),
        size if size >= 0.0995e-3 => format!("{:.2} mV", 1e3 * value),
        _ => format!("{:.2} µV", 1e6 * value),
    }
}

/// A level in V rms as the user wants to read levels.
pub fn level(volts_rms: f64, unit: LevelUnit) -> String {
    /// The voltage of 1 mW in 600 Ω.
    const DBU_VOLTS: f64 = 0.774_596_669_241_483_4;
    match unit {
        LevelUnit::Volts => volts(volts_rms),
        LevelUnit::Dbu => format!("{:.2} dBu", decibels_of(volts_rms / DBU_VOLTS)),
        LevelUnit::Dbv => format!("{:.2} dBV", decibels_of(volts_rms)),
    }
}

/// Amperes as mA, small ones as µA or nA.
pub fn amperes(value: f64) -> String {
    match value.abs() {
        size if size < 0.5e-12 => "0 A".to_owned(),
        size if size >= 0.9995e-4 => format!("{:.3} mA", 1e3 * value),
        size if size >= 0.9995e-7 => format!("{:.2} µA", 1e6 * value),
        _ => format!("{:.2} nA", 1e9 * value),
    }
}

/// Watts, small ones as mW.
pub fn watts(value: f64) -> String {
    match value.abs() {
        size if size >= 0.0995 => format!("{value:.2} W"),
        size if size >= 0.5e-5 => format!("{:.2} mW", 1e3 * value),
        _ => "0 W".to_owned(),
    }
}

/// Ohms with k or M.
pub fn ohms(value: f64) -> String {
    match value.abs() {
        size if size >= 0.99995e6 => format!("{} MΩ", digits(1e-6 * value, 4)),
        size if size >= 999.95 => format!("{} kΩ", digits(1e-3 * value, 4)),
        _ => format!("{} Ω", digits(value, 4)),
    }
}

/// Siemens as mS.
pub fn siemens(value: f64) -> String {
    format!("{:.3} mS", 1e3 * value)
}

/// Decibels.
pub fn decibels(value: f64) -> String {
    format!("{value:.2} dB")
}

/// Percent with three significant digits.
pub fn percent(value: f64) -> String {
    format!("{} %", digits(value, 3))
}

/// Hertz, with k or M.
pub fn hertz(value: f64) -> String {
    match value {
        size if size >= 0.99995e6 => format!("{} MHz", digits(1e-6 * value, 4)),
        size if size >= 999.95 => format!("{} kHz", digits(1e-3 * value, 4)),
        _ => format!("{} Hz", digits(value, 4)),
    }
}

fn short(value: f64, unit: &str) -> String {
    match value.abs() {
        size if size >= 99.95 => format!("{value:.1} {unit}"),
        size if size >= 9.995 => format!("{value:.2} {unit}"),
        _ => format!("{value:.3} {unit}"),
    }
}

/// `value` with `count` significant digits, trailing zeros left out.
fn digits(value: f64, count: usize) -> String {
    if value == 0.0 || !value.is_finite() {
        return format!("{value}");
    }
    let before = libm::log10(value.abs()).floor() as i32 + 1;
    let decimals = (count as i32 - before).clamp(0, 12) as usize;
    let text = format!("{value:.decimals$}");
    if text.contains('.') { text.trim_end_matches('0').trim_end_matches('.').to_owned() } else { text }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn digits_suit_the_size() {
        assert_eq!(volts(291.2345), "291.2 V");
        assert_eq!(volts(0.01234), "12.34 mV");
        assert_eq!(volts(-3.4567), "-3.457 V");
        assert_eq!(volts(3.4e-6), "3.40 µV");
        assert_eq!(level(0.7746, LevelUnit::Dbu), "0.00 dBu");
        assert_eq!(amperes(4.321e-3), "4.321 mA");
        assert_eq!(amperes(3.2e-8), "32.00 nA");
        assert_eq!(ohms(33_000.0), "33 kΩ");
        assert_eq!(ohms(10e6), "10 MΩ");
        assert_eq!(percent(0.012345), "0.0123 %");
        assert_eq!(hertz(1000.0), "1 kHz");
        assert_eq!(hertz(12.5), "12.5 Hz");
    }
}
