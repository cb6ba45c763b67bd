//! A plot's frame: axes with ticks and units, lines cut off at the frame, labels at the ends of lines.

use super::axis::Axis;
use crate::report::svg::{Anchor, Canvas, Label, text_width};

/// Size of a plot; text is 12 units high, so a plot fits a telephone's width without becoming unreadable.
pub const WIDTH: f64 = 420.0;
/// Room for the numbers left of the vertical axis.
const LEFT: f64 = 44.0;
/// Room for numbers and unit below the horizontal axis.
const BOTTOM: f64 = 38.0;
/// Room for the vertical axis' unit.
const TOP: f64 = 26.0;
/// Least distance of two labels at the ends of lines.
const LINE: f64 = 14.5;

/// Inner edges of a frame.
#[derive(Clone, Copy, Debug)]
pub struct Edges {
    pub left: f64,
    pub right: f64,
    pub top: f64,
    pub bottom: f64,
    /// Of the whole picture.
    pub width: f64,
}

impl Edges {
    /// A frame in a picture of `height`, with `right` units for labels at the ends of lines and `above` for marks.
    pub fn of(height: f64, right: f64, above: f64) -> Edges {
        Edges { left: LEFT, right: WIDTH - right, top: TOP + above, bottom: height - BOTTOM, width: WIDTH }
    }

    /// The same in a narrower picture.
    pub fn narrowed(self, width: f64) -> Edges {
        Edges { right: self.right - (self.width - width), width, ..self }
    }

    pub fn x(&self) -> (f64, f64) {
        (self.left, self.right)
    }

    /// From the bottom up.
    pub fn y(&self) -> (f64, f64) {
        (self.bottom, self.top)
    }
}

/// A plot with its axes drawn.
pub struct Frame {
    pub canvas: Canvas,
    pub x: Axis,
    pub y: Axis,
    pub edges: Edges,
}

impl Frame {
    /// Draws the axes; `x_unit` stands below, `y_unit` above the vertical axis.
    pub fn new(height: f64, edges: Edges, x: Axis, y: Axis, (x_unit, y_unit): (&str, &str)) -> Frame {
        let mut frame = Frame { canvas: Canvas::new(edges.width, height), x, y, edges };
        frame.vertical(y_unit);
        frame.horizontal(x_unit);
        frame
    }

    fn vertical(&mut self, unit: &str) {
        let Edges { left, right, top, .. } = self.edges;
        for (value, text) in self.y.ticks(5) {
            let y = self.y.at(value);
            self.canvas.line("grid", (left, y), (right, y));
            let label = Label { text: &text, class: "tick", x: left - 7.0, y: y + 4.0, anchor: Anchor::End };
            self.canvas.label(label);
        }
        self.canvas.label(Label { text: unit, class: "unit", x: 2.0, y: 11.0_f64.min(top), anchor: Anchor::Start });
    }

    fn horizontal(&mut self, unit: &str) {
        let Edges { left, right, bottom, .. } = self.edges;
        for value in self.x.minor() {
            let x = self.x.at(value);
            self.canvas.line("axis", (x, bottom), (x, bottom + 2.5));
        }
        let mut free_from = f64::NEG_INFINITY;
        for (value, text) in self.x.ticks(8) {
            let x = self.x.at(value);
            self.canvas.line("axis", (x, bottom), (x, bottom + 5.0));
            let half = text_width(&text) / 2.0;
            if x - half < free_from || x + half > self.edges.width {
                continue;
            }
            self.canvas.label(Label { text: &text, class: "tick", x, y: bottom + 18.0, anchor: Anchor::Middle });
            free_from = x + half + 6.0;
        }
        self.canvas.line("axis", (left, bottom), (right, bottom));
        let middle = (left + right) / 2.0;
        let label = Label { text: unit, class: "unit", x: middle, y: bottom + 34.0, anchor: Anchor::Middle };
        self.canvas.label(label);
    }

    /// A place in the picture.
    pub fn place(&self, (x, y): (f64, f64)) -> (f64, f64) {
        (self.x.at(x), self.y.at(y))
    }

    /// A line through values, cut off at the frame; `None` breaks it. Returns the last place inside.
    pub fn curve(&mut self, class: &str, values: &[Option<(f64, f64)>]) -> Option<(f64, f64)> {
        let mut pieces: Vec<Vec<(f64, f64)>> = vec![Vec::new()];
        let mut before: Option<(f64, f64)> = None;
        for value in values {
            let now = value.map(|value| self.place(value));
            if let (Some(a), Some(b)) = (before, now)
                && let Some((a, b)) = self.clipped(a, b)
            {
                match pieces.last_mut() {
                    Some(piece) if piece.last() == Some(&a) => piece.push(b),
                    _ => pieces.push(vec![a, b]),
                }
            }
            before = now;
        }
        for piece in &pieces {
            self.canvas.polyline(class, piece);
        }
        pieces.last().and_then(|piece| piece.last()).copied()
    }

    /// The part of a straight line inside the frame (Liang & Barsky, ACM Trans. Graph. 3, 1984).
    fn clipped(&self, a: (f64, f64), b: (f64, f64)) -> Option<((f64, f64), (f64, f64))> {
        let Edges { left, right, top, bottom, .. } = self.edges;
        let (dx, dy) = (b.0 - a.0, b.1 - a.1);
        let (mut enter, mut leave) = (0.0_f64, 1.0_f64);
        for (step, room) in [(-dx, a.0 - left), (dx, right - a.0), (-dy, a.1 - top), (dy, bottom - a.1)] {
            if step == 0.0 {
                if room < 0.0 {
                    return None;
                }
            } else if step < 0.0 {
                enter = enter.max(room / step);
            } else {
                leave = leave.min(room / step);
            }
        }
        let at = |part: f64| match part {
            0.0 => a,
            1.0 => b,
            part => (a.0 + part * dx, a.1 + part * dy),
        };
        (enter < leave).then(|| (at(enter), at(leave)))
    }

    /// Names at the right ends of lines, pushed apart where lines end close together.
    pub fn name_ends(&mut self, ends: Vec<(String, &'static str, (f64, f64))>) {
        let mut ends = ends;
        ends.sort_by(|a, b| a.2.1.total_cmp(&b.2.1));
        let (top, bottom) = (self.edges.top + 3.0, self.edges.bottom);
        let mut places: Vec<f64> = ends.iter().map(|(_, _, end)| end.1).collect();
        for k in 1..places.len() {
            places[k] = places[k].max(places[k - 1] + LINE);
        }
        let over = places.last().map_or(0.0, |last| (last - bottom).max(0.0));
        if over > 0.0 {
            let mut limit = bottom;
            for place in places.iter_mut().rev() {
                *place = place.min(limit);
                limit = *place - LINE;
            }
        }
        let column = self.edges.right + 12.0;
        for ((name, class, end), y) in ends.iter().zip(places) {
            let y = y.max(top);
            if (y - end.1).abs() > 2.0 || column - end.0 > 14.0 {
                self.canvas.line("leader", (end.0 + 2.0, end.1), (column - 2.0, y));
            }
            self.canvas.label(Label { text: name, class, x: column, y: y + 4.0, anchor: Anchor::Start });
        }
    }

    /// A hairline at a value of the horizontal axis with its text above the frame, on the first free row.
    pub fn upright(&mut self, class: &'static str, value: f64, text: &str, rows: usize) {
        let x = self.x.at(value);
        let first = self.edges.top - 6.0;
        let row = |row: usize| first - 14.0 * row as f64;
        let places: Vec<(f64, f64, Anchor)> = (0..rows)
            .flat_map(|k| {
                [(x, row(k), Anchor::Middle), (x + 2.0, row(k), Anchor::End), (x - 2.0, row(k), Anchor::Start)]
            })
            .collect();
        let label = Label { text, class, x, y: first, anchor: Anchor::Middle };
        let shown = self.canvas.label_where_free(label, &places);
        let top = if shown { self.edges.top - 3.0 } else { self.edges.top };
        self.canvas.line("limit", (x, top), (x, self.edges.bottom));
    }
}
