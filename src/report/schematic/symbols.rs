//! Graphical symbols for diagrams (IEC 60617): rectangle for a resistor, parallel plates for a capacitor, envelope
//! with plate, grid and cathode for a triode.

use crate::report::svg::{Anchor, Canvas, Label};

/// A place in the drawing.
pub type Place = (f64, f64);

/// Half a resistor's length and thickness.
const BODY: (f64, f64) = (20.0, 7.0);
/// Half a capacitor plate and half the gap.
const PLATES: (f64, f64) = (12.0, 3.5);
/// Radius of a triode's envelope.
pub const ENVELOPE: f64 = 27.0;

/// A pen over the canvas; a part that is exceeded is drawn in red.
pub struct Pen {
    pub canvas: Canvas,
}

impl Pen {
    pub fn wire(&mut self, points: &[Place]) {
        self.canvas.polyline("wire", points);
    }

    pub fn dot(&mut self, place: Place) {
        self.canvas.circle("joint", place, 2.6);
    }

    pub fn text(&mut self, class: &'static str, (x, y): Place, anchor: Anchor, text: &str) {
        self.canvas.label(Label { text, class, x, y, anchor });
    }

    /// A resistor down from (x, `from`) to (x, `to`).
    pub fn resistor_down(&mut self, x: f64, from: f64, to: f64) {
        let middle = (from + to) / 2.0;
        self.wire(&[(x, from), (x, middle - BODY.0)]);
        self.wire(&[(x, middle + BODY.0), (x, to)]);
        self.canvas.rectangle("part", x - BODY.1, middle - BODY.0, 2.0 * BODY.1, 2.0 * BODY.0);
    }

    /// A resistor from (`from`, y) to the right.
    pub fn resistor_across(&mut self, from: f64, to: f64, y: f64) {
        let middle = (from + to) / 2.0;
        self.wire(&[(from, y), (middle - BODY.0, y)]);
        self.wire(&[(middle + BODY.0, y), (to, y)]);
        self.canvas.rectangle("part", middle - BODY.0, y - BODY.1, 2.0 * BODY.0, 2.0 * BODY.1);
    }

    /// A capacitor down; an electrolytic one, which has a plus.
    pub fn capacitor_down(&mut self, x: f64, from: f64, to: f64, polar: bool) {
        let middle = (from + to) / 2.0;
        self.wire(&[(x, from), (x, middle - PLATES.1)]);
        self.wire(&[(x, middle + PLATES.1), (x, to)]);
        for y in [middle - PLATES.1, middle + PLATES.1] {
            self.canvas.line("part", (x - PLATES.0, y), (x + PLATES.0, y));
        }
        if polar {
            self.plus((x - PLATES.0 + 1.0, middle - 10.0));
        }
    }

    /// A capacitor to the right, its plus at the left where it has one.
    pub fn capacitor_across(&mut self, from: f64, to: f64, y: f64) {
        let middle = (from + to) / 2.0;
        self.wire(&[(from, y), (middle - PLATES.1, y)]);
        self.wire(&[(middle + PLATES.1, y), (to, y)]);
        for x in [middle - PLATES.1, middle + PLATES.1] {
            self.canvas.line("part", (x, y - PLATES.0), (x, y + PLATES.0));
        }
    }

    fn plus(&mut self, (x, y): Place) {
        self.canvas.line("fine", (x - 3.0, y), (x + 3.0, y));
        self.canvas.line("fine", (x, y - 3.0), (x, y + 3.0));
    }

    pub fn ground(&mut self, (x, y): Place) {
        for (k, half) in [10.0, 6.5, 3.0].into_iter().enumerate() {
            let y = y + 4.0 * k as f64;
            self.canvas.line("part", (x - half, y), (x + half, y));
        }
    }

    /// A signal source down to ground.
    pub fn source(&mut self, x: f64, from: f64, to: f64) {
        let middle = (from + to) / 2.0;
        self.wire(&[(x, from), (x, middle - 14.0)]);
        self.wire(&[(x, middle + 14.0), (x, to)]);
        self.canvas.circle("part", (x, middle), 14.0);
        let wave: Vec<Place> = (0..=16)
            .map(|k| f64::from(k) / 16.0)
            .map(|t| (x - 8.0 + 16.0 * t, middle - 5.0 * libm::sin(std::f64::consts::TAU * t)))
            .collect();
        self.canvas.polyline("fine", &wave);
        self.ground((x, to));
    }

    /// A triode around (x, y); its terminals are at the envelope's left, top and bottom.
    pub fn triode(&mut self, (x, y): Place) {
        self.canvas.circle("envelope", (x, y), ENVELOPE);
        self.wire(&[(x, y - ENVELOPE), (x, y - 13.0)]);
        self.canvas.line("part", (x - 12.0, y - 13.0), (x + 12.0, y - 13.0));
        self.wire(&[(x - ENVELOPE, y), (x - 17.0, y)]);
        for dash in [-15.0, -5.0, 5.0] {
            self.canvas.line("part", (x + dash, y), (x + dash + 7.0, y));
        }
        let cathode = [(x - 12.0, y + 18.0), (x - 12.0, y + 14.0), (x + 9.0, y + 14.0), (x + 12.0, y + 18.0)];
        self.canvas.polyline("part", &[cathode[0], cathode[1], (x + 12.0, y + 14.0), cathode[3]]);
        self.wire(&[(x, y + 14.0), (x, y + ENVELOPE)]);
    }

    /// A switch down.
    pub fn switch_down(&mut self, x: f64, from: f64, to: f64, closed: bool) {
        self.canvas.circle("contact", (x, from), 2.4);
        self.canvas.circle("contact", (x, to), 2.4);
        let reach = if closed { 0.0 } else { 11.0 };
        self.canvas.line("part", (x, to - 2.0), (x - reach, from + if closed { 2.0 } else { 1.0 }));
    }

    /// A pot's wiper: an arrow that points left at (x, y).
    pub fn wiper(&mut self, (x, y): Place, from: f64) {
        self.wire(&[(from, y), (x, y)]);
        self.canvas.polygon("arrow", &[(x, y), (x + 7.0, y - 3.5), (x + 7.0, y + 3.5)]);
    }

    pub fn terminal(&mut self, place: Place) {
        self.canvas.circle("contact", place, 3.2);
    }
}
