//! One cycle of a tone.

use super::axis::Axis;
use super::frame::{Edges, Frame};
use super::{Lettered, name_class};
use crate::figures::CycleFigures;
use crate::report::svg::Picture;
use crate::report::words;

const HEIGHT: f64 = 290.0;

/// The output during one cycle at each level, over the input's peak, so that shapes can be compared.
pub fn cycles(of: Lettered<'_>, cycles: &[CycleFigures]) -> Option<Picture> {
    let scaled = |cycle: &CycleFigures| -> Vec<f64> {
        cycle.output.iter().map(|volts| volts / (cycle.input_rms * std::f64::consts::SQRT_2)).collect()
    };
    let shapes: Vec<(usize, &CycleFigures, Vec<f64>)> = cycles
        .iter()
        .enumerate()
        .map(|(k, c)| (k, c, scaled(c)))
        .filter(|(_, _, shape)| !shape.is_empty())
        .collect();
    let reach = shapes.iter().flat_map(|(_, _, shape)| shape).fold(0.0, |a: f64, b| a.max(b.abs()));
    if reach == 0.0 {
        return None;
    }
    let edges = Edges::of(HEIGHT, 56.0, 0.0);
    let x = Axis::linear((0.0, 1.0), edges.x());
    let y = Axis::linear((-1.1 * reach, 1.1 * reach), edges.y());
    let mut frame = Frame::new(HEIGHT, edges, x, y, ("time, ms", "output over input peak, V/V"));
    let mut ends = Vec::new();
    for (k, cycle, shape) in &shapes {
        let count = shape.len() as f64;
        // From the input's lowest point, where the levels differ: their names stand at the ends of the lines.
        let from = 3 * shape.len() / 4;
        let closed = shape.iter().cycle().skip(from).take(shape.len() + 1);
        let values: Vec<_> = closed.enumerate().map(|(n, value)| Some((n as f64 / count, *value))).collect();
        if let Some(end) = frame.curve(class(of.index, *k), &values) {
            ends.push((words::level(cycle.input_rms), name_class(of.index), end));
        }
    }
    frame.name_ends(ends);
    let title = format!("One cycle at the output of configuration {} at three levels", of.letter);
    Some(frame.canvas.finish(format!("cycle-{}", of.letter), "cycle", &title))
}

/// Output against input while a cycle passes.
pub fn transfer(of: Lettered<'_>, cycles: &[CycleFigures]) -> Option<Picture> {
    let peak = |cycle: &CycleFigures| cycle.input_rms * std::f64::consts::SQRT_2;
    let played: Vec<(usize, &CycleFigures)> =
        cycles.iter().enumerate().filter(|(_, cycle)| !cycle.output.is_empty()).collect();
    let reach_in = played.iter().map(|(_, cycle)| peak(cycle)).fold(0.0, f64::max);
    let reach_out = played.iter().flat_map(|(_, cycle)| &cycle.output).fold(0.0, |a: f64, b| a.max(b.abs()));
    if reach_in == 0.0 || reach_out == 0.0 {
        return None;
    }
    let edges = Edges::of(HEIGHT, 20.0, 0.0);
    let x = Axis::linear((-1.05 * reach_in, 1.05 * reach_in), edges.x());
    let y = Axis::linear((-1.1 * reach_out, 1.1 * reach_out), edges.y());
    let mut frame = Frame::new(HEIGHT, edges, x, y, ("input, V", "output, V"));
    for (k, cycle) in played.into_iter().rev() {
        let count = cycle.output.len() as f64;
        let input = |n: usize| peak(cycle) * libm::sin(std::f64::consts::TAU * n as f64 / count);
        let closed = cycle.output.iter().chain(cycle.output.first());
        let values: Vec<_> = closed.enumerate().map(|(n, volts)| Some((input(n), *volts))).collect();
        frame.curve(class(of.index, k), &values);
    }
    let title = format!("Output against input of configuration {} during a cycle", of.letter);
    Some(frame.canvas.finish(format!("transfer-{}", of.letter), "transfer", &title))
}

/// The lower the level, the heavier the line.
fn class(index: usize, level: usize) -> &'static str {
    let classes = [
        ["line c0", "line c1", "line c2", "line c3"],
        ["line second c0", "line second c1", "line second c2", "line second c3"],
        ["line third c0", "line third c1", "line third c2", "line third c3"],
    ];
    classes[level.min(2)][index % super::TOGETHER]
}
