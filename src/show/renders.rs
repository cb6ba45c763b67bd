//! Rendered files as a list.

use super::units;
use crate::rendering::{RenderFigures, alias_lines, level_line};
use crate::terminal::plain;

/// One line a file, and the level that they share.
pub fn renders(figures: &[RenderFigures]) -> String {
    let width = figures.iter().map(|f| plain(&f.file).chars().count()).max().unwrap_or(0);
    let mut out = String::from("Rendered\n");
    for f in figures {
        let peak = f.peak_dbfs.map_or_else(|| "silence".to_owned(), |dbfs| format!("{dbfs:.2} dBFS"));
        let over = if f.over_full_scale > 0 { format!("  {} over", f.over_full_scale) } else { String::new() };
        out.push_str(&format!(
            "  {:<width$}  {:>9} peak, {peak:>11}{over}\n",
            plain(&f.file),
            units::volts(f.peak_volts)
        ));
    }
    if let Some(line) = level_line(figures) {
        out.push_str(&format!("{line}\n"));
    }
    for line in alias_lines(figures) {
        out.push_str(&format!("{}\n", plain(&line)));
    }
    out
}
