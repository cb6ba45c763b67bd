//! Numbers as the page writes them: a true minus, no break before the unit.

use crate::show::units;

/// What stands where a figure was not measured.
pub const NOT_MEASURED: &str = "not measured";

/// A text of [`units`] as the page writes it.
pub fn nice(text: &str) -> String {
    text.replace('-', "−").replace(' ', "\u{a0}")
}

/// A sentence with figures in it: no break between a number and what follows it.
pub fn nice_sentence(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    let mut before = ' ';
    for c in text.chars() {
        out.push(if c == ' ' && before.is_ascii_digit() { '\u{a0}' } else { c });
        before = c;
    }
    crate::terminal::plain(&out).into_owned()
}

/// A number with fixed decimals.
pub fn plain_number(value: f64, decimals: usize) -> String {
    let text = format!("{value:.decimals$}");
    let zero = text.trim_start_matches('-').chars().all(|c| c == '0' || c == '.');
    if zero { text.trim_start_matches('-').to_owned() } else { text.replace('-', "−") }
}

/// A number of a logarithmic axis: 1k, 0.01, 10M.
pub fn short_number(value: f64) -> String {
    match value {
        v if v >= 0.999e6 => format!("{}M", trimmed(v / 1e6)),
        v if v >= 999.0 => format!("{}k", trimmed(v / 1e3)),
        v if v >= 0.000_99 => trimmed(v),
        v => format!("{v:e}").replace('-', "−"),
    }
}

fn trimmed(value: f64) -> String {
    let text = format!("{value:.4}");
    text.trim_end_matches('0').trim_end_matches('.').to_owned()
}

/// A value with a fixed number of decimals and its unit.
pub fn fixed(value: f64, decimals: usize, unit: &str) -> String {
    format!("{}\u{a0}{unit}", plain_number(value, decimals))
}

pub fn decibels(value: f64) -> String {
    fixed(value, 1, "dB")
}

/// Percent with two or three digits that matter.
pub fn percent(value: f64) -> String {
    nice(&units::percent(value))
}

/// A voltage of the bench, to what a meter shows.
pub fn bench_volts(value: f64) -> String {
    match value.abs() {
        size if size < 0.5e-4 => fixed(0.0, 0, "V"),
        size if size >= 99.95 => fixed(value, 0, "V"),
        size if size >= 9.995 => fixed(value, 1, "V"),
        size if size >= 0.0995 => fixed(value, 2, "V"),
        _ => fixed(1e3 * value, 1, "mV"),
    }
}

/// An rms level: "0.5 V".
pub fn level(volts_rms: f64) -> String {
    let (value, unit) = match volts_rms {
        v if v >= 0.0995 => (v, "V"),
        v if v >= 0.995e-4 => (1e3 * v, "mV"),
        v => (1e6 * v, "µV"),
    };
    format!("{}\u{a0}{unit}", significant(value, 3))
}

/// A frequency with three digits.
pub fn frequency(hertz: f64) -> String {
    let (value, unit) = match hertz {
        v if v >= 0.9995e6 => (v / 1e6, "MHz"),
        v if v >= 999.5 => (v / 1e3, "kHz"),
        v => (v, "Hz"),
    };
    format!("{}\u{a0}{unit}", significant(value, 3))
}

/// `count` digits that matter, trailing zeros left out.
pub fn significant(value: f64, count: usize) -> String {
    if value == 0.0 || !value.is_finite() {
        return "0".to_owned();
    }
    let before = libm::floor(libm::log10(value.abs())) as i32 + 1;
    let decimals = (count as i32 - before).clamp(0, 12) as usize;
    let text = plain_number(value, decimals);
    if text.contains('.') { text.trim_end_matches('0').trim_end_matches('.').to_owned() } else { text }
}

/// Three digits that matter, zeros kept, so that a column stays even.
pub fn three_digits(value: f64) -> String {
    if value == 0.0 || !value.is_finite() {
        return "0".to_owned();
    }
    // Rounded first: 9.996 has one digit more before the point than its logarithm says.
    let rounded: f64 = format!("{value:.2e}").parse().unwrap_or(value);
    let before = libm::floor(libm::log10(rounded.abs()) + 1e-12) as i32 + 1;
    plain_number(value, (3 - before).clamp(0, 12) as usize)
}

/// Ohms in a column: with a k from 10 000 on.
pub fn column_ohms(value: f64) -> String {
    if value >= 9999.5 { format!("{}k", three_digits(value / 1e3)) } else { three_digits(value) }
}

/// A configuration's letter: A to Z, then A2 and so on.
pub fn letter(index: usize) -> String {
    let letter = char::from(b'A' + (index % 26) as u8);
    match index / 26 {
        0 => letter.to_string(),
        round => format!("{letter}{}", round + 1),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_are_written_as_a_printer_would() {
        assert_eq!(decibels(-3.04), "−3.0\u{a0}dB");
        assert_eq!(decibels(-0.04), "0.0\u{a0}dB");
        assert_eq!(level(0.5), "0.5\u{a0}V");
        assert_eq!(level(0.0125), "12.5\u{a0}mV");
        assert_eq!(short_number(20_000.0), "20k");
        assert_eq!(short_number(0.01), "0.01");
        assert_eq!(bench_volts(184.4), "184\u{a0}V");
        assert_eq!(letter(27), "B2");
        assert_eq!(three_digits(9.996), "10.0");
        assert_eq!(three_digits(0.29), "0.290");
        assert_eq!(column_ohms(37_611.0), "37.6k");
    }
}
