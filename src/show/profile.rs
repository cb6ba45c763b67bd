//! Configurations in the order in which they come near a profile.

use super::figures::or_dash;
use super::{SideBySide, units};
use crate::figures::{ConfigurationFigures, ProfileFigures, ProfileHarmonicFigures};
use crate::plan::LevelUnit;

/// The nearest configuration first, those without a distance last; `None` where no profile was asked.
pub fn profile(configurations: &[ConfigurationFigures], unit: LevelUnit) -> Option<SideBySide> {
    let mut ranked: Vec<(&str, &ProfileFigures)> =
        configurations.iter().filter_map(|c| Some((c.name.as_str(), c.profile.as_ref()?))).collect();
    let (_, first) = *ranked.first()?;
    let distance = |figures: &ProfileFigures| figures.distance_db.unwrap_or(f64::INFINITY);
    ranked.sort_by(|(_, a), (_, b)| distance(a).total_cmp(&distance(b)));
    let names: Vec<String> =
        ranked.iter().enumerate().map(|(at, (name, _))| format!("{}. {name}", at + 1)).collect();
    let mut table = SideBySide::of(names.iter().map(String::as_str));
    table.heading(&format!("Profile at {}, nearest first", units::hertz(first.frequency)));
    let mut row = |label: &str, figure: &dyn Fn(&ProfileFigures) -> String| {
        table.row(label, ranked.iter().map(|(_, figures)| Some(figure(figures))));
    };
    row("distance", &|p| or_dash(p.distance_db, units::decibels));
    row("level in", &|p| or_dash(p.input_rms, |volts| units::level(volts, unit)));
    row("level out", &|p| or_dash(p.output_rms, |volts| units::level(volts, unit)));
    for (index, harmonic) in first.harmonics.iter().enumerate() {
        row(&label(harmonic), &|p| or_dash(p.harmonics.get(index).and_then(|h| h.got), |dbc| format!("{dbc:.2}")));
        row("  off by", &|p| or_dash(p.harmonics.get(index).and_then(|h| h.miss_db), miss));
    }
    Some(table)
}

/// "H2 = -46 dBc".
fn label(harmonic: &ProfileHarmonicFigures) -> String {
    let sign = match harmonic.want.as_str() {
        "at_most" => "≤",
        "at_least" => "≥",
        _ => "=",
    };
    format!("H{} {sign} {} dBc", harmonic.order, harmonic.wanted)
}

/// What lies beyond the tolerance, if anything.
fn miss(db: f64) -> String {
    if db == 0.0 { "met".to_owned() } else { format!("{db:+.2} dB") }
}
