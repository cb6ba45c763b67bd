//! Thermal noise of the resistors and shot noise of the triodes at the output, and what the supply's ripple leaves there.
//!
//! Flicker and grid shot noise are left out: what is given is a best case.

use super::SmallSignal;
use crate::circuit::Terminal;
use num_complex::Complex64;

/// Boltzmann's constant, J/K (exact in the SI of 2019).
const BOLTZMANN: f64 = 1.380649e-23;
/// Temperature of every resistor, and that to which the triodes' equivalent resistance refers, K.
const TEMPERATURE: f64 = 300.0;
/// A triode's noise is that of a resistor of 2.5/gm before its grid (Thompson, North & Harris, "Fluctuations in
/// space-charge-limited currents at moderately high frequencies", RCA Review, 1940).
const SHOT_FACTOR: f64 = 2.5;
/// The band, Hz.
const BAND: (f64, f64) = (20.0, 20_000.0);

/// Noise at the output over 20 Hz to 20 kHz.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Noise {
    /// V rms at `o`, unweighted.
    pub output_rms: f64,
    /// V rms at `o`, A-weighted (IEC 61672-1).
    pub output_rms_a: f64,
}

impl Noise {
    /// The noise of a linearised stage; `None` where its equations are singular somewhere in the band.
    pub fn of(stage: &SmallSignal<'_>) -> Option<Noise> {
        let (mut flat, mut weighted) = (0.0, 0.0);
        for (frequency, width) in band_nodes() {
            let density = density(stage, frequency)?;
            flat += width * density;
            weighted += width * density * a_weighting(frequency).powi(2);
        }
        Some(Noise { output_rms: flat.sqrt(), output_rms_a: weighted.sqrt() })
    }
}

/// Squared noise voltage at `o` per hertz, V²/Hz.
fn density(stage: &SmallSignal<'_>, frequency: f64) -> Option<f64> {
    let transfer = stage.transfer_from_nodes(frequency)?;
    let (network, point) = (stage.network(), stage.point());
    let between = |from: Terminal, to: Terminal| {
        let at = |t: Terminal| t.map_or(Complex64::ZERO, |node| transfer[node]);
        (at(from) - at(to)).norm_sqr()
    };
    let four_kt = 4.0 * BOLTZMANN * TEMPERATURE;
    let resistors: f64 = network.resistors.iter().map(|r| between(r.from, r.to) / r.value).sum();
    let sources: f64 = network.sources.iter().map(|s| between(s.node, None) / s.resistance).sum();
    let triodes: f64 = network
        .triodes
        .iter()
        .zip(&point.tubes)
        .map(|(place, tube)| between(place.plate, place.cathode) * SHOT_FACTOR * tube.gm().max(0.0))
        .sum();
    Some(four_kt * (resistors + sources + triodes))
}

/// The voltage at `o` over the ripple of the supply ahead of its resistance, at `frequency` Hz; `None` where the
/// equations are singular.
pub fn supply_transfer(stage: &SmallSignal<'_>, frequency: f64) -> Option<Complex64> {
    let transfer = stage.transfer_from_nodes(frequency)?;
    let supply = stage.network().sources.get(1)?;
    Some(supply.node.map_or(Complex64::ZERO, |node| transfer[node]) / supply.resistance)
}

/// The A-weighting as a factor (IEC 61672-1, annex E), 1 at 1 kHz.
pub fn a_weighting(frequency: f64) -> f64 {
    let square = |f: f64| f * f;
    let f2 = square(frequency);
    // Pole frequencies of the standard, Hz.
    let (p1, p2, p3, p4) = (20.598997, 107.65265, 737.86223, 12194.217);
    let shape = |f2: f64| {
        square(p4) * f2 * f2
            / ((f2 + square(p1)) * ((f2 + square(p2)) * (f2 + square(p3))).sqrt() * (f2 + square(p4)))
    };
    shape(f2) / shape(1e6)
}

/// Frequencies and widths (Hz) that integrate over the band: Gauss–Legendre of three points in panels of equal ratio.
fn band_nodes() -> impl Iterator<Item = (f64, f64)> {
    /// Panels, some 13 a decade.
    const PANELS: usize = 40;
    let (low, high) = BAND;
    let step = libm::log(high / low) / PANELS as f64;
    (0..PANELS).flat_map(move |panel| {
        let middle = libm::log(low) + (panel as f64 + 0.5) * step;
        let reach = 0.5 * step * 0.6f64.sqrt();
        [(-reach, 5.0 / 18.0), (0.0, 8.0 / 18.0), (reach, 5.0 / 18.0)].map(|(offset, weight)| {
            let frequency = libm::exp(middle + offset);
            (frequency, weight * step * frequency)
        })
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_band_is_as_wide_as_it_says() {
        let width: f64 = band_nodes().map(|(_, w)| w).sum();
        assert!((width / 19_980.0 - 1.0).abs() < 1e-9, "{width}");
    }

    #[test]
    fn a_weighting_meets_the_standard() {
        // IEC 61672-1:2013, table 3, design goals to 0.1 dB at the nominal one-third-octave frequencies, whose exact
        // values are 1000·10^(n/10).
        let table = [
            (-17, -50.5),
            (-15, -39.4),
            (-10, -19.1),
            (-7, -10.9),
            (-3, -3.2),
            (0, 0.0),
            (3, 1.2),
            (4, 1.3),
            (7, 0.5),
            (10, -2.5),
            (12, -6.6),
            (13, -9.3),
        ];
        for (n, want) in table {
            let frequency = 1000.0 * crate::portable::ratio(2.0 * f64::from(n));
            let got = crate::portable::decibels(a_weighting(frequency));
            assert!((got - want).abs() <= 0.051, "{frequency} Hz: {got} dB against {want}");
        }
    }
}
