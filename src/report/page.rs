//! The page's view: plain texts and finished pictures, which the template sets.

use askama::Template;

use super::document::Document;
use super::exceeded::{self, Warning};
use super::glance::{self, Cell, Column};
use super::plots::{self, Lettered, TOGETHER};
use super::section::Section;
use super::svg::Picture;
use super::{PICTURE_STYLE, words};
use crate::figures::{ConfigurationFigures, TubeDataFigures};
use crate::terminal::plain;

/// The whole page.
#[derive(Template)]
#[template(path = "page.html")]
pub struct Page {
    title: String,
    subtitle: String,
    style: &'static str,
    picture_style: &'static str,
    script: &'static str,
    exceeded: Vec<Warning>,
    notes: Vec<Warning>,
    columns: Vec<Column>,
    rows: Vec<Row>,
    marked: bool,
    doubts: Vec<String>,
    trusted: bool,
    plays: Vec<Play>,
    /// The address of the listening pack's page.
    listening_pack: Option<String>,
    /// Pictures in which configurations stand together, by heading.
    together: Vec<Panel>,
    sections: Vec<Section>,
    provenance: Option<Provenance>,
}

/// A configuration in the first table.
pub struct Row {
    pub letter: String,
    pub name: String,
    pub shape: usize,
    pub cells: Vec<Cell>,
}

/// Pictures under one heading.
pub struct Panel {
    pub heading: &'static str,
    pub words: String,
    pub lines: Vec<String>,
    pub pictures: Vec<Picture>,
}

/// A recording with its renders.
pub struct Play {
    pub recording: String,
    /// How its levels lie to the headroom.
    pub histograms: Vec<Picture>,
    pub files: Vec<Render>,
}

/// A rendered file.
pub struct Render {
    pub letter: String,
    pub name: String,
    pub link: String,
    pub file: String,
}

/// Where everything comes from.
pub struct Provenance {
    pub program: String,
    pub options: Vec<[String; 2]>,
    pub stage_file: String,
    pub download: String,
    pub tubes: Vec<TubeData>,
}

/// A tube type in words.
pub struct TubeData {
    pub tube: String,
    pub origin: String,
    pub rests_on: String,
    pub evidence: Vec<String>,
}

impl Page {
    /// The view of a report.
    pub fn of(document: &Document) -> Page {
        let all = &document.figures.configurations;
        let letters: Vec<String> = (0..all.len()).map(words::letter).collect();
        let lettered: Vec<Lettered<'_>> = all
            .iter()
            .zip(&letters)
            .enumerate()
            .map(|(index, (figures, letter))| Lettered { index, letter, figures })
            .collect();
        let (columns, cells) = glance::table(document);
        let (exceeded, notes) = exceeded::warnings(all, &letters);
        let rows: Vec<Row> = lettered.iter().zip(cells).map(|(one, cells)| row(one, cells)).collect();
        let title = document.figures.title.as_deref().unwrap_or("A tube line stage");
        Page {
            title: plain(title).into_owned(),
            subtitle: subtitle(document),
            style: include_str!("template/page.css"),
            picture_style: PICTURE_STYLE,
            script: include_str!("template/page.js"),
            exceeded,
            notes,
            columns,
            marked: rows.iter().flat_map(|row| &row.cells).any(|cell| !cell.mark.is_empty()),
            rows,
            doubts: glance::doubts(document, &letters),
            trusted: is_trusted(all),
            plays: plays(document, &lettered),
            listening_pack: document.figures.listening_pack.as_deref().map(|page| percent_encoded(page, "/")),
            together: together(document, &lettered),
            sections: lettered.iter().map(|one| Section::of(document, *one)).collect(),
            provenance: document.figures.provenance.as_ref().map(provenance),
        }
    }

    /// Every picture of the page.
    pub fn pictures(&self) -> impl Iterator<Item = &Picture> {
        let panels = self.together.iter().flat_map(|panel| &panel.pictures);
        let panels = panels.chain(self.plays.iter().flat_map(|play| &play.histograms));
        panels.chain(self.sections.iter().flat_map(Section::pictures))
    }
}

fn row(one: &Lettered<'_>, cells: Vec<Cell>) -> Row {
    let name = plain(&one.figures.name).into_owned();
    Row { letter: one.letter.to_owned(), name, shape: one.index % TOGETHER, cells }
}

fn subtitle(document: &Document) -> String {
    let all = &document.figures.configurations;
    let count = match all.len() {
        1 => "one configuration".to_owned(),
        many => format!("{many} configurations"),
    };
    let tone = all.first().and_then(glance::tone).map_or_else(String::new, |tone| {
        format!(
            ", figures at {} and {} rms at the input",
            words::nice(&hertz(tone.frequency)),
            words::level(tone.input_rms)
        )
    });
    format!("{count}{tone}")
}

fn hertz(value: f64) -> String {
    crate::show::units::hertz(value)
}

/// In groups that share a picture.
fn groups<'a>(all: &'a [Lettered<'a>]) -> impl Iterator<Item = (usize, &'a [Lettered<'a>])> {
    all.chunks(TOGETHER).enumerate()
}

fn together(document: &Document, all: &[Lettered<'_>]) -> Vec<Panel> {
    let spectra = all.iter().filter_map(|one| Some(plots::spectrum(*one, glance::tone(one.figures)?)));
    let level = all.first().and_then(|one| glance::tone(one.figures)).map_or_else(String::new, |tone| {
        format!("A {} sine of {} rms.", words::nice(&hertz(tone.frequency)), words::level(tone.input_rms))
    });
    let targets = document.figures.configurations.iter().any(|c| c.profile.is_some());
    let target = if targets { " Boxes and brackets: what the target profile wants." } else { "" };
    let bars = if is_trusted(&document.figures.configurations) {
        " Bars: what equally good fits of the tubes' published points allow."
    } else {
        ""
    };
    let each = |draw: &dyn Fn(&[Lettered<'_>], String) -> Option<Picture>, name: &str| -> Vec<Picture> {
        groups(all).filter_map(|(k, group)| draw(group, format!("{name}-{}", k + 1))).collect()
    };
    let panels = vec![
        Panel {
            heading: "Harmonics",
            words: format!("{level}{bars}{target}"),
            lines: Vec::new(),
            pictures: spectra.collect(),
        },
        Panel {
            heading: "Distortion against level",
            words: "A mark stands where the gain has fallen by 1 dB.".to_owned(),
            lines: Vec::new(),
            pictures: each(&plots::thd_over_level, "thd"),
        },
        Panel {
            heading: "Response",
            words: "Marks: 3 dB below 1 kHz.".to_owned(),
            lines: all.iter().filter_map(edges).collect(),
            pictures: each(&plots::response, "response"),
        },
        Panel {
            heading: "Impedances",
            words: "Seen by the source, and by the load with the load removed.".to_owned(),
            lines: Vec::new(),
            pictures: each(&plots::impedances, "impedances"),
        },
    ];
    panels.into_iter().filter(|panel| !panel.pictures.is_empty()).collect()
}

/// Whether harmonics carry how far the tube data go.
fn is_trusted(configurations: &[ConfigurationFigures]) -> bool {
    let tones = configurations.iter().filter_map(glance::tone);
    tones.flat_map(|tone| &tone.harmonics).any(|harmonic| harmonic.trust_db.is_some())
}

/// "A 3.1 Hz to 92 kHz".
fn edges(one: &Lettered<'_>) -> Option<String> {
    let sweep = one.figures.frequency_sweep.as_ref()?;
    let edge = |frequency: Option<f64>| frequency.map_or_else(|| "none".to_owned(), words::frequency);
    Some(format!("{}\u{a0} {} to {}", one.letter, edge(sweep.low), edge(sweep.high)))
}

fn plays(document: &Document, all: &[Lettered<'_>]) -> Vec<Play> {
    let mut plays: Vec<Play> = Vec::new();
    for render in document.figures.renders.iter().flatten() {
        let Some(one) = all.iter().find(|one| one.figures.name == render.configuration) else { continue };
        let file = Render {
            letter: one.letter.to_owned(),
            name: plain(&one.figures.name).into_owned(),
            link: percent_encoded(&render.file, "/"),
            file: plain(&render.file).into_owned(),
        };
        let recording = plain(&render.recording).into_owned();
        match plays.iter_mut().find(|play| play.recording == recording) {
            Some(play) => play.files.push(file),
            None => {
                let histograms = histograms(document, &render.recording, all);
                plays.push(Play { recording, histograms, files: vec![file] });
            }
        }
    }
    plays
}

fn histograms(document: &Document, recording: &str, all: &[Lettered<'_>]) -> Vec<Picture> {
    let recordings = document.figures.recordings.iter().flatten().enumerate();
    let Some((n, figures)) = recordings.into_iter().find(|(_, figures)| figures.name == recording) else {
        return Vec::new();
    };
    groups(all)
        .filter_map(|(k, group)| plots::histogram(figures, group, format!("recording-{}-{}", n + 1, k + 1)))
        .collect()
}

/// Text as a part of an address (RFC 3986): letters, digits, `-._~` and what `kept` names stay.
fn percent_encoded(text: &str, kept: &str) -> String {
    let mut out = String::with_capacity(text.len());
    for byte in text.bytes() {
        let c = char::from(byte);
        if c.is_ascii_alphanumeric() || "-._~".contains(c) || (c.is_ascii() && kept.contains(c)) {
            out.push(c);
        } else {
            out.push_str(&format!("%{byte:02X}"));
        }
    }
    out
}

fn provenance(figures: &crate::figures::ProvenanceFigures) -> Provenance {
    let lines = figures.stage_file.lines().map(|line| plain(&line.replace('\t', "    ")).into_owned());
    let option = |[name, value]: &[String; 2]| [plain(name).into_owned(), plain(value).into_owned()];
    Provenance {
        program: figures.program.clone(),
        options: figures.options.iter().map(option).collect(),
        stage_file: lines.collect::<Vec<_>>().join("\n"),
        download: format!("data:application/toml;charset=utf-8,{}", percent_encoded(&figures.stage_file, "")),
        tubes: figures.tubes.iter().map(tube).collect(),
    }
}

fn tube(data: &TubeDataFigures) -> TubeData {
    let origin = match (data.from_library, data.ensemble) {
        (true, 0) => format!("library, law {}", data.model),
        (true, many) => format!("library, law {}, {many} equally good fits", data.model),
        (false, _) => format!("the stage file's own, law {}", data.model),
    };
    TubeData {
        tube: plain(&data.tube).into_owned(),
        origin,
        rests_on: plain(&data.rests_on).into_owned(),
        evidence: data.evidence.iter().map(|text| words::nice_sentence(text)).collect(),
    }
}
