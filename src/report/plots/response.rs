//! What depends on frequency.

use super::axis::Axis;
use super::frame::{Edges, Frame};
use super::{Lettered, joined, line_class, mark_class, name_class};
use crate::figures::SweepPointFigures;
use crate::report::svg::{Anchor, Label, Picture};

const HEIGHT: f64 = 290.0;
/// Decibels below the highest gain that are shown.
const DEPTH: f64 = 30.0;

fn points<'a>(one: &Lettered<'a>) -> &'a [SweepPointFigures] {
    one.figures.frequency_sweep.as_ref().map_or(&[], |sweep| &sweep.points)
}

fn span(group: &[Lettered<'_>]) -> Option<(f64, f64)> {
    let all = || group.iter().flat_map(|one| points(one)).map(|point| point.response.frequency);
    let (low, high) = (all().fold(f64::INFINITY, f64::min), all().fold(0.0, f64::max));
    (low < high).then_some((low, high))
}

/// Gain of several configurations with their −3 dB points.
pub fn response(group: &[Lettered<'_>], name: String) -> Option<Picture> {
    let gains = || group.iter().flat_map(|one| points(one)).filter_map(|point| point.response.gain_db);
    let top = gains().fold(f64::NEG_INFINITY, f64::max);
    let low = gains().fold(f64::INFINITY, f64::min).max(top - DEPTH);
    let edges = Edges::of(HEIGHT, 18.0, 0.0);
    let x = Axis::logarithmic(span(group)?, edges.x());
    let y = Axis::linear((5.0 * (low / 5.0).floor(), 5.0 * (top / 5.0 + 0.3).ceil()), edges.y());
    let mut frame = Frame::new(HEIGHT, edges, x, y, ("Hz", "gain, dB"));
    let mut named = Vec::new();
    for one in group {
        let value = |point: &SweepPointFigures| Some((point.response.frequency, point.response.gain_db?));
        let values: Vec<_> = points(one).iter().map(value).collect();
        frame.curve(line_class(one.index), &values);
        // Lines fall together at both ends; their names stand at the middle of the band.
        if let Some(gain) = between(&values, 1000.0) {
            named.push((one.letter.to_owned(), name_class(one.index), frame.place((1000.0, gain))));
        }
        let Some(sweep) = &one.figures.frequency_sweep else { continue };
        for edge in [sweep.low, sweep.high].into_iter().flatten() {
            if let Some(gain) = between(&values, edge).filter(|gain| frame.x.holds(edge) && frame.y.holds(*gain)) {
                let place = frame.place((edge, gain));
                frame.canvas.mark(mark_class(one.index), one.index, place, 3.4);
            }
        }
    }
    for (letters, class, (x, y)) in joined(named) {
        let places: Vec<(f64, f64, Anchor)> = [y - 7.0, y + 17.0]
            .into_iter()
            .flat_map(|y| [0.0, 40.0, -40.0].map(|dx| (x + dx, y, Anchor::Middle)))
            .collect();
        frame.canvas.label_where_free(Label { text: &letters, class, x, y, anchor: Anchor::Middle }, &places);
    }
    Some(frame.canvas.finish(name, "response", "Gain against frequency with the points 3 dB below 1 kHz"))
}

/// The value at a frequency, by straight line over its logarithm.
fn between(values: &[Option<(f64, f64)>], frequency: f64) -> Option<f64> {
    let known: Vec<(f64, f64)> = values.iter().flatten().copied().collect();
    let pair = known.windows(2).find(|pair| pair[0].0 <= frequency && frequency <= pair[1].0)?;
    let part = libm::log(frequency / pair[0].0) / libm::log(pair[1].0 / pair[0].0);
    Some(pair[0].1 + part * (pair[1].1 - pair[0].1))
}

/// Input and output impedance of several configurations.
pub fn impedances(group: &[Lettered<'_>], name: String) -> Option<Picture> {
    let size = |z: Option<[f64; 2]>| z.map(|[re, im]| libm::hypot(re, im)).filter(|size| *size > 0.0);
    let input = |point: &SweepPointFigures| Some((point.response.frequency, size(point.response.input_impedance)?));
    let output =
        |point: &SweepPointFigures| Some((point.response.frequency, size(point.response.output_impedance)?));
    let all = || group.iter().flat_map(|one| points(one)).flat_map(|p| [input(p), output(p)]).flatten();
    let (low, high) = (all().map(|p| p.1).fold(f64::INFINITY, f64::min), all().map(|p| p.1).fold(0.0, f64::max));
    let edges = Edges::of(HEIGHT, 96.0, 0.0);
    let x = Axis::logarithmic(span(group)?, edges.x());
    let y = Axis::logarithmic((low.max(0.1) / 2.5, high.min(1e9) * 1.5), edges.y());
    let mut frame = Frame::new(HEIGHT, edges, x, y, ("Hz", "impedance, Ω"));
    let mut ends = Vec::new();
    for one in group {
        let inputs: Vec<_> = points(one).iter().map(input).collect();
        let outputs: Vec<_> = points(one).iter().map(output).collect();
        for (word, values) in [("in", inputs), ("out", outputs)] {
            if let Some(end) = frame.curve(line_class(one.index), &values) {
                ends.push((format!("{} {word}", one.letter), name_class(one.index), end));
            }
        }
    }
    frame.name_ends(joined(ends));
    Some(frame.canvas.finish(name, "impedances", "Size of the input and output impedance against frequency"))
}
