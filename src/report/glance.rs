//! The table that a choice begins with.

use super::document::Document;
use super::words;
use crate::figures::{ConfigurationFigures, ToneFigures};

/// A column.
#[derive(Clone, Debug, PartialEq)]
pub struct Column {
    pub title: &'static str,
    pub detail: String,
}

/// A figure of a configuration.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Cell {
    pub title: &'static str,
    pub text: String,
    /// How far it is trusted, or another quiet word beside it.
    pub beside: String,
    /// "best", "worst" or nothing.
    pub mark: &'static str,
    /// Where the figure stands in report.json: pointers, and what is done with them.
    pub json: String,
    pub operation: &'static str,
    pub exceeded: bool,
}

/// Which end of a column is better for every stage.
#[derive(Clone, Copy, PartialEq)]
enum Better {
    Low,
    High,
    Neither,
}

struct Figure {
    value: Option<f64>,
    text: String,
    beside: String,
    pointers: Vec<String>,
    operation: &'static str,
}

impl Figure {
    fn none() -> Figure {
        let (text, operation) = (words::NOT_MEASURED.to_owned(), "value");
        Figure { value: None, text, beside: String::new(), pointers: Vec::new(), operation }
    }

    fn of(value: Option<f64>, show: &dyn Fn(f64) -> String, pointer: String) -> Figure {
        match value {
            Some(value) => {
                Figure { value: Some(value), text: show(value), pointers: vec![pointer], ..Figure::none() }
            }
            None => Figure::none(),
        }
    }
}

/// Columns and, for every configuration, its cells.
pub fn table(document: &Document) -> (Vec<Column>, Vec<Vec<Cell>>) {
    let all = &document.figures.configurations;
    let detail = |text: &str| text.to_owned();
    let mut columns: Vec<(&'static str, String, Better, Vec<Figure>)> = Vec::new();
    let mut column = |title, detail, better, figure: &dyn Fn(usize, &ConfigurationFigures) -> Figure| {
        columns.push((title, detail, better, all.iter().enumerate().map(|(k, c)| figure(k, c)).collect()));
    };
    column("Gain", detail("dB"), Better::Neither, &|k, c| {
        Figure::of(
            tone(c).and_then(|t| t.gain_db),
            &|v| words::plain_number(v, 2),
            format!("{}/gain_dB", at_tone(k)),
        )
    });
    column("THD", detail("%"), Better::Low, &thd);
    column("H2 over H3", detail("dB"), Better::Neither, &balance);
    column("Output at 1 %", detail("V rms"), Better::High, &|k, c| {
        let at = one_percent(c);
        let value = at.and_then(|(_, limit)| limit.output_rms);
        let pointer = format!("/configurations/{k}/headroom/thd/{}/output_rms", at.map_or(0, |(n, _)| n));
        Figure::of(value, &|v| words::three_digits(v), pointer)
    });
    column("Headroom", detail("dB over the recording"), Better::High, &|k, c| {
        let at = one_percent(c);
        let value = at.and_then(|(_, limit)| limit.over_play_db);
        let pointer = format!("/configurations/{k}/headroom/thd/{}/over_play_dB", at.map_or(0, |(n, _)| n));
        Figure::of(value, &|v| words::plain_number(v, 1), pointer)
    });
    column("Signal to noise", detail("dB, best case"), Better::High, &|k, c| {
        let value = c.noise.as_ref().and_then(|noise| noise.signal_to_noise_db);
        let pointer = format!("/configurations/{k}/noise/signal_to_noise_dB");
        Figure::of(value, &|v| words::plain_number(v, 1), pointer)
    });
    column("Output impedance", detail("Ω at 1 kHz"), Better::Low, &output_impedance);
    column("Loudness", detail("LUFS of the render"), Better::Neither, &|_, c| loudness(document, c));
    column("Worst rating", detail("% of the limit"), Better::Low, &worst_rating);
    if all.iter().any(|c| c.profile.is_some()) {
        column("Off target", detail("dB"), Better::Low, &|k, c| {
            let value = c.profile.as_ref().and_then(|profile| profile.distance_db);
            let pointer = format!("/configurations/{k}/profile/distance_dB");
            Figure::of(value, &|v| words::plain_number(v, 2), pointer)
        });
    }
    let heads = columns.iter().map(|(title, detail, ..)| Column { title, detail: detail.clone() }).collect();
    let rows = (0..all.len()).map(|row| columns.iter().map(|column| cell(column, row)).collect()).collect();
    (heads, rows)
}

fn cell((title, _, better, figures): &(&'static str, String, Better, Vec<Figure>), row: usize) -> Cell {
    let figure = &figures[row];
    Cell {
        title,
        text: figure.text.clone(),
        beside: figure.beside.clone(),
        mark: mark(*better, figures, row),
        json: figure.pointers.join(" "),
        operation: figure.operation,
        exceeded: *title == "Worst rating" && figure.value.is_some_and(|used| used > 100.05),
    }
}

/// Best and worst, where figures differ as they are shown and a direction is better.
fn mark(better: Better, figures: &[Figure], row: usize) -> &'static str {
    let known: Vec<f64> = figures.iter().filter_map(|figure| figure.value).collect();
    let differ = figures.iter().any(|figure| figure.text != figures[0].text);
    let Some(value) = figures[row].value.filter(|_| better != Better::Neither && differ && known.len() > 1) else {
        return "";
    };
    let low = known.iter().copied().fold(f64::INFINITY, f64::min);
    let high = known.iter().copied().fold(f64::NEG_INFINITY, f64::max);
    let same = |end: f64| {
        let text = figures.iter().find(|figure| figure.value == Some(end)).map(|figure| &figure.text);
        value == end || text == Some(&figures[row].text)
    };
    let (best, worst) = if better == Better::Low { (low, high) } else { (high, low) };
    match (same(best), same(worst)) {
        (true, false) => "best",
        (false, true) => "worst",
        _ => "",
    }
}

/// The first tone, which the table is about.
pub fn tone(configuration: &ConfigurationFigures) -> Option<&ToneFigures> {
    configuration.tones.as_ref()?.first()
}

fn at_tone(k: usize) -> String {
    format!("/configurations/{k}/tones/0")
}

fn one_percent(c: &ConfigurationFigures) -> Option<(usize, &crate::figures::LimitFigures)> {
    c.headroom.as_ref()?.thd.iter().enumerate().find(|(_, limit)| limit.percent == Some(1.0))
}

fn thd(k: usize, c: &ConfigurationFigures) -> Figure {
    let value = tone(c).and_then(|t| t.thd_percent);
    let mut figure = Figure::of(value, &|v| words::three_digits(v), format!("{}/thd_percent", at_tone(k)));
    if let Some(trust) = trust(c) {
        figure.beside = format!("±{} dB", words::plain_number(trust, 1));
    }
    figure
}

/// How far the THD is trusted, ± dB: the harmonics' trust, each by its part of the distortion's power.
fn trust(c: &ConfigurationFigures) -> Option<f64> {
    let weighed: Vec<(f64, f64)> =
        tone(c)?.harmonics.iter().filter_map(|h| Some((libm::pow(10.0, h.dbc? / 10.0), h.trust_db?))).collect();
    let power: f64 = weighed.iter().map(|(power, _)| power).sum();
    (power > 0.0).then(|| weighed.iter().map(|(power, trust)| power * trust).sum::<f64>() / power)
}

fn balance(k: usize, c: &ConfigurationFigures) -> Figure {
    let dbc = |order: u32| {
        let harmonics = &tone(c)?.harmonics;
        let (at, harmonic) = harmonics.iter().enumerate().find(|(_, h)| h.order == order)?;
        Some((at, harmonic.dbc?))
    };
    let Some(((at2, h2), (at3, h3))) = dbc(2).zip(dbc(3)) else { return Figure::none() };
    let pointer = |at: usize| format!("{}/harmonics/{at}/dBc", at_tone(k));
    let mut figure = Figure::of(Some(h2 - h3), &|v| words::plain_number(v, 1), pointer(at2));
    figure.pointers.push(pointer(at3));
    figure.operation = "difference";
    figure
}

fn output_impedance(k: usize, c: &ConfigurationFigures) -> Figure {
    let response = c.response.iter().flatten().enumerate().find(|(_, r)| r.frequency == 1000.0);
    let Some((at, [re, im])) = response.and_then(|(at, r)| Some((at, r.output_impedance?))) else {
        return Figure::none();
    };
    let pointer = format!("/configurations/{k}/response/{at}/output_impedance");
    let size = libm::hypot(re, im);
    Figure { operation: "size", ..Figure::of(Some(size), &|v| words::column_ohms(v), pointer) }
}

fn loudness(document: &Document, c: &ConfigurationFigures) -> Figure {
    let renders = document.figures.renders.iter().flatten().enumerate();
    let found = renders
        .filter(|(_, render)| render.configuration == c.name)
        .find_map(|(at, r)| Some((at, r.loudness_lufs?)));
    match found {
        Some((at, value)) => {
            Figure::of(Some(value), &|v| words::plain_number(v, 1), format!("/renders/{at}/loudness_LUFS"))
        }
        None => Figure::none(),
    }
}

fn worst_rating(k: usize, c: &ConfigurationFigures) -> Figure {
    let ratings = c.operating_point.ratings.iter().enumerate();
    let used = ratings.filter_map(|(at, rating)| Some((at, rating, rating.used_percent?)));
    let Some((at, rating, used)) = used.max_by(|a, b| a.2.total_cmp(&b.2)) else {
        return Figure { text: "none stated".to_owned(), ..Figure::none() };
    };
    let pointer = format!("/configurations/{k}/operating_point/ratings/{at}/used_percent");
    let beside = format!("{} {}", rating.part, rating.limit.replace('_', " "));
    Figure { beside, ..Figure::of(Some(used), &|v| words::plain_number(v, 0), pointer) }
}

/// Differences between configurations that the tube data do not settle, a line a harmonic.
pub fn doubts(document: &Document, letters: &[String]) -> Vec<String> {
    let figures = &document.figures;
    let letter = |name: &String| {
        let at = figures.configurations.iter().position(|c| c.name == *name);
        at.and_then(|at| letters.get(at)).map_or("?", String::as_str)
    };
    let line = |order: u32| {
        let pairs: Vec<_> = figures.undecided.iter().filter(|doubt| doubt.order == order).collect();
        let told: Vec<String> = pairs
            .iter()
            .take(TOLD)
            .map(|doubt| {
                let (a, b) = (letter(&doubt.between[0]), letter(&doubt.between[1]));
                let difference = words::plain_number(doubt.difference_db.abs(), 1);
                format!("{a}\u{2013}{b} {difference}\u{a0}±\u{a0}{}", words::decibels(doubt.trust_db))
            })
            .collect();
        let more = pairs.len().saturating_sub(TOLD);
        let more = if more > 0 { format!(" and {more} pairs more") } else { String::new() };
        (!told.is_empty()).then(|| {
            format!("The tube data do not settle which has the higher H{order}: {}{more}.", told.join(", "))
        })
    };
    (2..=10).filter_map(line).collect()
}

/// Pairs that are told one by one.
const TOLD: usize = 8;
