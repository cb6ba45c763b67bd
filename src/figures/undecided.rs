//! Differences between configurations that the tube data do not settle.

use platewright_dsp::analysis::half_range;

use super::{ConfigurationFigures, HarmonicFigures, UndecidedFigures};

/// Harmonics that are compared.
const ORDERS: [u32; 2] = [2, 3];

/// Pairs of configurations that differ in a harmonic of their first tone by less than equally good fits of the same
/// tubes make the difference move.
pub fn of(configurations: &[ConfigurationFigures]) -> Vec<UndecidedFigures> {
    let mut out = Vec::new();
    for (index, first) in configurations.iter().enumerate() {
        for second in &configurations[index + 1..] {
            out.extend(ORDERS.iter().filter_map(|&order| undecided(first, second, order)));
        }
    }
    out
}

fn undecided(first: &ConfigurationFigures, second: &ConfigurationFigures, order: u32) -> Option<UndecidedFigures> {
    let (a, b) = (harmonic(first, order)?, harmonic(second, order)?);
    let difference_db = a.dbc? - b.dbc?;
    // Fit by fit: what the same tubes share in both configurations cancels, what unlike tubes have does not.
    let members = a.fits_dbc.len().max(b.fits_dbc.len());
    let fit = |h: &HarmonicFigures, k: usize| match h.fits_dbc.len() {
        0 => h.dbc,
        count => h.fits_dbc.get(k % count).copied(),
    };
    let differences: Option<Vec<f64>> = (0..members).map(|k| Some(fit(a, k)? - fit(b, k)?)).collect();
    let trust_db = half_range(&differences?)?;
    (difference_db.abs() < trust_db).then(|| UndecidedFigures {
        order,
        between: [first.name.clone(), second.name.clone()],
        difference_db,
        trust_db,
    })
}

fn harmonic(configuration: &ConfigurationFigures, order: u32) -> Option<&HarmonicFigures> {
    configuration.tones.as_ref()?.first()?.harmonics.iter().find(|h| h.order == order)
}
