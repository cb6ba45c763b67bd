//! Values as parts carry them: IEC 60062 style in both directions ("4k7", "220n", "1M", "0R33").
//!
//! The letter stands for the decimal point and the multiplier at once (IEC 60062, resistance R K M G T, capacitance
//! p n µ m F). Beside the strict form a decimal point before the letter is read too ("4.7k"), `k` as well as `K`,
//! `u` for `µ`, and a plain number.

use std::fmt;

/// Why a text is no value.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum NotAValue {
    /// Nothing there.
    Empty,
    /// A comma where a point belongs.
    Comma,
    /// A space inside or around the value.
    Space,
    /// A sign that no value has, or a second letter: most often a unit.
    Sign(char),
    /// No digit at all.
    NoDigits,
    /// Two points, or a point beside a letter that is one already.
    Points,
    /// More than a number can hold.
    TooLarge,
}

impl fmt::Display for NotAValue {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::Empty => f.write_str("it is empty"),
            Self::Comma => f.write_str("the decimal sign is a point or the letter, as in 4.7k or 4k7"),
            Self::Space => f.write_str("a value holds no spaces"),
            Self::Sign(sign) => write!(
                f,
                "`{}` does not belong here: one letter of p n u m R k M G T, and no unit",
                crate::terminal::plain(&sign.to_string())
            ),
            Self::NoDigits => f.write_str("it has no digits"),
            Self::Points => f.write_str("it has two decimal signs"),
            Self::TooLarge => f.write_str("it is larger than any number"),
        }
    }
}

/// Reads "4k7", "220n", "1M", "0R33", "4.7k", "820" or "1e-6" as a number in SI units.
///
/// # Errors
/// [`NotAValue`] where the text is none of these.
pub fn parse(text: &str) -> Result<f64, NotAValue> {
    if text.trim().is_empty() {
        return Err(NotAValue::Empty);
    }
    if !text.contains(|c: char| c.is_ascii_digit()) {
        return Err(NotAValue::NoDigits);
    }
    if text.contains(char::is_whitespace) {
        return Err(NotAValue::Space);
    }
    if text.contains(',') {
        return Err(NotAValue::Comma);
    }
    let (sign, body) = match text.strip_prefix(['-', '+']) {
        Some(rest) => (if text.starts_with('-') { "-" } else { "" }, rest),
        None => ("", text),
    };
    let decimal = match body.char_indices().find_map(|(at, c)| exponent_of(c).map(|e| (at, c, e))) {
        Some((at, letter, exponent)) => with_letter(&body[..at], &body[at + letter.len_utf8()..], exponent)
            .map(|text| format!("{sign}{text}"))?,
        None => plain_number(body).map(|text| format!("{sign}{text}"))?,
    };
    // One correctly rounded conversion of the decimal text, so that "330n" is the number that 330e-9 is.
    match decimal.parse::<f64>() {
        Ok(value) if value.is_finite() => Ok(value),
        Ok(_) => Err(NotAValue::TooLarge),
        Err(_) => Err(NotAValue::Points),
    }
}

fn exponent_of(letter: char) -> Option<i32> {
    Some(match letter {
        'p' => -12,
        'n' => -9,
        'u' | 'µ' | 'μ' => -6,
        'm' => -3,
        'R' | 'F' => 0,
        'k' | 'K' => 3,
        'M' => 6,
        'G' => 9,
        'T' => 12,
        _ => return None,
    })
}

fn with_letter(before: &str, after: &str, exponent: i32) -> Result<String, NotAValue> {
    if before.is_empty() && after.is_empty() {
        return Err(NotAValue::NoDigits);
    }
    only_digits(after)?;
    if let Some((whole, fraction)) = before.split_once('.') {
        only_digits(whole)?;
        only_digits(fraction)?;
        if !after.is_empty() || (whole.is_empty() && fraction.is_empty()) {
            return Err(NotAValue::Points);
        }
        return Ok(format!("{whole}.{fraction}e{exponent}"));
    }
    only_digits(before)?;
    Ok(format!("{before}.{after}e{exponent}"))
}

fn plain_number(body: &str) -> Result<String, NotAValue> {
    let (mantissa, exponent) = body.split_once(['e', 'E']).unwrap_or((body, "0"));
    let (whole, fraction) = mantissa.split_once('.').unwrap_or((mantissa, ""));
    only_digits(whole)?;
    only_digits(fraction)?;
    if whole.is_empty() && fraction.is_empty() {
        return Err(NotAValue::NoDigits);
    }
    let digits = exponent.strip_prefix(['-', '+']).unwrap_or(exponent);
    only_digits(digits)?;
    if digits.is_empty() {
        return Err(NotAValue::NoDigits);
    }
    Ok(body.to_owned())
}

fn only_digits(text: &str) -> Result<(), NotAValue> {
    match text.chars().find(|c| !c.is_ascii_digit()) {
        Some('.') => Err(NotAValue::Points),
        Some(other) => Err(NotAValue::Sign(other)),
        None => Ok(()),
    }
}

/// What a value measures, as far as its letters go.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Letters {
    /// R k M G T: the ohm's own letter stands between 10 mΩ and 1 kΩ.
    Resistance,
    /// p n u m F.
    Capacitance,
}

/// Writes a value with up to four significant digits: "4k7", "390n", "0R33". Zero, negative or not finite: as Rust
/// writes the number.
pub fn format(value: f64, letters: Letters) -> String {
    if !(value > 0.0 && value.is_finite()) {
        return format!("{value}");
    }
    // Four digits, correctly rounded, as d.ddde±x: every later step works on text and cannot round again.
    let scientific = format!("{value:.3e}");
    let (mantissa, exponent) = scientific.split_once('e').unwrap_or((&scientific, "0"));
    let exponent: i32 = exponent.parse().unwrap_or(0);
    let digits: String = mantissa.chars().filter(char::is_ascii_digit).collect();
    let (step, letter) = pick_letter(exponent, letters);
    place_letter(&digits, exponent - step, letter)
}

/// [`format()`], or `None` where four digits do not say the value exactly.
pub fn format_exact(value: f64, letters: Letters) -> Option<String> {
    let text = format(value, letters);
    (parse(&text) == Ok(value)).then_some(text)
}

fn pick_letter(exponent: i32, letters: Letters) -> (i32, char) {
    let choices: &[(i32, char)] = match letters {
        Letters::Resistance if exponent < -2 => &[(-3, 'm')],
        Letters::Resistance => &[(12, 'T'), (9, 'G'), (6, 'M'), (3, 'k'), (0, 'R')],
        Letters::Capacitance => &[(0, 'F'), (-3, 'm'), (-6, 'u'), (-9, 'n'), (-12, 'p')],
    };
    let fits = choices.iter().find(|(step, _)| exponent >= *step);
    *fits.or(choices.last()).unwrap_or(&(0, 'R'))
}

/// Puts the letter where the decimal point of 0.`digits` × 10^(`point` + 1) stands, and drops trailing zeros.
fn place_letter(digits: &str, point: i32, letter: char) -> String {
    let (whole, fraction) = if point < 0 {
        ("0".to_owned(), format!("{}{digits}", "0".repeat((-point - 1).unsigned_abs() as usize)))
    } else {
        let split = (point.unsigned_abs() as usize + 1).min(digits.len());
        let padding = (point.unsigned_abs() as usize + 1).saturating_sub(digits.len());
        (format!("{}{}", &digits[..split], "0".repeat(padding)), digits[split..].to_owned())
    };
    format!("{whole}{letter}{}", fraction.trim_end_matches('0'))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn reads_the_forms_that_parts_carry() {
        // Left: marking; right: value. IEC 60062's own examples are of the form R33, 4K7, 1M5, 332p, 3n32 (from memory).
        let cases = [
            ("4k7", 4700.0),
            ("4K7", 4700.0),
            ("220n", 220e-9),
            ("1M", 1e6),
            ("0R33", 0.33),
            ("R33", 0.33),
            ("33k", 33e3),
            ("2.2u", 2.2e-6),
            ("2u2", 2.2e-6),
            ("39µ", 39e-6),
            ("39μ", 39e-6),
            ("470p", 470e-12),
            ("3u3", 3.3e-6),
            ("1F5", 1.5),
            ("5m", 0.005),
            ("10G", 1e10),
            ("820", 820.0),
            ("820R", 820.0),
            ("0", 0.0),
            ("0R", 0.0),
            ("0.45", 0.45),
            (".5", 0.5),
            ("1e-6", 1e-6),
            ("-1.5", -1.5),
            ("-4k7", -4700.0),
        ];
        for (text, value) in cases {
            assert_eq!(parse(text), Ok(value), "{text}");
        }
    }

    #[test]
    fn says_what_is_wrong_with_other_texts() {
        let cases = [
            ("", NotAValue::Empty),
            ("  ", NotAValue::Empty),
            ("4 k7", NotAValue::Space),
            ("4,7k", NotAValue::Comma),
            ("4k7Ω", NotAValue::Sign('Ω')),
            ("220nF", NotAValue::Sign('F')),
            ("4volts", NotAValue::Sign('v')),
            ("k", NotAValue::NoDigits),
            ("-", NotAValue::NoDigits),
            ("1e", NotAValue::NoDigits),
            ("4.7k2", NotAValue::Points),
            ("1.2.3", NotAValue::Points),
            ("1e400", NotAValue::TooLarge),
            ("nan", NotAValue::NoDigits),
            ("inf", NotAValue::NoDigits),
        ];
        for (text, problem) in cases {
            assert_eq!(parse(text), Err(problem), "{text}");
        }
    }

    #[test]
    fn writes_the_shortest_exact_form() {
        let ohms = [
            (4700.0, "4k7"),
            (33e3, "33k"),
            (820.0, "820R"),
            (0.33, "0R33"),
            (0.12, "0R12"),
            (1e6, "1M"),
            (22.1e3, "22k1"),
            (1.0, "1R"),
            (0.005, "5m"),
            (10e6, "10M"),
            (999_960.0, "1M"),
            (1e13, "10T"),
        ];
        for (value, text) in ohms {
            assert_eq!(format(value, Letters::Resistance), text);
        }
        let farads = [
            (390e-9, "390n"),
            (3.3e-6, "3u3"),
            (150e-6, "150u"),
            (470e-12, "470p"),
            (0.5e-12, "0p5"),
            (1.5, "1F5"),
        ];
        for (value, text) in farads {
            assert_eq!(format(value, Letters::Capacitance), text);
        }
        assert_eq!(format(0.0, Letters::Resistance), "0");
        assert_eq!(format_exact(12345.0, Letters::Resistance), None);
    }

    /// Every value of four significant digits from 1 pF to 9.999 TΩ comes back as the same number.
    #[test]
    fn every_four_digit_value_comes_back() {
        for digits in (1000..10_000).step_by(7) {
            for exponent in -15..10 {
                let value: f64 = format!("{digits}e{exponent}").parse().expect("a number");
                for letters in [Letters::Resistance, Letters::Capacitance] {
                    let text = format(value, letters);
                    assert_eq!(parse(&text), Ok(value), "{text}");
                }
            }
        }
    }
}
