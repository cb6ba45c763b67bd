//! The harmonics of one tone as pins.

use super::Lettered;
use super::axis::Axis;
use super::frame::{Edges, Frame};
use crate::figures::{ProfileHarmonicFigures, ToneFigures};
use crate::report::svg::{Anchor, Label, Picture};
use crate::report::words;

const HEIGHT: f64 = 250.0;
/// Narrow, so that four stand side by side.
const WIDTH: f64 = 306.0;
/// Least level of the picture, dBc; what is smaller is not drawn.
const FLOOR: f64 = -140.0;

/// The spectrum of `tone`, with the marks of a target where one was given.
pub fn spectrum(of: Lettered<'_>, tone: &ToneFigures) -> Picture {
    let top = tone.harmonics.iter().filter_map(|h| h.dbc).fold(-40.0, f64::max);
    let high = (20.0 * (top / 20.0).ceil()).max(-20.0) + 20.0;
    let edges = Edges::of(HEIGHT, 8.0, 0.0).narrowed(WIDTH);
    let orders = tone.harmonics.iter().map(|h| h.order).max().unwrap_or(10);
    let x = Axis::linear((1.4, f64::from(orders) + 0.6), edges.x());
    let y = Axis::linear((FLOOR, high), edges.y());
    let mut frame = Frame::new(HEIGHT, edges, x, y, ("harmonic", "dBc"));
    for harmonic in &tone.harmonics {
        let at = f64::from(harmonic.order);
        let target =
            of.figures.profile.iter().flat_map(|profile| &profile.harmonics).find(|t| t.order == harmonic.order);
        if let Some(target) = target {
            mark_target(&mut frame, at, target);
        }
        match harmonic.dbc {
            Some(dbc) if dbc > FLOOR => pin(&mut frame, of.index, at, dbc, harmonic.trust_db),
            _ => {
                let (x, y) = frame.place((at, FLOOR));
                let text = if harmonic.dbc.is_some() { "low" } else { "–" };
                frame.canvas.label(Label { text, class: "quiet", x, y: y - 6.0, anchor: Anchor::Middle });
            }
        }
    }
    let title = format!("Harmonics of configuration {}, dBc", of.letter);
    frame.canvas.finish(format!("harmonics-{}", of.letter), "spectrum", &title)
}

fn pin(frame: &mut Frame, index: usize, at: f64, dbc: f64, trust: Option<f64>) {
    let foot = frame.place((at, FLOOR));
    let head = frame.place((at, dbc));
    frame.canvas.line(pin_class(index), foot, head);
    let mut top = head.1;
    if let Some(trust) = trust {
        let (up, down) = (frame.place((at, dbc + trust)), frame.place((at, (dbc - trust).max(FLOOR))));
        frame.canvas.line("trust", up, down);
        let ends = if dbc - trust > FLOOR { vec![up, down] } else { vec![up] };
        for end in ends {
            frame.canvas.line("trust", (end.0 - 4.0, end.1), (end.0 + 4.0, end.1));
        }
        top = top.min(up.1);
    }
    frame.canvas.mark(super::mark_class(index), index, head, 3.2);
    let text = words::plain_number(dbc, 0);
    let x = head.0.clamp(0.0, WIDTH);
    frame.canvas.label(Label { text: &text, class: "value", x, y: top - 8.0, anchor: Anchor::Middle });
}

fn pin_class(index: usize) -> &'static str {
    ["pin c0", "pin c1", "pin c2", "pin c3"][index % super::TOGETHER]
}

/// A wanted level is a box of the width allowed; a limit is a bar with its foot on the side that is forbidden.
fn mark_target(frame: &mut Frame, at: f64, target: &ProfileHarmonicFigures) {
    let half = 9.0;
    let clamp = |dbc: f64| dbc.clamp(frame.y.low, frame.y.high);
    if target.want == "wanted" {
        let (x, top) = frame.place((at, clamp(target.wanted + target.within_db)));
        let (_, bottom) = frame.place((at, clamp(target.wanted - target.within_db)));
        let height = (bottom - top).max(3.0);
        frame.canvas.rectangle("target", x - half, (top + bottom - height) / 2.0, 2.0 * half, height);
        return;
    }
    let foot = if target.want == "at_most" { -6.0 } else { 6.0 };
    let (x, y) = frame.place((at, clamp(target.wanted)));
    frame.canvas.line("target", (x - half, y), (x + half, y));
    for end in [x - half, x + half] {
        frame.canvas.line("target", (end, y), (end, y + foot));
    }
}
