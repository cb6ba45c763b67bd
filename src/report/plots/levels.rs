//! What rises with the level.

use super::axis::Axis;
use super::frame::{Edges, Frame};
use super::{Lettered, joined, line_class, mark_class, name_class};
use crate::figures::{ConfigurationFigures, HeadroomFigures, LevelFigures, LimitFigures};
use crate::report::svg::Picture;
use crate::report::words;

const HEIGHT: f64 = 290.0;
/// Least THD of the picture, %.
const LEAST_THD: f64 = 0.001;
/// Least harmonic of the picture, dBc.
const LEAST_DBC: f64 = -140.0;
/// Rows of texts above the frame.
const ROWS: usize = 4;

/// THD of several configurations against the level at `in`, with a mark where the gain has fallen by 1 dB.
pub fn thd_over_level(group: &[Lettered<'_>], name: String) -> Option<Picture> {
    let (low, high) = range(group.iter().map(|one| one.figures))?;
    let edges = Edges::of(HEIGHT, 70.0, 0.0);
    let x = Axis::logarithmic((low, high), edges.x());
    let y = Axis::logarithmic((LEAST_THD, 100.0), edges.y());
    let mut frame = Frame::new(HEIGHT, edges, x, y, ("V rms at the input, 1 kHz", "THD, %"));
    let mut ends = Vec::new();
    for one in group {
        let Some(sweep) = &one.figures.level_sweep else { continue };
        let values: Vec<_> = sweep.iter().map(|at| Some((at.input_rms, at.thd_percent?))).collect();
        if let Some(end) = frame.curve(line_class(one.index), &values) {
            ends.push((one.letter.to_owned(), name_class(one.index), end));
        }
        if let Some(at) = one.figures.headroom.as_ref().and_then(|h| h.compression_1db.input_rms)
            && frame.x.holds(at)
            && let Some(thd) = thd_at(sweep, at)
        {
            let place = frame.place((at, thd));
            frame.canvas.mark(mark_class(one.index), one.index, place, 3.6);
        }
    }
    frame.name_ends(joined(ends));
    Some(frame.canvas.finish(name, "levels", "Total harmonic distortion against level, a line a configuration"))
}

/// THD between two levels of a sweep, by straight line over logarithms.
fn thd_at(sweep: &[LevelFigures], level: f64) -> Option<f64> {
    let pair = sweep.windows(2).find(|pair| pair[0].input_rms <= level && level <= pair[1].input_rms)?;
    let part = libm::log(level / pair[0].input_rms) / libm::log(pair[1].input_rms / pair[0].input_rms);
    let (a, b) = (pair[0].thd_percent?, pair[1].thd_percent?);
    Some(libm::exp(libm::log(a) + part * libm::log(b / a)))
}

/// Ends of the sweeps, from where there is something to see.
fn range<'a>(all: impl Iterator<Item = &'a ConfigurationFigures> + Clone) -> Option<(f64, f64)> {
    let points = || all.clone().filter_map(|c| c.level_sweep.as_ref()).flatten();
    let seen = points().filter(|at| at.thd_percent.is_some_and(|thd| thd > LEAST_THD));
    let low = seen.map(|at| at.input_rms).fold(f64::INFINITY, f64::min);
    let high = points().map(|at| at.input_rms).fold(0.0, f64::max);
    (low < high).then_some((low, high))
}

/// THD and H2 to H7 of one configuration against the level, with its limits.
pub fn harmonics_over_level(of: Lettered<'_>) -> Option<Picture> {
    let sweep = of.figures.level_sweep.as_ref()?;
    let (low, high) = range(std::iter::once(of.figures))?;
    let above = 14.0 * ROWS as f64;
    let height = HEIGHT + above;
    let edges = Edges::of(height, 40.0, above);
    let x = Axis::logarithmic((low, high), edges.x());
    let y = Axis::linear((LEAST_DBC, 0.0), edges.y());
    let mut frame = Frame::new(height, edges, x, y, ("V rms at the input, 1 kHz", "dBc"));
    for (text, at) in limits(of.figures.headroom.as_ref()) {
        if frame.x.holds(at) {
            frame.upright("note", at, &text, ROWS);
        }
    }
    let mut ends = Vec::new();
    let orders = sweep.iter().map(|at| at.harmonics_dbc.len()).max().unwrap_or(0);
    for order in 0..orders {
        let value = |at: &LevelFigures| Some((at.input_rms, (*at.harmonics_dbc.get(order)?)?));
        let values: Vec<_> = sweep.iter().map(value).collect();
        if let Some(end) = frame.curve(harmonic_class(order), &values) {
            ends.push((format!("H{}", order + 2), "name", end));
        }
    }
    let thd = |at: &LevelFigures| Some((at.input_rms, 20.0 * libm::log10(at.thd_percent? / 100.0)));
    let values: Vec<_> = sweep.iter().map(thd).collect();
    if let Some(end) = frame.curve(line_class(of.index), &values) {
        ends.push(("THD".to_owned(), name_class(of.index), end));
    }
    frame.name_ends(ends);
    let title = format!("Harmonics and limits of configuration {} against level", of.letter);
    Some(frame.canvas.finish(format!("level-{}", of.letter), "levels", &title))
}

fn harmonic_class(order: usize) -> &'static str {
    ["harmonic even", "harmonic odd"][order % 2]
}

fn limits(headroom: Option<&HeadroomFigures>) -> Vec<(String, f64)> {
    let Some(headroom) = headroom else { return Vec::new() };
    let one_percent = headroom.thd.iter().find(|limit| limit.percent == Some(1.0));
    let tube = |limit: &LimitFigures| limit.tube.clone().unwrap_or_default();
    let all = [
        one_percent.map(|limit| ("1 % THD".to_owned(), limit)),
        Some((format!("grid current, {}", tube(&headroom.grid_current)), &headroom.grid_current)),
        Some((format!("cut-off, {}", tube(&headroom.cutoff)), &headroom.cutoff)),
        Some(("gain −1 dB".to_owned(), &headroom.compression_1db)),
    ];
    let shown = |(text, limit): (String, &LimitFigures)| {
        let at = limit.input_rms?;
        Some((format!("{text} {}", words::level(at)), at))
    };
    let mut limits: Vec<_> = all.into_iter().flatten().filter_map(shown).collect();
    limits.sort_by(|a, b| a.1.total_cmp(&b.1));
    limits
}
