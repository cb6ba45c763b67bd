//! The library against measured plate curves and µ along measured load lines. Sources stand in the first line of each file
//! in `tests/published/curves`: curve-tracer data of the public repository mbrennwa/curvetracedata, and jacmusic.com
//! techcorner, gmmu3.

mod published;

use platewright_dsp::triode::fitting::{
    Condition, CurvePoint, Family, Figure, FitOptions, Quantity, Specimen, fit_points,
};
use platewright_dsp::triode::{Section, library};
use published::{Errors, Row, table, tube};

/// How the specimens behind a type's curves differ from its nominal, as its data file shows it.
fn specimen(name: &str) -> Specimen {
    let record = library::record(name).unwrap();
    let set = record.evidence.iter().find(|set| set.what.contains("curves")).unwrap();
    Specimen { emission: set.emission, mu_factor: set.mu_factor, grid_offset: set.grid_offset }
}

/// What two sections reach when fitted to each set of curves alone, percent where the current exceeds 3 % of full scale:
/// median and 95th percentile, known to a tenth and to a whole percent, so half a step is allowed.
const ALONE: [(&str, f64, f64); 5] = [
    ("6DJ8", 1.25, 7.5),
    ("12AT7", 2.15, 7.5),
    ("6N23P", 3.75, 12.5),
    ("6SL7GT", 1.15, 6.5),
    ("6N30P", 4.15, 14.5),
];

/// The points of a set of curves and its full scale, A.
fn curve(name: &str) -> (Vec<CurvePoint>, f64) {
    let point = |row: &Row| CurvePoint {
        vpk: row.number("plate_volts"),
        vgk: row.number("grid_volts"),
        plate: 1e-3 * row.number("plate_mA"),
        grid: None,
    };
    let points: Vec<CurvePoint> = table(&format!("curves/{name}.csv")).iter().map(point).collect();
    let full_scale = points.iter().map(|point| point.plate).fold(0.0, f64::max);
    (points, full_scale)
}

/// Errors where the current exceeds 3 % of full scale.
fn errors(points: &[CurvePoint], full_scale: f64, law: impl Fn(&CurvePoint) -> f64) -> Errors {
    let mut errors = Errors::default();
    for point in points.iter().filter(|point| point.plate > 0.03 * full_scale) {
        errors.add(law(point), point.plate);
    }
    errors
}

/// The library's laws, which must meet data sheets, charts and µ lines as well, scaled to the specimens that were measured.
/// 6DJ8's µ line pulls it from its curves: 1.7 % in the median is what two sections reach on both together.
#[test]
fn the_library_on_measured_plate_curves() {
    for (name, alone, high) in ALONE {
        let tube = tube(name);
        let specimen = specimen(name);
        let (points, full_scale) = curve(name);
        let law = |point: &CurvePoint| {
            let condition = Condition::Bias { vpk: point.vpk, vgk: point.vgk };
            let figure = Figure { condition, quantity: Quantity::PlateCurrent, published: point.plate, error: 1.0 };
            figure.of_specimen(&tube.section, &specimen)
        };
        let errors = errors(&points, full_scale, law);
        let (got_median, got_high) = (errors.median(), errors.quantile(0.95));
        println!(
            "{name}: {} points, median {got_median:.2} %, 95 % {got_high:.2} % ({specimen:?})",
            errors.count()
        );
        let median = if name == "6DJ8" { 1.7 } else { alone };
        assert!(got_median < median && got_high < high, "{name}");
    }
}

/// The law itself: fitted to one set of measured curves and nothing else (6SL7GT's were read off a chart by eye).
#[test]
fn the_law_fitted_to_each_set_of_curves_alone() {
    for (name, median, high) in ALONE.into_iter().filter(|(name, ..)| *name != "6SL7GT") {
        let (points, full_scale) = curve(name);
        let flowing: Vec<CurvePoint> = points.iter().filter(|p| p.plate > 0.03 * full_scale).copied().collect();
        let options = FitOptions { family: Family::ThreeSection, members: 0, ..FitOptions::default() };
        let fit = fit_points(&flowing, &options).unwrap();
        let section = Section { law: fit.law, grid: fit.grid, capacitance: Default::default() };
        let errors = errors(&points, full_scale, |point| section.currents(point.vgk, point.vpk).plate);
        println!("{name} alone: median {:.2} %, 95 % {:.2} %", errors.median(), errors.quantile(0.95));
        assert!(errors.median() < median && errors.quantile(0.95) < high, "{name}");
    }
}

/// Within 2 % in the median and 6 % at worst over the rows not doubted by their source, every second of which no fit used.
#[test]
fn mu_along_measured_load_lines() {
    for (name, line) in [("6SN7GTB", "6SN7 ("), ("6DJ8", "6DJ8 ("), ("5842", "417A (")] {
        if library::find(name).is_none() {
            continue;
        }
        let (mut all, mut kept_out) = (Errors::default(), Errors::default());
        let rows = table("curves/mu-along-a-load-line.csv");
        let ours = rows.iter().filter(|row| row.text("tube_and_line").starts_with(line));
        for (k, row) in ours.filter(|row| row.text("doubtful") == "no").enumerate() {
            let vpk = row.number("plate_volts");
            let condition = Condition::Current { vpk, current: 1e-3 * row.number("cathode_mA") };
            let got = Quantity::Mu.of(&tube(name).section, &condition);
            let error = all.add(got, row.number("mu"));
            if k % 2 == 1 {
                kept_out.add(got, row.number("mu"));
            }
            println!("{name} {vpk} V: mu {}, {got:.2}, {error:+.1} %", row.number("mu"));
        }
        println!("{name}: all {:.2} %, {:.2} %", all.median(), all.worst());
        println!("{name}: kept out {:.2} %, {:.2} %", kept_out.median(), kept_out.worst());
        assert!(all.median() < 2.0 && all.worst() < 6.0);
        assert!(kept_out.median() < 2.0 && kept_out.worst() < 6.0);
    }
}
