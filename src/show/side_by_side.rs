//! Configurations beside each other, with a mark where they differ.

use comfy_table::{Cell, CellAlignment, ContentArrangement, Table, presets};

use crate::terminal::plain;

/// A row that differs between configurations begins with this.
const DIFFERS: &str = "≠";
/// Room for one configuration's figures, in columns of the terminal.
const COLUMN: usize = 13;
/// Room for the mark and a row's label.
const LABEL: usize = 22;

/// A table whose columns are configurations.
#[derive(Clone, Debug, Default)]
pub struct SideBySide {
    names: Vec<String>,
    rows: Vec<Row>,
}

#[derive(Clone, Debug)]
enum Row {
    Heading(String),
    Figures(String, Vec<String>),
}

impl SideBySide {
    /// A table of the named configurations.
    pub fn of<'a>(names: impl Iterator<Item = &'a str>) -> Self {
        SideBySide { names: names.map(|name| plain(name).into_owned()).collect(), rows: Vec::new() }
    }

    /// Begins a group of rows.
    pub fn heading(&mut self, text: &str) {
        self.rows.push(Row::Heading(text.to_owned()));
    }

    /// A row with one figure a configuration; a row that no configuration fills is left out.
    pub fn row(&mut self, label: &str, cells: impl Iterator<Item = Option<String>>) {
        let cells: Vec<Option<String>> = cells.collect();
        if cells.iter().any(Option::is_some) {
            let shown = |cell: Option<String>| cell.unwrap_or_else(|| "–".to_owned());
            self.rows.push(Row::Figures(label.to_owned(), cells.into_iter().map(shown).collect()));
        }
    }

    /// The table in `width` columns of a terminal: as many configurations side by side as fit, the rest below.
    pub fn render(&self, width: usize) -> String {
        let beside = (width.saturating_sub(LABEL) / (COLUMN + 1)).max(1);
        let several = self.names.len() > 1;
        let pages = self.names.len().div_ceil(beside).max(1);
        let page = |page: usize| {
            let columns = page * beside..((page + 1) * beside).min(self.names.len());
            self.page(columns, several)
        };
        let mut out = (0..pages).map(page).collect::<Vec<_>>().join("\n");
        if several {
            out.push_str(&format!("{DIFFERS} differs between configurations\n"));
        }
        out
    }

    fn page(&self, columns: std::ops::Range<usize>, several: bool) -> String {
        let mut table = Table::new();
        table.load_style(presets::NOTHING).set_content_arrangement(ContentArrangement::Disabled);
        let mut header = vec![Cell::new(""), Cell::new("")];
        header.extend(
            self.names[columns.clone()]
                .iter()
                .map(|name| Cell::new(wrapped(name, COLUMN)).set_alignment(CellAlignment::Right)),
        );
        table.set_header(header);
        for row in &self.rows {
            match row {
                Row::Heading(text) => table.add_row(vec![Cell::new(""), Cell::new(text)]),
                Row::Figures(label, cells) => {
                    let differs = several && cells.iter().any(|cell| cell != &cells[0]);
                    let mut line =
                        vec![Cell::new(if differs { DIFFERS } else { "" }), Cell::new(format!("  {label}"))];
                    let figures = cells[columns.clone()].iter();
                    line.extend(figures.map(|cell| Cell::new(cell).set_alignment(CellAlignment::Right)));
                    table.add_row(line)
                }
            };
        }
        table.column_iter_mut().for_each(|column| {
            column.set_padding((0, 1));
        });
        let text = table.trim_fmt();
        text + "\n"
    }
}

/// `text` broken at spaces into lines of at most `width` characters where its words allow.
fn wrapped(text: &str, width: usize) -> String {
    let mut lines: Vec<String> = Vec::new();
    for word in text.split(' ') {
        match lines.last_mut() {
            Some(line) if line.chars().count() + 1 + word.chars().count() <= width => {
                line.push(' ');
                line.push_str(word);
            }
            _ => lines.push(word.to_owned()),
        }
    }
    lines.join("\n")
}
