//! Plate curves with the load line, the operating point and the tone's path.

use super::Lettered;
use super::axis::Axis;
use super::frame::{Edges, Frame};
use crate::figures::{CycleFigures, PlateFigures};
use crate::report::svg::{Anchor, Label, Picture};
use crate::report::words;

const HEIGHT: f64 = 330.0;
const MILLI: f64 = 1e3;

/// The curves of one tube; `tube` is its place in the cycles' paths.
pub fn plates(of: Lettered<'_>, plate: &PlateFigures, tube: usize, cycles: &[CycleFigures]) -> Picture {
    let top_volts = plate.plate_volts.last().copied().unwrap_or(1.0);
    let path_top = cycles.iter().filter_map(|c| c.paths.get(tube)).flat_map(|p| &p.amperes);
    let rest = plate.at_rest[1];
    let top = path_top.fold((2.0 * rest).min(1.1 * plate.load_line[0][1]), |a: f64, b| a.max(*b)) * MILLI * 1.08;
    let edges = Edges::of(HEIGHT, 50.0, 0.0);
    let x = Axis::linear((0.0, top_volts), edges.x());
    let y = Axis::linear((0.0, top), edges.y());
    let mut frame = Frame::new(HEIGHT, edges, x, y, ("plate to cathode, V", "plate current, mA"));
    dissipation(&mut frame, plate, top_volts);
    let mut last_label: Option<(f64, f64)> = None;
    for curve in &plate.curves {
        let points = plate.plate_volts.iter().zip(&curve.amperes);
        let values: Vec<_> = points.map(|(v, a)| Some((*v, a * MILLI))).collect();
        let Some(end) = frame.curve("plate", &values) else { continue };
        let text = if curve.grid_volts == 0.0 {
            "0 V".to_owned()
        } else {
            format!("{} V", words::significant(curve.grid_volts, 3))
        };
        let apart = last_label.is_none_or(|(x, y)| (end.1 - y).abs() > 14.0 || (end.0 - x).abs() > 44.0);
        if apart {
            let at_top = end.1 < edges.top + 1.0;
            let places: &[(f64, f64, Anchor)] = if at_top {
                &[(end.0, edges.top - 5.0, Anchor::Middle), (end.0 + 8.0, edges.top - 5.0, Anchor::Middle)]
            } else {
                &[(end.0 + 5.0, end.1 + 4.0, Anchor::Start)]
            };
            let label = Label { text: &text, class: "quiet", x: end.0, y: end.1, anchor: Anchor::Middle };
            if frame.canvas.label_where_free(label, places) {
                last_label = Some(end);
            }
        }
    }
    let line = plate.load_line.map(|[v, a]| Some((v, a * MILLI)));
    frame.curve("load", &line);
    for (k, cycle) in cycles.iter().enumerate().rev() {
        let Some(path) = cycle.paths.get(tube) else { continue };
        let mut values: Vec<_> = path.volts.iter().zip(&path.amperes).map(|(v, a)| Some((*v, a * MILLI))).collect();
        values.push(values.first().copied().flatten());
        frame.curve(path_class(of.index, k), &values);
    }
    let place = frame.place((plate.at_rest[0], rest * MILLI));
    frame.canvas.circle("rest", place, 4.0);
    let text = format!("{} V, {} mA", words::significant(plate.at_rest[0], 3), words::significant(rest * MILLI, 3));
    let label = Label { text: &text, class: "value", x: place.0, y: place.1, anchor: Anchor::Start };
    let places = [
        (place.0 + 9.0, place.1 - 8.0, Anchor::Start),
        (place.0 - 9.0, place.1 + 16.0, Anchor::End),
        (place.0 + 9.0, place.1 + 18.0, Anchor::Start),
    ];
    frame.canvas.label_where_free(label, &places);
    let title = format!("Plate curves of the {} tube of configuration {}", plate.role, of.letter);
    frame.canvas.finish(format!("plates-{}-{}", plate.role, of.letter), "plates", &title)
}

fn path_class(index: usize, level: usize) -> &'static str {
    match level {
        0 => ["path loudest c0", "path loudest c1", "path loudest c2", "path loudest c3"][index % super::TOGETHER],
        _ => ["path c0", "path c1", "path c2", "path c3"][index % super::TOGETHER],
    }
}

/// The curve of the stated plate dissipation.
fn dissipation(frame: &mut Frame, plate: &PlateFigures, top_volts: f64) {
    let Some(watts) = plate.dissipation else { return };
    let values: Vec<_> = (1..=60)
        .map(|k| top_volts * f64::from(k) / 60.0)
        .map(|volts| Some((volts, watts / volts * MILLI)))
        .collect();
    let Some(end) = frame.curve("forbidden", &values) else { return };
    let text = format!("{} W", words::significant(watts, 3));
    let places = [(end.0 + 5.0, end.1 + 4.0, Anchor::Start), (end.0 - 6.0, end.1 - 8.0, Anchor::End)];
    frame
        .canvas
        .label_where_free(Label { text: &text, class: "warn", x: end.0, y: end.1, anchor: Anchor::Start }, &places);
}
