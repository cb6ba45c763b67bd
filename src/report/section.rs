//! What the page says of one configuration.

use super::bench_sheet::{self, Sheet};
use super::document::Document;
use super::plots::{self, Lettered, TOGETHER};
use super::svg::Picture;
use super::{schematic, words};
use crate::figures::{ConfigurationFigures, LimitFigures, RatingFigures, TubeFigures};
use crate::show::units;
use crate::terminal::plain;

/// One configuration.
pub struct Section {
    pub letter: String,
    pub name: String,
    pub shape: usize,
    pub drawing: Option<Picture>,
    pub tubes: Vec<TubeColumn>,
    pub ratings: Vec<Rating>,
    pub figures: Vec<Figure>,
    pub pictures: Vec<Captioned>,
    pub sheet: Option<Sheet>,
}

/// A tube's operating point.
pub struct TubeColumn {
    pub role: &'static str,
    pub tube: String,
    pub figures: Vec<Figure>,
}

/// A figure with its name.
pub struct Figure {
    pub name: String,
    pub text: String,
    pub json: String,
}

/// A limit and how much of it is used.
pub struct Rating {
    pub part: String,
    pub limit: String,
    pub asked: String,
    pub allowed: String,
    pub used: String,
    pub json: String,
    pub exceeded: bool,
    /// Part of the limit in use for the bar, 0 to 100.
    pub bar: u32,
}

/// A picture with what it is.
pub struct Captioned {
    pub heading: String,
    pub words: String,
    pub picture: Picture,
}

impl Section {
    pub fn of(document: &Document, one: Lettered<'_>) -> Section {
        let figures = one.figures;
        let k = one.index;
        let point = &figures.operating_point;
        let both = [("gain", "Gain tube", Some(&point.gain)), ("follower", "Follower", point.follower.as_ref())];
        let column = |(key, role, tube): (&str, &'static str, Option<&TubeFigures>)| {
            let tube = tube?;
            let figures = tube_figures(tube, &format!("/configurations/{k}/operating_point/{key}"));
            Some(TubeColumn { role, tube: plain(&tube.tube).into_owned(), figures })
        };
        let ratings = point.ratings.iter().enumerate();
        Section {
            letter: one.letter.to_owned(),
            name: plain(&figures.name).into_owned(),
            shape: k % TOGETHER,
            drawing: schematic::drawing(one.letter, figures),
            tubes: both.into_iter().filter_map(column).collect(),
            ratings: ratings
                .map(|(at, r)| rating(r, format!("/configurations/{k}/operating_point/ratings/{at}/used_percent")))
                .collect(),
            figures: more_figures(k, figures),
            pictures: pictures(one),
            sheet: bench_sheet::sheet(k, figures, document.figures.provenance.as_ref()),
        }
    }

    /// Every picture of the section.
    pub fn pictures(&self) -> impl Iterator<Item = &Picture> {
        self.drawing.iter().chain(self.pictures.iter().map(|captioned| &captioned.picture))
    }
}

fn tube_figures(tube: &TubeFigures, at: &str) -> Vec<Figure> {
    let figure = |name: &str, key: &str, value: Option<f64>, show: fn(f64) -> String| Figure {
        name: name.to_owned(),
        text: value.map_or_else(|| "–".to_owned(), |value| words::nice(&show(value))),
        json: value.map_or_else(String::new, |_| format!("{at}/{key}")),
    };
    vec![
        figure("plate to ground", "plate_to_ground", Some(tube.plate_to_ground), units::volts),
        figure("cathode to ground", "cathode_to_ground", Some(tube.cathode_to_ground), units::volts),
        figure("grid to cathode", "grid_to_cathode", Some(tube.grid_to_cathode), units::volts),
        figure("plate to cathode", "plate_to_cathode", Some(tube.plate_to_cathode), units::volts),
        figure("plate current", "plate_current", Some(tube.plate_current), units::amperes),
        figure("heat at the plate", "plate_dissipation", Some(tube.plate_dissipation), units::watts),
        figure("gm", "gm", Some(tube.gm), units::siemens),
        figure("µ", "mu", tube.mu, |mu| words::plain_number(mu, 1)),
        figure("rp", "rp", tube.rp, units::ohms),
    ]
}

fn rating(rating: &RatingFigures, json: String) -> Rating {
    let show = |value: f64| match rating.unit.as_str() {
        "A" => format!("{}\u{a0}mA", words::significant(1e3 * value, 3)),
        unit => format!("{}\u{a0}{unit}", words::significant(value, 3)),
    };
    let used = rating.used_percent;
    Rating {
        part: rating.part.clone(),
        limit: rating.limit.replace('_', " "),
        asked: show(rating.asked),
        allowed: rating.allowed.map_or_else(|| "not stated".to_owned(), show),
        used: used.map_or_else(String::new, |used| words::fixed(used, 0, "%")),
        json: used.map_or_else(String::new, |_| json),
        exceeded: used.is_some_and(|used| used > 100.05),
        bar: used.map_or(0, |used| used.clamp(0.0, 100.0).round() as u32),
    }
}

/// Figures that the first table has no room for.
fn more_figures(k: usize, c: &ConfigurationFigures) -> Vec<Figure> {
    let at = format!("/configurations/{k}");
    let mut out = Vec::new();
    for (n, tone) in c.tones.iter().flatten().enumerate() {
        let name =
            format!("THD, {} at {} rms", words::nice(&units::hertz(tone.frequency)), words::level(tone.input_rms));
        out.push(percent(name, tone.thd_percent, format!("{at}/tones/{n}/thd_percent")));
    }
    let pairs = c.imd.iter().flatten().enumerate().flat_map(|(n, imd)| {
        let pointer = move |key: &str| format!("{}/imd/{n}/{key}", format_args!("/configurations/{k}"));
        match imd.kind.as_str() {
            "difference" => vec![
                percent("difference tone, d2".to_owned(), imd.d2_percent, pointer("d2_percent")),
                percent("difference tone, d3".to_owned(), imd.d3_percent, pointer("d3_percent")),
            ],
            "smpte" => vec![percent("intermodulation, SMPTE".to_owned(), imd.percent, pointer("percent"))],
            _ => vec![percent("intermodulation, DIN".to_owned(), imd.percent, pointer("percent"))],
        }
    });
    out.extend(pairs);
    if let Some(noise) = &c.noise {
        let volts = |value: f64| words::nice(&units::volts(value));
        let plain =
            |name: &str, value, key: &str| shown(name.to_owned(), value, &volts, format!("{at}/noise/{key}"));
        out.push(plain("noise at the output", noise.output_rms, "output_rms"));
        out.push(plain("the same, A-weighted", noise.output_rms_a, "output_rms_a"));
    }
    out.extend(headroom(k, c));
    out
}

fn headroom(k: usize, c: &ConfigurationFigures) -> Vec<Figure> {
    let Some(headroom) = &c.headroom else { return Vec::new() };
    let at = format!("/configurations/{k}/headroom");
    let line = |name: String, limit: &LimitFigures, key: &str| {
        let name = match &limit.tube {
            Some(tube) => format!("{name}, {tube} tube"),
            None => name,
        };
        shown(name, limit.input_rms, &|v| words::level(v), format!("{at}/{key}/input_rms"))
    };
    let thd = headroom.thd.iter().enumerate().map(|(n, limit)| {
        let percent = words::significant(limit.percent.unwrap_or(0.0), 2);
        line(format!("input for {percent}\u{a0}% THD"), limit, &format!("thd/{n}"))
    });
    let mut out: Vec<Figure> = thd.collect();
    out.push(line("input at 1\u{a0}dB compression".to_owned(), &headroom.compression_1db, "compression_1dB"));
    out.push(line("input at grid current".to_owned(), &headroom.grid_current, "grid_current"));
    out.push(line("input at cut-off".to_owned(), &headroom.cutoff, "cutoff"));
    out
}

fn percent(name: String, value: Option<f64>, json: String) -> Figure {
    shown(name, value, &|v| words::percent(v), json)
}

fn shown(name: String, value: Option<f64>, show: &dyn Fn(f64) -> String, json: String) -> Figure {
    match value {
        Some(value) => Figure { name, text: show(value), json },
        None => Figure { name, text: "–".to_owned(), json: String::new() },
    }
}

fn pictures(one: Lettered<'_>) -> Vec<Captioned> {
    let mut out = Vec::new();
    let captioned = |heading: &str, words: String, picture: Option<Picture>| {
        picture.map(|picture| Captioned { heading: heading.to_owned(), words, picture })
    };
    if let Some(curves) = &one.figures.curves {
        let levels = curves.cycles.iter().map(|c| words::level(c.input_rms)).collect::<Vec<_>>().join(", ");
        for (n, plate) in curves.plates.iter().enumerate() {
            let heading = format!("Plate curves, {} tube ({})", plate.role, plain(&plate.tube));
            let words = format!("Load line, operating point, and the path of 1\u{a0}kHz at {levels} rms.");
            out.push(Captioned { heading, words, picture: plots::plates(one, plate, n, &curves.cycles) });
        }
        let words = "Output of a 1\u{a0}kHz sine over the input's peak, so that shapes compare.".to_owned();
        out.extend(captioned("One cycle at three levels", words, plots::cycles(one, &curves.cycles)));
        let words = format!("Output against input during a cycle of 1\u{a0}kHz at {levels} rms.");
        out.extend(captioned("Transfer curve", words, plots::transfer(one, &curves.cycles)));
    }
    let words = "Heavy line: THD. Uprights: where limits are reached.".to_owned();
    out.extend(captioned("Harmonics against level", words, plots::harmonics_over_level(one)));
    out
}
