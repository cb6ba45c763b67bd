//! Harmonics as bars.

use crate::figures::{ConfigurationFigures, ToneFigures};
use crate::terminal::plain;

/// The bars' floor, dBc.
const FLOOR: f64 = -140.0;
/// Columns of a full bar.
const COLUMNS: f64 = 40.0;
/// Harmonics shown.
const HIGHEST: u32 = 7;

/// A group of bars for the first tone of every configuration; empty where none was measured.
pub fn spectrum(configurations: &[ConfigurationFigures]) -> String {
    let tone = |c: &ConfigurationFigures| c.tones.as_ref().and_then(|t| t.first()).cloned();
    let groups: Vec<String> = configurations.iter().filter_map(|c| Some(bars(&c.name, &tone(c)?))).collect();
    if groups.is_empty() {
        return String::new();
    }
    format!("Harmonics, bars from {FLOOR:.0} dBc\n{}", groups.concat())
}

fn bars(name: &str, tone: &ToneFigures) -> String {
    let mut out = format!("  {}\n", plain(name));
    for harmonic in tone.harmonics.iter().filter(|h| h.order <= HIGHEST) {
        if let Some(dbc) = harmonic.dbc.filter(|&dbc| dbc > FLOOR) {
            out.push_str(&format!("    H{} {:>8.1} {}\n", harmonic.order, dbc, bar((dbc - FLOOR) / -FLOOR)));
        }
    }
    out
}

/// A bar in eighths of a column.
fn bar(part: f64) -> String {
    let eighths = (part.clamp(0.0, 1.0) * COLUMNS * 8.0).round() as usize;
    let rest = ["", "▏", "▎", "▍", "▌", "▋", "▊", "▉"][eighths % 8];
    "█".repeat(eighths / 8) + rest
}
