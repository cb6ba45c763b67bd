//! Headroom, noise, intermodulation and sweeps as tables.

use super::figures::{or_dash, table};
use super::{SideBySide, units};
use crate::figures::{ConfigurationFigures, HeadroomFigures, ImdFigures, LimitFigures, NoiseFigures};
use crate::plan::LevelUnit;

/// Intermodulation; `None` where none was asked.
pub fn intermodulation(configurations: &[ConfigurationFigures], unit: LevelUnit) -> Option<SideBySide> {
    let first = configurations.iter().find_map(|c| c.imd.as_ref())?;
    let mut table = table(configurations);
    for (index, pair) in first.iter().enumerate() {
        let each = || configurations.iter().map(move |c| c.imd.as_ref().and_then(|pairs| pairs.get(index)));
        let mut row = |label: &str, figure: &dyn Fn(&ImdFigures) -> Option<f64>| {
            table.row(label, each().map(|i| i.map(|i| or_dash(figure(i), units::percent))));
        };
        let name = format!("{} ({})", pair.kind, units::level(pair.input_rms, unit));
        if pair.kind == "difference" {
            row("difference d2", &|i| i.d2_percent);
            row("difference d3", &|i| i.d3_percent);
        } else {
            row(&name, &|i| i.percent);
        }
    }
    Some(table)
}

/// Noise; `None` where none was asked.
pub fn noise(configurations: &[ConfigurationFigures], unit: LevelUnit) -> Option<SideBySide> {
    configurations.iter().find_map(|c| c.noise.as_ref())?;
    let mut table = table(configurations);
    table.heading("Noise, 20 Hz to 20 kHz");
    let mut row = |label: &str, figure: &dyn Fn(&NoiseFigures) -> Option<String>| {
        table.row(label, configurations.iter().map(|c| c.noise.as_ref().map(|n| or(figure(n)))));
    };
    row("output", &|n| n.output_rms.map(|v| units::level(v, unit)));
    row("output, A", &|n| n.output_rms_a.map(|v| units::level(v, unit)));
    row("at the input", &|n| n.input_rms.map(|v| units::level(v, unit)));
    row("signal to noise", &|n| n.signal_to_noise_db.map(|db| format!("{db:.1} dB")));
    let mut optional = |label: &str, figure: &dyn Fn(&NoiseFigures) -> Option<String>| {
        let of = |c: &ConfigurationFigures| c.noise.as_ref().and_then(figure);
        table.row(label, configurations.iter().map(of));
    };
    optional("THD+N", &|n| n.thd_n_percent.map(units::percent));
    optional("hum", &|n| n.hum_rms.map(units::volts));
    optional("  at", &|n| n.hum_frequency.map(units::hertz));
    optional("  below 0 dBFS", &|n| n.hum_below_full_scale_db.map(|db| format!("{db:.1} dB")));
    Some(table)
}

fn or(figure: Option<String>) -> String {
    figure.unwrap_or_else(|| "–".to_owned())
}

/// Headroom; `None` where none was asked.
pub fn headroom(configurations: &[ConfigurationFigures], unit: LevelUnit) -> Option<SideBySide> {
    let all: Vec<Option<&HeadroomFigures>> = configurations.iter().map(|c| c.headroom.as_ref()).collect();
    let first = all.iter().flatten().next()?;
    let mut table = table(configurations);
    table.heading("Headroom at 1 kHz");
    for (index, thd) in first.thd.iter().enumerate() {
        let name = format!("THD {} %", thd.percent.unwrap_or_default());
        limit_rows(&mut table, &name, all.iter().map(|h| h.and_then(|h| h.thd.get(index))).collect(), unit);
    }
    let mut named = |name: &str, of: fn(&HeadroomFigures) -> &LimitFigures| {
        limit_rows(&mut table, name, all.iter().map(|h| h.map(of)).collect(), unit);
    };
    named("gain −1 dB", |h| &h.compression_1db);
    for (what, of) in [
        ("grid current", (|h| &h.grid_current_of) as fn(&HeadroomFigures) -> &Vec<LimitFigures>),
        ("cut-off", |h| &h.cutoff_of),
    ] {
        for tube in ["gain", "follower"] {
            let limits: Vec<_> = all
                .iter()
                .map(|h| h.and_then(|h| of(h).iter().find(|l| l.tube.as_deref() == Some(tube))))
                .collect();
            limit_rows(&mut table, &format!("{what} {}", if tube == "gain" { "1" } else { "2" }), limits, unit);
        }
    }
    Some(table)
}

fn limit_rows(table: &mut SideBySide, name: &str, limits: Vec<Option<&LimitFigures>>, unit: LevelUnit) {
    let mut row = |label: &str, figure: &dyn Fn(&LimitFigures) -> Option<String>| {
        table.row(label, limits.iter().map(|l| l.map(|l| or(figure(l)))));
    };
    row(&format!("{name}, in"), &|l| l.input_rms.map(|v| units::level(v, unit)));
    row("  out", &|l| l.output_rms.map(|v| units::level(v, unit)));
    row("  over 0 dBFS", &|l| l.over_full_scale_db.map(|db| format!("{db:+.2} dB")));
    if limits.iter().flatten().any(|l| l.over_play_db.is_some()) {
        row("  over the peak", &|l| l.over_play_db.map(|db| format!("{db:+.2} dB")));
    }
}

/// The level sweep, every third level; `None` where none was asked.
pub fn level_sweep(configurations: &[ConfigurationFigures], unit: LevelUnit) -> Option<SideBySide> {
    let first = configurations.iter().find_map(|c| c.level_sweep.as_ref())?;
    let mut table = table(configurations);
    table.heading("Level sweep, 1 kHz: THD_F");
    for (index, level) in first.iter().enumerate().rev().step_by(3).collect::<Vec<_>>().into_iter().rev() {
        let at = |c: &ConfigurationFigures| {
            let thd = c.level_sweep.as_ref()?.get(index)?.thd_percent;
            Some(or_dash(thd, units::percent))
        };
        table.row(&format!("{} in", units::level(level.input_rms, unit)), configurations.iter().map(at));
    }
    Some(table)
}

/// The frequency sweep's edges and two points a decade; `None` where none was asked.
pub fn frequency_sweep(configurations: &[ConfigurationFigures]) -> Option<SideBySide> {
    let first = configurations.iter().find_map(|c| c.frequency_sweep.as_ref())?;
    let mut table = table(configurations);
    table.heading("Frequency sweep");
    let edge = |of: fn(&crate::figures::FrequencySweepFigures) -> Option<f64>| {
        configurations.iter().map(move |c| c.frequency_sweep.as_ref().map(|s| or_dash(of(s), units::hertz)))
    };
    table.row("−3 dB, low", edge(|s| s.low));
    table.row("−3 dB, high", edge(|s| s.high));
    for (index, point) in first.points.iter().enumerate().step_by(5) {
        let at = |c: &ConfigurationFigures| {
            let gain = c.frequency_sweep.as_ref()?.points.get(index)?.response.gain_db;
            Some(or_dash(gain, units::decibels))
        };
        table.row(&format!("gain, {}", units::hertz(point.response.frequency)), configurations.iter().map(at));
    }
    Some(table)
}
