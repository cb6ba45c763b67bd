//! Sweeps over level and frequency.

use platewright_dsp::analysis::{
    Cycle, OperatingPoint, SmallSignal, band, frequencies, level_sweep, levels, ripple_rejection_db,
};
use platewright_dsp::circuit::Network;
use platewright_dsp::portable::{decibels, magnitude};

use super::{FrequencySweepFigures, LevelFigures, SweepPointFigures, Why, tone};

/// Levels of a sweep.
const LEVELS: usize = 40;
/// The sweep ends this far over full scale, dB: well into clipping for any stage worth building.
const TOP_DB: f64 = 24.0;
/// The tone of a level sweep, Hz.
const TONE: f64 = 1000.0;
/// Ends of a frequency sweep, Hz, and points a decade.
const SWEEP: (f64, f64, usize) = (1.0, 1e6, 10);
/// Highest harmonic of a level sweep.
const HIGHEST: usize = 7;
/// Harmonics below this are not told apart from the arithmetic at a fixed number of steps.
const TRUSTED_DBC: f64 = -160.0;

/// THD, H2 to H7 and gain from 80 dB below full scale into clipping.
pub fn over_level(network: &Network, full_scale: f64) -> Vec<LevelFigures> {
    let levels = levels(full_scale, TOP_DB, LEVELS);
    levels.iter().zip(level_sweep(network, TONE, &levels)).map(|(&level, cycle)| at_level(level, cycle)).collect()
}

fn at_level(input_rms: f64, cycle: Option<Cycle>) -> LevelFigures {
    let Some(cycle) = cycle else {
        let reason = "no state was found that repeats after one period";
        return LevelFigures {
            input_rms,
            output_rms: None,
            gain_db: None,
            thd_percent: None,
            harmonics_dbc: vec![None; HIGHEST - 1],
            least_plate_volts: Vec::new(),
            peak_plate_volts: Vec::new(),
            why: ["output_rms", "gain_dB", "thd_percent", "harmonics_dBc"]
                .map(|key| (key.to_owned(), reason.to_owned()))
                .into(),
        };
    };
    let dbc = |order: usize| {
        let part = magnitude(cycle.harmonics[order - 1]) / magnitude(cycle.harmonics[0]);
        (part > 0.0).then(|| decibels(part)).filter(|&dbc| dbc > TRUSTED_DBC)
    };
    let harmonics_dbc: Vec<Option<f64>> = (2..=HIGHEST).map(dbc).collect();
    let mut why = Why::new();
    if harmonics_dbc.contains(&None) {
        let reason = format!("below {TRUSTED_DBC} dBc: not told apart from the arithmetic");
        why.insert("harmonics_dBc".to_owned(), reason);
    }
    LevelFigures {
        input_rms,
        output_rms: Some(cycle.output_rms()),
        gain_db: Some(decibels(cycle.gain())),
        thd_percent: Some(100.0 * cycle.thd()),
        harmonics_dbc,
        least_plate_volts: cycle.tubes.iter().map(|t| t.least_plate_volts).collect(),
        peak_plate_volts: cycle.tubes.iter().map(|t| t.peak_plate_volts).collect(),
        why,
    }
}

/// Response, phase, impedances and ripple rejection from 1 Hz to 1 MHz, and THD of `level` V rms in the audio band.
pub fn over_frequency(network: &Network, point: &OperatingPoint, level: f64) -> FrequencySweepFigures {
    let small = SmallSignal::new(network, point);
    let edges = band(&small);
    let mut why = Why::new();
    for (key, edge) in [("low", edges.and_then(|b| b.low)), ("high", edges.and_then(|b| b.high))] {
        if edge.is_none() {
            why.insert(key.to_owned(), "no −3 dB point between 0.01 Hz and 100 MHz".to_owned());
        }
    }
    let (low, high, per_decade) = SWEEP;
    let at = |frequency: f64| SweepPointFigures {
        response: tone::response(network, point, frequency),
        ripple_rejection_db: ripple_rejection_db(&small, frequency),
        thd_percent: (20.0..=20_000.0)
            .contains(&frequency)
            .then(|| Cycle::of(network, frequency, level).ok().map(|cycle| 100.0 * cycle.thd()))
            .flatten(),
    };
    FrequencySweepFigures {
        low: edges.and_then(|b| b.low),
        high: edges.and_then(|b| b.high),
        points: frequencies(low, high, per_decade).into_iter().map(at).collect(),
        why,
    }
}
