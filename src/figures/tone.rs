//! Tones and small-signal response.

use platewright_dsp::analysis::{OperatingPoint, Response, SmallSignal, Tone, fits, half_range};
use platewright_dsp::circuit::Network;
use platewright_dsp::portable::{decibels, degrees, magnitude};

use super::{HarmonicFigures, ResponseFigures, ToneFigures, Why};

/// Harmonics measured and summed.
pub const ORDERS: usize = 10;

/// Why a harmonic is not shown.
pub const NOT_TRUSTED: &str = "below -220 dBc, or it did not settle as the steps were made finer: not trusted";

/// How far the tube data carry a harmonic.
pub enum Trust<'a> {
    /// Nobody wants to know.
    Off,
    /// The stage with every other set of its tubes' parameters; empty where no tube has one.
    Ensemble(&'a [Network]),
}

/// A tone of `input_rms` volts at `frequency` Hz.
pub fn tone(network: &Network, trust: &Trust<'_>, frequency: f64, input_rms: f64) -> ToneFigures {
    let mut figures = match Tone::measure(network, frequency, input_rms, ORDERS) {
        Ok(tone) => measured(&tone),
        Err(reason) => silent(frequency, input_rms, &reason.to_string()),
    };
    judge(&mut figures, trust);
    figures
}

/// Puts the ensemble's spread beside every harmonic.
fn judge(figures: &mut ToneFigures, trust: &Trust<'_>) {
    let fits = match trust {
        Trust::Off => Err("--trust off".to_owned()),
        Trust::Ensemble([]) => Err("the tubes bring no equally good parameter sets".to_owned()),
        Trust::Ensemble(members) => {
            fits(members, figures.frequency, figures.input_rms, ORDERS).map_err(|reason| reason.to_string())
        }
    };
    for harmonic in figures.harmonics.iter_mut() {
        let levels = fits.as_ref().ok().and_then(|fits| fits.get(harmonic.order as usize - 2));
        harmonic.trust_db = harmonic.dbc.and_then(|_| half_range(levels?));
        harmonic.fits_dbc = levels.cloned().unwrap_or_default();
        if harmonic.trust_db.is_none() {
            let other = || "the harmonic, or one of the fits, is not trusted itself".to_owned();
            harmonic.why.insert("trust_dB".to_owned(), fits.as_ref().err().cloned().unwrap_or_else(other));
        }
    }
}

fn measured(tone: &Tone) -> ToneFigures {
    let mut figures = ToneFigures {
        frequency: tone.frequency,
        input_rms: tone.input_rms,
        output_fundamental_rms: tone.output_rms(),
        gain_db: tone.gain_db(),
        thd_percent: tone.thd_f().map(|thd| 100.0 * thd),
        thd_r_percent: tone.thd_r().map(|thd| 100.0 * thd),
        thd_orders: ORDERS as u32,
        warnings: Vec::new(),
        harmonics: (2..=ORDERS).map(|order| harmonic(tone, order)).collect(),
        why: Why::new(),
    };
    if figures.output_fundamental_rms.is_none() {
        explain(&mut figures, "the fundamental did not settle as the steps were made finer");
    } else if figures.thd_percent.is_none() {
        let reason = "a harmonic did not settle as the steps were made finer, or none stands above -220 dBc";
        figures.why.extend(["thd_percent", "thd_r_percent"].map(|key| (key.to_owned(), reason.to_owned())));
    }
    figures
}

fn harmonic(tone: &Tone, order: usize) -> HarmonicFigures {
    let (dbc, phase_deg) = (tone.dbc(order), tone.relative_phase(order));
    let mut why = Why::new();
    if dbc.is_none() {
        why.extend(["dBc", "phase_deg"].map(|key| (key.to_owned(), NOT_TRUSTED.to_owned())));
    }
    HarmonicFigures { order: order as u32, dbc, phase_deg, trust_db: None, fits_dbc: Vec::new(), why }
}

fn silent(frequency: f64, input_rms: f64, reason: &str) -> ToneFigures {
    let none = |order: usize| HarmonicFigures {
        order: order as u32,
        dbc: None,
        phase_deg: None,
        trust_db: None,
        fits_dbc: Vec::new(),
        why: ["dBc", "phase_deg"].map(|key| (key.to_owned(), reason.to_owned())).into(),
    };
    let mut figures = ToneFigures {
        frequency,
        input_rms,
        output_fundamental_rms: None,
        gain_db: None,
        thd_percent: None,
        thd_r_percent: None,
        thd_orders: ORDERS as u32,
        warnings: Vec::new(),
        harmonics: (2..=ORDERS).map(none).collect(),
        why: Why::new(),
    };
    explain(&mut figures, reason);
    figures
}

fn explain(figures: &mut ToneFigures, reason: &str) {
    for key in ["output_fundamental_rms", "gain_dB", "thd_percent", "thd_r_percent"] {
        figures.why.insert(key.to_owned(), reason.to_owned());
    }
}

/// The small-signal response at `frequency` Hz.
pub fn response(network: &Network, point: &OperatingPoint, frequency: f64) -> ResponseFigures {
    match SmallSignal::new(network, point).at(frequency) {
        Some(response) => responded(&response),
        None => ResponseFigures {
            frequency,
            gain_db: None,
            phase_deg: None,
            input_impedance: None,
            output_impedance: None,
            why: ["gain_dB", "phase_deg", "input_impedance", "output_impedance"]
                .map(|key| (key.to_owned(), "the network has no solution at this frequency".to_owned()))
                .into(),
        },
    }
}

fn responded(response: &Response) -> ResponseFigures {
    let size = magnitude(response.gain);
    let (gain_db, phase_deg, why) = if size > 0.0 {
        (Some(decibels(size)), Some(degrees(response.gain)), Why::new())
    } else {
        let reason = "nothing reaches the output";
        (None, None, ["gain_dB", "phase_deg"].map(|key| (key.to_owned(), reason.to_owned())).into())
    };
    let parts = |z: platewright_dsp::Complex64| Some([z.re, z.im]);
    ResponseFigures {
        frequency: response.frequency,
        gain_db,
        phase_deg,
        input_impedance: parts(response.input_impedance),
        output_impedance: parts(response.output_impedance),
        why,
    }
}
