//! A recording's levels beside what the stage takes.

use super::axis::Axis;
use super::frame::{Edges, Frame};
use super::{Lettered, name_class};
use crate::figures::RecordingFigures;
use crate::report::svg::Picture;
use crate::report::words;

const HEIGHT: f64 = 250.0;
/// Rows of texts above the frame.
const ROWS: usize = 4;

/// How long a recording stays at each level, and where each configuration reaches 1 %.
pub fn histogram(recording: &RecordingFigures, group: &[Lettered<'_>], name: String) -> Option<Picture> {
    let low = *recording.levels_dbfs.first()?;
    let limit = |one: &Lettered<'_>| {
        let headroom = one.figures.headroom.as_ref()?;
        headroom.thd.iter().find(|limit| limit.percent == Some(1.0))?.over_full_scale_db
    };
    let limits: Vec<(Lettered<'_>, f64)> = group.iter().filter_map(|one| Some((*one, limit(one)?))).collect();
    let high = limits.iter().map(|(_, at)| *at).fold(0.0, f64::max);
    let most = recording.time_percent.iter().copied().fold(1.0, f64::max);
    let above = 14.0 * ROWS as f64;
    let height = HEIGHT + above;
    let edges = Edges::of(height, 16.0, above);
    let x = Axis::linear((low - 1.0, (high / 5.0).ceil() * 5.0 + 5.0), edges.x());
    let y = Axis::linear((0.0, most * 1.05), edges.y());
    let units = ("level at the input, dB over a full-scale sine", "% of the time");
    let mut frame = Frame::new(height, edges, x, y, units);
    for (upper, percent) in recording.levels_dbfs.iter().zip(&recording.time_percent) {
        if *percent > 0.0 {
            let (left, top) = frame.place((upper - 1.0, *percent));
            let (right, bottom) = frame.place((*upper, 0.0));
            frame.canvas.rectangle("bar", left + 0.3, top, right - left - 0.6, bottom - top);
        }
    }
    let mut shared: Vec<(String, &'static str, f64)> = Vec::new();
    for (one, at) in limits {
        match shared.iter_mut().find(|(_, _, other)| (other - at).abs() < 0.05) {
            Some((letters, class, _)) => {
                letters.push_str(&format!(" {}", one.letter));
                *class = "name";
            }
            None => shared.push((one.letter.to_owned(), name_class(one.index), at)),
        }
    }
    for (letters, class, at) in shared {
        frame.upright(class, at, &format!("{letters} 1 % at {}", words::decibels(at)), ROWS);
    }
    Some(frame.canvas.finish(name, "histogram", "How long the recording stays at each level, with the 1 % limits"))
}
