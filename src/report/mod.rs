//! The page: report.json in, one file out that needs nothing else.
//!
//! Everything on the page comes from report.json's text, so a page made beside a comparison and one made later are the
//! same bytes.

mod bench_sheet;
mod document;
mod exceeded;
mod glance;
mod page;
mod plots;
mod schematic;
mod section;
mod svg;
mod words;

use std::path::PathBuf;

use crate::audio_files::{OutputFolder, StagedFile};
use crate::failure::{Failure, WorkError};

/// The page's file.
pub const PAGE: &str = "report.html";
/// The folder of pictures below the output folder.
pub const PLOTS: &str = "plots";

/// Looks of the pictures, on the page and in files of their own.
const PICTURE_STYLE: &str = include_str!("template/pictures.css");

/// A page, and its pictures as files of their own by name.
#[derive(Clone, Debug)]
pub struct Report {
    pub html: String,
    pub plots: Vec<(String, String)>,
}

/// Draws the report.json in `json`, known to a person as `name`.
///
/// # Errors
/// [`crate::failure::RequestError`] where it is damaged, of another schema or no report.
pub fn draw(name: &str, json: &str) -> Result<Report, Failure> {
    let document = document::Document::read(name, json)?;
    let page = page::Page::of(&document);
    let html = askama::Template::render(&page).map_err(|error| WorkError::Failed {
        problem: format!("the page could not be written: {error}"),
        remedy: "please report this".to_owned(),
    })?;
    let file = |picture: &svg::Picture| (format!("{}.svg", picture.name), picture.file(PICTURE_STYLE));
    Ok(Report { html, plots: page.pictures().map(file).collect() })
}

/// Every picture that a report may write, below the output folder: more than one needs not be drawn.
pub fn plot_files(configurations: usize, recordings: usize) -> Vec<PathBuf> {
    let of_each = ["harmonics", "schematic", "plates-gain", "plates-follower", "cycle", "transfer", "level"];
    let each =
        (0..configurations).map(words::letter).flat_map(|letter| of_each.map(|kind| format!("{kind}-{letter}")));
    let groups = 1..=configurations.div_ceil(plots::TOGETHER);
    let together = groups.clone().flat_map(|k| ["thd", "response", "impedances"].map(|kind| format!("{kind}-{k}")));
    let played = (1..=recordings).flat_map(|n| groups.clone().map(move |k| format!("recording-{n}-{k}")));
    each.chain(together).chain(played).map(|name| PathBuf::from(format!("{PLOTS}/{name}.svg"))).collect()
}

impl Report {
    /// The page, and its pictures where they are wanted, staged in `folder`.
    ///
    /// # Errors
    /// A temporary cannot be made or written.
    pub fn staged(&self, folder: &OutputFolder, plots: bool) -> Result<Vec<StagedFile>, Failure> {
        let mut staged = vec![folder.stage_contents(PAGE, self.html.as_bytes())?];
        for (name, svg) in self.plots.iter().filter(|_| plots) {
            staged.push(folder.stage_contents(PathBuf::from(format!("{PLOTS}/{name}")), svg.as_bytes())?);
        }
        Ok(staged)
    }
}
