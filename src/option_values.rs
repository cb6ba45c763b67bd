//! Values on the command line: what each option takes, and the item that is wrong where one is.

use platewright_dsp::analysis::TonePair;

use crate::failure::RequestError;
use crate::iec60062;
use crate::plan::Tone;
use crate::terminal::plain;

/// What a number on the command line measures, and its range.
pub struct Range {
    what: &'static str,
    low: f64,
    high: f64,
    example: &'static str,
}

/// Range of a frequency.
pub const HERTZ: Range =
    Range { what: "a frequency from 0.001 Hz to 10 MHz", low: 1e-3, high: 1e7, example: "1000 or 1k" };
/// Range of a level or full scale.
pub const LEVEL: Range =
    Range { what: "a level from 1 nV to 10 kV rms", low: 1e-9, high: 1e4, example: "0.5 or 500m" };
/// Range of a meter.
pub const OHMS: Range = Range { what: "a resistance from 1 Ω to 1 TΩ", low: 1.0, high: 1e12, example: "10M" };
/// Range of `--tail`.
pub const TAIL: Range = Range { what: "a time from 0 to 600 s", low: 0.0, high: 600.0, example: "2" };
/// Range of `--drive`.
pub const DRIVE: Range = Range { what: "a gain from -120 to 120 dB", low: -120.0, high: 120.0, example: "-6" };

/// Range of `--from`.
pub const FROM: Range = Range { what: "a time from 0 to 100000 s", low: 0.0, high: 1e5, example: "12.5" };
/// Range of `--length`: loudness has none below, and a pack is held in memory.
pub const LENGTH: Range = Range { what: "a time from 0.4 to 120 s", low: 0.4, high: 120.0, example: "20" };
/// Range of `--effect`.
pub const EFFECT: Range = Range {
    what: "a probability above 0.5, up to 1: guessing is right half the time",
    low: 0.501,
    high: 1.0,
    example: "0.7",
};
/// Range of `--power` and `--alpha`.
pub const PROBABILITY: Range =
    Range { what: "a probability from 0.0001 to 0.9999", low: 1e-4, high: 0.9999, example: "0.8" };

impl Range {
    /// The value of an option that may be left out.
    ///
    /// # Errors
    /// [`RequestError`] where it is no value or out of range.
    pub fn option(&self, option: &str, text: Option<&str>) -> Result<Option<f64>, RequestError> {
        text.map(|text| self.value(option, text, text)).transpose()
    }

    /// The value of `text`, which is `item` of `option` or a part of it.
    ///
    /// # Errors
    /// [`RequestError`] where it is no value or out of range.
    pub fn value(&self, option: &str, item: &str, text: &str) -> Result<f64, RequestError> {
        let wrong = |why: String| {
            wrong_item(option, item, &why, &format!("expected {}, such as {}", self.what, self.example))
        };
        let value =
            iec60062::parse(text).map_err(|reason| wrong(format!("\"{}\" is no value: {reason}", plain(text))))?;
        if (self.low..=self.high).contains(&value) {
            return Ok(value);
        }
        Err(wrong(format!("{} is out of range", plain(text))))
    }
}

fn wrong_item(option: &str, item: &str, why: &str, remedy: &str) -> RequestError {
    let item = if item.is_empty() { "an empty item".to_owned() } else { format!("\"{}\"", plain(item)) };
    RequestError::new(format!("{option}: {item}: {why}"), remedy)
}

/// Items of a repeated option whose values may hold several, separated by commas.
pub fn items(values: &[String]) -> impl Iterator<Item = &str> {
    values.iter().flat_map(|value| value.split(',')).map(str::trim)
}

/// One `--tone`: frequency:volts.
///
/// # Errors
/// [`RequestError`] naming the item and what is wrong with it.
pub fn tone(item: &str) -> Result<Tone, RequestError> {
    let Some((frequency, level)) = item.split_once(':') else {
        let remedy = "write frequency:volts, such as 1000:0.5 or 1k:500m";
        return Err(wrong_item("--tone", item, "there is no colon between frequency and level", remedy));
    };
    let frequency = HERTZ.value("--tone", item, frequency)?;
    let level = LEVEL.value("--tone", item, level)?;
    Ok(Tone { frequency, level })
}

/// One `--imd`.
///
/// # Errors
/// [`RequestError`] where it is no pair of tones.
pub fn tone_pair(item: &str) -> Result<TonePair, RequestError> {
    let pairs = [TonePair::Smpte, TonePair::Din, TonePair::Difference];
    let found = pairs.into_iter().find(|pair| pair.key() == item);
    found.ok_or_else(|| wrong_item("--imd", item, "no such pair of tones", "write smpte, din or difference"))
}

/// `--oversample`.
///
/// # Errors
/// [`RequestError`] where it is no power of two to 64.
pub fn oversample(text: &str) -> Result<usize, RequestError> {
    match text.parse::<usize>() {
        Ok(times) if times.is_power_of_two() && times <= 64 => Ok(times),
        _ => Err(wrong_item("--oversample", text, "not a power of two to 64", "write 1, 2, 4, 8, 16, 32 or 64")),
    }
}

/// `--rate`.
///
/// # Errors
/// [`RequestError`] where it is no whole number of hertz that WAV files are read and written at.
pub fn rate(text: &str) -> Result<u32, RequestError> {
    let remedy = "write a whole number of hertz from 8000 to 192000, such as 48000 or 48k";
    match iec60062::parse(text) {
        Ok(hertz) if hertz.fract() == 0.0 && (8000.0..=192_000.0).contains(&hertz) => Ok(hertz as u32),
        Ok(_) => Err(wrong_item("--rate", text, "not a sample rate", remedy)),
        Err(reason) => Err(wrong_item("--rate", text, &format!("it is no value: {reason}"), remedy)),
    }
}
