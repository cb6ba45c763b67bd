//! The stage as a schematic: one layout for every topology, parts that are not there left out.

mod symbols;

use crate::figures::{ConfigurationFigures, ValueFigure, ValuesFigures};
use crate::iec60062::{self, Letters};
use crate::report::svg::{Anchor, Canvas, Picture};
use crate::report::words;
use symbols::{ENVELOPE, Pen, Place};

const HEIGHT: f64 = 412.0;
const RAIL: f64 = 60.0;
/// Height of the input's wires and of the gain tube's grid.
const INPUT: f64 = 196.0;
/// Height of the gain tube's plate joint.
const PLATE: f64 = 152.0;
const CATHODE: f64 = 240.0;
const GROUND: f64 = 384.0;
/// Where the two tubes stand.
const GAIN: f64 = 334.0;
const FOLLOWER: f64 = 700.0;
/// Height of the follower's cathode joint, and of the junction below.
const FOLLOWER_CATHODE: f64 = 202.0;
const JUNCTION: f64 = 276.0;
/// Where the branch behind the coupling capacitor goes down.
const LEAK: f64 = 560.0;

/// The drawing of a configuration; `None` where report.json holds no values for it.
pub fn drawing(letter: &str, figures: &ConfigurationFigures) -> Option<Picture> {
    let values = figures.values.as_ref()?;
    let follows = values.contains_key("follower.tube");
    let output = if follows { 850.0 } else { 590.0 };
    let canvas = Canvas::new(output + 200.0, HEIGHT);
    let mut sheet = Sheet { pen: Pen { canvas }, values, figures };
    sheet.supply(follows);
    sheet.input();
    sheet.gain();
    if follows {
        sheet.coupling();
        sheet.follower();
        sheet.output((FOLLOWER, FOLLOWER_CATHODE), output);
    } else {
        sheet.output((GAIN, PLATE), output);
    }
    let title = format!("Schematic of configuration {letter}");
    let class = if follows { "schematic" } else { "schematic short" };
    Some(sheet.pen.canvas.finish(format!("schematic-{letter}"), class, &title))
}

struct Sheet<'a> {
    pen: Pen,
    values: &'a ValuesFigures,
    figures: &'a ConfigurationFigures,
}

impl Sheet<'_> {
    fn number(&self, key: &str) -> Option<f64> {
        match self.values.get(key)? {
            ValueFigure::Number(number) => Some(*number),
            _ => None,
        }
    }

    fn word(&self, key: &str) -> &str {
        match self.values.get(key) {
            Some(ValueFigure::Word(word)) => word,
            _ => "",
        }
    }

    fn ohms(&self, key: &str) -> String {
        self.number(key).map_or_else(|| "?".to_owned(), |ohms| iec60062::format(ohms, Letters::Resistance))
    }

    fn farads(&self, key: &str) -> String {
        let farads = self.number(key);
        farads.map_or_else(
            || "?".to_owned(),
            |farads| iec60062::format(farads, Letters::Capacitance).replace('u', "µ"),
        )
    }

    /// A stopper of 0 Ω is a wire.
    fn is_wire(&self, key: &str) -> bool {
        self.number(key).is_none_or(|ohms| ohms == 0.0)
    }

    /// Draws a part; where a rating of `part` is exceeded, in red and with a mark beside `text`.
    fn part(&mut self, part: &str, text: (Place, Anchor, String), draw: &dyn Fn(&mut Pen)) {
        let warnings = &self.figures.operating_point.warnings;
        let over = warnings.iter().any(|warning| warning.part == part && warning.used_percent.is_some());
        self.pen.canvas.open_group(if over { "over" } else { "sound" });
        draw(&mut self.pen);
        let (place, anchor, text) = text;
        let text = if over { format!("{text} ▲") } else { text };
        self.pen.text("value", place, anchor, &text);
        self.pen.canvas.close_group();
    }

    fn node(&mut self, place: Place, anchor: Anchor, name: &str) {
        let Some(meter) = &self.figures.operating_point.meter else { return };
        if let Some(reading) = meter.readings.iter().find(|reading| reading.node == name) {
            let text = words::bench_volts(reading.volts);
            self.pen.text("node", place, anchor, &text);
        }
    }

    fn supply(&mut self, follows: bool) {
        self.pen.terminal((150.0, RAIL));
        let volts = self.number("supply.voltage").map_or_else(String::new, words::bench_volts);
        self.pen.text("value", (140.0, RAIL + 4.0), Anchor::End, &volts);
        let text = ((190.0, RAIL - 14.0), Anchor::Middle, self.ohms("supply.resistance"));
        self.part("supply.resistance", text, &|pen| pen.resistor_across(153.0, 227.0, RAIL));
        let text = ((262.0, RAIL + 32.0), Anchor::Start, self.farads("supply.reservoir"));
        self.part("supply.reservoir", text, &|pen| {
            pen.capacitor_down(245.0, RAIL, RAIL + 52.0, true);
            pen.ground((245.0, RAIL + 52.0));
        });
        let end = if follows { FOLLOWER } else { GAIN };
        self.pen.wire(&[(227.0, RAIL), (end, RAIL)]);
        self.pen.dot((245.0, RAIL));
        self.node((262.0, RAIL - 10.0), Anchor::Start, "B");
    }

    fn input(&mut self) {
        let full_scale = self.number("source.full_scale").map_or_else(String::new, words::level);
        self.pen.text("quiet", (14.0, 350.0), Anchor::Start, &format!("0 dBFS = {full_scale}"));
        self.pen.source(36.0, INPUT, 318.0);
        let text = ((82.0, INPUT - 14.0), Anchor::Middle, self.ohms("source.resistance"));
        self.part("source.resistance", text, &|pen| pen.resistor_across(36.0, 128.0, INPUT));
        let has_leak = self.number("input.grid_leak").is_some();
        if self.number("input.pot.resistance").is_some() {
            self.pot();
        } else {
            self.pen.wire(&[(128.0, INPUT), (204.0, INPUT)]);
        }
        if has_leak {
            self.pen.dot((204.0, INPUT));
            let text = ((216.0, 262.0), Anchor::Start, self.ohms("input.grid_leak"));
            self.part("input.grid_leak", text, &|pen| {
                pen.resistor_down(204.0, INPUT, 318.0);
                pen.ground((204.0, 318.0));
            });
        }
        let grid = GAIN - ENVELOPE;
        if self.is_wire("input.grid_stopper") {
            self.pen.wire(&[(204.0, INPUT), (grid, INPUT)]);
        } else {
            let text = ((252.0, INPUT - 14.0), Anchor::Middle, self.ohms("input.grid_stopper"));
            self.part("input.grid_stopper", text, &|pen| {
                pen.resistor_across(204.0, 300.0, INPUT);
                pen.wire(&[(300.0, INPUT), (grid, INPUT)]);
            });
        }
    }

    fn pot(&mut self) {
        let text = ((116.0, 254.0), Anchor::End, self.ohms("input.pot.resistance"));
        self.part("input.pot", text, &|pen| {
            pen.resistor_down(128.0, INPUT, 318.0);
            pen.ground((128.0, 318.0));
            pen.wiper((135.0, 257.0), 160.0);
        });
        let position = self.number("input.pot.position").unwrap_or(0.0);
        let text = format!("at {}", words::significant(position, 2));
        self.pen.text("quiet", (116.0, 271.0), Anchor::End, &text);
        self.pen.wire(&[(160.0, 257.0), (160.0, INPUT), (204.0, INPUT)]);
    }

    fn gain(&mut self) {
        let text = ((GAIN + 14.0, 110.0), Anchor::Start, self.ohms("gain.plate_resistor"));
        self.part("gain.plate_resistor", text, &|pen| pen.resistor_down(GAIN, RAIL, PLATE));
        self.pen.dot((GAIN, PLATE));
        self.node((GAIN - 10.0, PLATE + 1.0), Anchor::End, "p1");
        self.pen.wire(&[(GAIN, PLATE), (GAIN, INPUT - ENVELOPE)]);
        self.tube("gain", (GAIN, INPUT));
        self.pen.wire(&[(GAIN, INPUT + ENVELOPE), (GAIN, CATHODE)]);
        self.node((GAIN - 10.0, CATHODE + 5.0), Anchor::End, "k1");
        let text = ((GAIN - 14.0, 316.0), Anchor::End, self.ohms("gain.cathode_resistor"));
        self.part("gain.cathode_resistor", text, &|pen| {
            pen.resistor_down(GAIN, CATHODE, GROUND);
            pen.ground((GAIN, GROUND));
        });
        if self.number("gain.bypass.capacitance").is_some() {
            self.bypass();
        }
    }

    fn tube(&mut self, role: &'static str, (x, y): Place) {
        let name = self.word(if role == "gain" { "gain.tube" } else { "follower.tube" }).to_owned();
        let point = &self.figures.operating_point;
        let tube = if role == "gain" { Some(&point.gain) } else { point.follower.as_ref() };
        let current =
            tube.map_or_else(String::new, |t| format!("{} mA", words::significant(1e3 * t.plate_current, 3)));
        self.part(role, ((x + ENVELOPE + 8.0, y - 6.0), Anchor::Start, short_name(&name)), &|pen| {
            pen.triode((x, y))
        });
        self.pen.text("node", (x + ENVELOPE + 8.0, y + 12.0), Anchor::Start, &current);
    }

    fn bypass(&mut self) {
        let x = GAIN + 84.0;
        self.pen.wire(&[(GAIN, CATHODE), (x, CATHODE)]);
        self.pen.dot((GAIN, CATHODE));
        let esr = !self.is_wire("gain.bypass.esr");
        let below = if esr { 276.0 } else { 330.0 };
        let text =
            ((x + 18.0, (CATHODE + below) / 2.0 + 5.0), Anchor::Start, self.farads("gain.bypass.capacitance"));
        self.part("gain.bypass", text, &|pen| pen.capacitor_down(x, CATHODE, below, true));
        if esr {
            let text = ((x + 13.0, 308.0), Anchor::Start, self.ohms("gain.bypass.esr"));
            self.part("gain.bypass.esr", text, &|pen| pen.resistor_down(x, 276.0, 330.0));
        }
        let closed = self.values.get("gain.bypass.engaged") == Some(&ValueFigure::Switch(true));
        self.pen.wire(&[(x, 330.0), (x, 344.0)]);
        self.pen.switch_down(x, 344.0, 368.0, closed);
        self.pen.wire(&[(x, 370.0), (x, GROUND)]);
        self.pen.ground((x, GROUND));
        if self.number("gain.bypass.trickle_resistor").is_some() {
            let beside = x + 56.0;
            self.pen.dot((x, 332.0));
            self.pen.wire(&[(x, 332.0), (beside, 332.0)]);
            let text = ((beside + 13.0, 362.0), Anchor::Start, self.ohms("gain.bypass.trickle_resistor"));
            self.part("gain.bypass.trickle_resistor", text, &|pen| pen.resistor_down(beside, 332.0, GROUND));
            self.pen.ground((beside, GROUND));
        }
    }

    fn coupling(&mut self) {
        let grid = FOLLOWER - ENVELOPE;
        if self.word("coupling.kind") == "direct" {
            self.pen.wire(&[(GAIN, PLATE), (LEAK, PLATE)]);
        } else {
            let text = ((500.0, PLATE - 20.0), Anchor::Middle, self.farads("coupling.capacitor"));
            self.part("coupling.capacitor", text, &|pen| pen.capacitor_across(GAIN, LEAK, PLATE));
            self.leak();
        }
        if self.is_wire("coupling.grid_stopper") {
            self.pen.wire(&[(LEAK, PLATE), (grid, PLATE)]);
        } else {
            let text = ((616.0, PLATE - 14.0), Anchor::Middle, self.ohms("coupling.grid_stopper"));
            self.part("coupling.grid_stopper", text, &|pen| pen.resistor_across(LEAK, grid, PLATE));
        }
    }

    fn leak(&mut self) {
        self.pen.dot((LEAK, PLATE));
        self.node((LEAK - 9.0, PLATE + 20.0), Anchor::End, "x");
        let to_ground = self.word("coupling.returns_to") == "ground";
        let text = ((LEAK + 14.0, 220.0), Anchor::Start, self.ohms("coupling.grid_leak"));
        let end = if to_ground { GROUND } else { JUNCTION };
        self.part("coupling.grid_leak", text, &|pen| {
            pen.resistor_down(LEAK, PLATE, JUNCTION);
            pen.wire(&[(LEAK, JUNCTION), (LEAK, end)]);
            if to_ground {
                pen.ground((LEAK, end));
            } else {
                pen.wire(&[(LEAK, JUNCTION), (FOLLOWER, JUNCTION)]);
                pen.dot((FOLLOWER, JUNCTION));
            }
        });
    }

    fn follower(&mut self) {
        self.pen.wire(&[(FOLLOWER, RAIL), (FOLLOWER, PLATE - ENVELOPE)]);
        self.tube("follower", (FOLLOWER, PLATE));
        self.pen.wire(&[(FOLLOWER, PLATE + ENVELOPE), (FOLLOWER, FOLLOWER_CATHODE)]);
        self.node((FOLLOWER - 10.0, FOLLOWER_CATHODE + 5.0), Anchor::End, "k2");
        if self.number("follower.bias_resistor").is_some_and(|ohms| ohms > 0.0) {
            let text = ((FOLLOWER + 14.0, 244.0), Anchor::Start, self.ohms("follower.bias_resistor"));
            self.part("follower.bias_resistor", text, &|pen| {
                pen.resistor_down(FOLLOWER, FOLLOWER_CATHODE, JUNCTION);
            });
            self.node((FOLLOWER + 12.0, JUNCTION + 6.0), Anchor::Start, "j");
        } else {
            self.pen.wire(&[(FOLLOWER, FOLLOWER_CATHODE), (FOLLOWER, JUNCTION)]);
        }
        let text = ((FOLLOWER + 14.0, 335.0), Anchor::Start, self.ohms("follower.tail_resistor"));
        self.part("follower.tail_resistor", text, &|pen| {
            pen.resistor_down(FOLLOWER, JUNCTION, GROUND);
            pen.ground((FOLLOWER, GROUND));
        });
    }

    fn output(&mut self, (x, y): Place, o: f64) {
        self.pen.dot((x, y));
        let text = (((x + o) / 2.0 + 20.0, y - 20.0), Anchor::Middle, self.farads("output.capacitor"));
        self.part("output.capacitor", text, &|pen| pen.capacitor_across(x + 40.0, o, y));
        self.pen.wire(&[(x, y), (x + 40.0, y)]);
        let down = |pen: &mut Pen, x: f64| {
            pen.dot((x, y));
            pen.resistor_down(x, y, y + 124.0);
            pen.ground((x, y + 124.0));
        };
        let text = ((o + 13.0, y + 67.0), Anchor::Start, self.ohms("output.bleed"));
        self.part("output.bleed", text, &|pen| down(pen, o));
        let load = o + 68.0;
        let text = ((load + 13.0, y + 67.0), Anchor::Start, self.ohms("output.load.resistance"));
        self.part("output.load", text, &|pen| down(pen, load));
        let mut end = load;
        if self.number("output.load.capacitance").is_some() {
            end = load + 64.0;
            let text = ((end + 17.0, y + 67.0), Anchor::Start, self.farads("output.load.capacitance"));
            self.part("output.load.capacitance", text, &|pen| {
                pen.capacitor_down(end, y, y + 124.0, false);
                pen.ground((end, y + 124.0));
            });
        }
        self.pen.wire(&[(o, y), (end, y)]);
        self.pen.text("quiet", (o, y - 12.0), Anchor::Start, "out");
    }
}

/// A type's name, cut where it would run into what stands beside it.
fn short_name(name: &str) -> String {
    match name.char_indices().nth(12) {
        Some((at, _)) => format!("{}…", &name[..at]),
        None => name.to_owned(),
    }
}
