//! `maker.txt`: every correction, for the maker alone.

use super::key::{Key, KeyRecording, KeyTake};
use crate::terminal::plain;

/// What a taker of the pack and its maker should know.
const HEAD: &str = "\
For the maker alone: do not send this folder. Send everything in send/.

Every take of a recording begins at the same sample, has the same length, loudness
(ITU-R BS.1770-4) and fades (10 ms), and no DC. Levels were lowered only. What is left between
two takes is the stage: its harmonics, its dynamics, its response. Noise is not rendered.
";

const FOOT: &str = "\
The seal that the page carries is the SHA-256 of key.json: keep that file as it is, or
answers can no longer be told. Whoever has the stage file, the recordings and the seed
can make this pack again and so read the letters; the page and its takes alone tell
nothing. Answers carry a chain of hashes: it shows changes made by accident or in an
editor, and proves no more than that.
";

/// DC below this is none: it lies under half a step of 24 bit, −150.5 dBFS.
const LEAST_DC: f64 = -150.0;

/// The text.
pub fn text(key: &Key, seal: &str, seed: u64, notes: &[String]) -> String {
    let mut text = format!("{HEAD}\npack   {}\nseal   {seal}\nseed   {seed}\n", key.pack);
    text.push_str(&format!("trials {} a run\n", key.trials));
    for recording in &key.recordings {
        text.push_str(&about(recording));
    }
    if !notes.is_empty() {
        text.push_str("\nTo know\n");
        notes.iter().for_each(|note| text.push_str(&format!("  {note}\n")));
    }
    text.push('\n');
    text.push_str(FOOT);
    text
}

fn about(recording: &KeyRecording) -> String {
    let rate = f64::from(recording.sample_rate);
    let mut text = format!(
        "\nRecording {}: {}\n  from {:.3} s, {:.3} s long, {} Hz, {}\n  before the gains 0 dBFS is {} V rms at the \
         output; all takes at {:.2} LUFS\n",
        recording.number,
        plain(&recording.name),
        recording.from_seconds,
        recording.frames as f64 / rate,
        recording.sample_rate,
        if recording.channels == 1 { "mono" } else { "stereo" },
        recording.full_scale_rms,
        recording.loudness,
    );
    let loudest = recording.takes.iter().map(|take| take.own_loudness).fold(f64::NEG_INFINITY, f64::max);
    for take in &recording.takes {
        text.push_str(&about_take(take, loudest));
    }
    text
}

fn about_take(take: &KeyTake, loudest: f64) -> String {
    let turned = if take.turned { "turned around: the stage inverts" } else { "as it came" };
    let dc = |dc: Option<f64>| match dc {
        Some(dc) if dc > LEAST_DC => format!("{dc:.1} dBFS"),
        _ => "none".to_owned(),
    };
    let mut text = format!(
        "\n  {}  {}\n     gain {:.2} dB: from {:.2} LUFS, {:.2} dBTP to {:.2} LUFS, {:.2} dBTP\n     polarity {turned}; \
         DC taken out {}, left {}\n",
        take.letter,
        plain(take.name()),
        take.gain,
        take.own_loudness,
        take.own_true_peak,
        take.loudness,
        take.true_peak,
        dc(take.dc_removed),
        dc(take.dc),
    );
    if let (Some(gain), Some(low), Some(high)) = (take.stage_gain, take.response_low, take.response_high) {
        text.push_str(&format!(
            "     the stage's own: {gain:+.2} dB at 1 kHz, {low:+.2} dB at 20 Hz, {high:+.2} dB at 20 kHz (left in); \
             {:.2} LU below\n     the loudest take (taken out)\n",
            loudest - take.own_loudness
        ));
    }
    text
}
