//! Noise.

use platewright_dsp::analysis::{Noise, OperatingPoint, SmallSignal, supply_transfer};
use platewright_dsp::circuit::{Network, Ripple, Stage};
use platewright_dsp::portable::{decibels, magnitude};

use super::{NoiseFigures, ToneFigures, Why};

/// What the figures leave out.
const NOTE: &str = "best case: thermal noise at 300 K and 2.5/gm a triode; without flicker and grid noise";

/// The noise of `stage`, which is `network`, the hum of its supply, and the THD+N of `tone` where there is one.
pub fn of(stage: &Stage, network: &Network, point: &OperatingPoint, tone: Option<&ToneFigures>) -> NoiseFigures {
    let full_scale = stage.source.full_scale;
    let small = SmallSignal::new(network, point);
    let noise = Noise::of(&small);
    let gain = small.at(1000.0).map(|r| magnitude(r.gain)).filter(|&gain| gain > 0.0);
    let mut why = Why::new();
    if noise.is_none() {
        why.extend(
            ["output_rms", "output_rms_a", "input_rms", "signal_to_noise_dB"].map(|key| {
                (key.to_owned(), "the network has no solution somewhere from 20 Hz to 20 kHz".to_owned())
            }),
        );
    } else if gain.is_none() {
        why.extend(
            ["input_rms", "signal_to_noise_dB"]
                .map(|key| (key.to_owned(), "nothing reaches the output".to_owned())),
        );
    }
    let ripple = stage.supply.ripple;
    let hum = ripple.and_then(|ripple| hum(&small, ripple));
    // Hum of 0 V is below full scale by no number of decibels.
    let below = hum.filter(|&hum| hum > 0.0).zip(gain).map(|(hum, gain)| decibels(full_scale * gain / hum));
    if ripple.is_some() {
        let missing = [("hum_rms", hum.is_none()), ("hum_below_full_scale_dB", below.is_none())];
        let reason = if hum.is_none() { "the network has no solution there" } else { "nothing reaches the output" };
        why.extend(missing.iter().filter(|(_, none)| *none).map(|(key, _)| ((*key).to_owned(), reason.to_owned())));
    }
    let both = noise.zip(gain);
    NoiseFigures {
        output_rms: noise.map(|n| n.output_rms),
        output_rms_a: noise.map(|n| n.output_rms_a),
        input_rms: both.map(|(n, gain)| n.output_rms / gain),
        signal_to_noise_db: both.map(|(n, gain)| decibels(full_scale * gain / n.output_rms)),
        hum_rms: ripple.map(|_| hum),
        hum_frequency: ripple.map(|ripple| ripple.frequency),
        hum_below_full_scale_db: ripple.map(|_| below),
        thd_n_percent: tone.zip(noise).and_then(|(tone, noise)| thd_n(tone, noise)),
        note: NOTE.to_owned(),
        why,
    }
}

/// What the ripple leaves at the output, V rms.
fn hum(small: &SmallSignal<'_>, ripple: Ripple) -> Option<f64> {
    Some(ripple.rms * magnitude(supply_transfer(small, ripple.frequency)?))
}

/// THD+N = √(ΣH² + noise²)/H1.
fn thd_n(tone: &ToneFigures, noise: Noise) -> Option<f64> {
    let fundamental = tone.output_fundamental_rms?;
    Some(libm::hypot(tone.thd_percent?, 100.0 * noise.output_rms / fundamental))
}
